"""The Knizhnik-Zamolodchikov step that adds one puncture, in exact numbers.

Legs 1..N at positions: label 1 at 0, the letters 2..N-2 between, label N-1 at z, label N at 1, label N+1 at infinity.
The functions ``f_(a;b)(z)``, indexed by two words a, b that share out the letters, are integrals over the letters below
z of chains rooted at 0 (word a) and at 1 (word b); they satisfy

    ``df/dz = (A/z + B/(z - 1)) f``

with matrices linear in the ``s_ij``.  A mixes a basis element with those where a bracketed subsequence of a has moved
behind b; B is its mirror image.  (Selberg integrals: Aomoto 1987, Kaneko 1993; the recursion for string amplitudes:
Broedel, Schlotterer, Stieberger, Terasoma 2013, arXiv:1304.7304.)
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from itertools import combinations, permutations
from typing import TypeAlias

Word: TypeAlias = tuple[int, ...]
Pairs: TypeAlias = tuple[tuple[int, int], ...]
ZERO_POINT = 1  # the label at 0


@dataclass(frozen=True)
class Step:
    """The matrices of one step; entries are sums of ``s_ij`` over pairs of labels, with a sign.

    Attributes
    ----------
    basis : tuple of (a, b)
        Row and column order.
    first, second : tuple of (row, column, sign, pairs)
        The entries of A and of B.
    rho : pairs
        The pairs whose sum is the exponent of f at z = 0.
    """

    basis: tuple[tuple[Word, Word], ...]
    first: tuple[tuple[int, int, int, Pairs], ...]
    second: tuple[tuple[int, int, int, Pairs], ...]
    rho: Pairs


def _bracket(letters: Word) -> list[tuple[int, Word]]:
    """The words of the left-nested bracket [[..[g1,g2],..],gl] with signs."""
    found: list[tuple[int, Word]] = [(1, letters[:1])]
    for letter in letters[1:]:
        found = [(sign, (*word, letter)) for sign, word in found] + [(-sign, (letter, *word)) for sign, word in found]
    return found


def _inside(labels: Word) -> Pairs:
    return tuple(combinations(sorted(labels), 2))


def _entries(
    basis: tuple[tuple[Word, Word], ...], root: int, z: int, mirrored: bool
) -> tuple[tuple[int, int, int, Pairs], ...]:
    index = {pair: k for k, pair in enumerate(basis)}
    entries = []
    for row, pair in enumerate(basis):
        a, b = pair[::-1] if mirrored else pair
        entries.append((row, row, 1, _inside((root, z, *a))))
        for size in range(1, len(a) + 1):
            for places in combinations(range(len(a)), size):
                moved = tuple(a[p] for p in places)
                rest = tuple(letter for p, letter in enumerate(a) if p not in places)
                c = tuple((min(j, moved[0]), max(j, moved[0])) for j in (root, *a[: places[0]]))
                for sign, word in _bracket(moved):
                    column = (rest, b + word)
                    entries.append((row, index[column[::-1] if mirrored else column], sign, c))
    return tuple(entries)


@cache
def step(points: int) -> Step:
    """The step from ``points`` to ``points + 1`` legs, points >= 3."""
    letters = tuple(range(2, points - 1))
    z, one = points - 1, points
    basis = tuple((word[:cut], word[cut:]) for cut in range(len(letters), -1, -1) for word in permutations(letters))
    return Step(
        basis,
        _entries(basis, ZERO_POINT, z, False),
        _entries(basis, one, z, True),
        _inside(tuple(range(1, points))),
    )


@cache
def words(points: int) -> tuple[Word, ...]:
    """The words that index the integrals of ``points`` legs: permutations of the labels 2..points-2."""
    return tuple(permutations(range(2, points - 1)))
