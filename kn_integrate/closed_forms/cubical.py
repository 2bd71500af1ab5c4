"""Cubical coordinates: z_{n-1} = 1, z_k = u_{k-1} u_k ... u_{n-3}, z_1 = 0, z_n = infinity.

A finite difference becomes z_{j+2} - z_{i+1} = z_{j+2} (1 - u_i ... u_j), so the integral over 0 < u_i < 1 has the
integrand

    prod_i u_i^(a_i - 1) (1 - u_i)^(c_i - 1)  prod_{i<j} (1 - u_i ... u_j)^(L_ij)

with a_i = Y of positions 1..i+1, c_i = Y of positions i+1, i+2 and L_ij the exponent of z_{i+1,j+2}
(multiperipheral variables; Bardakci and Ruegg 1968; Brown 2009).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from ..exact import ZERO, Exact
from .pairs import PairExponents


@dataclass(frozen=True)
class Cubical:
    """Exponents in cubical coordinates.

    Attributes
    ----------
    a, c : tuple[Exact, ...]
        n - 3 numbers each; u_i has exponent a_i - 1, 1 - u_i has exponent c_i - 1.
    long : tuple[tuple[tuple[int, int], Exact], ...]
        ((i, j), L_ij) with i < j and L_ij != 0, sorted.
    """

    a: tuple[Exact, ...]
    c: tuple[Exact, ...]
    long: tuple[tuple[tuple[int, int], Exact], ...] = ()

    @property
    def n(self) -> int:
        """The number of punctures."""
        return len(self.a) + 3

    @classmethod
    def of(cls, pairs: PairExponents) -> Cubical:
        """Pass from pair exponents to cubical ones."""
        size = pairs.n - 3
        long = tuple(
            ((i, j), pairs.at(i + 1, j + 2))
            for i in range(1, size + 1)
            for j in range(i + 1, size + 1)
            if pairs.at(i + 1, j + 2)
        )
        return cls(
            tuple(pairs.divisor(1, i + 1) for i in range(1, size + 1)),
            tuple(pairs.divisor(i + 1, i + 2) for i in range(1, size + 1)),
            long,
        )

    def pairs(self) -> PairExponents:
        """Pass back to pair exponents."""
        size = len(self.a)
        finite: dict[tuple[int, int], Exact] = {(i + 1, j + 2): value for (i, j), value in self.long}
        for i in range(1, size + 1):
            finite[i + 1, i + 2] = self.c[i - 1] - 1
        before = ZERO  # the sum of the exponents among positions 1..i
        for i in range(1, size + 1):
            upto = self.a[i - 1] - i
            row = sum((finite.get((b, i + 1), ZERO) for b in range(2, i + 1)), ZERO)
            finite[1, i + 1] = upto - before - row
            before = upto
        return PairExponents.from_finite(self.n, finite)

    def blocks(self) -> Mapping[tuple[int, int], Exact] | None:
        """The long exponents when no two of their intervals overlap, else None."""
        last = 0
        for (i, j), _ in self.long:
            if i <= last:
                return None
            last = j
        return dict(self.long)
