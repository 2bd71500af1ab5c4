r"""The momentum kernel, its inverse, and the double-ordered sums of cubic trees.

All three are combinatorial. Chords of the polygon P (planar channels) that are planar in Q too are *common*; a common
triangulation is a cubic tree that both orderings share, and each of its triangles (vertices) is traversed by Q in the
same or the opposite sense.

* ``biadjoint(P, Q)``: the sum over common triangulations of ``(-1)^flips prod 1/X``.
* ``inverse_klt(P, Q)``: edges between triangles of opposite sense are the same in every common triangulation; each
  gives ``1/sin pi X`` and they cut the polygon into blocks.  A block contributes the sum over its dissections into
  polygons with an odd number v of corners, weight Catalan((v-3)/2) each, with ``cot pi X`` for every edge inside; the
  sign is ``(-1)^flips``.
* ``klt_kernel``: ``S[A,j|B,j,C]_1 = sin pi(s_1j + sum_{b in B} s_jb) S[A|B,C]_1``, ``S[empty] = 1``.

Sources: Kawai, Lewellen and Tye 1986; Bjerrum-Bohr, Damgaard, Sondergaard and Vanhove (arXiv:1010.3933) for the kernel;
Cachazo, He and Yuan (arXiv:1309.0885) for the trees; Mizera (arXiv:1610.04230, arXiv:1706.08527) for the inverse.
References from memory.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Iterable, Sequence
from functools import cache
from itertools import combinations, pairwise, permutations
from math import comb
from typing import Any

from .channels import Channel, dotted, read_labels, read_ordering
from .errors import InputError, PoleError
from .exact import ONE, ZERO, Exact, read_integer
from .kinematics import Mandelstams
from .precise.context import handed_out, local_context

Chord = tuple[int, int]  # corners a < b of the polygon; it separates the sides a..b-1 from the others
Triangle = tuple[int, int, int]


def _crosses(one: Chord, other: Chord) -> bool:
    (a, b), (c, d) = sorted((one, other))
    return a < c < b < d


@cache
def _triangulations(corners: tuple[int, ...]) -> tuple[tuple[Triangle, ...], ...]:
    """All triangulations of a polygon with the given corners, as sets of triangles."""
    if len(corners) < 3:
        return ((),)
    found = []
    first, last = corners[0], corners[-1]
    for k in range(1, len(corners) - 1):
        for left in _triangulations(corners[: k + 1]):
            for right in _triangulations(corners[k:]):
                found.append((*left, (first, corners[k], last), *right))
    return tuple(found)


def _diagonals(triangles: Iterable[Triangle], n: int) -> set[Chord]:
    edges = {edge for t in triangles for edge in combinations(t, 2)}
    return {(a, b) for a, b in edges if b - a not in (1, n - 1)}


class _Shared:
    """What two orderings share.  Corner k of the polygon P stands before its side k, which carries label P[k]."""

    def __init__(self, p: Channel, q: Channel) -> None:
        self.n = len(p)
        self.p = p
        self.place = {label: k for k, label in enumerate(q)}
        self.common = {
            (a, b)
            for a, b in combinations(range(self.n), 2)
            if b - a not in (1, self.n - 1) and self._is_planar(p[a:b])
        }

    def _is_planar(self, labels: Sequence[int]) -> bool:
        inside = [False] * self.n
        for label in labels:
            inside[self.place[label]] = True
        return sum(inside[k] != inside[k - 1] for k in range(self.n)) == 2

    def triangulations(self) -> list[tuple[Triangle, ...]]:
        """The common ones."""
        every = _triangulations(tuple(range(self.n)))
        return [t for t in every if _diagonals(t, self.n) <= self.common]

    def flipped(self, triangle: Triangle) -> bool:
        """Whether Q meets the three branches of a vertex in the opposite cyclic sense."""
        a, b, c = (self.place[self.p[corner]] for corner in triangle)  # one label of each branch
        return not ((a < b < c) or (b < c < a) or (c < a < b))

    def channel(self, chord: Chord) -> Channel:
        return self.p[chord[0] : chord[1]]


def biadjoint(kin: Mandelstams, p: Sequence[int], q: Sequence[int]) -> Exact:
    """The sum over cubic trees planar in both orderings of ``(-1)^flips prod 1/X``, exact.

    The field-theory limit of ``Z_P(PT(Q))`` (coefficient of ``alpha'^-(n-3)``).

    Parameters
    ----------
    kin
        Kinematics of n legs.
    p, q
        Permutations of 1..n.

    Raises
    ------
    PoleError
        When some X of a common channel is zero.

    Examples
    --------
    >>> kin = Mandelstams.from_planar(4, {(1, 2): "1/2", (2, 3): "1/3"})
    >>> biadjoint(kin, (1, 2, 3, 4), (1, 2, 3, 4)), biadjoint(kin, (1, 2, 3, 4), (1, 2, 4, 3))
    (Exact('5'), Exact('-2'))
    """
    shared = _Shared(read_ordering(p, kin.n, "p"), read_ordering(q, kin.n, "q"))
    inverse: dict[Chord, Exact] = {}
    total = ZERO
    for triangles in shared.triangulations():
        product = ONE
        for chord in sorted(_diagonals(triangles, shared.n)):
            if chord not in inverse:
                x = kin.channel(shared.channel(chord))
                if not x:
                    raise PoleError(tuple(sorted(shared.channel(chord))), 0, x)
                inverse[chord] = ONE / x
            product = product * inverse[chord]
        flips = sum(shared.flipped(t) for t in triangles)
        total = total - product if flips % 2 else total + product
    return total


def inverse_klt(kin: Mandelstams, p: Sequence[int], q: Sequence[int], digits: int | None = None) -> Any:
    """The entry (P, Q) of the inverse momentum kernel.

    Parameters
    ----------
    kin, p, q
        As for :func:`biadjoint`.
    digits
        Decimal digits (an mpmath number); None for double precision.

    Raises
    ------
    PoleError
        When X of a common channel is an integer.

    Examples
    --------
    >>> kin = Mandelstams.from_planar(4, {(1, 2): "1/4", (2, 3): "1/4"})
    >>> print(f"{inverse_klt(kin, (1, 2, 3, 4), (1, 2, 3, 4)):.12f}")  # cot + cot
    2.000000000000
    """
    shared = _Shared(read_ordering(p, kin.n, "p"), read_ordering(q, kin.n, "q"))
    sine = sine_of(digits)
    every = shared.triangulations()
    if not every:
        return sine.handed_out(sine.zero)
    triangles = every[0]
    flip = {t: shared.flipped(t) for t in triangles}
    cuts = [
        chord
        for chord in sorted(_diagonals(triangles, shared.n))
        if len({flip[t] for t in triangles if set(chord) <= set(t)}) == 2
    ]
    result = -sine.one if sum(flip.values()) % 2 else sine.one
    for chord in cuts:
        result = result / _sin(sine, kin, shared, chord)
    for block in _blocks(tuple(range(shared.n)), cuts):
        result = result * _block(sine, kin, shared, block)
    return sine.handed_out(result)


def _blocks(corners: tuple[int, ...], cuts: Sequence[Chord]) -> list[tuple[int, ...]]:
    """The polygons into which chords that do not cross cut a polygon."""
    if not cuts:
        return [corners]
    (a, b), *rest = cuts
    inner = tuple(c for c in corners if a <= c <= b)
    outer = tuple(c for c in corners if c <= a or c >= b)
    sides = [(inner, [c for c in rest if a <= c[0] and c[1] <= b]), (outer, [])]
    sides[1] = (outer, [c for c in rest if c not in sides[0][1]])
    return [block for polygon, inside in sides for block in _blocks(polygon, inside)]


def _block(sine: Sine, kin: Mandelstams, shared: _Shared, corners: tuple[int, ...]) -> Any:
    """The sum over dissections into odd polygons: Catalan weights, cotangents of the edges inside."""
    known: dict[tuple[int, ...], Any] = {}

    def cot(chord: Chord) -> Any:
        return _cos(sine, kin, shared, chord) / _sin(sine, kin, shared, chord)

    def total(polygon: tuple[int, ...]) -> Any:
        # sum over the cell that stands on the side (first corner, last corner)
        if len(polygon) == 2:
            return sine.one
        if polygon in known:
            return known[polygon]
        result = sine.zero
        inner = polygon[1:-1]
        for size in range(1, len(inner) + 1, 2):  # cells with size + 2 corners, odd
            weight = comb(size - 1, (size - 1) // 2) // ((size - 1) // 2 + 1)
            for chosen in combinations(inner, size):
                ring = (polygon[0], *chosen, polygon[-1])
                product = sine.one * weight
                for a, b in pairwise(ring):
                    between = tuple(c for c in polygon if a <= c <= b)
                    if len(between) > 2:
                        product = product * cot((a, b)) * total(between)
                result = result + product
        known[polygon] = result
        return result

    return total(corners)


def klt_kernel(
    kin: Mandelstams,
    rows: Iterable[Sequence[int]] | None = None,
    columns: Iterable[Sequence[int]] | None = None,
    digits: int | None = None,
) -> tuple[tuple[Any, ...], ...]:
    """The momentum kernel ``S[r|t]_1`` for words r (rows) and t (columns) of the labels 2..n-2 (all when None).

    Words of other label sets that do not contain 1 are allowed too: on those of 2..n-1 the kernel annihilates the disk
    integrals.

    Parameters
    ----------
    kin
        Open-string kinematics for the string kernel of disk integrals; closed-string kinematics as they are.
    digits
        Decimal digits (mpmath numbers); None for double precision.

    Examples
    --------
    >>> kin = Mandelstams.from_planar(4, {(1, 2): "1/6", (2, 3): "1/4"})
    >>> print(f"{klt_kernel(kin)[0][0]:.12f}")
    0.500000000000
    """
    words = tuple(permutations(range(2, kin.n - 1)))
    left = words if rows is None else tuple(read_labels(word, kin.n, "rows") for word in rows)
    right = words if columns is None else tuple(read_labels(word, kin.n, "columns") for word in columns)
    sine = sine_of(digits)
    for word in (*left, *right):
        if set(word) != set(left[0]) or 1 in word:
            raise InputError("rows, columns", dotted(word), "words of the same labels, without 1")
    return tuple(tuple(sine.handed_out(_entry(sine, kin, row, column)) for column in right) for row in left)


def _entry(sine: Sine, kin: Mandelstams, row: Channel, column: Channel) -> Any:
    product = sine.one
    while row:
        j = row[-1]
        place = column.index(j)
        x = kin.pair(1, j)
        for b in column[:place]:
            x = x + kin.pair(j, b)
        product = product * sine.sin(x)
        row, column = row[:-1], column[:place] + column[place + 1 :]
    return product


# --- sines of exact numbers -----------------------------------------------------------------------------------------


class Sine:
    """``sin pi x`` and ``cos pi x`` of exact numbers, relatively accurate next to their zeros, and their arithmetic.

    With digits all numbers belong to a local mpmath context; ``handed_out`` turns a result into an ordinary number.
    """

    def __init__(self, digits: int | None) -> None:
        self.ctx: Any = None if digits is None else local_context(digits + 10)
        self.zero: Any = 0.0 if self.ctx is None else self.ctx.mpf(0)
        self.one: Any = 1.0 if self.ctx is None else self.ctx.mpf(1)

    def number(self, x: Any) -> Any:
        """An exact number, or a value of either kind, in this arithmetic."""
        if isinstance(x, Exact):
            if self.ctx is None:
                return x.value()
            real = self.ctx.mpf(x.re.numerator) / x.re.denominator
            return real if x.is_real else self.ctx.mpc(real, self.ctx.mpf(x.im.numerator) / x.im.denominator)
        return x if self.ctx is None else self.ctx.mpmathify(x)

    def handed_out(self, x: Any) -> Any:
        """A result for the caller."""
        return x if self.ctx is None else handed_out(x)

    def sin(self, x: Exact) -> Any:
        """``sin pi x``."""
        whole = round(x.re)
        rest = self.number(x - whole)
        if self.ctx is not None:
            value = self.ctx.sinpi(rest)
        else:
            value = cmath.sin(math.pi * rest) if isinstance(rest, complex) else math.sin(math.pi * rest)
        return -value if whole % 2 else value

    def cos(self, x: Exact) -> Any:
        """``cos pi x``."""
        half: Exact = x + ONE / 2
        return self.sin(half)


def sine_of(digits: Any) -> Sine:
    """Sines in double precision, or with this many digits."""
    return Sine(None if digits is None else read_integer(digits, "digits", "a positive integer or None"))


def _sin(sine: Sine, kin: Mandelstams, shared: _Shared, chord: Chord) -> Any:
    x = kin.channel(shared.channel(chord))
    if x.is_integer:
        raise PoleError(tuple(sorted(shared.channel(chord))), abs(int(x)), x, f"sin pi X vanishes at X = {x}")
    return sine.sin(x)


def _cos(sine: Sine, kin: Mandelstams, shared: _Shared, chord: Chord) -> Any:
    return sine.cos(kin.channel(shared.channel(chord)))
