"""A plain quadrature of a convergent disk integral from its definition, in double or in multiple precision.

Cut the simplex of gaps by which gap is the largest, then again to its left and right.  In the sector of such a binary
tree every gap is its parent's times t in [0, 1], and the integrand is prod t^(Y-1) times an analytic function (sector
decomposition: Hepp 1966); a Gauss rule for the weight t^(Y-1) takes each t.  Real exponents with every Y > 0 only.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any

import mpmath
import numpy as np

from kn_integrate.closed_forms import PairExponents
from kn_integrate.exact import Exact

Span = tuple[int, int]


@dataclass(frozen=True)
class Arithmetic:
    """What the sum needs from a number type; arrays are numpy arrays of it."""

    number: Callable[[Exact], Any]
    eigen: Callable[[list[Any], list[Any]], tuple[Any, Any]]  # diagonal, off-diagonal -> nodes, first components
    log: Callable[[Any], Any]
    exp: Callable[[Any], Any]
    sqrt: Callable[[Any], Any]


def _eigen_double(diagonal: list[float], off: list[float]) -> tuple[Any, Any]:
    nodes, vectors = np.linalg.eigh(np.diag(diagonal) + np.diag(off, 1) + np.diag(off, -1))
    return nodes, vectors[0]


def _eigen_big(diagonal: list[Any], off: list[Any]) -> tuple[Any, Any]:
    matrix = mpmath.diag(diagonal)
    for k, x in enumerate(off):
        matrix[k, k + 1] = matrix[k + 1, k] = x
    nodes, vectors = mpmath.eigsy(matrix)
    return np.array(list(nodes), dtype=object), np.array([vectors[0, k] for k in range(len(diagonal))], dtype=object)


DOUBLE = Arithmetic(lambda x: float(x), _eigen_double, np.log, np.exp, np.sqrt)
BIG = Arithmetic(
    lambda x: mpmath.mpf(x.re.numerator) / x.re.denominator,
    _eigen_big,
    np.frompyfunc(lambda x: mpmath.log(x), 1, 1),
    np.frompyfunc(lambda x: mpmath.exp(x), 1, 1),
    lambda x: mpmath.sqrt(x),
)


def jacobi_rule(exponent: Any, count: int, using: Arithmetic) -> tuple[Any, Any]:
    """Gauss rule on [0, 1] for the weight t^(exponent-1) (Golub and Welsch 1969; recurrence: DLMF 18.9.2)."""
    b = exponent - 1
    diagonal = [b / (b + 2)] + [b * b / ((2 * k + b) * (2 * k + b + 2)) for k in range(1, count)]
    squares = [
        4 * k * k * (k + b) ** 2 / ((2 * k + b) ** 2 * (2 * k + b + 1) * (2 * k + b - 1)) for k in range(2, count)
    ]
    if count > 1:  # k = 1 with the factor (1 + b) cancelled, which is 0/0 in the general form at b = -1
        squares.insert(0, 4 * (1 + b) / ((2 + b) ** 2 * (3 + b)))
    nodes, first = using.eigen(diagonal, [using.sqrt(x) for x in squares])
    return (nodes + 1) / 2, first * first / exponent


def trees(first: int, last: int) -> Iterator[tuple[tuple[int, int, int, int], ...]]:
    """Every binary tree on the gaps first..last as (root, first, last, parent) per node, parents before children."""

    def grow(first: int, last: int, parent: int) -> Iterator[tuple[tuple[int, int, int, int], ...]]:
        if first > last:
            yield ()
            return
        for root in range(first, last + 1):
            for left in grow(first, root - 1, root):
                for right in grow(root + 1, last, root):
                    yield ((root, first, last, parent), *left, *right)

    return grow(first, last, -1)


def sector_sum(pairs: PairExponents, count: int, using: Arithmetic = DOUBLE) -> Any:
    """The disk integral with ``count`` nodes per variable."""
    gaps = pairs.n - 2
    power = {(a, b): pairs.at(a + 1, b + 2) for a in range(gaps) for b in range(a + 1, gaps)}
    rules: dict[Span, tuple[Any, Any]] = {}
    total: Any = 0
    for tree in trees(0, gaps - 1):
        sizes: list[Any] = [1] * gaps
        weight: Any = 1
        for axis, (root, first, last, parent) in enumerate(tree[1:]):
            span = (first, last)
            if span not in rules:
                rules[span] = jacobi_rule(using.number(pairs.divisor(first + 1, last + 2)), count, using)
            shape = [1] * (gaps - 1)
            shape[axis] = count
            nodes, weights = (x.reshape(shape) for x in rules[span])
            sizes[root] = sizes[parent] * nodes
            weight = weight * weights
        logs: Any = 0
        for (a, b), exponent in power.items():
            if exponent:
                largest = next(root for root, first, last, _ in tree if first <= a and b <= last and a <= root <= b)
                logs = logs + using.number(exponent) * using.log(sum(sizes[a : b + 1]) / sizes[largest])
        total = total + (weight * using.exp(logs)).sum()
    return total
