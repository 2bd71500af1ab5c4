"""Power series of one step of the KZ recursion, double precision, real or complex, with stochastic rounding.

The variable is y with ``z = 4y/(1+y)^2`` (and v with ``1 - z = 4v/(1+v)^2`` on the other half): all singularities
z = 0, 1, infinity lie at y = 0 and on the unit circle, so at z = 1/2 series fall like ``(3 - 2 sqrt 2)^k``.  The
equation in y has poles at 0, 1 and -1, which costs a second running sum with alternating signs and nothing else.

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
    y,
    terms,
    noise,
    seed,
    c,
    total,
    alternating,
    both,
    lifted,
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
    """``series = sum c_k y^k`` and ``extra = sum_k h_k y^k``, without the factor ``z^rho``.

    With ``P_k = P_(k-1) + c_k`` and ``Q_k = c_k - Q_(k-1)`` the solution is
    ``(k + rho - A) c_k = 2 (rho - A) Q_(k-1) - d_k``, ``d_k = 2 B (P+Q)_(k-1)``, and the integral of its B part
    ``(k + rho) h_k = d_k + 2 rho L_(k-1)``, ``L_k = h_k - L_(k-1)``.  (With ``(1+y)^(-2 rho)`` left in the series its
    alternating terms would cancel.)  ``c`` holds c_0 on entry; vectors have shape (rows, 4).  Denominators come as a
    whole number and a rest, so that ``k + rho - lambda`` keeps its digits next to zero:
    ``a_whole + a_rest = rho - lambda``.
    """
    rows = len(c)
    state = np.uint64(seed)
    power = 1.0
    for r in range(rows):
        for lane in range(4):
            total[r, lane] = c[r, lane]
            alternating[r, lane] = c[r, lane]
            series[r, lane] = c[r, lane]
            extra[r, lane] = 0.0
            lifted[r, lane] = 0.0
    twice = 2.0 * (rho_whole + rho_rest)
    for k in range(1, terms + 1):
        power *= y
        by_rho = 1.0 / ((rho_whole + k) + rho_rest)
        for r in range(rows):
            scaled = 2.0 * noise * (abs(total[r, 0]) + abs(alternating[r, 0]))
            both[r, 0] = 2.0 * (total[r, 0] + alternating[r, 0])
            for lane in range(1, 4):
                state = _next(state)
                both[r, lane] = 2.0 * (total[r, lane] + alternating[r, lane]) + _unit(state) * scaled
        for r in range(rows):
            d = b_diagonal[r]
            v0, v1, v2, v3 = d * both[r, 0], d * both[r, 1], d * both[r, 2], d * both[r, 3]
            size = abs(v0)
            for e in range(b_start[r], b_start[r + 1]):
                q = b_column[e]
                m = b_value[e]
                part = m * both[q, 0]
                size += abs(part)
                v0 += part
                v1 += m * both[q, 1]
                v2 += m * both[q, 2]
                v3 += m * both[q, 3]
            scaled = noise * size
            state = _next(state)
            v1 += _unit(state) * scaled
            state = _next(state)
            v2 += _unit(state) * scaled
            state = _next(state)
            v3 += _unit(state) * scaled
            work[r, 0], work[r, 1], work[r, 2], work[r, 3] = v0, v1, v2, v3
            before = lifted[r, 0]
            h = (v0 + twice * before) * by_rho
            size_h = noise * (abs(v0) + abs(twice * before)) * abs(by_rho)
            size_lifted, size_extra = noise * (abs(h) + abs(before)), noise * (abs(h * power) + abs(extra[r, 0]))
            lifted[r, 0] = h - before
            extra[r, 0] += h * power
            for lane in range(1, 4):
                state = _next(state)
                h = (work[r, lane] + twice * lifted[r, lane]) * by_rho + _unit(state) * size_h
                state = _next(state)
                shake = _unit(state)
                lifted[r, lane] = h - lifted[r, lane] + shake * size_lifted
                extra[r, lane] += h * power + shake * size_extra
        # from here `both` holds c_k - 2 Q_(k-1), which A multiplies
        for place in range(rows):
            r = a_order[place]
            d = 2.0 * (a_whole[r] + a_rest[r])
            v0, v1 = d * alternating[r, 0] - work[r, 0], d * alternating[r, 1] - work[r, 1]
            v2, v3 = d * alternating[r, 2] - work[r, 2], d * alternating[r, 3] - work[r, 3]
            size = abs(work[r, 0]) + abs(d * alternating[r, 0])
            for e in range(a_start[r], a_start[r + 1]):
                q = a_column[e]
                m = a_value[e]
                part = m * both[q, 0]
                size += abs(part)
                v0 += part
                v1 += m * both[q, 1]
                v2 += m * both[q, 2]
                v3 += m * both[q, 3]
            scaled = noise * size
            by = 1.0 / ((a_whole[r] + k) + a_rest[r])
            c[r, 0] = v0 * by
            state = _next(state)
            c[r, 1] = (v1 + _unit(state) * scaled) * by
            state = _next(state)
            c[r, 2] = (v2 + _unit(state) * scaled) * by
            state = _next(state)
            c[r, 3] = (v3 + _unit(state) * scaled) * by
            scaled = noise * (abs(c[r, 0]) + 2.0 * abs(alternating[r, 0]))
            both[r, 0] = c[r, 0] - 2.0 * alternating[r, 0]
            for lane in range(1, 4):
                state = _next(state)
                both[r, lane] = c[r, lane] - 2.0 * alternating[r, lane] + _unit(state) * scaled
        for r in range(rows):
            for lane in range(4):
                total[r, lane] += c[r, lane]
                alternating[r, lane] = c[r, lane] - alternating[r, lane]
                series[r, lane] += c[r, lane] * power
            size_total, size_series = noise * abs(total[r, 0]), noise * abs(series[r, 0])
            size_alternating = noise * abs(alternating[r, 0])
            for lane in range(1, 4):
                state = _next(state)
                shake = _unit(state)
                total[r, lane] += shake * size_total
                series[r, lane] += shake * size_series
                state = _next(state)
                alternating[r, lane] += _unit(state) * size_alternating


@njit(**_JIT)
def right_series(
    v,
    terms,
    noise,
    seed,
    f,
    u,
    image,
    first,
    second,
    result,
    a_start,
    a_column,
    a_value,
    a_diagonal,
    b_start,
    b_column,
    b_value,
    b_diagonal,
    b_whole,
    b_rest,
    b_order,
):
    """``result = int_x^1 (A/z) f`` from ``f = f(x)``, ``1 - x = 4v/(1+v)^2``; ``b_whole + b_rest = mu``.

    The integral is ``M f(x)`` with a matrix series ``M = sum M_k v^k``; with ``P_k = P_(k-1) + M_k``,
    ``Q_k = M_k - Q_(k-1)``, ``P_0 = Q_0 = 1`` it is ``M_k (k + B) = 2 (P+Q)_(k-1) A + 2 (Q_(k-1) + (-1)^k) B``.
    Going backwards only vectors are needed: what is still to come is ``P_k first + Q_k second + result``.
    """
    rows = len(f)
    state = np.uint64(seed)
    powers = np.empty(terms + 1)
    powers[0] = 1.0
    for k in range(1, terms + 1):
        powers[k] = powers[k - 1] * v
    for r in range(rows):
        for lane in range(4):
            first[r, lane] = 0.0
            second[r, lane] = 0.0
            result[r, lane] = 0.0
    for k in range(terms, 0, -1):
        power = powers[k]
        sign = 2.0 if k % 2 == 0 else -2.0
        for place in range(rows):
            r = b_order[place]
            o0 = 0.0 * f[r, 0]
            o1 = o0
            o2 = o0
            o3 = o0
            size = abs(power * f[r, 0]) + abs(first[r, 0]) + abs(second[r, 0])
            for e in range(b_start[r], b_start[r + 1]):
                q = b_column[e]
                m = b_value[e]
                part = m * u[q, 0]
                size += abs(part)
                o0 += part
                o1 += m * u[q, 1]
                o2 += m * u[q, 2]
                o3 += m * u[q, 3]
            scaled = noise * size
            by = 1.0 / ((b_whole[r] + k) + b_rest[r])
            d = b_diagonal[r]
            u[r, 0] = (power * f[r, 0] + first[r, 0] + second[r, 0] - o0) * by
            image[r, 0] = o0 + d * u[r, 0]
            state = _next(state)
            shake = _unit(state) * scaled
            u[r, 1] = (power * f[r, 1] + first[r, 1] + second[r, 1] - o1 + shake) * by
            image[r, 1] = o1 + d * u[r, 1] + shake
            state = _next(state)
            shake = _unit(state) * scaled
            u[r, 2] = (power * f[r, 2] + first[r, 2] + second[r, 2] - o2 + shake) * by
            image[r, 2] = o2 + d * u[r, 2] + shake
            state = _next(state)
            shake = _unit(state) * scaled
            u[r, 3] = (power * f[r, 3] + first[r, 3] + second[r, 3] - o3 + shake) * by
            image[r, 3] = o3 + d * u[r, 3] + shake
        for r in range(rows):
            d = a_diagonal[r]
            v0, v1, v2, v3 = d * u[r, 0], d * u[r, 1], d * u[r, 2], d * u[r, 3]
            size = abs(v0)
            for e in range(a_start[r], a_start[r + 1]):
                q = a_column[e]
                m = a_value[e]
                part = m * u[q, 0]
                size += abs(part)
                v0 += part
                v1 += m * u[q, 1]
                v2 += m * u[q, 2]
                v3 += m * u[q, 3]
            new = 2.0 * (v0 + image[r, 0]) - second[r, 0]
            scaled = noise * (2.0 * size + abs(first[r, 0]))
            scaled_second = noise * (2.0 * abs(image[r, 0]) + abs(second[r, 0]))
            scaled_result = noise * (2.0 * abs(image[r, 0]) + abs(result[r, 0]))
            first[r, 0] += 2.0 * v0
            second[r, 0] = new
            result[r, 0] += sign * image[r, 0]
            state = _next(state)
            shake = _unit(state) * scaled
            state = _next(state)
            other = _unit(state)
            second[r, 1] = 2.0 * (v1 + image[r, 1]) - second[r, 1] + shake + other * scaled_second
            first[r, 1] += 2.0 * v1 + shake
            result[r, 1] += sign * image[r, 1] + other * scaled_result
            state = _next(state)
            shake = _unit(state) * scaled
            state = _next(state)
            other = _unit(state)
            second[r, 2] = 2.0 * (v2 + image[r, 2]) - second[r, 2] + shake + other * scaled_second
            first[r, 2] += 2.0 * v2 + shake
            result[r, 2] += sign * image[r, 2] + other * scaled_result
            state = _next(state)
            shake = _unit(state) * scaled
            state = _next(state)
            other = _unit(state)
            second[r, 3] = 2.0 * (v3 + image[r, 3]) - second[r, 3] + shake + other * scaled_second
            first[r, 3] += 2.0 * v3 + shake
            result[r, 3] += sign * image[r, 3] + other * scaled_result
    for r in range(rows):
        size = noise * (abs(first[r, 0]) + abs(second[r, 0]) + abs(result[r, 0]))
        result[r, 0] += first[r, 0] + second[r, 0]
        for lane in range(1, 4):
            state = _next(state)
            result[r, lane] += first[r, lane] + second[r, lane] + _unit(state) * size
