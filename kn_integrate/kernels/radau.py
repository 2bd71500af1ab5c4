"""Gauss-Jacobi nodes and the endpoint-subtracted rule made from them, for real exponents, compiled.

The mathematics is in ``disk.rules.radau``; here it is arranged so that a rule takes well below a microsecond: nodes
start from an interpolation in the exponent and are polished by Newton steps of all of them at once.

With ``p_k`` orthonormal and ``S = sum_{k<N} p_k(x)^2`` the Christoffel-Darboux formula (DLMF 18.2.12) makes the Newton
step on ``p_N`` equal to ``p_{N-1}(x) r(x) / S`` with r the residual of the last row of the recurrence, so a step needs
no derivative, and the sum that it needs is the weight: ``w = 1/S``.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit

from .vecmath import exp, log

_JIT: Any = {"cache": True, "nogil": True, "error_model": "numpy", "fastmath": {"contract"}}
NEWTON_STEPS = 2
ROUNDINGS = 4.0  # units of round-off in a weight whose rule integrates constants exactly


@njit(**_JIT)
def first_nodes(x, count, y, tables, spans):
    """Starting values of the ``count`` nodes for ``x^(y-1)``: Clenshaw summation of the interpolant in y.

    Parameters
    ----------
    x : (W,) float64
        Receives them, W >= count.
    tables : (N, T, N) float64
        Chebyshev coefficients ``tables[count, k, j]`` of node j.
    spans : (N, 3) float64
        ``c, low, high`` of the variable ``u = y/(y + c)``, ``low <= u <= high``.
    """
    c = spans[count, 0]
    t = 2.0 * (y / (y + c) - spans[count, 1]) / (spans[count, 2] - spans[count, 1]) - 1.0
    terms = tables.shape[1]
    for j in range(count):
        later = 0.0
        latest = 0.0
        for k in range(terms - 1, 0, -1):
            value = tables[count, k, j] + 2.0 * t * latest - later
            later = latest
            latest = value
        x[j] = tables[count, 0, j] + t * latest - later


@njit(**_JIT)
def gauss(x, sums, values, count, y, tables, spans, work):
    """Nodes, ``S = 1/weights``, and the orthonormal values of the last four degrees (highest first).

    Parameters
    ----------
    x, sums : (W,) float64
        Receive nodes and sums; W is at least ``count`` rounded up to a multiple of 4.
    values : (4, W) float64
        Receives ``p_{count-1-z}(x_j)``.
    work : (6, W) float64
        Scratch.
    """
    diagonal = work[0]
    off = work[1]
    inverse = work[2]
    older = work[3]
    newer = work[4]
    beta = y - 1.0
    diagonal[0] = y / (y + 1.0)
    off[0] = np.sqrt(y / (y + 2.0)) / (y + 1.0)
    for k in range(1, count):
        double = 2.0 * k + beta
        diagonal[k] = 0.5 + 0.5 * beta * beta / (double * (double + 2.0))
    for k in range(1, count):
        double = 2.0 * (k + 1.0) + beta
        off[k] = (k + 1.0) * (k + 1.0 + beta) / (double * np.sqrt((double + 1.0) * (double - 1.0)))
    for k in range(count):
        inverse[k] = 1.0 / off[k]
    first_nodes(x, count, y, tables, spans)
    wide = (count + 3) // 4 * 4
    for j in range(count, wide):
        x[j] = 0.5
    root = np.sqrt(y)
    for step in range(NEWTON_STEPS + 1):
        last = step == NEWTON_STEPS
        for j in range(wide):
            older[j] = 0.0
            newer[j] = root
            sums[j] = y
        if last and count <= 4:
            for j in range(wide):
                values[count - 1, j] = root
        for k in range(1, count):
            a = diagonal[k - 1]
            b = off[k - 2] if k > 1 else 0.0
            scale = inverse[k - 1]
            for j in range(wide):
                value = ((x[j] - a) * newer[j] - b * older[j]) * scale
                older[j] = newer[j]
                newer[j] = value
                sums[j] += value * value
            if last and k >= count - 4:
                z = count - 1 - k
                for j in range(wide):
                    values[z, j] = newer[j]
        if not last:
            a = diagonal[count - 1]
            b = off[count - 2] if count > 1 else 0.0
            for j in range(count):
                x[j] -= newer[j] * ((x[j] - a) * newer[j] - b * older[j]) / sums[j]


@njit(**_JIT)
def radau(y, y1, bend, count, tables, spans, nodes, weights, nulls, noise, scratch):
    """The subtracted rule with ``count`` nodes for ``t^(Y-1)``, real Y > -1; see ``disk.rules.radau``.

    Parameters
    ----------
    y, y1 : float
        Y and Y + 1, each correctly rounded.
    bend : float
        Of ``t = x / (1 + bend - bend x)``.
    nodes, weights, noise : (W,) float64
        Receive the rule and bounds on the errors of its weights in units of round-off.
    nulls : (4, W) float64
        Receives the null functionals.
    scratch : (12, W) float64

    Returns
    -------
    bool
        False when the nodes did not come out as nodes of such a rule.
    """
    inner = count - 1
    x = scratch[0]
    sums = scratch[1]
    values = scratch[2:6]
    gauss(x, sums, values, inner, y1, tables, spans, scratch[6:12])
    before = 0.0
    for j in range(inner):
        if not (x[j] > before and x[j] < 1.0 and sums[j] > 0.0):
            return False
        before = x[j]
    total = 0.0
    size = 0.0
    for j in range(inner):
        weights[j + 1] = 1.0 / (sums[j] * x[j])
        total += weights[j + 1]
    if y > 0.0:
        product = 1.0
        for k in range(1, count):
            product *= k / (y + k)
        weights[0] = product * product / y
    else:
        # as a difference: it takes up the error of the large weight next to it, so that constants stay exact
        weights[0] = 1.0 / y - total
    # how well the rule integrates low powers tells how accurate its nodes and weights came out
    size = abs(weights[0]) + total
    missed = abs(weights[0] + total - 1.0 / y)
    m1 = 0.0
    m2 = 0.0
    m3 = 0.0
    for j in range(inner):
        v = weights[j + 1] * x[j]
        m1 += v
        m2 += v * x[j]
        m3 += v * x[j] * x[j]
    missed = max(missed, abs(m1 - 1.0 / y1), abs(m2 - 1.0 / (y + 2.0)), abs(m3 - 1.0 / (y + 3.0))) / size
    # exp and log below: the exponent is rounded, which the weights are told
    rounding = ROUNDINGS + 2.0 * missed / 2.0**-52 + 2.0 * abs(y1) * log(1.0 + bend)
    factor = np.sqrt(2.0 / y1)
    start = (1.0 + bend) * exp(-y1 * log(1.0 + bend))
    for z in range(4):
        null_sum = 0.0
        for j in range(inner):
            null_sum += values[z, j] * weights[j + 1]
        nulls[z, 0] = -null_sum * factor * start
    nodes[0] = 0.0
    weights[0] *= start
    noise[0] = rounding * abs(weights[0])
    wide = (inner + 3) // 4 * 4
    smooth = scratch[6]
    for j in range(wide):
        stretch = 1.0 + bend - bend * x[j]
        smooth[j] = (1.0 + bend) * exp(-y1 * log(stretch))
        sums[j] = x[j] / stretch
    for j in range(inner):
        nodes[j + 1] = sums[j]
        weights[j + 1] *= smooth[j]
        noise[j + 1] = rounding * abs(weights[j + 1])
        for z in range(4):
            nulls[z, j + 1] = values[z, j] * weights[j + 1] * factor
    return True
