"""Power series of one step of the KZ recursion, double precision, real or complex, with stochastic rounding.

Four copies (lanes) run together and share all loads: lane 0 is the result, in lanes 1..3 every rounded quantity gets an
extra ``noise * r * (sum of the moduli of its terms)``, r from a small linear congruential generator in [-1, 1].  The
spread of the lanes measures what rounding costs.  The moduli matter: where terms cancel, rounding is relative to them
and not to their sum.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit

_JIT: Any = {"cache": True, "nogil": True, "error_model": "numpy", "fastmath": {"contract"}}


# Unsigned on purpose: the compiler may assume that signed products never overflow.
_FACTOR, _STEP, _SHIFT = np.uint64(6364136223846793005), np.uint64(1442695040888963407), np.uint64(34)


@njit(**_JIT)
def _next(state):
    return state * _FACTOR + _STEP


@njit(**_JIT)
def _unit(state):
    return np.int64(state >> _SHIFT) * 1.862645149230957e-09 - 1.0  # 30 bits times 2^-29


@njit(**_JIT)
def left_series(
    rho_whole,
    rho_rest,
    x,
    terms,
    noise,
    seed,
    c,
    total,
    work,
    series,
    extra,
    a_start,
    a_column,
    a_value,
    a_whole,
    a_rest,
    a_order,
    b_start,
    b_column,
    b_value,
    b_diagonal,
):
    """``series = sum c_k x^k`` and ``extra = sum_k B C_(k-1) x^k/(rho+k)``, without the factor ``x^rho``.

    ``c`` holds c_0 on entry; vectors have shape (rows, 4).  Denominators come as a whole number and a rest, so that
    ``k + rho - lambda`` keeps its digits next to zero: ``a_whole + a_rest = rho - lambda``.
    """
    rows = len(c)
    state = np.uint64(seed)
    power = 1.0
    for r in range(rows):
        for lane in range(4):
            total[r, lane] = c[r, lane]
            series[r, lane] = c[r, lane]
            extra[r, lane] = 0.0
    for k in range(1, terms + 1):
        power *= x
        by_rho = power / ((rho_whole + k) + rho_rest)
        for r in range(rows):
            d = b_diagonal[r]
            v0, v1, v2, v3 = d * total[r, 0], d * total[r, 1], d * total[r, 2], d * total[r, 3]
            size = abs(v0)
            for e in range(b_start[r], b_start[r + 1]):
                q = b_column[e]
                m = b_value[e]
                part = m * total[q, 0]
                size += abs(part)
                v0 += part
                v1 += m * total[q, 1]
                v2 += m * total[q, 2]
                v3 += m * total[q, 3]
            scaled = noise * size
            state = _next(state)
            v1 += _unit(state) * scaled
            state = _next(state)
            v2 += _unit(state) * scaled
            state = _next(state)
            v3 += _unit(state) * scaled
            work[r, 0], work[r, 1], work[r, 2], work[r, 3] = v0, v1, v2, v3
            tail = noise * (abs(v0 * by_rho) + abs(extra[r, 0]))
            extra[r, 0] += v0 * by_rho
            state = _next(state)
            extra[r, 1] += v1 * by_rho + _unit(state) * tail
            state = _next(state)
            extra[r, 2] += v2 * by_rho + _unit(state) * tail
            state = _next(state)
            extra[r, 3] += v3 * by_rho + _unit(state) * tail
        for place in range(rows):
            r = a_order[place]
            v0, v1, v2, v3 = -work[r, 0], -work[r, 1], -work[r, 2], -work[r, 3]
            size = abs(v0)
            for e in range(a_start[r], a_start[r + 1]):
                q = a_column[e]
                m = a_value[e]
                part = m * c[q, 0]
                size += abs(part)
                v0 += part
                v1 += m * c[q, 1]
                v2 += m * c[q, 2]
                v3 += m * c[q, 3]
            scaled = noise * size
            by = 1.0 / ((a_whole[r] + k) + a_rest[r])
            c[r, 0] = v0 * by
            state = _next(state)
            c[r, 1] = (v1 + _unit(state) * scaled) * by
            state = _next(state)
            c[r, 2] = (v2 + _unit(state) * scaled) * by
            state = _next(state)
            c[r, 3] = (v3 + _unit(state) * scaled) * by
        for r in range(rows):
            for lane in range(4):
                total[r, lane] += c[r, lane]
                series[r, lane] += c[r, lane] * power
            size_total, size_series = noise * abs(total[r, 0]), noise * abs(series[r, 0])
            for lane in range(1, 4):
                state = _next(state)
                shake = _unit(state)
                total[r, lane] += shake * size_total
                series[r, lane] += shake * size_series


@njit(**_JIT)
def right_series(
    w,
    terms,
    noise,
    seed,
    f,
    u,
    result,
    a_start,
    a_column,
    a_value,
    a_diagonal,
    b_start,
    b_column,
    b_value,
    b_whole,
    b_rest,
    b_order,
):
    """``result = int_x^1 (A/z) f`` from ``f = f(x)``, w = 1 - x, by backward recursion; ``b_whole + b_rest = mu``."""
    rows = len(f)
    state = np.uint64(seed)
    for r in range(rows):
        for lane in range(4):
            result[r, lane] = 0.0
    power = 1.0
    for _ in range(terms):
        power *= w
    for k in range(terms, 0, -1):
        for place in range(rows):
            r = b_order[place]
            v0, v1 = power * f[r, 0] + result[r, 0], power * f[r, 1] + result[r, 1]
            v2, v3 = power * f[r, 2] + result[r, 2], power * f[r, 3] + result[r, 3]
            size = abs(power * f[r, 0]) + abs(result[r, 0])
            for e in range(b_start[r], b_start[r + 1]):
                q = b_column[e]
                m = b_value[e]
                part = m * u[q, 0]
                size += abs(part)
                v0 -= part
                v1 -= m * u[q, 1]
                v2 -= m * u[q, 2]
                v3 -= m * u[q, 3]
            scaled = noise * size
            by = 1.0 / ((b_whole[r] + k) + b_rest[r])
            u[r, 0] = v0 * by
            state = _next(state)
            u[r, 1] = (v1 + _unit(state) * scaled) * by
            state = _next(state)
            u[r, 2] = (v2 + _unit(state) * scaled) * by
            state = _next(state)
            u[r, 3] = (v3 + _unit(state) * scaled) * by
        for r in range(rows):
            d = a_diagonal[r]
            v0, v1 = result[r, 0] + d * u[r, 0], result[r, 1] + d * u[r, 1]
            v2, v3 = result[r, 2] + d * u[r, 2], result[r, 3] + d * u[r, 3]
            size = abs(result[r, 0]) + abs(d * u[r, 0])
            for e in range(a_start[r], a_start[r + 1]):
                q = a_column[e]
                m = a_value[e]
                part = m * u[q, 0]
                size += abs(part)
                v0 += part
                v1 += m * u[q, 1]
                v2 += m * u[q, 2]
                v3 += m * u[q, 3]
            scaled = noise * size
            result[r, 0] = v0
            state = _next(state)
            result[r, 1] = v1 + _unit(state) * scaled
            state = _next(state)
            result[r, 2] = v2 + _unit(state) * scaled
            state = _next(state)
            result[r, 3] = v3 + _unit(state) * scaled
        power /= w
