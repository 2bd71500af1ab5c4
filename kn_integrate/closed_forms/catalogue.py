"""Which closed forms apply to given exponents."""

from __future__ import annotations

from typing import Any

from .beta import BetaProduct, EulerBeta
from .dixon_anderson import DixonAnderson
from .dougall import RogersDougall
from .five_point_loci import LOCI
from .form import DiskForm, Match
from .hypergeometric import FivePoint, HypergeometricChain
from .pairs import PairExponents
from .selberg import Selberg
from .sphere import ComplexBeta, ComplexSelberg, SphereForm

DISK_FORMS: tuple[type[DiskForm], ...] = (
    EulerBeta,
    BetaProduct,
    *LOCI,
    FivePoint,
    RogersDougall,
    HypergeometricChain,
    DixonAnderson,
    Selberg,
)
SPHERE_FORMS: tuple[type[SphereForm], ...] = (ComplexBeta, ComplexSelberg)


def find(exponents: Any) -> tuple[Match, ...]:
    """All closed forms of a disk integral in absolute-value form, Gamma products before series.

    Parameters
    ----------
    exponents : PairExponents or sequence of numbers
        A_ij in the order (1,2), (1,3), ..., (n-1,n) of the positions on the circle; rows sum to -2.

    Examples
    --------
    >>> [match.form.name for match in find(EulerBeta("1/3", "1/5").pairs())]
    ['Euler beta', 'product of Euler betas', 'Selberg integral']
    """
    pairs = PairExponents.of(exponents)
    matches = (form.match(pairs) for form in DISK_FORMS)
    return tuple(match for match in matches if match is not None)


def find_sphere(left: Any, right: Any) -> tuple[SphereForm, ...]:
    """All closed forms of a sphere integral with exponents ``left`` of z_ij and ``right`` of conj(z_ij)."""
    matches = (form.match(left, right) for form in SPHERE_FORMS)
    return tuple(match for match in matches if match is not None)
