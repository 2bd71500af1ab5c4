r"""The matrices A and B of one step, as index structures.

A step goes from N to N + 1 legs.  Points: 0, the m = N - 3 letters, z, and 1.  Basis: for words a, b that partition
the letters, ``psi_{a;b} = D_0(a) D_1(b)`` with ``D_r(w) = prod_k sum_{j before k, or r} s_{j w_k} / (w_k - j)``.  With
``f_{a;b}(z) = z^{s_0z} (1-z)^{s_z1} int (Koba-Nielsen factor) psi_{a;b}`` over the letters between 0 and z:

* A is diagonal plus strictly lower in |a|.  Diagonal: ``lambda_a`` = sum of s over the pairs in {0, z} and a.
  Row (a;b): for every non-empty subsequence g of a, with ``c = sum of s_{j g_1} over j = 0 and the letters before g_1
  in a``, the columns ``(a without g; b followed by w)`` get +-c for the words w of the nested bracket
  ``[..[[g_1, g_2], g_3].., g_l]``.
* B is the mirror image under 0 <-> 1, a <-> b; diagonal ``mu_b`` = sum over the pairs in {1, z} and b.

The entries per matrix are ``m! ((3^(m+1) - 1)/4 - (m+1)/2)``.  That they satisfy the equation is checked in the tests
as an identity of rational functions, in exact arithmetic.
"""

from __future__ import annotations

from array import array
from dataclasses import dataclass
from functools import cache
from itertools import combinations, permutations

import numpy as np
from numpy.typing import NDArray

Word = tuple[int, ...]
Split = tuple[Word, Word]


@dataclass(frozen=True)
class HalfPattern:
    """One matrix off its diagonal in compressed rows; entry = sign * (prefix sum number ``prefix`` of its row).

    Attributes
    ----------
    start : (rows + 1,) int64
    column : (entries,) int32
    prefix : (entries,) int8
        p stands for ``c`` with g_1 the letter at place p of the row's word.
    sign : (entries,) int8
    order : (rows,) int32
        Rows by ascending length of the word, so that columns of a row come before it.
    words : (rows, m) int8
        The row's word (a for A, b for B), padded with -1.
    members : (rows,) int64
        The letters of the word as a bit mask.
    """

    start: NDArray[np.int64]
    column: NDArray[np.int32]
    prefix: NDArray[np.int8]
    sign: NDArray[np.int8]
    order: NDArray[np.int32]
    words: NDArray[np.int8]
    members: NDArray[np.int64]


@dataclass(frozen=True)
class StepPattern:
    """Both matrices of a step with m letters, numbered 0..m-1.

    Attributes
    ----------
    m : int
    splits : the basis (a; b)
    a, b : HalfPattern
    full : (m!,) int32
        Rows (a; empty) for the words a in the order of ``itertools.permutations``.
    target : ((m+1)!,) int32, target_sign : float64
        The word (a, z, b) number k of the next step is ``sign * Y[target]``.
    """

    m: int
    splits: tuple[Split, ...]
    a: HalfPattern
    b: HalfPattern
    full: NDArray[np.int32]
    target: NDArray[np.int32]
    target_sign: NDArray[np.float64]


@cache
def nested_bracket(length: int) -> tuple[tuple[Word, int], ...]:
    """The words of ``[..[[g_0, g_1], g_2].., g_(l-1)]`` with their signs.

    >>> nested_bracket(2)
    (((0, 1), 1), ((1, 0), -1))
    """
    words: list[tuple[Word, int]] = [((0,), 1)]
    for k in range(1, length):
        words = [item for w, s in words for item in (((*w, k), s), ((k, *w), -s))]
    return tuple(words)


def entry_count(m: int) -> int:
    """Entries of one matrix: what memory and time of a step are proportional to."""
    factorial = 1
    for k in range(2, m + 1):
        factorial *= k
    return int(factorial * ((3 ** (m + 1) - 1) / 4 - (m + 1) / 2))


def _basis(m: int) -> tuple[Split, ...]:
    found = []
    for size in range(m + 1):
        for word in permutations(range(m)):
            found.append((word[:size], word[size:]))
    return tuple(found)


def _half(m: int, splits: tuple[Split, ...], index: dict[Split, int], mirror: bool) -> HalfPattern:
    start = array("q", [0])
    column, prefix, sign = array("i"), array("b"), array("b")  # compact: eight million entries at m = 7
    words = np.full((len(splits), max(m, 1)), -1, dtype=np.int8)
    lengths = np.empty(len(splits), dtype=np.int64)
    for row, (a, b) in enumerate(splits):
        word, other = (b, a) if mirror else (a, b)
        words[row, : len(word)] = word
        lengths[row] = len(word)
        places = range(len(word))
        for size in range(1, len(word) + 1):
            bracket = nested_bracket(size)
            for chosen in combinations(places, size):
                g = [word[p] for p in chosen]
                rest = tuple(word[p] for p in places if p not in chosen)
                for pattern, s in bracket:
                    moved = (*other, *(g[k] for k in pattern))
                    column.append(index[(moved, rest) if mirror else (rest, moved)])
                    prefix.append(chosen[0])
                    sign.append(s)
        start.append(len(column))
    return HalfPattern(
        np.array(start, dtype=np.int64),
        np.array(column, dtype=np.int32),
        np.array(prefix, dtype=np.int8),
        np.array(sign, dtype=np.int8),
        np.argsort(lengths, kind="stable").astype(np.int32),
        words,
        np.where(words >= 0, 1 << np.maximum(words, 0).astype(np.int64), 0).sum(axis=1),
    )


@cache
def step_pattern(m: int) -> StepPattern:
    """The pattern of the step with m letters; built once and kept.

    >>> [len(step_pattern(m).a.column) for m in (1, 2, 3)] == [entry_count(m) for m in (1, 2, 3)]
    True
    """
    splits = _basis(m)
    index = {split: k for k, split in enumerate(splits)}
    z = m
    target, signs = [], []
    for word in permutations(range(m + 1)):
        place = word.index(z)
        a, b = word[:place], word[place + 1 :]
        target.append(index[a, b[::-1]])
        signs.append((-1.0) ** len(b))
    return StepPattern(
        m,
        splits,
        _half(m, splits, index, False),
        _half(m, splits, index, True),
        np.array([index[word, ()] for word in permutations(range(m))], dtype=np.int32),
        np.array(target, dtype=np.int32),
        np.array(signs),
    )
