"""The published sources of the methods behind a number, as text and as BibTeX.

A result names its method and may name, under ``details["techniques"]``, what it used on the way; both are looked up
here.  A technique without a published source of its own (common practice, or worked out in this package) is absent.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from typing import Any


@dataclass(frozen=True)
class Reference:
    """A publication, and what it is cited for.

    Attributes
    ----------
    key : str
        Of the BibTeX entry.
    authors : tuple of str
        ``"F. C. S. Brown"``.
    title, journal, volume, year, pages : str
    eprint : str
        Number in the arXiv, or empty.
    use : str
        What it is cited for.
    """

    key: str
    authors: tuple[str, ...]
    title: str
    journal: str
    volume: str
    year: str
    pages: str
    eprint: str = ""
    use: str = ""

    @property
    def text(self) -> str:
        """One line."""
        where = f"{self.journal} {self.volume} ({self.year}) {self.pages}"
        eprint = f", arXiv:{self.eprint}" if self.eprint else ""
        return f"{', '.join(self.authors)}, {where}{eprint}" + (f": {self.use}" if self.use else "")

    @property
    def bibtex(self) -> str:
        """One entry."""
        fields = {
            "author": " and ".join(_last_first(author) for author in self.authors),
            "title": "{" + self.title + "}",
            "journal": self.journal,
            "volume": self.volume,
            "year": self.year,
            "pages": self.pages,
        }
        if self.eprint:
            fields |= {"eprint": self.eprint, "archivePrefix": "arXiv"}
        if self.use:
            fields["note"] = "used for: " + self.use
        return f"@article{{{self.key},\n" + "".join(f"  {k} = {{{v}}},\n" for k, v in fields.items()) + "}\n"

    def cited_for(self, use: str) -> Reference:
        """The same publication, cited for something else."""
        return replace(self, use=use)


def _last_first(author: str) -> str:
    """``"F. C. S. Brown"`` as ``"Brown, F. C. S."``."""
    parts = author.split(" ")
    start = next(k for k, part in enumerate(parts) if not part.endswith("."))
    return f"{' '.join(parts[start:])}, {' '.join(parts[:start])}"


_KOBA_NIELSEN = Reference(
    "KobaNielsen1969",
    ("Z. Koba", "H. B. Nielsen"),
    "Manifestly crossing-invariant parametrization of n-meson amplitude",
    "Nucl. Phys. B",
    "12",
    "1969",
    "517",
    use="the integrals",
)
_BROWN = Reference(
    "Brown2009",
    ("F. C. S. Brown",),
    r"Multiple zeta values and periods of moduli spaces $\mathfrak{M}_{0,n}$",
    "Ann. Sci. Ec. Norm. Super.",
    "42",
    "2009",
    "371",
    "math/0606419",
    "dihedral coordinates, the divisors at which the integrand is singular",
)
_VUILLEMIN = Reference(
    "Vuillemin1980",
    ("J. Vuillemin",),
    "A unifying look at data structures",
    "Commun. ACM",
    "23",
    "1980",
    "229",
    use="Cartesian trees, which cut the domain into sectors",
)
_KZ = Reference(
    "KnizhnikZamolodchikov1984",
    ("V. G. Knizhnik", "A. B. Zamolodchikov"),
    "Current algebra and Wess-Zumino model in two dimensions",
    "Nucl. Phys. B",
    "247",
    "1984",
    "83",
    use="the differential equation",
)
_ASSOCIATOR = Reference(
    "BroedelSchlottererStiebergerTerasoma2014",
    ("J. Broedel", "O. Schlotterer", "S. Stieberger", "T. Terasoma"),
    r"All order $\alpha'$-expansion of superstring trees from the Drinfeld associator",
    "Phys. Rev. D",
    "89",
    "2014",
    "066014",
    "1304.7304",
    "one puncture at a time through that equation",
)
_DOTSENKO_FATEEV = Reference(
    "DotsenkoFateev1985",
    ("V. S. Dotsenko", "V. A. Fateev"),
    r"Four-point correlation functions and the operator algebra in 2D conformal invariant theories with central "
    r"charge $c \leq 1$",
    "Nucl. Phys. B",
    "251",
    "1985",
    "691",
    use="integrals over complex planes, chirally split",
)
_KLT = Reference(
    "KawaiLewellenTye1986",
    ("H. Kawai", "D. C. Lewellen", "S.-H. H. Tye"),
    "A relation between tree amplitudes of closed and open strings",
    "Nucl. Phys. B",
    "269",
    "1986",
    "1",
    use="closed-string trees from open-string trees",
)
_KERNEL = Reference(
    "BjerrumBohrDamgaardSondergaardVanhove2011",
    ("N. E. J. Bjerrum-Bohr", "P. H. Damgaard", "T. Sondergaard", "P. Vanhove"),
    "The momentum kernel of gauge and gravity theories",
    "JHEP",
    "01",
    "2011",
    "001",
    "1010.3933",
    "the kernel",
)
_GOLUB_WELSCH = Reference(
    "GolubWelsch1969",
    ("G. H. Golub", "J. H. Welsch"),
    "Calculation of Gauss quadrature rules",
    "Math. Comp.",
    "23",
    "1969",
    "221",
    use="Gauss rules from a tridiagonal eigenproblem",
)
_KLEISS_KUIJF = Reference(
    "KleissKuijf1989",
    ("R. Kleiss", "H. Kuijf"),
    "Multigluon cross sections and 5-jet production at hadron colliders",
    "Nucl. Phys. B",
    "312",
    "1989",
    "616",
    use="relations among colour orderings",
)
_BY_PARTS = Reference(
    "HeTengZhang2019",
    ("S. He", "F. Teng", "Y. Zhang"),
    "String amplitudes from field-theory amplitudes and vice versa",
    "Phys. Rev. Lett.",
    "122",
    "2019",
    "211603",
    "1812.03369",
    "reduction of integrands by integration by parts",
)
_BERENDS_GIELE = Reference(
    "BerendsGiele1988",
    ("F. A. Berends", "W. T. Giele"),
    "Recursive calculations for processes with n gluons",
    "Nucl. Phys. B",
    "306",
    "1988",
    "759",
    use="Yang-Mills trees",
)
_SUPERSTRING = Reference(
    "MafraSchlottererStieberger2013",
    ("C. R. Mafra", "O. Schlotterer", "S. Stieberger"),
    "Complete N-point superstring disk amplitude I. Pure spinor computation",
    "Nucl. Phys. B",
    "873",
    "2013",
    "419",
    "1106.2645",
    "superstring trees from field-theory trees and F functions",
)
_DOUBLE_SHUFFLES = Reference(
    "IharaKanekoZagier2006",
    ("K. Ihara", "M. Kaneko", "D. Zagier"),
    "Derivation and double shuffle relations for multiple zeta values",
    "Compositio Math.",
    "142",
    "2006",
    "307",
    use="double shuffle relations",
)
_ZETA_BASIS = Reference(
    "SchlottererStieberger2013",
    ("O. Schlotterer", "S. Stieberger"),
    "Motivic multiple zeta values and superstring amplitudes",
    "J. Phys. A",
    "46",
    "2013",
    "475401",
    "1205.1516",
    "the basis of zeta values",
)
_LATTICE = Reference(
    "LenstraLenstraLovasz1982",
    ("A. K. Lenstra", "H. W. Lenstra", "L. Lovasz"),
    "Factoring polynomials with rational coefficients",
    "Math. Ann.",
    "261",
    "1982",
    "515",
    use="lattice reduction, for integer relations",
)
_U_EQUATIONS = "the relations among dihedral coordinates"

SOURCES: Mapping[str, tuple[Reference, ...]] = {
    # methods
    "quadrature": (_KOBA_NIELSEN, _BROWN, _VUILLEMIN),
    "residue": (_KOBA_NIELSEN, _BROWN, _VUILLEMIN),
    "kz": (_KOBA_NIELSEN, _KZ, _ASSOCIATOR),
    "direct": (_KOBA_NIELSEN, _DOTSENKO_FATEEV),
    "klt": (_KLT, _KERNEL),
    "associator": (_ASSOCIATOR.cited_for("trees from the Drinfeld associator"), _DOUBLE_SHUFFLES, _ZETA_BASIS),
    "recursion": (_KZ, _ASSOCIATOR),
    "relations": (_LATTICE,),
    # techniques
    "by-parts": (_BY_PARTS,),
    "berends-giele": (_BERENDS_GIELE,),
    "superstring": (_SUPERSTRING,),
    "gauss-jacobi": (_GOLUB_WELSCH,),
    "u-equations": (_KOBA_NIELSEN.cited_for(_U_EQUATIONS), _BROWN.cited_for(_U_EQUATIONS)),
    "kleiss-kuijf": (_KLEISS_KUIJF,),
}


def references_of(method: str, details: Mapping[str, Any]) -> tuple[Reference, ...]:
    """The sources of a method, joint methods (``"a+b"``) and listed techniques, each use once, in order of use."""
    techniques = details.get("techniques", ())
    names = [*method.split("+"), *(techniques if isinstance(techniques, Iterable) else ())]
    return tuple(dict.fromkeys(source for name in names for source in SOURCES.get(str(name), ())))


def sources_of(method: str, details: Mapping[str, Any]) -> tuple[str, ...]:
    """One line for each source.

    >>> [source.split(":")[0] for source in sources_of("klt", {})][0]
    'H. Kawai, D. C. Lewellen, S.-H. H. Tye, Nucl. Phys. B 269 (1986) 1'
    """
    return tuple(source.text for source in references_of(method, details))


def bibtex_of(method: str, details: Mapping[str, Any]) -> str:
    """BibTeX entries of the sources, a publication once, with all its uses in the note.

    >>> print(bibtex_of("quadrature", {}).splitlines()[0])
    @article{KobaNielsen1969,
    """
    merged: dict[str, Reference] = {}
    for source in references_of(method, details):
        known = merged.get(source.key)
        merged[source.key] = source if known is None else known.cited_for(f"{known.use}; {source.use}")
    return "\n".join(source.bibtex for source in merged.values())
