"""The alpha'-expansion of the disk integrals in exact numbers: no floating point, no fitting.

One step of the recursion (``steps``) takes the boundary value c_0 of the functions f at z = 0 to the integrals with one
more leg.  Appending ``h = int_0^z (A/z) f`` as a second block,

    ``G' = (e0/z + e1/(z - 1)) G``,  ``e0 = [[A, 0], [A, 0]]``, ``e1 = [[B, 0], [0, 0]]``,

the result is the lower block of ``Phi(e0, e1) (c_0; c_0)`` with Drinfeld's associator Phi: the sum over words in e0, e1
with (shuffle regularised) multiple zeta values as coefficients (Terasoma 2002; arXiv:1304.7304).  Since
``e0 (c_0; c_0) = rho (c_0; c_0)`` and Phi does not see multiples of the identity, e0 can be replaced by ``e0 - rho``,
which kills the starting vector; the lower block of e1 is zero.  Only words that begin with e1 and end with e0 remain,
and their coefficients are convergent multiple zeta values, which ``reduction`` knows exactly.

The entries of the matrices are linear in the invariants, so words of length w are the order alpha'^w: every
coefficient comes out as a combination of multiple zeta values of one weight.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeAlias

from ..exact import ZERO, Exact
from .reduction import composition_of, reduced
from .steps import Word, step, words
from .zetas import Product, product_of, product_weight

# Numbers are Exact, or anything with the same arithmetic (polynomials, when coefficients are wanted as such).
Number: TypeAlias = Any
Vector: TypeAlias = list[Number]
Matrix: TypeAlias = list[tuple[int, int, Number]]
Graded: TypeAlias = dict[Product, Vector]


def _apply(matrix: Matrix, vector: Vector, zero: Number) -> Vector:
    result = [zero] * len(vector)
    for row, column, entry in matrix:
        value = vector[column]
        if value:
            result[row] = result[row] + entry * value
    return result


def _matrix(entries: Any, s: Callable[[int, int], Number], zero: Number) -> Matrix:
    collected: dict[tuple[int, int], Number] = {}
    for row, column, sign, pairs in entries:
        value = sum((s(i, j) for i, j in pairs), zero)
        collected[row, column] = collected.get((row, column), zero) + (value if sign > 0 else -value)
    return [(row, column, value) for (row, column), value in collected.items() if value]


class _Walk:
    """All words of one step, applied to one starting vector."""

    def __init__(self, first: Matrix, second: Matrix, rho: Number, zero: Number) -> None:
        self.first, self.second, self.rho, self.zero = first, second, rho, zero
        self.found: Graded = {}

    def run(self, start: Vector, product: Product, length: int) -> None:
        """Add the words of up to ``length`` letters on the start vector, times a product of zeta values."""
        self.product, self.length = product, length
        if length >= 2:
            upper = _apply(self.second, start, self.zero)
            self._down("1", upper, [self.zero] * len(start), -1)

    def _down(self, word: str, upper: Vector, lower: Vector, sign: int) -> None:
        if not any(upper) and not any(lower):
            return
        image = _apply(self.first, upper, self.zero)
        ended = [a - self.rho * b for a, b in zip(image, lower, strict=True)]
        if any(ended):
            for zeta_product, c in reduced(composition_of(word + "0")).items():
                self._add(product_of(self.product, zeta_product), c if sign > 0 else -c, ended)
        if len(word) + 1 < self.length:
            reduced_upper = [a - self.rho * b for a, b in zip(image, upper, strict=True)]
            self._down(word + "0", reduced_upper, ended, sign)
            if len(word) + 2 <= self.length:
                self._down(word + "1", _apply(self.second, upper, self.zero), [self.zero] * len(upper), -sign)

    def _add(self, product: Product, c: Exact, vector: Vector) -> None:
        into = self.found.get(product)
        if into is None:
            self.found[product] = [c * value for value in vector]
        else:
            for k, value in enumerate(vector):
                if value:
                    into[k] = into[k] + c * value


def expand_integrals(
    n: int, s: Callable[[int, int], Number], weight: int, zero: Number = ZERO, one: Number | None = None
) -> dict[Word, dict[Product, Number]]:
    """The functions ``F_w`` of n legs in ordering 1..n through one weight, exactly.

    ``F_w = int over 0 < z_2 < ... < z_(n-2) < 1 of prod |z_ij|^s_ij prod_k sum_j s_(j w_k) / (z_(w_k) - z_j)``, j over
    label 1 and the letters before ``w_k``; ``F_w -> delta(w, identity)`` as s -> 0.

    Parameters
    ----------
    n
        Number of legs, 4 or more; massless.
    s
        ``s(i, j)`` for labels 1 <= i < j <= n - 1.
    weight
        The highest weight, at most 12.
    zero, one
        The numbers 0 and 1 of the arithmetic in use.

    Returns
    -------
    word (permutation of 2..n-2) -> product of zeta values -> coefficient
        The product fixes the order in alpha': its weight.
    """
    unit = Exact(1) if one is None else one
    current: Graded = {(): [unit]}
    for points in range(3, n):
        at = step(points)
        first, second = (_matrix(entries, s, zero) for entries in (at.first, at.second))
        rho = sum((s(i, j) for i, j in at.rho), zero)
        walk = _Walk(first, second, rho, zero)
        rows = {word: k for k, word in enumerate(words(points))}
        ordered = list(current)
        full: Graded = {}
        for product in ordered:
            # words a with b empty stand first in the basis, in the same order as `words`
            vector = [*current[product], *[zero] * (len(at.basis) - len(rows))]
            full[product] = vector
            walk.run(vector, product, weight - product_weight(product))
        for product, vector in full.items():
            into = walk.found.setdefault(product, [zero] * len(at.basis))
            for k, value in enumerate(vector):
                into[k] = into[k] + value
        place = {pair: k for k, pair in enumerate(at.basis)}
        current = {}
        for product, vector in walk.found.items():
            values = []
            for word in words(points + 1):
                # F_(a, z, b) is the component (a; reversed b), with a sign for every letter of b
                cut = word.index(points - 1)
                a, b = word[:cut], word[cut + 1 :]
                value = vector[place[a, b[::-1]]]
                values.append(-value if len(b) % 2 else value)
            if any(values):
                current[product] = values
    return {
        word: {product: vector[k] for product, vector in current.items() if vector[k]}
        for k, word in enumerate(words(n))
    }
