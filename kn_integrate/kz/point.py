"""One massless kinematic point as the recursion needs it: exact sums of invariants, ready for any arithmetic."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..channels import pair_index, pair_order
from ..exact import ZERO, Exact


@dataclass(frozen=True)
class Point:
    """Massless invariants in the positions 1..n of an ordering.

    Attributes
    ----------
    n : int
    pairs : tuple of Exact
        In the order of ``channels.pair_order(n)``.
    """

    n: int
    pairs: tuple[Exact, ...]

    def s(self, i: int, j: int) -> Exact:
        """``s_ij``."""
        return self.pairs[pair_index(self.n)[i, j]]

    @cached_property
    def is_real(self) -> bool:
        """True when every invariant is real."""
        return all(p.is_real for p in self.pairs)

    @cached_property
    def _sums(self) -> dict[int, Exact]:
        return {0: ZERO}

    def inside(self, mask: int) -> Exact:
        """The sum of ``s_ij`` over the pairs of a set of labels, bit i for label i."""
        sums = self._sums
        if mask not in sums:
            top = mask.bit_length() - 1
            rest = mask & ~(1 << top)
            value = self.inside(rest)
            for i in range(1, top):
                if rest >> i & 1:
                    value = value + self.s(i, top)
            sums[mask] = value
        return sums[mask]

    def channel(self, labels: tuple[int, ...]) -> Exact:
        """The invariant of a set of labels."""
        return self.inside(sum(1 << label for label in labels))

    def planar(self) -> dict[tuple[int, int], Exact]:
        """X of the labels i..j for all 1 <= i < j <= n-1 but (1, n-1)."""
        n = self.n
        return {
            (i, j): self.channel(tuple(range(i, j + 1)))
            for i in range(1, n - 1)
            for j in range(i + 1, n)
            if (i, j) != (1, n - 1)
        }

    def table(self) -> NDArray[Any]:
        """``s[i, j]`` in double precision, indices from 1."""
        kind = float if self.is_real else complex
        table = np.zeros((self.n + 1, self.n + 1), dtype=kind)
        for (i, j), value in zip(pair_order(self.n), self.pairs, strict=True):
            table[i, j] = table[j, i] = value.value()
        return table

    def moved(self, shift: tuple[Exact, ...]) -> Point:
        """Every pair moved by its entry of ``shift``."""
        return Point(self.n, tuple(p + h for p, h in zip(self.pairs, shift, strict=True)))


def split(value: Exact) -> tuple[float, float | complex]:
    """A number as the integer nearest to its real part and the rest, each correctly rounded.

    >>> split(Exact("-3") + Exact("1e-20"))
    (-3.0, 1e-20)
    """
    whole = round(value.re)
    rest: Exact = value - whole
    return float(whole), rest.value()


def subset_sums(point: Point, root: int, z: int, letters: int) -> Mapping[int, Exact]:
    """For every set of the letters 2..letters+1, as bits 0.., the sum over pairs in {root, z} and the set."""
    base = (1 << root) | (1 << z)
    return {mask: point.inside(base | (mask << 2)) for mask in range(1 << letters)}
