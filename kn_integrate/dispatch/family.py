"""A disk integral together with its neighbourhood in kinematic space."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from ..channels import pair_order
from ..disk.terms import Term
from ..errors import InputError
from ..exact import ONE, Exact
from ..exponents import DiskExponents
from ..integrals import DiskIntegral, DiskTerm
from ..integrand import Integrand, parse_integrand
from ..kinematics import Mandelstams
from .integral import Shift, TermsAt, shifted
from .shifts import Chord, chords_of, pair_shift


@dataclass(frozen=True)
class DiskFamily:
    """What the engines need to know of one integral at one kinematic point.

    Attributes
    ----------
    n : int
    ordering : tuple of int
        Labels by position.
    terms_at : function
        The terms at the point moved by a shift of planar invariants.
    invariants : mapping or None
        X of every chord at the point; None when only exponents are known.
    varying : bool
        True when coefficients depend on the kinematics.
    """

    n: int
    ordering: tuple[int, ...]
    terms_at: TermsAt
    invariants: Mapping[Chord, Exact] | None
    varying: bool

    def name(self, chord: Chord) -> tuple[int, ...]:
        """The labels of the channel of a chord, sorted."""
        return tuple(sorted(self.ordering[chord[0] - 1 : chord[1]]))

    def chord(self, labels: Sequence[int], field: str = "channel") -> Chord:
        """The chord of a planar channel given by its labels or by those of its complement.

        Raises
        ------
        InputError
            When the labels are no planar channel of the ordering.
        """
        inside = set(labels)
        everything = set(self.ordering)
        for chord in chords_of(self.n):
            cluster = set(self.name(chord))
            if inside in (cluster, everything - cluster):
                return chord
        expected = "two or more labels that are neighbours in the ordering " + ".".join(map(str, self.ordering))
        raise InputError(field, ".".join(map(str, labels)), expected)


def disk_family(kin: Any, f: Any = None, ordering: Sequence[int] | None = None) -> DiskFamily:
    """Read what a caller gives for a disk integral; see :func:`kn_integrate.disk_integral` for the forms of f.

    Raises
    ------
    InputError
    """
    if isinstance(kin, DiskExponents):
        if f is not None:
            raise InputError("f", repr(f), "no integrand beside DiskExponents, which contain it")
        if ordering is not None:
            raise InputError("ordering", repr(ordering), "none beside DiskExponents: punctures stand in order")
        terms: Sequence[Term] = [DiskTerm(ONE, kin.pairs)]
        n = kin.n
        return DiskFamily(n, tuple(range(1, n + 1)), lambda by: shifted(n, terms, by), None, False)
    if not isinstance(kin, Mandelstams):
        raise InputError("kin", type(kin).__name__, "Mandelstams or DiskExponents")
    n = kin.n
    if f is None:
        raise InputError("f", "None", "an integrand, such as parke_taylor(1, 2, ..., n)")
    if isinstance(f, str):
        f = parse_integrand(f)
    if isinstance(f, DiskIntegral):
        if ordering is not None and tuple(ordering) != f.ordering:
            raise InputError("ordering", repr(tuple(ordering)), f"the ordering of the integral, {f.ordering}")
        return _fixed(kin, f)
    if isinstance(f, Integrand):
        return _fixed(kin, DiskIntegral(n, f, ordering))
    if not callable(f):
        raise InputError("f", type(f).__name__, "an Integrand, its text, a DiskIntegral or a function of kinematics")
    function = f
    order = DiskIntegral(n, _integrand_of(function, kin), ordering).ordering

    def terms_at(by: Shift) -> Sequence[Term]:
        point = moved(kin, order, by)
        return DiskIntegral(n, _integrand_of(function, point), order).terms(point)

    return DiskFamily(n, order, terms_at, _invariants(kin, order), True)


def _fixed(kin: Mandelstams, spec: DiskIntegral) -> DiskFamily:
    terms = spec.terms(kin)
    n = spec.n
    return DiskFamily(n, spec.ordering, lambda by: shifted(n, terms, by), _invariants(kin, spec.ordering), False)


def _integrand_of(f: Callable[[Mandelstams], Integrand], kin: Mandelstams) -> Integrand:
    found = f(kin)
    if not isinstance(found, Integrand):
        raise InputError(
            "f", f"a function that returned {type(found).__name__}", "a function that returns an Integrand"
        )
    return found


def _invariants(kin: Mandelstams, ordering: Sequence[int]) -> dict[Chord, Exact]:
    return {(i, j): kin.channel(tuple(ordering[i - 1 : j])) for i, j in chords_of(kin.n)}


def moved(kin: Mandelstams, ordering: Sequence[int], by: Shift) -> Mandelstams:
    """The point with planar invariants of an ordering moved, all other planar invariants and the row sums held."""
    if not by:
        return kin
    n = kin.n
    pairs = {}
    for (i, j), h in zip(pair_order(n), pair_shift(n, by), strict=True):
        a, b = ordering[i - 1], ordering[j - 1]
        pairs[min(a, b), max(a, b)] = kin.pair(a, b) + h
    return kin.with_pairs(pairs)
