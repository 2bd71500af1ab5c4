"""Where an integral may have poles: the exponent Y of every boundary divisor, exactly.

The integrand is ``t^(Y-1) dt`` at a divisor, so poles are at Y = 0, -1, -2, ...  In a sum of monomials the least Y
counts; poles of single terms may cancel in the sum, so what is marked is where a pole *may* be.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations

from ..channels import Channel, pair_index
from ..dispatch.shifts import chord_exponents
from ..exact import ZERO, Exact
from ..exponents import DiskExponents, SphereExponents
from ..integrals import DiskIntegral, SphereIntegral
from ..scans.points import Place


@dataclass(frozen=True)
class Divisor:
    """A channel with the exponent of its divisor.

    Attributes
    ----------
    channel : tuple of int
    pole : Exact
        Poles are where this is 0, -1, -2, ...
    convergence : Exact
        The integral converges at the divisor where the real part of this is positive.
    """

    channel: Channel
    pole: Exact
    convergence: Exact


def divisors(spec: DiskIntegral | SphereIntegral | None, place: Place) -> tuple[Divisor, ...]:
    """All divisors at a point; None stands for exponents, which are an integral by themselves."""
    if isinstance(spec, SphereIntegral):
        terms = [(term.pairs, term.left, term.right) for term in spec.terms(place)]  # type: ignore[arg-type]
        return _on_the_sphere(spec.n, terms)
    if isinstance(place, SphereExponents):
        return _on_the_sphere(place.n, [(place.pairs, place.left, place.right)])
    order: Channel
    if spec is None:
        assert isinstance(place, DiskExponents)
        order, exponents = tuple(range(1, place.n + 1)), [place.pairs]
    else:
        order, exponents = spec.ordering, [term.pairs for term in spec.terms(place)]  # type: ignore[arg-type]
    least: dict[tuple[int, int], Exact] = {}
    for pairs in exponents:
        for chord, y in chord_exponents(place.n, pairs).items():
            least[chord] = min(least.get(chord, y), y, key=_real)
    return tuple(Divisor(tuple(sorted(order[i - 1 : j])), y, y) for (i, j), y in least.items())


def _on_the_sphere(
    n: int, terms: Sequence[tuple[Sequence[Exact], Sequence[int], Sequence[int]]]
) -> tuple[Divisor, ...]:
    index = pair_index(n)
    least: dict[Channel, Divisor] = {}
    for pairs, lefts, rights in terms:
        for size in range(2, n - 1):
            for channel in combinations(range(1, n), size):
                inside = [index[pair] for pair in combinations(channel, 2)]
                x = sum((pairs[k] for k in inside), ZERO) + (size - 1)
                left, right = (sum(powers[k] for k in inside) for powers in (lefts, rights))
                found = Divisor(channel, x + max(left, right), x + Exact(left + right) / 2)
                known = least.get(channel, found)
                pole = min(known.pole, found.pole, key=_real)
                least[channel] = Divisor(channel, pole, min(known.convergence, found.convergence, key=_real))
    return tuple(least.values())


def _real(value: Exact) -> float:
    return float(value.re)


def levels_between(first: float, last: float) -> list[int]:
    """The levels N >= 0 with Y = -N between two real values, ends included.

    >>> levels_between(0.5, -1.5), levels_between(-0.2, -0.8)
    ([0, 1], [])
    """
    low, high = min(first, last), max(first, last)
    return list(range(max(0, math.ceil(-high)), math.floor(-low) + 1))
