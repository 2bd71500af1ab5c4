r"""From basis integrals to Parke-Taylor integrands: amputated double currents of planar cubic trees.

``Z_P(1, Q', n) = sum_w N(1 Q' | 1 w (n-1)) F_w`` for P = 12..n, where N is the double current without its last
propagator.  The double current ``phi_{P|R}`` of two words on the same letters sums the cubic trees planar in both:

    ``s_P phi_{P|R} = sum_{P=XY, R=VW} (phi_{X|V} phi_{Y|W} - phi_{Y|V} phi_{X|W})``,   ``phi_{i|j} = delta_ij``,

``s_P`` the sum of s over the pairs in P.  It vanishes unless R is obtained from P by turning over vertices: R is a
*separable* permutation of P, a direct sum (X then Y, sign +) or a skew sum (Y then X, sign -) at every step.  There are
2, 6, 22, 90, 394, ... of them (the large Schroeder numbers), few beside all permutations.

Source: double-ordered cubic trees, Cachazo, He and Yuan 2013 (arXiv:1309.0885); their recursion by Mafra 2016
(arXiv:1603.09731); references from memory.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

Word = tuple[int, ...]


@dataclass(frozen=True)
class Separable:
    """The separable permutations of one length, each with its ways to split.

    Attributes
    ----------
    words : tuple of Word
        Permutations of 0..length-1.
    splits : for each word a tuple of (p, sign, i, j)
        X = the first p letters of P with permutation number i of that length, Y = the rest with number j.
    """

    words: tuple[Word, ...]
    splits: tuple[tuple[tuple[int, int, int, int], ...], ...]


@cache
def separable(length: int) -> Separable:
    """The separable permutations of a length.

    >>> [len(separable(k).words) for k in (1, 2, 3, 4, 5)]
    [1, 2, 6, 22, 90]
    """
    if length == 1:
        return Separable(((0,),), ((),))
    found: dict[Word, list[tuple[int, int, int, int]]] = {}
    for p in range(1, length):
        for i, x in enumerate(separable(p).words):
            for j, y in enumerate(separable(length - p).words):
                shifted = tuple(p + letter for letter in y)
                found.setdefault((*x, *shifted), []).append((p, 1, i, j))
                found.setdefault((*shifted, *x), []).append((p, -1, i, j))
    return Separable(tuple(found), tuple(tuple(ways) for ways in found.values()))


def amputated(letters: Sequence[int], channel: Callable[[Word], Any], zero: Any, one: Any) -> dict[Word, Any]:
    """``N(P | R)`` for P = letters and every R, as ``{R: value}``; words that do not occur have N = 0.

    Parameters
    ----------
    letters
        P, any labels.
    channel
        The invariant s_S of a set of labels, consecutive in P; called for 2 up to len(P) - 1 labels.
    zero, one
        Of the arithmetic in use (float, complex, arb, acb, Exact).

    Raises
    ------
    ZeroDivisionError
        When a channel of consecutive letters of P is on its massless pole.
    """
    length = len(letters)
    phi: dict[tuple[int, int], list[Any]] = {(k, 1): [one] for k in range(length)}
    top: list[Any] = [one]
    for size in range(2, length + 1):
        shape = separable(size)
        for start in range(length - size + 1):
            values = []
            for ways in shape.splits:
                value = zero
                for p, sign, i, j in ways:
                    product = phi[start, p][i] * phi[start + p, size - p][j]
                    value = value + product if sign > 0 else value - product
                values.append(value)
            if size == length:
                top = values
            else:
                total = channel(tuple(letters[start : start + size]))
                phi[start, size] = [value / total for value in values]
    words = separable(length).words
    return {tuple(letters[k] for k in word): value for word, value in zip(words, top, strict=True)}


@dataclass(frozen=True)
class _Flat:
    """The splits of one length as arrays: which products to form for each p, and how to sum them word by word."""

    pairs: tuple[tuple[int, NDArray[np.int64], NDArray[np.int64], NDArray[np.float64]], ...]
    order: NDArray[np.int64]
    starts: NDArray[np.int64]


@cache
def _flat(length: int) -> _Flat:
    shape = separable(length)
    columns: dict[int, list[tuple[int, int, int, int]]] = {}
    for word, ways in enumerate(shape.splits):
        for p, sign, i, j in ways:
            columns.setdefault(p, []).append((word, sign, i, j))
    pairs, words = [], []
    for p, rows in columns.items():
        table = np.array(rows, dtype=np.int64)
        pairs.append((p, table[:, 2], table[:, 3], table[:, 1].astype(float)[:, None]))
        words.append(table[:, 0])
    every = np.concatenate(words)
    order = np.argsort(every, kind="stable")
    return _Flat(tuple(pairs), order, np.flatnonzero(np.diff(every[order], prepend=-1)))


def amputated_lanes(letters: Sequence[int], channel: Callable[[Word], NDArray[Any]]) -> NDArray[Any]:
    """:func:`amputated` for arrays of values: one row for each word of ``separable(len(letters))``, one column a lane.

    ``channel`` gives an array with one entry a lane.
    """
    length = len(letters)
    lanes = channel(tuple(letters[:2]))
    one = np.ones((1, len(lanes)), dtype=lanes.dtype)
    phi = {(k, 1): one for k in range(length)}
    for size in range(2, length + 1):
        flat = _flat(size)
        for start in range(length - size + 1):
            parts = [sign * phi[start, p][i] * phi[start + p, size - p][j] for p, i, j, sign in flat.pairs]
            values = np.add.reduceat(np.concatenate(parts)[flat.order], flat.starts, axis=0)
            phi[start, size] = values if size == length else values / channel(tuple(letters[start : start + size]))
    return phi[0, length]


@cache
def closed_words(length: int) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """The separable words that start with the first letter and end with the last: their numbers, and the numbers of
    what stands between among the permutations of the letters in between.
    """
    from itertools import permutations

    place = {word: k for k, word in enumerate(permutations(range(1, length - 1)))}
    numbers, targets = [], []
    for k, word in enumerate(separable(length).words):
        if word[0] == 0 and word[-1] == length - 1:
            numbers.append(k)
            targets.append(place[word[1:-1]])
    return np.array(numbers), np.array(targets)
