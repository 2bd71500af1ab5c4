"""Exponents of one sphere integral, and the arrays that the kernels read for each tree."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from itertools import combinations
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..channels import pair_index
from ..errors import InputError, PoleError
from ..exact import ZERO, Exact
from .tree import Tree

Array = NDArray[Any]


@dataclass(frozen=True)
class SphereData:
    """Exponents ``a = s + left`` of z_ij and ``b = s + right`` of its conjugate, in one labelling.

    The pair (i, j), i < j, contributes ``|z_ij|^{a+b} (z_ij/|z_ij|)^{a-b}`` with z_ij = z_i - z_j.

    Attributes
    ----------
    n : int
    a, b : tuple of Exact
        In the pair order.
    sign : int
        From differences that a relabelling turned round.
    """

    n: int
    a: tuple[Exact, ...]
    b: tuple[Exact, ...]
    sign: int = 1

    @classmethod
    def of(cls, n: int, pairs: Sequence[Exact], left: Sequence[int], right: Sequence[int]) -> SphereData:
        """From the exponents of a term."""
        a = tuple(s + p for s, p in zip(pairs, left, strict=True))
        return cls(n, a, tuple(s + q for s, q in zip(pairs, right, strict=True)))

    def relabelled(self, frame: Sequence[int]) -> SphereData:
        """With puncture ``frame[k-1]`` called k.

        The value does not change but for signs: a pair whose order turns gives (-1)^(a-b).  (Moving another puncture to
        infinity brings no further sign, because the spins of every row sum to zero.)
        """
        index = pair_index(self.n)
        a, b, sign = [], [], self.sign
        for i, j in combinations(frame, 2):
            k = index[i, j]
            a.append(self.a[k])
            b.append(self.b[k])
            if i > j and int((self.a[k] - self.b[k]).re) % 2:
                sign = -sign
        return SphereData(self.n, tuple(a), tuple(b), sign)

    def cluster(self, labels: Sequence[int]) -> tuple[Exact, Exact]:
        """Divisor exponents of a cluster, for z and its conjugate: sums of exponents + size - 1."""
        index, size = pair_index(self.n), len(labels) - 1
        inside = [index[pair] for pair in combinations(labels, 2)]
        return sum((self.a[k] for k in inside), ZERO) + size, sum((self.b[k] for k in inside), ZERO) + size

    @property
    def is_real(self) -> bool:
        """All exponents real: conjugating every coordinate conjugates the integrand."""
        return all(x.is_real for x in self.a)

    @property
    def is_spinless(self) -> bool:
        """The integrand depends on moduli only."""
        return self.a == self.b

    def refuse_rows(self) -> None:
        """Raise InputError unless every row of a and of b sums to -2 and the spins are integers."""
        index = pair_index(self.n)
        if len(self.a) != len(self.b) or len(self.a) != self.n * (self.n - 1) // 2:
            raise InputError("terms", f"{len(self.a)} exponents", f"{self.n * (self.n - 1) // 2} for n = {self.n}")
        for i in range(1, self.n + 1):
            row = [index[i, j] for j in range(1, self.n + 1) if j != i]
            for side in (self.a, self.b):
                total = sum((side[k] for k in row), ZERO)
                if total != -2:
                    raise InputError(f"exponents, label {i}", f"a sum of {total}", "the row sum -2")

    def refuse_poles(self) -> None:
        """Raise PoleError naming the cluster, when both of its divisor exponents are 0, -1, -2, ..."""
        for size in range(2, self.n - 1):
            for labels in combinations(range(1, self.n), size):
                ends = self.cluster(labels)
                if all(x.is_integer and x.re <= 0 for x in ends):
                    level = -int(min(x.re for x in ends))
                    text = f"pole at the cluster {labels}: its divisor exponents are {ends[0]} and {ends[1]}"
                    raise PoleError(labels, level, ends[0], f"{text}; the value does not exist here")


@dataclass(frozen=True)
class Shape:
    """What the kernels need to know of a tree, without exponents."""

    pairs: Array  # (labels pairs, 2): slots
    between: tuple[tuple[int, int], ...]
    edge_slots: Array
    clusters: tuple[tuple[int, ...], ...]
    factors: tuple[int, ...]  # pairs that depend on disc coordinates
    starts: Array
    terms: Array


@lru_cache(maxsize=4096)
def shape_of(tree: Tree) -> Shape:
    """Tables of a tree."""
    between = tuple(combinations(tree.labels, 2))
    maps = [tree.pair(i, j) for i, j in between]
    factors = tuple(k for k, m in enumerate(maps) if m.terms)
    terms = [term for k in factors for term in maps[k].terms]
    starts = np.cumsum([0, *(len(maps[k].terms) for k in factors)])
    return Shape(
        np.array([(m.left, m.right) for m in maps], dtype=np.int64).reshape(-1, 2),
        between,
        np.array(tree.edges, dtype=np.int64),
        tuple(tree.below(s) for s in tree.edges),
        factors,
        starts.astype(np.int64),
        np.array(terms, dtype=np.int64).reshape(-1, 4),
    )


class Numbers:
    """Double-precision exponents for all trees of one integral."""

    def __init__(self, data: SphereData) -> None:
        self.data = data
        self.index = pair_index(data.n)
        self.total = np.array([complex(x + y) for x, y in zip(data.a, data.b, strict=True)])
        self.spin = np.array([int((x - y).re) for x, y in zip(data.a, data.b, strict=True)], dtype=np.int64)
        self.left = np.array([complex(x) for x in data.a])
        self.right = np.array([complex(y).conjugate() for y in data.b])
        self.mirror = data.is_spinless and data.is_real
        self._ends: dict[tuple[int, ...], tuple[complex, int, complex, int]] = {}

    def end(self, labels: tuple[int, ...]) -> tuple[complex, int, complex, int]:
        """Of the disc of a cluster: A + B + 2; l = A - B; A + 1 + k next to its zero; that k."""
        if labels not in self._ends:
            a, b = self.data.cluster(labels)
            nearest = max(round(-a.re), 0)
            self._ends[labels] = complex(a + b), int((a - b).re), complex(a + nearest), nearest
        return self._ends[labels]

    def of_pairs(self, between: Sequence[tuple[int, int]]) -> Array:
        """Indices of pairs of labels."""
        return np.array([self.index[pair] for pair in between], dtype=np.int64)
