"""Massless kinematics and signs written out from their definitions, for tests only.

Nothing here comes from the package but the exact numbers and the closed forms, so that agreement means something.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import combinations, permutations
from typing import Any

import mpmath

from kn_integrate.closed_forms import PairExponents, find
from kn_integrate.exact import ZERO, Exact, read

Planar = Mapping[tuple[int, ...], Any]
Pairs = dict[tuple[int, int], Exact]


def big(x: Exact) -> Any:
    """The exact number in the precision of mpmath.mp."""
    real = mpmath.mpf(x.re.numerator) / x.re.denominator
    return real if x.is_real else mpmath.mpc(real, mpmath.mpf(x.im.numerator) / x.im.denominator)


def massless_pairs(n: int, planar: Planar) -> Pairs:
    """All s_ij, i < j, from the n(n-3)/2 planar channels of the ordering 1..n; every row sums to zero."""
    known = {frozenset(labels): read(value, "planar")[0] for labels, value in planar.items()}
    everything = frozenset(range(1, n + 1))

    def channel(first: int, last: int) -> Exact:
        inside = frozenset(range(first, last + 1))
        if len(inside) < 2 or len(inside) > n - 2:
            return ZERO
        return known[inside] if inside in known else known[everything - inside]

    return {
        (i, j): channel(i, j) - channel(i + 1, j) - channel(i, j - 1) + channel(i + 1, j - 1)
        for i, j in combinations(range(1, n + 1), 2)
    }


def neighbours(cycle: Sequence[int]) -> list[tuple[int, int]]:
    """(q1, q2), (q2, q3), ..., (qn, q1)."""
    return list(zip(cycle, [*cycle[1:], cycle[0]], strict=True))


def shifted(s: Pairs, cycle: Sequence[int]) -> Pairs:
    """s_ij minus one for every neighbouring pair of the cycle."""
    result = dict(s)
    for a, b in neighbours(cycle):
        result[min(a, b), max(a, b)] = result[min(a, b), max(a, b)] - 1
    return result


def in_order(exponents: Pairs, order: Sequence[int]) -> PairExponents:
    """The exponents with the labels put at positions 1..n in the given order."""
    flat = (exponents[min(a, b), max(a, b)] for a, b in combinations(order, 2))
    return PairExponents(len(order), tuple(flat))


def cycle_sign(cycle: Sequence[int], order: Sequence[int]) -> int:
    """Sign of (-1)^(n-1) / prod (z_q - z_q') where the points rise in the given order."""
    place = {label: k for k, label in enumerate(order)}
    negative = sum(place[a] < place[b] for a, b in neighbours(cycle))
    return (-1) ** (len(cycle) - 1 + negative)


def z_term(s: Pairs, ordering: Sequence[int], cycle: Sequence[int]) -> tuple[int, PairExponents]:
    """Z_ordering(PT(cycle)) = sign x integral in absolute-value form."""
    return cycle_sign(cycle, ordering), in_order(shifted(s, cycle), ordering)


def z_value(s: Pairs, ordering: Sequence[int], cycle: Sequence[int], digits: int) -> Any:
    """Z_ordering(PT(cycle)) by the first closed form that applies (always one for n = 4 and 5)."""
    sign, pairs = z_term(s, ordering, cycle)
    return sign * find(pairs)[0].form.value(digits)


def momentum_kernel(s: Pairs, left: Sequence[int], right: Sequence[int]) -> Any:
    """S[left|right]_1 with sines (Kawai, Lewellen, Tye 1986; recursion: arXiv:1010.3933)."""
    if not left:
        return mpmath.mpf(1)
    last = left[-1]
    at = list(right).index(last)
    total = s[1, last]
    for b in right[:at]:
        total = total + s[min(b, last), max(b, last)]
    rest = [*right[:at], *right[at + 1 :]]
    return mpmath.sin(mpmath.pi * big(total)) * momentum_kernel(s, left[:-1], rest)


def j_value(s: Pairs, cycle: Sequence[int], other: Sequence[int], digits: int) -> Any:
    """The sphere integral J(cycle|other) from products of disk integrals (Kawai, Lewellen, Tye 1986)."""
    n = len(cycle)
    inner = list(permutations(range(2, n - 1)))
    total = mpmath.mpf(0)
    for rho in inner:
        left = z_value(s, (1, *rho, n, n - 1), cycle, digits)
        for tau in inner:
            right = z_value(s, (1, *tau, n - 1, n), other, digits)
            total += left * momentum_kernel(s, rho, tau) * right
    return -total / mpmath.pi ** (n - 3)
