"""What is integrated: an integrand on an ordered disk or on the sphere, without kinematics.

A :class:`DiskIntegral` knows its ordering P and turns a kinematic point into absolute-value terms in *positions* along
P: ``Z_P(f) = sum_k c_k I(A_k)`` with ``I(A) = int prod |z_ij|^{A_ij}`` over ``z_1 < ... < z_n``.  Every sign is in the
coefficients: on the domain ``z_ij`` is negative exactly when i stands before j in P.

Moebius covariance.  Under ``z -> (a z + b)/(c z + d)`` the factor ``(c z_i + d)`` stands in ``prod |z_jk|^{s_jk}`` with
the power ``-R_i``, in a monomial with ``-sum_j n_ij``, and in ``dz_i`` with -2.  A monomial can be integrated modulo
SL(2) only if they cancel: ``R_i + sum_j n_ij = -2`` for every puncture.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from typing import Any

from .channels import Channel, Pair, pair_index, pair_order, read_count, read_ordering
from .errors import InputError
from .exact import ZERO, Exact
from .integrand import Integrand, Powers, monomial, parse_integrand
from .kinematics import Mandelstams
from .ratios import shown


@dataclass(frozen=True, slots=True)
class DiskTerm:
    """``coefficient * I(A)``; ``pairs`` holds A by positions, in the order (1,2), (1,3), ..., (n-1,n)."""

    coefficient: Exact
    pairs: tuple[Exact, ...]


@dataclass(frozen=True, slots=True)
class SphereTerm:
    """``coefficient * int prod |z_ij|^{2 s_ij} z_ij^{left} conj(z_ij)^{right}``, pairs of labels in the same order."""

    coefficient: Exact
    pairs: tuple[Exact, ...]
    left: tuple[int, ...]
    right: tuple[int, ...]


@dataclass(frozen=True)
class _Monomial:
    """A term of an integrand, prepared for one ordering: the sign is in the coefficient, powers are by position."""

    coefficient: Exact
    shifts: tuple[int, ...]
    degrees: tuple[int, ...]  # sum_j n_ij by label


def _prepare(n: int, f: Integrand, ordering: Channel) -> tuple[_Monomial, ...]:
    places = {label: k for k, label in enumerate(ordering, start=1)}
    index = pair_index(n)
    found = []
    for term in f.terms:
        shifts = [0] * len(pair_order(n))
        degrees = [0] * n
        negative = False
        for (i, j), power in term.powers:
            shifts[index[places[i], places[j]]] = power
            degrees[i - 1] += power
            degrees[j - 1] += power
            negative ^= places[i] < places[j] and power % 2 == 1
        # different monomials have different shifts, so there is nothing to merge
        found.append(_Monomial(-term.coefficient if negative else term.coefficient, tuple(shifts), tuple(degrees)))
    return tuple(found)


def _read_integrand(f: Any, n: int, field: str) -> Integrand:
    if isinstance(f, str):
        f = parse_integrand(f)
    if not isinstance(f, Integrand):
        raise InputError(field, shown(f), "an Integrand, or its text")
    if f.n > n:
        raise InputError(field, f"the label {f.n}", f"labels from 1 to {n}")
    return f


def _check_kinematics(kin: Any, n: int) -> None:
    if not isinstance(kin, Mandelstams):
        raise InputError("kin", type(kin).__name__, "Mandelstams")
    if kin.n != n:
        raise InputError("kin", f"kinematics of {kin.n} legs", f"{n} legs, as in the integral")


def _check_covariance(row_sums: Sequence[Exact], degrees: Sequence[tuple[int, ...]], what: str) -> None:
    """Raise for the first puncture with ``R_i + sum_j n_ij != -2``."""
    needed = [-2 - row for row in row_sums]
    for each in degrees:
        if any(a != b for a, b in zip(needed, each, strict=True)):
            i = next(k for k, (a, b) in enumerate(zip(needed, each, strict=True)) if a != b)
            found = f"puncture {i + 1} with R_{i + 1} + sum_j n_{i + 1}j = {row_sums[i]} + {each[i]}"
            found += f" = {row_sums[i] + each[i]} in a monomial"
            raise InputError(what, found, "-2 for every puncture and monomial (Moebius covariance, the mass shell)")


@dataclass(frozen=True, init=False)
class DiskIntegral:
    """The integral of f over the disk domain of one ordering.

    Parameters
    ----------
    n
        Number of punctures.
    f
        An :class:`~kn_integrate.Integrand`, or its text.
    ordering
        A permutation of the labels 1..n, along the boundary; 1..n when None.

    Raises
    ------
    InputError
        For labels beyond n, or an ordering that is no permutation.

    Examples
    --------
    >>> from kn_integrate.integrand import parke_taylor
    >>> kin = Mandelstams.from_planar(4, {(1, 2): "1/3", (2, 3): "1/5"})
    >>> (term,) = DiskIntegral(4, parke_taylor(1, 2, 3, 4), (4, 3, 2, 1)).terms(kin)
    >>> str(term.coefficient), [str(a) for a in term.pairs]
    ('1', ['-2/3', '-8/15', '-4/5', '-4/5', '-8/15', '-2/3'])
    """

    n: int
    f: Integrand
    ordering: Channel

    def __init__(self, n: int, f: Integrand | str, ordering: Sequence[int] | None = None) -> None:
        object.__setattr__(self, "n", read_count(n))
        object.__setattr__(self, "f", _read_integrand(f, self.n, "f"))
        object.__setattr__(self, "ordering", read_ordering(ordering, self.n))
        object.__setattr__(self, "_monomials", _prepare(self.n, self.f, self.ordering))
        index = pair_index(self.n)
        places = tuple(index[self.ordering[i - 1], self.ordering[j - 1]] for i, j in pair_order(self.n))
        object.__setattr__(self, "_places", places)

    @property
    def monomials(self) -> tuple[_Monomial, ...]:
        """The terms of f with their signs on the domain; powers by position."""
        found: tuple[_Monomial, ...] = self._monomials  # type: ignore[attr-defined]
        return found

    def terms(self, kin: Mandelstams) -> tuple[DiskTerm, ...]:
        """The absolute-value terms at a kinematic point.

        Equal exponents are merged and terms that vanish are left out; an empty tuple is the zero integral.

        Raises
        ------
        InputError
            For closed-string kinematics, another number of legs, and a monomial that is not Moebius covariant at
            these row sums; names the puncture.
        """
        _check_kinematics(kin, self.n)
        if kin.string == "closed":
            expected = "open-string kinematics on the disk (.as_closed() leads from open to closed, for the sphere)"
            raise InputError("kin", "closed-string kinematics", expected)
        _check_covariance(kin.row_sums, [each.degrees for each in self.monomials], "f")
        pairs = kin.pairs
        values = [pairs[k] for k in self._places]  # type: ignore[attr-defined]
        return tuple(
            DiskTerm(each.coefficient, tuple([a + k if k else a for a, k in zip(values, each.shifts, strict=True)]))
            for each in self.monomials
        )

    def poles(self, kin: Mandelstams) -> tuple[tuple[Channel, int, Exact], ...]:
        """The channels whose divisor exponent is a pole, 0, -1, -2, ..., in some term.

        Returns
        -------
        tuple of (channel, level, X)
            All labels of the channel (without the last one of the ordering), the largest level over the terms, and
            the planar invariant.  Poles of single terms may cancel in the sum.
        """
        found: dict[tuple[int, int], int] = {}
        for term in self.terms(kin):
            for chord, level in _pole_levels(self.n, term.pairs):
                found[chord] = max(level, found.get(chord, 0))
        named = ((self.ordering[i - 1 : j], level) for (i, j), level in found.items())
        return tuple((tuple(sorted(labels)), level, kin.channel(labels)) for labels, level in named)

    def to_dict(self) -> dict[str, Any]:
        """Plain data: ``{"n": ..., "f": text, "ordering": [...]}``."""
        return {"n": self.n, "f": str(self.f), "ordering": list(self.ordering)}

    def __str__(self) -> str:
        return f"disk integral over the ordering ({', '.join(map(str, self.ordering))}) of {self.f}"


@cache
def _clusters(n: int) -> tuple[tuple[int, int], ...]:
    """First and last position of every cluster that a chord cuts off, by size; never with the last position."""
    return tuple((i, i + size - 1) for size in range(2, n - 1) for i in range(1, n - size + 1))


def _pole_levels(n: int, pairs: Sequence[Exact]) -> list[tuple[tuple[int, int], int]]:
    index = pair_index(n)
    total: dict[tuple[int, int], Exact] = {}
    found = []
    for i, j in _clusters(n):
        value = pairs[index[i, j]] + total.get((i, j - 1), ZERO) + total.get((i + 1, j), ZERO)
        value = value - total.get((i + 1, j - 1), ZERO)
        total[i, j] = value
        if value.is_integer and value + (j - i) <= 0:
            found.append(((i, j), -int(value + (j - i))))
    return found


def shifted_exponents(ordering: Sequence[int], powers: Mapping[Pair, int] | Powers) -> tuple[int, dict[Pair, int]]:
    """Every monomial on P is a Parke-Taylor integral at shifted kinematics.

    Returns
    -------
    (sign, shifts)
        ``Z_P(prod z_ij^{n_ij})`` at s is ``sign * Z_P(PT(P))`` at ``s_ij + shifts[i, j]``, where
        ``shifts[i, j] = n_ij + [i, j adjacent cyclically in P]`` for all i < j.  A covariant monomial leads to massless
        rows, whatever the row sums of s: double poles, tachyons and absolute-value exponents need nothing else.

    Notes
    -----
    ``PT(P)`` is positive on the domain of P and has ``|z_ij|^{-1}`` for adjacent labels, so the sign is the one of the
    monomial on the domain.

    Examples
    --------
    >>> shifted_exponents((1, 2, 3, 4), {(1, 2): -3, (3, 4): -2})[0]
    -1
    """
    order = read_ordering(ordering, len(tuple(ordering)))
    n = len(order)
    places = {label: k for k, label in enumerate(order)}
    shifts = dict.fromkeys(pair_order(n), 0)
    for k, label in enumerate(order):
        a, b = order[k - 1], label
        shifts[min(a, b), max(a, b)] = 1
    (term,) = monomial(dict(powers)).terms
    sign = 1 if term.coefficient == 1 else -1
    for (i, j), power in term.powers:
        if j > n:
            raise InputError("powers", f"the label {j}", f"labels from 1 to {n}")
        shifts[i, j] += power
        if power % 2 and places[i] < places[j]:
            sign = -sign
    return sign, shifts


def shifted_parke_taylor(kin: Mandelstams, integral: DiskIntegral) -> tuple[tuple[Exact, Mandelstams], ...]:
    """``Z_P(f)`` at kin as ``sum_k c_k Z_P(PT(P))`` at massless points ``kin_k``; see :func:`shifted_exponents`.

    Raises
    ------
    InputError
        As :meth:`DiskIntegral.terms`.
    """
    integral.terms(kin)
    found: dict[Mandelstams, Exact] = {}
    for term in integral.f.terms:
        sign, shifts = shifted_exponents(integral.ordering, term.powers)
        values = tuple(kin.pairs[k] + shifts[pair] for k, pair in enumerate(pair_order(integral.n)))
        point = Mandelstams(integral.n, values, (ZERO,) * integral.n, kin.string)
        found[point] = found.get(point, ZERO) + (term.coefficient if sign > 0 else -term.coefficient)
    return tuple((c, point) for point, c in found.items() if c)


# --- the sphere -----------------------------------------------------------------------------------------------------


@dataclass(frozen=True, init=False)
class SphereIntegral:
    """``J(f|g) = int d^2z.../pi^{n-3} prod |z_ij|^{2 s_ij} f(z) conj(g(z))`` modulo SL(2,C); g = f when None.

    Raises
    ------
    InputError
        For labels beyond n.
    """

    n: int
    f: Integrand
    g: Integrand

    def __init__(self, n: int, f: Integrand | str, g: Integrand | str | None = None) -> None:
        object.__setattr__(self, "n", read_count(n))
        object.__setattr__(self, "f", _read_integrand(f, self.n, "f"))
        object.__setattr__(self, "g", self.f if g is None else _read_integrand(g, self.n, "g"))
        for name, integrand in (("_left", self.f), ("_right", self.g)):
            object.__setattr__(self, name, tuple(_by_label(self.n, term.powers) for term in integrand.terms))

    def terms(self, kin: Mandelstams) -> tuple[SphereTerm, ...]:
        """The terms at a kinematic point, one for each pair of monomials of f and g; an empty tuple is zero.

        Raises
        ------
        InputError
            For open-string kinematics, another number of legs, and monomials that are not Moebius covariant.
        """
        _check_kinematics(kin, self.n)
        if kin.string == "open":
            expected = "closed-string kinematics on the sphere: .as_closed() (alpha' -> alpha'/4)"
            raise InputError("kin", "open-string kinematics", expected)
        for name, powers in (("f", self._left), ("g", self._right)):  # type: ignore[attr-defined]
            _check_covariance(kin.row_sums, [_degrees(self.n, each) for each in powers], name)
        return tuple(
            SphereTerm(a.coefficient * b.coefficient.conjugate(), kin.pairs, left, right)
            for a, left in zip(self.f.terms, self._left, strict=True)  # type: ignore[attr-defined]
            for b, right in zip(self.g.terms, self._right, strict=True)  # type: ignore[attr-defined]
        )

    def poles(self, kin: Mandelstams) -> tuple[tuple[Channel, int, Exact], ...]:
        """Channels on a pole in some term: both divisor exponents are non-positive integers.

        Returns
        -------
        tuple of (channel, level, X)
            The labels without n, or the complement, whichever does not hold label n; the larger of the two levels (the
            largest over the terms); the invariant X.
        """
        found: dict[Channel, int] = {}
        index = pair_index(self.n)
        for term in self.terms(kin):
            for channel in _subsets(self.n):
                inside = [index[a, b] for k, a in enumerate(channel) for b in channel[k + 1 :]]
                x = sum((term.pairs[k] for k in inside), ZERO) + (len(channel) - 1)
                if not x.is_integer:
                    continue
                ends = [int(x) + sum(powers[k] for k in inside) for powers in (term.left, term.right)]
                if max(ends) <= 0:
                    found[channel] = max(-min(ends), found.get(channel, 0))
        return tuple((channel, level, kin.channel(channel)) for channel, level in found.items())

    def to_dict(self) -> dict[str, Any]:
        """Plain data: ``{"n": ..., "f": text, "g": text}``."""
        return {"n": self.n, "f": str(self.f), "g": str(self.g)}

    def __str__(self) -> str:
        return f"sphere integral of {self.f} times the conjugate of {self.g}"


def _by_label(n: int, powers: Powers) -> tuple[int, ...]:
    found = [0] * len(pair_order(n))
    for pair, power in powers:
        found[pair_index(n)[pair]] = power
    return tuple(found)


def _degrees(n: int, powers: Sequence[int]) -> tuple[int, ...]:
    found = [0] * n
    for (i, j), power in zip(pair_order(n), powers, strict=True):
        found[i - 1] += power
        found[j - 1] += power
    return tuple(found)


@cache
def _subsets(n: int) -> tuple[Channel, ...]:
    """All channels of the sphere, 2 to n-2 labels, by the side that does not hold label n."""
    from itertools import combinations

    return tuple(c for size in range(2, n - 1) for c in combinations(range(1, n), size))
