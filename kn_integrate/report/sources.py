"""The published sources of the methods behind a number.

A result names its method and may name, under ``details["techniques"]``, what it used on the way; both are looked up
here.  A technique without a published source of its own (common practice, or worked out in this package) is absent.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

_KOBA_NIELSEN = "Z. Koba, H. B. Nielsen, Nucl. Phys. B 12 (1969) 517: the integrals"
_KLT = "H. Kawai, D. C. Lewellen, S.-H. H. Tye, Nucl. Phys. B 269 (1986) 1: closed-string trees from open-string trees"

SOURCES: Mapping[str, tuple[str, ...]] = {
    # methods
    "quadrature": (
        _KOBA_NIELSEN,
        "F. C. S. Brown, Ann. Sci. Ec. Norm. Super. 42 (2009) 371, arXiv:math/0606419: dihedral coordinates, "
        "the divisors at which the integrand is singular",
        "J. Vuillemin, Commun. ACM 23 (1980) 229: Cartesian trees, which cut the domain into sectors",
    ),
    "kz": (
        _KOBA_NIELSEN,
        "V. G. Knizhnik, A. B. Zamolodchikov, Nucl. Phys. B 247 (1984) 83: the differential equation",
        "J. Broedel, O. Schlotterer, S. Stieberger, T. Terasoma, Phys. Rev. D 89 (2014) 066014, arXiv:1304.7304: "
        "one puncture at a time through that equation",
    ),
    "direct": (
        _KOBA_NIELSEN,
        "V. S. Dotsenko, V. A. Fateev, Nucl. Phys. B 251 (1985) 691: integrals over complex planes, chirally split",
    ),
    "klt": (
        _KLT,
        "N. E. J. Bjerrum-Bohr, P. H. Damgaard, T. Sondergaard, P. Vanhove, JHEP 01 (2011) 001, arXiv:1010.3933: "
        "the kernel",
    ),
    # techniques
    "gauss-jacobi": (
        "G. H. Golub, J. H. Welsch, Math. Comp. 23 (1969) 221: Gauss rules from a tridiagonal eigenproblem",
    ),
    "u-equations": (
        "Z. Koba, H. B. Nielsen, Nucl. Phys. B 12 (1969) 517; F. C. S. Brown, arXiv:math/0606419: "
        "the relations among dihedral coordinates",
    ),
    "kleiss-kuijf": ("R. Kleiss, H. Kuijf, Nucl. Phys. B 312 (1989) 616: relations among colour orderings",),
}


def sources_of(method: str, details: Mapping[str, Any]) -> tuple[str, ...]:
    """The sources of a method, joint methods (``"a+b"``) and listed techniques, each once, in order of use.

    >>> [source.split(":")[0] for source in sources_of("klt", {})][0]
    'H. Kawai, D. C. Lewellen, S.-H. H. Tye, Nucl. Phys. B 269 (1986) 1'
    """
    techniques = details.get("techniques", ())
    names = [*method.split("+"), *(techniques if isinstance(techniques, Iterable) else ())]
    return tuple(dict.fromkeys(source for name in names for source in SOURCES.get(str(name), ())))
