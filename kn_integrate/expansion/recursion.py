"""The alpha'-expansion as numbers: the differential equation of ``steps`` solved by power series, order by order.

No multiple zeta value enters, so this is an independent check of the exact engine, and all there is for kinematics
whose exact rational numbers would be of no use.  With every invariant multiplied by alpha' the matrices are of first
order, and nothing is ever divided by more than an integer k.  In units where ``c_k`` is a polynomial in alpha', S the
shift by one order, T = A - rho:

* around 0: ``f(x) = x^rho sum c_k x^k``, ``k c_k = S (T c_k - B C_(k-1))``, ``C_k = c_0 + ... + c_k``, and
  ``int_0^x (A/z) f = x^rho [sum c_k x^k + sum_(k>=1) x^k S B C_(k-1) / (k + S rho)]``;
* around 1, with w = 1 - x, downward from r = 0: ``k u = w^k f(x) + r - S B u``, ``r <- r + S A u``; after k = 1,
  ``r = int_x^1 (A/z) f``.

Both meet at x = 1/2 (Broedel, Schlotterer, Stieberger, Terasoma 2013, arXiv:1304.7304, for the equation).

Errors.  Numbers are integers in units of 2^-bits, rounded down.  The same recursions for upper bounds of norms, in
floating point, bound the growth of every rounding (one unit at each division) and the tails cut off after k = bits.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from math import lcm
from typing import TypeAlias

from ..exact import ZERO, Exact
from ..kinematics import Mandelstams
from .balls import Ball
from .steps import Step, Word, step, words

Vector: TypeAlias = list[int]
Orders: TypeAlias = list[Vector]  # one vector for each order in alpha'
Sparse: TypeAlias = list[list[tuple[int, int]]]  # for each row: (column, integer)
Bounds: TypeAlias = list[float]  # one for each order

_MARGIN = 64  # terms of a tail that are bounded one by one; what follows is smaller by 2^-64
_SLACK = 1.0 + 1e-9  # for the roundings of the bounds themselves


class _Numbers:
    """The matrices of one step as integers over a common denominator.

    Complex numbers are pairs of real ones: vectors hold a block of real and a block of imaginary parts.
    """

    def __init__(self, kin: Mandelstams, at: Step, denominator: int, is_real: bool) -> None:
        self.size = len(at.basis)
        self.denominator = denominator
        self.is_real = is_real
        rho = sum((kin.pair(i, j) for i, j in at.rho), ZERO)
        first = self._collect(kin, at.first)
        second = self._collect(kin, at.second)
        shifted = dict(first)
        for k in range(self.size):
            shifted[k, k] = shifted.get((k, k), ZERO) - rho
        self.a, self.b, self.t = (self._sparse(each) for each in (first, second, shifted))
        self.rho = self._sparse({(k, k): rho for k in range(self.size)})

    def _collect(
        self, kin: Mandelstams, entries: Sequence[tuple[int, int, int, Sequence[tuple[int, int]]]]
    ) -> dict[tuple[int, int], Exact]:
        found: dict[tuple[int, int], Exact] = {}
        for row, column, sign, pairs in entries:
            value = sum((kin.pair(i, j) for i, j in pairs), ZERO)
            found[row, column] = found.get((row, column), ZERO) + sign * value
        return found

    def _sparse(self, entries: dict[tuple[int, int], Exact]) -> Sparse:
        d, size = self.denominator, self.size
        rows: Sparse = [[] for _ in range(size if self.is_real else 2 * size)]
        for (row, column), value in entries.items():
            p, q, e = value.as_ratio()
            p, q = p * (d // e), q * (d // e)
            if p:
                rows[row].append((column, p))
                if not self.is_real:
                    rows[row + size].append((column + size, p))
            if q:
                rows[row].append((column + size, -q))
                rows[row + size].append((column, q))
        return rows

    def norm(self, matrix: Sparse) -> float:
        """The largest sum of moduli in a row."""
        return max(sum(abs(c) for _, c in row) for row in matrix) / self.denominator * _SLACK


def _apply(matrix: Sparse, vector: Vector) -> Vector:
    """The product, still to be divided by the common denominator."""
    result = []
    for row in matrix:
        total = 0
        for column, c in row:
            total += c * vector[column]
        result.append(total)
    return result


def _left(numbers: _Numbers, start: Orders, bits: int) -> tuple[Orders, Orders]:
    """``sum c_k 2^-k`` and ``sum 2^-k S B C_(k-1) / (k + S rho)``."""
    d = numbers.denominator
    orders, size = len(start), len(start[0])
    total = [list(v) for v in start]
    value = [list(v) for v in start]
    extra = [[0] * size for _ in range(orders)]
    for k in range(1, bits + 1):
        pushed = [_apply(numbers.b, total[w]) for w in range(orders - 1)]
        dk = d * k
        c: Vector = [0] * size
        y: Vector = [0] * size
        for w in range(1, orders):
            turned = _apply(numbers.t, c)
            scaled = _apply(numbers.rho, y)
            b = pushed[w - 1]
            c = [(p - q) // dk for p, q in zip(turned, b, strict=True)]
            y = [(q - p) // dk for p, q in zip(scaled, b, strict=True)]
            value[w] = [p + (q >> k) for p, q in zip(value[w], c, strict=True)]
            extra[w] = [p + (q >> k) for p, q in zip(extra[w], y, strict=True)]
            total[w] = [p + q for p, q in zip(total[w], c, strict=True)]
    return value, extra


def _right(numbers: _Numbers, value: Orders, bits: int) -> Orders:
    """``int_(1/2)^1 (A/z) f`` for f(1/2) = value."""
    d = numbers.denominator
    orders, size = len(value), len(value[0])
    r = [[0] * size for _ in range(orders)]
    for k in range(bits, 0, -1):
        u: Vector = [0] * size
        for w in range(orders):
            turned = _apply(numbers.b, u)
            given = [(p >> k) + q for p, q in zip(value[w], r[w], strict=True)]
            if w:  # r at this order takes what u of the order below gives
                r[w] = [p + q // d for p, q in zip(r[w], _apply(numbers.a, u), strict=True)]
            u = [(p * d - q) // (d * k) for p, q in zip(given, turned, strict=True)]
    return r


def _bounds(numbers: _Numbers, size: Bounds, error: Bounds, bits: int) -> Bounds:
    """Bounds, in units of 2^-bits, of the error of ``value + extra + r`` at each order.

    ``size`` bounds the starting vector (as numbers), ``error`` its error in units of 2^-bits.
    """
    a, b, t, rho = (numbers.norm(each) for each in (numbers.a, numbers.b, numbers.t, numbers.rho))
    orders = len(size)

    def left(start: Bounds, rounding: float, last: int, first_kept: int) -> tuple[Bounds, Bounds]:
        """Sums of bounds of |c_k| 2^-k and of the extra terms, from ``first_kept`` on, times 2^first_kept."""
        total = list(start)
        value = list(start) if not first_kept else [0.0] * orders
        extra = [0.0] * orders
        for k in range(1, last + 1):
            c = y = 0.0
            c_all, weight = [0.0] * orders, 2.0 ** (first_kept - k) if k >= first_kept else 0.0
            for w in range(1, orders):
                c_new = (t * c + b * total[w - 1]) / k + rounding
                y = (rho * y + b * total[w - 1]) / k + rounding
                c = c_new
                c_all[w] = c
                value[w] += weight * c + (rounding if k >= first_kept else 0.0)
                extra[w] += weight * y + (rounding if k >= first_kept else 0.0)
            total = [(p + q) * _SLACK for p, q in zip(total, c_all, strict=True)]
        return value, extra

    def right(given: Bounds, start: Bounds, rounding: float, first: int, last: int, scale: int) -> Bounds:
        r = list(start)
        for k in range(first, last, -1):
            u = 0.0
            for w in range(orders):
                source = 2.0 ** (scale - k) * given[w] + r[w] + rounding
                if w:
                    r[w] = (r[w] + a * u + rounding) * _SLACK
                u = (source + b * u) / k + rounding
        return r

    # rounding errors, and errors of the start, in units of 2^-bits
    value_error, extra_error = left(error, 1.0, bits, 0)
    # the tails beyond k = bits, in units of 2^-bits: the last kept factor is 2^-bits
    value_tail, extra_tail = left(size, 0.0, bits + _MARGIN, bits)
    value_error = [p + 2.0 * q for p, q in zip(value_error, value_tail, strict=True)]
    extra_error = [p + 2.0 * q for p, q in zip(extra_error, extra_tail, strict=True)]
    value_size, _ = left(size, 0.0, bits, 0)
    neglected = right(value_size, [0.0] * orders, 0.0, bits + _MARGIN, bits, bits)
    r_error = right(value_error, [2.0 * q for q in neglected], 1.0, bits, 0, 0)
    return [(p + q + r) * _SLACK for p, q, r in zip(value_error, extra_error, r_error, strict=True)]


def _half_power(rho: Sparse, vectors: Orders, errors: Bounds, norm: float, d: int, bits: int) -> tuple[Orders, Bounds]:
    """Times ``2^(-S rho)``: the factor x^rho at x = 1/2."""
    log2 = _log_two(bits)
    result = [list(v) for v in vectors]
    bounds = list(errors)
    power, power_bounds = vectors, list(errors)
    sizes = [max((abs(c) for c in v), default=0) / (1 << bits) * _SLACK for v in vectors]
    for j in range(1, len(vectors)):
        shifted = [[0] * len(vectors[0])]
        for vector in power[:-1]:
            shifted.append([-((c * log2) >> bits) // (d * j) for c in _apply(rho, vector)])
        # |log 2| < 0.7; its error of one unit meets numbers of size norm * |vector|
        raised = [(0.7 * norm * p + norm * q) / j + 2.0 for p, q in zip(power_bounds, sizes, strict=True)]
        power_bounds = [0.0, *raised[:-1]]
        sizes = [0.0, *[0.7 * norm * q / j * _SLACK for q in sizes[:-1]]]
        power = shifted
        result = [[p + q for p, q in zip(x, y, strict=True)] for x, y in zip(result, power, strict=True)]
        bounds = [p + q for p, q in zip(bounds, power_bounds, strict=True)]
    return result, [p * _SLACK for p in bounds]


def _log_two(bits: int) -> int:
    """log 2 in units of 2^-bits, off by less than one unit: sum of 2^-k / k."""
    extra = 16
    total = sum((1 << (bits + extra - k)) // k for k in range(1, bits + extra))
    return total >> extra


def ball_engine(kin: Mandelstams, weight: int, bits: int) -> dict[Word, list[Ball]]:
    """The functions F of the ordering 1..n by order in alpha', with error bounds.

    Parameters
    ----------
    kin
        Massless kinematics, taken exactly; invariants of about 1 or less, for bounds that stay in the range of doubles.
    weight
        The highest order.
    bits
        Bits after the point.

    Returns
    -------
    word (permutation of 2..n-2) -> weight -> Ball
    """
    n, orders = kin.n, weight + 1
    is_real = kin.is_real
    denominator = lcm(*(value.as_ratio()[2] for value in kin.pairs))
    blocks = 1 if is_real else 2
    current: Orders = [[1 << bits] + [0] * (blocks - 1)] + [[0] * blocks for _ in range(weight)]
    errors: Bounds = [0.0] * orders
    for points in range(3, n):
        at = step(points)
        numbers = _Numbers(kin, at, denominator, is_real)
        count, size = len(words(points)), len(at.basis)
        start = []
        for vector in current:
            padded: Vector = []
            for block in range(blocks):
                padded += vector[block * count : (block + 1) * count] + [0] * (size - count)
            start.append(padded)
        sizes = [
            max(abs(c) for c in v) / (1 << bits) * _SLACK + math.ldexp(e, -bits)
            for v, e in zip(start, errors, strict=True)
        ]
        near, extra = _left(numbers, start, bits)
        r = _right(numbers, near, bits)
        errors = _bounds(numbers, sizes, errors, bits)
        y = [[p + q + s for p, q, s in zip(*each, strict=True)] for each in zip(near, extra, r, strict=True)]
        y, errors = _half_power(numbers.rho, y, errors, numbers.norm(numbers.rho), denominator, bits)
        place = {pair: k for k, pair in enumerate(at.basis)}
        current = []
        for vector in y:
            picked: Vector = []
            for block in range(blocks):
                for word in words(points + 1):
                    cut = word.index(points - 1)
                    a, b = word[:cut], word[cut + 1 :]
                    c = vector[place[a, b[::-1]] + block * size]
                    picked.append(-c if len(b) % 2 else c)
            current.append(picked)
    index = {word: k for k, word in enumerate(words(n))}
    found = {}
    for word, k in index.items():
        series = []
        for vector, e in zip(current, errors, strict=True):
            im = 0 if is_real else vector[k + len(index)]
            series.append(Ball(vector[k], im, int(e) + 1, bits))
        found[word] = series
    return found
