"""Power series of one step of the KZ recursion, double precision, real or complex.

Optional noise: to every new coefficient ``noise * r * (sum of the moduli of its terms)`` is added, with r from a small
linear congruential generator in [-1, 1]; comparing runs with and without measures what rounding costs (stochastic
rounding).  The moduli matter: where terms cancel, rounding is relative to them and not to their sum.
"""

from __future__ import annotations

from typing import Any

from numba import njit

_JIT: Any = {"cache": True, "nogil": True, "error_model": "numpy", "fastmath": {"contract"}}


@njit(**_JIT)
def left_series(
    rho_whole, rho_rest, x, terms, noise, seed, c, total, work, series, extra,
    a_start, a_column, a_value, a_whole, a_rest, a_order,
    b_start, b_column, b_value, b_diagonal,
):
    """``series = sum c_k x^k`` and ``extra = sum_k B C_(k-1) x^k/(rho+k)``, without the factor ``x^rho``.

    ``c`` holds c_0 on entry; all vectors have one entry a row.  Denominators come as a whole number and a rest, so that
    ``k + rho - lambda`` keeps its digits next to zero: ``a_whole + a_rest = rho - lambda``.
    """
    rows = len(c)
    state = seed
    power = 1.0
    for r in range(rows):
        total[r] = c[r]
        series[r] = c[r]
        extra[r] = 0.0
    for k in range(1, terms + 1):
        power *= x
        for r in range(rows):
            value = b_diagonal[r] * total[r]
            for e in range(b_start[r], b_start[r + 1]):
                value += b_value[e] * total[b_column[e]]
            if noise != 0.0:
                size = abs(b_diagonal[r] * total[r])
                for e in range(b_start[r], b_start[r + 1]):
                    size += abs(b_value[e] * total[b_column[e]])
                state = (state * 6364136223846793005 + 1442695040888963407) & 0x7FFFFFFFFFFFFFFF
                value += noise * ((state >> 33) / 536870912.0 - 1.0) * size
            work[r] = value
            part = value * (power / ((rho_whole + k) + rho_rest))
            extra[r] += part
            if noise != 0.0:
                state = (state * 6364136223846793005 + 1442695040888963407) & 0x7FFFFFFFFFFFFFFF
                extra[r] += noise * ((state >> 33) / 536870912.0 - 1.0) * (abs(part) + abs(extra[r]))
        for q in range(rows):
            r = a_order[q]
            value = -work[r]
            for e in range(a_start[r], a_start[r + 1]):
                value += a_value[e] * c[a_column[e]]
            if noise != 0.0:
                size = abs(work[r]) + abs(value)
                for e in range(a_start[r], a_start[r + 1]):
                    size += abs(a_value[e] * c[a_column[e]])
                state = (state * 6364136223846793005 + 1442695040888963407) & 0x7FFFFFFFFFFFFFFF
                value += noise * ((state >> 33) / 536870912.0 - 1.0) * size
            c[r] = value / ((a_whole[r] + k) + a_rest[r])
        for r in range(rows):
            total[r] += c[r]
            series[r] += c[r] * power
            if noise != 0.0:
                state = (state * 6364136223846793005 + 1442695040888963407) & 0x7FFFFFFFFFFFFFFF
                shake = noise * ((state >> 33) / 536870912.0 - 1.0)
                total[r] += shake * abs(total[r])
                series[r] += shake * abs(series[r])


@njit(**_JIT)
def right_series(
    w, terms, noise, seed, f, u, result,
    a_start, a_column, a_value, a_diagonal,
    b_start, b_column, b_value, b_whole, b_rest, b_order,
):
    """``result = int_x^1 (A/z) f`` from ``f = f(x)``, w = 1 - x, by backward recursion; ``b_whole + b_rest = mu``."""
    rows = len(f)
    state = seed
    for r in range(rows):
        result[r] = 0.0
    power = 1.0
    for _ in range(terms):
        power *= w
    for k in range(terms, 0, -1):
        for q in range(rows):
            r = b_order[q]
            value = power * f[r] + result[r]
            for e in range(b_start[r], b_start[r + 1]):
                value -= b_value[e] * u[b_column[e]]
            if noise != 0.0:
                size = abs(power * f[r]) + abs(result[r])
                for e in range(b_start[r], b_start[r + 1]):
                    size += abs(b_value[e] * u[b_column[e]])
                state = (state * 6364136223846793005 + 1442695040888963407) & 0x7FFFFFFFFFFFFFFF
                value += noise * ((state >> 33) / 536870912.0 - 1.0) * size
            u[r] = value / ((b_whole[r] + k) + b_rest[r])
        for r in range(rows):
            value = result[r] + a_diagonal[r] * u[r]
            for e in range(a_start[r], a_start[r + 1]):
                value += a_value[e] * u[a_column[e]]
            if noise != 0.0:
                size = abs(result[r]) + abs(a_diagonal[r] * u[r])
                for e in range(a_start[r], a_start[r + 1]):
                    size += abs(a_value[e] * u[a_column[e]])
                state = (state * 6364136223846793005 + 1442695040888963407) & 0x7FFFFFFFFFFFFFFF
                value += noise * ((state >> 33) / 536870912.0 - 1.0) * size
            result[r] = value
        power /= w
