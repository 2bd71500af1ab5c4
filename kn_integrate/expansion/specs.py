"""What can be expanded: disk integrals, sphere integrals, and entries of the matrix F."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, TypeAlias

from ..channels import read_count, read_labels
from ..errors import InputError
from ..integrals import DiskIntegral, SphereIntegral
from ..integrand import Integrand
from ..kinematics import Mandelstams
from .chains import Word
from .disk import ZERO_SUM, Engine, disk_series, exact_engine, f_series, uniform_words
from .lines import Series
from .sphere import sphere_series


@dataclass(frozen=True, init=False)
class FEntry:
    """One entry of the matrix F of disk integrals, which goes to the unit matrix as alpha' -> 0.

    ``F[row, column]`` is the integral over ``z_1 < z_row < z_(n-1) < z_n`` (z_1 = 0, z_(n-1) = 1, z_n = infinity) of
    ``prod |z_ij|^s_ij prod_k sum_j s_(j c_k)/(z_(c_k) - z_j)``, j over label 1 and the letters before ``c_k`` in the
    column; Mafra, Schlotterer, Stieberger 2011, arXiv:1106.2645.

    Parameters
    ----------
    n
        Number of legs.
    row, column
        Permutations of 2..n-2; the order of the labels when None.

    Examples
    --------
    >>> FEntry(5, (2, 3), (3, 2))
    FEntry(n=5, row=(2, 3), column=(3, 2))
    """

    n: int
    row: Word
    column: Word

    def __init__(self, n: int, row: Sequence[int] | None = None, column: Sequence[int] | None = None) -> None:
        count = read_count(n)
        object.__setattr__(self, "n", count)
        for name, given in (("row", row), ("column", column)):
            letters = tuple(range(2, count - 1))
            word = letters if given is None else read_labels(given, count, name)
            if tuple(sorted(word)) != letters:
                raise InputError(name, repr(word), f"a permutation of {letters}")
            object.__setattr__(self, name, word)

    def to_dict(self) -> dict[str, Any]:
        """Plain data."""
        return {"n": self.n, "row": list(self.row), "column": list(self.column)}


Spec: TypeAlias = DiskIntegral | SphereIntegral | FEntry


def leading_order(spec: Spec) -> int:
    """The power of alpha' of weight 0."""
    return 0 if isinstance(spec, FEntry) else 3 - spec.n


def kind_of(spec: Spec) -> str:
    """One word for the kind of integral."""
    return {DiskIntegral: "disk", SphereIntegral: "sphere", FEntry: "F"}[type(spec)]


def is_uniform(spec: Spec) -> bool:
    """Whether every coefficient has zeta values of one weight: no double poles."""
    if isinstance(spec, FEntry):
        return True
    integrands = (spec.f,) if isinstance(spec, DiskIntegral) else (spec.f, spec.g)
    return all(uniform_words(spec.n, each) is not None for each in integrands)


def check(spec: Spec, kin: Mandelstams) -> None:
    """Raise InputError for a point that does not belong to the integral."""
    if not isinstance(spec, FEntry):
        spec.terms(kin)  # string, number of legs, covariance
    elif kin.n != spec.n:
        raise InputError("kin", f"kinematics of {kin.n} legs", f"{spec.n} legs")
    elif kin.string == "closed":
        raise InputError("kin", "closed-string kinematics", "open-string kinematics for disk integrals")
    if not kin.is_massless:
        rows = ", ".join(map(str, kin.row_sums))
        raise InputError("row_sums", f"({rows})", "zero: the expansion multiplies all invariants by alpha'")


def series_of(
    spec: Spec,
    kin: Mandelstams,
    weight: int,
    engine: Engine = exact_engine,
    zero: Any = ZERO_SUM,
    zeta2: Any = None,
) -> Series:
    """The coefficients by weight, from one of the engines."""
    if isinstance(spec, DiskIntegral):
        return disk_series(kin, spec.f, spec.ordering, weight, engine, zero)
    if isinstance(spec, SphereIntegral):
        return sphere_series(kin, spec.f, spec.g, weight, engine, zero, zeta2)
    return f_series(kin, spec.row, spec.column, weight, engine)


def read_spec(n: int, f: Any, g: Integrand | str | None = None, ordering: Sequence[int] | None = None) -> Spec:
    """The integral that the arguments of a public call mean."""
    if isinstance(f, (DiskIntegral, SphereIntegral, FEntry)):
        if g is not None:
            raise InputError("g", repr(g), "no second integrand beside an integral")
        if ordering is not None and not (isinstance(f, DiskIntegral) and tuple(ordering) == f.ordering):
            raise InputError("ordering", repr(ordering), "none beside an integral, which has its own")
        return f
    if g is None:
        return DiskIntegral(n, f, ordering)
    if ordering is not None:
        raise InputError("ordering", repr(ordering), "none on the sphere")
    return SphereIntegral(n, f, g)
