"""Chiral amplitudes: one reduced integrand on any ordering of the disk, from one run of the series engine each.

The rows of a tachyon are not massless.  ``prod |z_ij|^{s_ij} f`` is then written with integers ``sigma_ij`` as
``prod |z_ij|^{s'_ij} f'``, ``s' = s + sigma`` massless and ``f' = f prod z_ij^{-sigma_ij}``, up to the sign
``prod sgn(z_ij)^{sigma_ij}`` of the domain.  The same shift serves the sphere, where ``|z|^2 = z conj(z)``.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise, permutations
from typing import Any

from ..channels import Channel, Pair, pair_order
from ..errors import InputError, PoleError
from ..exact import ONE, ZERO, Exact
from ..integrand import Integrand, monomial
from ..kinematics import Mandelstams
from ..kz.currents import amputated
from ..kz.integral import MAX_PRECISE_LEGS
from ..kz.point import Point
from ..kz.vector import Vector, combination, f_values
from .reduction import parke_taylor_form

Word = tuple[int, ...]
UNIT = 2.0**-52


def integer_shift(row_sums: Sequence[Exact]) -> dict[Pair, int]:
    """Integers ``sigma_ij`` with ``sum_j sigma_ij = -R_i``, for integer row sums with an even total.

    >>> integer_shift((Exact(-2), Exact(-2), Exact(0), Exact(0)))
    {(1, 2): 2}
    """
    if not all(row.is_integer for row in row_sums):
        raise InputError("row_sums", str([str(row) for row in row_sums]), "integers")
    left = [-int(row) for row in row_sums]
    n = len(left)
    sigma: dict[Pair, int] = {}

    def put(i: int, j: int, k: int) -> None:
        pair = (min(i, j) + 1, max(i, j) + 1)
        sigma[pair] = sigma.get(pair, 0) + k
        left[i] -= k
        left[j] -= k

    heavy = [i for i in range(n) if left[i]]
    for a, b in pairwise(heavy):
        put(a, b, left[a])  # hand on to the next one what is left
    if heavy and left[heavy[-1]]:
        i = heavy[-1]
        j, k = [label for label in range(n) if label != i][:2]
        half, odd = divmod(left[i], 2)
        if odd:
            raise InputError("row_sums", str([str(row) for row in row_sums]), "integers with an even total")
        for a, b, c in ((i, j, half), (i, k, half), (j, k, -half)):
            put(a, b, c)
    return {pair: k for pair, k in sigma.items() if k}


@dataclass(frozen=True)
class Value:
    """A number with a bound on its error."""

    value: Any
    error: float


class Chiral:
    """An integrand at a kinematic point, reduced once, to be integrated over any ordering.

    Parameters
    ----------
    kin
        Rows are massless or integers.
    f
        Moebius covariant at these rows.

    Raises
    ------
    ResonanceError
        See :func:`~kn_integrate.amplitudes.reduction.parke_taylor_form`.
    """

    def __init__(self, kin: Mandelstams, f: Integrand) -> None:
        self.n = kin.n
        self.sigma = integer_shift(kin.row_sums)
        pairs = zip(pair_order(kin.n), kin.pairs, strict=True)
        values = tuple(value + self.sigma.get(pair, 0) for pair, value in pairs)
        self.massless = Mandelstams(kin.n, values, (ZERO,) * kin.n)
        shifted = f * monomial({pair: -k for pair, k in self.sigma.items()}) if self.sigma else f
        self.form = parke_taylor_form(kin.n, shifted, self.massless.pair)
        self._vectors: dict[Channel, tuple[Exact, ...]] = {}

    def point(self, ordering: Channel) -> Point:
        """The shifted massless point by positions of an ordering."""
        pair = self.massless.pair
        return Point(self.n, tuple(pair(ordering[i - 1], ordering[j - 1]) for i, j in pair_order(self.n)))

    def vector(self, ordering: Channel) -> tuple[Exact, ...]:
        """The integral as exact coefficients of the (n-3)! independent functions F of the ordering.

        ``Z_P = sum_w c_w F_w``, w the permutations of positions 2..n-2.  All coefficients vanish exactly if and only if
        the integrand is a total derivative, at a generic point.

        Raises
        ------
        ZeroDivisionError
            On a massless pole of a planar channel of the shifted point.
        """
        if ordering not in self._vectors:
            self._vectors[ordering] = self._vector(ordering)
        return self._vectors[ordering]

    def _vector(self, ordering: Channel) -> tuple[Exact, ...]:
        n = self.n
        position = {label: k for k, label in enumerate(ordering, start=1)}
        point = self.point(ordering)
        weights: dict[Word, Exact] = {}
        for word, c in self.form.items():
            for sign, cycle in combination(n, tuple(position[label] for label in (1, *word, n))):
                weights[cycle] = weights.get(cycle, ZERO) + (c if sign > 0 else -c)
        place = {word: k for k, word in enumerate(permutations(range(2, n - 1)))}
        total = [ZERO] * len(place)
        for word, c in weights.items():
            if not c:
                continue
            for other, weight in amputated(word, point.channel, ZERO, ONE).items():
                if other[0] == 1 and other[-1] == n - 1:
                    total[place[other[1:-1]]] = total[place[other[1:-1]]] + c * weight
        negative = sum(k for (i, j), k in self.sigma.items() if position[i] < position[j]) % 2 == 1
        return tuple(-value for value in total) if negative else tuple(total)

    @cached_property
    def _functions(self) -> dict[tuple[Channel, int | None], Any]:
        return {}

    def value(self, ordering: Channel, digits: int | None) -> Value:
        """``Z_P`` in double precision or with digits.

        Raises
        ------
        PoleError
            When a Parke-Taylor integral of the ordering has a pole at the shifted point; the sum may have none.
        NotAvailableError
            At a resonance of the series engine.
        """
        point = self.point(ordering)
        # The reduction is an identity of meromorphic functions.  Where a Parke-Taylor integral of the ordering has a
        # pole, a coefficient that vanishes says nothing: zero times infinity.
        for (i, j), x in point.planar().items():
            if x.is_integer and x <= 0:
                raise PoleError(tuple(sorted(ordering[i - 1 : j])), -int(x), x)
        vector = self.vector(ordering)
        if not any(vector):
            return Value(0.0 if digits is None else _zero(), 0.0)
        key = (ordering, digits)
        if key not in self._functions:
            self._functions[key] = functions(point, digits)
        found = self._functions[key]
        return contracted(vector, found.values, found.errors, digits)


LARGE = 30.0  # invariants of this size cost the series all digits of a double


def functions(point: Point, digits: int | None) -> Vector:
    """The functions F at a point; in multiple precision where double precision cannot hold them.

    Raises
    ------
    PoleError, NotAvailableError
    """
    if digits is not None or max(abs(value) for value in point.pairs) <= LARGE or point.n > MAX_PRECISE_LEGS:
        return f_values(point, digits)
    found = f_values(point, 25)
    values = tuple(float(v) if point.is_real else complex(v) for v in found.values)
    return Vector(values, tuple(e + 2 * UNIT * abs(v) for e, v in zip(found.errors, values, strict=True)))


def _zero() -> Any:
    import mpmath

    return mpmath.mpf(0)


def magnitude(value: Exact) -> float:
    """The modulus; infinite beyond the range of doubles."""
    try:
        return abs(value)
    except OverflowError:
        return math.inf


def contracted(vector: Sequence[Exact], values: Sequence[Any], errors: Sequence[float], digits: int | None) -> Value:
    """``sum_w c_w F_w`` with a bound: errors of F, and the rounding of the sum itself."""
    error = sum(magnitude(c) * e for c, e in zip(vector, errors, strict=True))
    size = sum(magnitude(c) * float(abs(v)) for c, v in zip(vector, values, strict=True))
    if digits is None:
        if not math.isfinite(size) or not math.isfinite(error):
            return Value(math.nan, math.inf)
        parts = [c.value() * v for c, v in zip(vector, values, strict=True)]
        if all(isinstance(part, float) for part in parts):
            return Value(math.fsum(parts), error + 2 * UNIT * size)
        total = complex(math.fsum(p.real for p in parts), math.fsum(p.imag for p in parts))
        return Value(total, error + 4 * UNIT * size)
    ctx = context(digits)
    total = ctx.mpf(0)
    for c, v in zip(vector, values, strict=True):
        total = total + to_context(ctx, c) * ctx.mpmathify(v)
    return Value(total, error + 4 * 10.0 ** (-digits - GUARD) * size)


GUARD = 10


def context(digits: int) -> Any:
    """An mpmath context of its own, with some more digits than asked for."""
    import mpmath

    ctx = mpmath.MPContext()
    ctx.dps = digits + GUARD
    return ctx


def to_context(ctx: Any, value: Exact) -> Any:
    """An exact number in a context."""
    p, q, d = value.as_ratio()
    return ctx.mpf(p) / d if not q else ctx.mpc(ctx.mpf(p) / d, ctx.mpf(q) / d)
