"""Moving a kinematic point: one planar invariant at a time, the others and all row sums held.

The chord whose cluster is the positions i..j has the planar invariant ``X = sum of s over the pairs inside``.
Adding h to it alone changes four pairs, ``s_ij`` and ``s_(i-1)(j+1)`` by +h and ``s_i(j+1)``, ``s_(i-1)j`` by -h
(positions cyclic), as inverting the relation between pairs and planar channels shows; no row sum changes.
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import cache

from ..channels import pair_order
from ..exact import ZERO, Exact

Chord = tuple[int, int]  # first and last position of the cluster, 1 <= i < j <= n - 1, not (1, n - 1)


@cache
def chords_of(n: int) -> tuple[Chord, ...]:
    """All chords, by size and then by position; the cluster never contains position n.

    >>> chords_of(5)
    ((1, 2), (2, 3), (3, 4), (1, 3), (2, 4))
    """
    return tuple((i, i + size - 1) for size in range(2, n - 1) for i in range(1, n - size + 1))


@cache
def _pattern(n: int, chord: Chord) -> tuple[tuple[int, int], ...]:
    """(index of the pair, sign) of the four pairs that a chord moves."""
    index = {pair: k for k, pair in enumerate(pair_order(n))}
    i, j = chord
    before, after = (i - 2) % n + 1, j % n + 1
    moved = [((i, j), 1), ((i, after), -1), ((before, j), -1), ((before, after), 1)]
    return tuple((index[min(pair), max(pair)], sign) for pair, sign in moved if pair[0] != pair[1])


def pair_shift(n: int, by: Mapping[Chord, Exact]) -> tuple[Exact, ...]:
    """The change of every pair when each chord's planar invariant moves by the given amount.

    >>> [str(h) for h in pair_shift(4, {(1, 2): Exact("1/2")})]
    ['1/2', '-1/2', '0', '0', '-1/2', '1/2']
    """
    shift = [ZERO] * len(pair_order(n))
    for chord, h in by.items():
        for k, sign in _pattern(n, chord):
            shift[k] = shift[k] + sign * h
    return tuple(shift)


def chord_exponents(n: int, pairs: tuple[Exact, ...]) -> dict[Chord, Exact]:
    """The divisor exponent Y of every chord: sum of the exponents inside the cluster plus its size less one."""
    index = {pair: k for k, pair in enumerate(pair_order(n))}
    total: dict[Chord, Exact] = {(i, i): ZERO for i in range(1, n + 1)}
    for size in range(2, n - 1):
        for i in range(1, n - size + 1):
            j = i + size - 1
            value = total[i, j - 1] + total[i + 1, j] + pairs[index[i, j]]
            if size > 2:
                value = value - total[i + 1, j - 1]
            total[i, j] = value
    return {(i, j): total[i, j] + (j - i) for i, j in chords_of(n)}
