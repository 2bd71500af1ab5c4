"""Every multiple zeta value of weight up to 12 in the basis, by linear algebra over the rationals.

Two products of the same numbers: as nested sums (the stuffle) and as iterated integrals (the shuffle),

    ``zeta(u) zeta(v) = sum over u stuffle v = sum over u shuffle v``,

and, with the divergent zeta(1) on one side, Hoffman's relation ``sum over (1) stuffle v - sum over (1) shuffle v = 0``
in which the divergent terms cancel; duality is the substitution t -> 1 - t in the integral.  All are theorems (Hoffman
1992; Ihara, Kaneko, Zagier 2006), so the reductions found here are too; that they suffice is seen from the rank, which
has to leave exactly the generators of the weight (Zagier's dimension), and is checked.

As a word in the letters 0 and 1 (forms dt/t and dt/(1-t), innermost first), ``zeta(n1, ..., nr)`` is
``1 0^(n1-1) 1 0^(n2-1) ...``.
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import cache
from itertools import product as choices
from math import lcm
from typing import Any, TypeAlias

from ..errors import KNError
from ..exact import ONE, ZERO, Exact
from .zetas import GENERATORS, Composition, Product, basis, product_of

Reduced: TypeAlias = Mapping[Product, Exact]


def word_of(composition: Composition) -> str:
    """The word of a composition.

    >>> word_of((3, 2)), composition_of("10010")
    ('10010', (3, 2))
    """
    return "".join("1" + "0" * (n - 1) for n in composition)


def composition_of(word: str) -> Composition:
    """The composition of a word that begins with 1."""
    return tuple(len(zeros) + 1 for zeros in word.split("1")[1:])


def words_of(weight: int) -> list[Composition]:
    """The convergent compositions of one weight."""
    if weight < 2:
        return []
    return [composition_of("1" + "".join(middle) + "0") for middle in choices("01", repeat=weight - 2)]


def dual(composition: Composition) -> Composition:
    """The composition of the reversed word with letters exchanged: the same value.

    >>> dual((1, 2)), dual((3, 2))
    ((3,), (2, 1, 2))
    """
    swapped = word_of(composition).translate(str.maketrans("01", "10"))
    return composition_of(swapped[::-1])


@cache
def shuffle(u: str, v: str) -> dict[str, int]:
    """All interleavings of two words, with multiplicity."""
    if not u or not v:
        return {u + v: 1}
    found: dict[str, int] = {}
    for rest, last in ((shuffle(u[:-1], v), u[-1]), (shuffle(u, v[:-1]), v[-1])):
        for word, count in rest.items():
            found[word + last] = found.get(word + last, 0) + count
    return found


@cache
def stuffle(u: Composition, v: Composition) -> dict[Composition, int]:
    """The product of two nested sums: the largest summation index is the one of u, of v, or common to both."""
    if not u or not v:
        return {u + v: 1}
    found: dict[Composition, int] = {}
    for rest, last in (
        (stuffle(u[:-1], v), u[-1]),
        (stuffle(u, v[:-1]), v[-1]),
        (stuffle(u[:-1], v[:-1]), u[-1] + v[-1]),
    ):
        for indices, count in rest.items():
            key = (*indices, last)
            found[key] = found.get(key, 0) + count
    return found


def reduced(composition: Composition) -> Reduced:
    """A convergent multiple zeta value in the basis of its weight."""
    return _table(sum(composition))[composition]


class _System:
    """The relations of one weight: unknown zeta values first, then generators, then products of generators."""

    def __init__(self, weight: int) -> None:
        self.weight = weight
        generators = [g for g in GENERATORS if sum(g) == weight]
        self.standing: dict[Composition, Composition] = {}  # duality halves the number of unknowns
        for word in words_of(weight):
            other = dual(word)
            pair = sorted((word, other), key=lambda c: (c not in generators, len(c), c))
            self.standing[word] = pair[0]
        unknowns = {word for word in self.standing.values() if word not in generators}
        products: list[Product] = [(g,) for g in generators]
        products += [p for p in basis(weight) if len(p) > 1]
        self.words = sorted(unknowns, key=lambda c: (-len(c), c))
        self.products = products
        self.column: dict[Any, int] = {word: k for k, word in enumerate(self.words)}
        self.column |= {product: len(self.words) + k for k, product in enumerate(products)}
        self.rows: dict[tuple[tuple[int, Exact], ...], None] = {}

    def place(self, word: Composition) -> int:
        standing = self.standing[word]
        return self.column[standing] if standing in self.column else self.column[(standing,)]

    def add(self, counts: Mapping[Composition, int], value: Reduced) -> None:
        """sum of counted zeta values = a known combination of products."""
        row: dict[int, Exact] = {}
        for word, count in counts.items():
            if count:
                k = self.place(word)
                row[k] = row.get(k, ZERO) + count
        for product, c in value.items():
            k = self.column[product]
            row[k] = row.get(k, ZERO) - c
        kept = sorted((k, c) for k, c in row.items() if c)
        if kept:
            scale = kept[0][1]
            self.rows[tuple((k, c / scale) for k, c in kept)] = None

    def fill(self) -> None:
        for word in words_of(self.weight - 1):  # Hoffman's relation
            counts = dict(stuffle((1,), word))
            for mixed, count in shuffle("1", word_of(word)).items():
                key = composition_of(mixed)
                counts[key] = counts.get(key, 0) - count
            self.add(counts, {})
        for low in range(2, self.weight // 2 + 1):
            for u in words_of(low):
                for v in words_of(self.weight - low):
                    if 2 * low == self.weight and v < u:
                        continue
                    value: dict[Product, Exact] = {}
                    for p, a in reduced(u).items():
                        for q, b in reduced(v).items():
                            both = product_of(p, q)
                            value[both] = value.get(both, ZERO) + a * b
                    counts = {}
                    for mixed, count in shuffle(word_of(u), word_of(v)).items():
                        key = composition_of(mixed)
                        counts[key] = counts.get(key, 0) + count
                    self.add(counts, value)
                    self.add(stuffle(u, v), value)

    def solve(self) -> dict[Composition, dict[Product, Exact]]:
        from flint import fmpz_mat

        found: dict[Composition, dict[Product, Exact]] = {}
        if self.words:
            columns = len(self.words) + len(self.products)
            matrix = fmpz_mat(len(self.rows), columns)
            for i, row in enumerate(self.rows):
                common = lcm(*(c.as_ratio()[2] for _, c in row))
                for k, c in row:
                    matrix[i, k] = int(c * common)
            echelon, _, rank = matrix.rref()
            if rank != len(self.words):
                raise KNError(f"the relations of weight {self.weight} have rank {rank}, not {len(self.words)}")
            for i, word in enumerate(self.words):  # full rank on the unknowns: the pivots are the first columns
                pivot = int(echelon[i, i])
                found[word] = {}
                for k, product in enumerate(self.products, start=len(self.words)):
                    entry = int(echelon[i, k])
                    if entry:
                        found[word][product] = Exact.from_ratio(*_positive(-entry, pivot))
        for product in self.products:
            if len(product) == 1:
                found[product[0]] = {product: ONE}
        return {word: found[standing] for word, standing in self.standing.items()}


def _positive(numerator: int, denominator: int) -> tuple[int, int, int]:
    return (numerator, 0, denominator) if denominator > 0 else (-numerator, 0, -denominator)


@cache
def _table(weight: int) -> dict[Composition, dict[Product, Exact]]:
    system = _System(weight)
    system.fill()
    return system.solve()
