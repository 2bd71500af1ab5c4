"""Values at kinematic points where single terms of a sum have vanishing propagators.

Every coefficient of an expansion is a rational function of the invariants whose denominator is a product of different
propagators, and it is homogeneous of known degree.  Along a line in kinematic space the coefficient times all
propagators is therefore a polynomial of bounded degree: a few exact evaluations away from the point determine it, and
its lowest Taylor coefficients at the point give the value, or show that there is none.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from fractions import Fraction
from itertools import combinations
from typing import Any, TypeAlias

from ..exact import ONE, ZERO, Exact
from ..kinematics import Mandelstams
from .zetas import ZetaSum

# The coefficients of one integral by weight: ZetaSum, or balls.
Series: TypeAlias = list[Any]


def through_zeros(
    point: Mandelstams,
    propagators: Sequence[Iterable[int]],
    weight: int,
    series_at: Callable[[Mandelstams], Series],
) -> Series | None:
    """The series at a point where ``series_at`` fails for vanishing propagators; None where it has a pole.

    Two different lines have to agree: a function such as x/y is finite along every line and has no value all the same.
    """
    n = point.n
    zeros = sum(1 for labels in propagators if not point.channel(labels))
    results = []
    for seed in (1, 2):
        direction = _direction(n, seed)
        places: list[Exact] = []
        values: list[Series] = []
        k = 0
        while len(places) <= max(zeros, len(propagators) + weight - (n - 3)):
            k = -k if k > 0 else 1 - k
            place = Exact(Fraction(k, 7))
            moved = point.moved(direction, place)
            whole = ONE
            for labels in propagators:
                whole = whole * moved.channel(labels)
            if whole:
                places.append(place)
                values.append([value * whole for value in series_at(moved)])
        lowest = [_taylor(places, [value[w] for value in values], zeros) for w in range(weight + 1)]
        rest = ONE
        for labels in propagators:
            x = point.channel(labels)
            rest = rest * (x if x else direction.channel(labels))
        if not all(_vanishes(c) for each in lowest for c in each[:zeros]):
            return None
        results.append([each[zeros] * (ONE / rest) for each in lowest])
    if not all(_vanishes(a - b) for a, b in zip(*results, strict=True)):
        return None
    return results[0]


def _vanishes(value: Any) -> bool:
    return not value if isinstance(value, ZetaSum) else bool(value.contains_zero())


def _direction(n: int, seed: int) -> Mandelstams:
    """A massless direction along which no channel stays constant."""
    pairs = {
        (i, j): Exact(1 + (seed * 7919 + 104729 * i + 1299709 * j * j) % 89) for i, j in combinations(range(1, n), 2)
    }
    pairs[1, 2] = pairs[1, 2] - sum(pairs.values(), ZERO)
    return Mandelstams.from_pairs(n, pairs)


def _taylor(places: Sequence[Exact], values: Sequence[Any], order: int) -> list[Any]:
    """The coefficients of t^0..t^order of the polynomial through the points (Lagrange's form)."""
    full = [ONE]  # prod (t - t_k), lowest power first
    for place in places:
        raised = [ZERO, *full]
        full = [a - place * b for a, b in zip(raised, [*full, ZERO], strict=True)]
    total: list[Any] = [None] * (order + 1)
    for place, value in zip(places, values, strict=True):
        quotient = [ZERO] * (len(full) - 1)  # full / (t - place)
        carry = ZERO
        for k in range(len(full) - 1, 0, -1):
            carry = full[k] + place * carry
            quotient[k - 1] = carry
        at = ZERO
        for c in reversed(quotient):
            at = at * place + c
        for k in range(order + 1):
            part = value * (quotient[k] / at)
            total[k] = part if total[k] is None else total[k] + part
    return total
