"""Disk quadrature in arbitrary precision, n = 4, 5, 6: the same sectors, rules in python-flint balls.

Chords with Re Y > -0.85 get the Radau rule (nodes by Newton's method from double precision), the others interpolation
on an overhanging real interval; both as in ``disk.rules``, with as many digits as are asked for.  Rounding is bounded
by the balls; truncation by comparing two numbers of nodes.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import product
from typing import Any

import numpy as np

from ..errors import NotAvailableError, WorkLimitError
from ..estimate import Estimate, judge
from ..exact import Exact
from ..precise.context import as_mpmath, ball, flint_precision
from .chords import exact_chords
from .rules.base import ellipse_parameter, symmetric_bend
from .rules.chebyshev import overhang_bend
from .rules.radau import gauss_jacobi
from .sectors import Run, Tree, runs_of, trees
from .terms import Term

MAX_LEGS = 6
REACH = 0.25
DEFAULT_MAX_POINTS = 3e6
STEP = 3  # nodes between the two runs that are compared


@dataclass(frozen=True)
class _Chord:
    """Exponent and rule of one chord: nodes and weights, one list for each of the two node counts."""

    nodes: tuple[list[Any], list[Any]]
    weights: tuple[list[Any], list[Any]]


def integrate_terms(
    n: int,
    terms: Sequence[Term],
    *,
    rtol: float,
    atol: float = 0.0,
    digits: int,
    max_points: float | None = None,
) -> Estimate:
    """Quadrature of ``sum_k c_k I(A_k)`` with ``digits`` decimal digits; no chord on a pole.

    Raises
    ------
    NotAvailableError
        For n > 6.
    WorkLimitError
        When more than ``max_points`` (3e6 by default, about a minute) evaluations are needed.
    """
    if n > MAX_LEGS:
        raise NotAvailableError(f"quadrature in multiple precision goes up to n = {MAX_LEGS}; use method='kz'")
    limit = DEFAULT_MAX_POINTS if max_points is None else max_points
    is_complex = not all(t.coefficient.is_real and all(p.is_real for p in t.pairs) for t in terms)
    depth = max((max(0.0, -float(y.re)) for t in terms for y in exact_chords(n, t.pairs).values()), default=0.0)
    goal, spent = float(digits), 0.0
    while True:
        points = sum(_points(n, term, goal) for term in terms)
        if spent + points > limit and not spent:
            hint = "raise max_points=, ask for fewer digits=, or use method='kz'"
            raise WorkLimitError(points, limit, "points", hint)
        working = int(goal + 15 + 2.5 * depth * (n - 3))
        value, error = _both(n, terms, goal, int(3.3220 * working) + 20, is_complex)
        spent += points
        size = float(abs(value))
        target = max(atol, rtol * size)
        if error <= target or spent + 2.0 * points > limit or goal > 3 * digits + 60:
            break
        goal += max(3.0, math.log10(error / target)) if target > 0 else 10.0
    status = judge(complex(value), error, rtol, atol, error)
    details = {"choice": "quadrature in multiple precision", "terms": len(terms), "working digits": working}
    return Estimate(value, error, status, "quadrature", int(spent), rtol, atol, digits, details)


def _both(n: int, terms: Sequence[Term], goal: float, bits: int, is_complex: bool) -> tuple[Any, float]:
    """The value with the finer rules as an mpmath number, and its distance from that with the coarser ones."""
    with flint_precision(bits):
        low: Any = None
        high: Any = None
        for term in terms:
            coarse, fine = _integrate(n, term, goal, is_complex)
            factor = ball(term.coefficient, is_complex)
            low = coarse * factor if low is None else low + coarse * factor
            high = fine * factor if high is None else high + fine * factor
        difference = abs(high - low)
        error = float(difference.mid()) + float(difference.rad()) + float(high.rad())
        return as_mpmath(high, bits), error


def _count(y: Exact, size: int, digits: float, growth: float) -> int:
    """Nodes of the finer rule of a chord."""
    goal = (digits + 2.0 + growth) * math.log(10.0)
    if float(y.re) > -0.85:
        rho = ellipse_parameter(1.0 / symmetric_bend(size))
        return math.ceil(goal / (2.0 * math.log(rho))) + 2 + STEP
    rho = overhang_bend(size, REACH)[2]
    return math.ceil((goal + 2.0 * max(0.0, -float(y.re)) * math.log(10.0)) / math.log(rho)) + 3 + STEP


def _growth(n: int, term: Term) -> float:
    """Decades by which large exponents can make the integrand grow off the interval."""
    return 0.25 * max(abs(p.value()) for p in term.pairs)


def _points(n: int, term: Term, digits: float) -> float:
    chords = exact_chords(n, term.pairs)
    growth = _growth(n, term)
    total = 0.0
    for tree in trees(n - 2):
        size = 1.0
        for v, parent in enumerate(tree.parent):
            if parent >= 0:
                run = tree.subtree[v]
                size *= _count(chords[run], run[1] - run[0] + 1, digits, growth)
        total += 2.0 * size
    return total


def _integrate(n: int, term: Term, digits: float, is_complex: bool) -> tuple[Any, Any]:
    """The integral with the coarser and with the finer rules."""
    from flint import acb, arb

    m = n - 2
    chords = exact_chords(n, term.pairs)
    growth = _growth(n, term)
    rules: dict[Run, _Chord] = {}
    for run, y in chords.items():
        size = run[1] - run[0] + 1
        fine = _count(y, size, digits, growth)
        pairs = [_rule(y, size, count, is_complex) for count in (fine - STEP, fine)]
        rules[run] = _Chord((pairs[0][0], pairs[1][0]), (pairs[0][1], pairs[1][1]))
    index = {}
    k = 0
    for i in range(1, n):
        for j in range(i + 1, n + 1):
            index[i, j] = k
            k += 1
    long_runs = [run for run in runs_of(m) if run[1] > run[0]]
    exponents = {run: ball(term.pairs[index[run[0] + 1, run[1] + 2]], is_complex) for run in long_runs}
    zero = acb(0) if is_complex else arb(0)
    totals = [zero, zero]
    for tree in trees(m):
        for which in (0, 1):
            totals[which] = totals[which] + _sector(tree, m, rules, exponents, which, zero)
    return totals[0], totals[1]


def _sector(tree: Tree, m: int, rules: dict[Run, _Chord], exponents: dict[Run, Any], which: int, zero: Any) -> Any:
    variables = [v for v in range(m) if tree.parent[v] >= 0]
    # parents before children, so that every gap is its parent's times its own variable
    variables.sort(key=tree.depth)
    tops = {run: tree.lca(run) for run in exponents}
    lists = [
        list(zip(rules[tree.subtree[v]].nodes[which], rules[tree.subtree[v]].weights[which], strict=True))
        for v in variables
    ]
    paths = {run: [tree.path(v, tops[run]) for v in range(run[0], run[1] + 1)] for run in exponents}
    total = zero
    t: list[Any] = [None] * m
    for chosen in product(*lists):
        weight = None
        for v, (node, w) in zip(variables, chosen, strict=True):
            t[v] = node
            weight = w if weight is None else weight * w
        log = zero
        for run, exponent in exponents.items():
            size: Any = None
            for path in paths[run]:
                part: Any = 1
                for v in path:
                    part = t[v] if part == 1 else part * t[v]
                size = part if size is None else size + part
            log = log + exponent * size.log()
        total = total + weight * log.exp()
    return total


def _rule(y: Exact, size: int, count: int, is_complex: bool) -> tuple[list[Any], list[Any]]:
    """Nodes and weights for ``t^(Y-1) dt`` in the current precision."""
    return _radau(y, size, count, is_complex) if float(y.re) > -0.85 else _overhang(y, size, count, is_complex)


def _bent(x: list[Any], weights: list[Any], y1: Any, bend: Any) -> tuple[list[Any], list[Any]]:
    stretch = [1 + bend - bend * value for value in x]
    nodes = [value / s for value, s in zip(x, stretch, strict=True)]
    factors = [w * (1 + bend) * (-(y1 * s.log())).exp() for w, s in zip(weights, stretch, strict=True)]
    return nodes, factors


def _radau(y: Exact, size: int, count: int, is_complex: bool) -> tuple[list[Any], list[Any]]:
    from flint import arb

    gauss = count - 1
    shifted: Exact = y + 1
    start = gauss_jacobi(gauss, shifted.value())[0]
    s = ball(shifted, is_complex and not y.is_real)
    one = s * 0 + 1
    beta = s - 1
    diagonal, squares = [s / (s + 1)], [s / ((s + 1) ** 2 * (s + 2))]
    for k in range(1, gauss):
        double = 2 * k + beta
        diagonal.append((one + beta * beta / (double * (double + 2))) / 2)
        if k >= 2:
            squares.append((k * (k + beta)) ** 2 / (double**2 * (double + 1) * (double - 1)))
    x: list[Any] = []
    weights: list[Any] = []
    for guess in np.asarray(start).tolist():
        node = one * 0 + _point(guess)
        for _ in range(60):
            previous, value, d_previous, slope = one * 0, one, one * 0, one * 0
            for k in range(gauss):
                below = squares[k - 1] if k else one * 0
                following = (node - diagonal[k]) * value - below * previous
                d_following = value + (node - diagonal[k]) * slope - below * d_previous
                previous, value, d_previous, slope = value, following, slope, d_following
            change = (value / slope).mid()
            node = (node - change).mid()
            if abs(complex(change)) < 1e-300 or _small(change):
                break
        # Christoffel number: 1 / sum of the squares of the orthonormal polynomials
        total, p_previous, p = s, one * 0, one
        norm = one
        for k in range(gauss - 1):
            below = squares[k - 1] if k else one * 0
            p_previous, p = p, (node - diagonal[k]) * p - below * p_previous
            norm = norm * squares[k]
            total = total + s * p * p / norm
        x.append(node)
        weights.append(1 / (total * node))
    end = 1 / ball(y, is_complex and not y.is_real)
    shift = ball(y, is_complex and not y.is_real)
    for k in range(1, gauss + 1):
        end = end * (k / (shift + k)) ** 2
    bend = arb(1 + size).sqrt() - 1
    return _bent([one * 0, *x], [end, *weights], s, bend)


def _point(value: Any) -> Any:
    from flint import acb, arb

    return acb(value.real, value.imag) if isinstance(value, complex) else arb(value)


def _small(change: Any) -> bool:
    import flint

    size = abs(change)
    return bool(size < flint.arb(2) ** (-(3 * flint.ctx.prec) // 4))


def _overhang(y: Exact, size: int, count: int, is_complex: bool) -> tuple[list[Any], list[Any]]:
    from flint import arb

    bend_double, a_double, _ = overhang_bend(size, REACH)
    bend, a = arb(bend_double), arb(a_double)  # any values near these will do; both are used as they are
    wide = is_complex and not y.is_real
    shifts = [ball(y + k, wide) for k in range(count + 1)]
    slope, offset = 2 / (1 + a), -(1 - a) / (1 + a)
    i0, i1, i2 = 1 / shifts[0], 1 / shifts[1], 1 / shifts[2]
    moments = [i0, slope * i1 + offset * i0]
    moments.append(2 * (slope * slope * i2 + 2 * slope * offset * i1 + offset * offset * i0) - i0)
    for k in range(2, count - 1):
        right = 2 * offset * moments[k] - moments[k - 1] * (k - 1 - shifts[0]) / (k - 1)
        right = right + arb(1) / (k + 1) - arb(1) / (k - 1)
        moments.append(right * (k + 1) / shifts[k + 1])
    x, weights = [], []
    for j in range(count):
        angle = arb(2 * j + 1) / (2 * count)
        cosine = angle.cos_pi()
        total = moments[0] / 2
        before, here = arb(1), cosine
        for k in range(1, count):
            total = total + moments[k] * here
            before, here = here, 2 * cosine * here - before
        x.append((1 + a) * (cosine + 1) / 2 - a)
        weights.append(total * 2 / count)
    return _bent(x, weights, ball(y + 1, wide), bend)
