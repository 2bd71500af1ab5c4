"""Correctly rounded sums of doubles with small whole-number coefficients.

Exponents are integer combinations of planar invariants; the exact ones, rounded once, are what single integrals see,
so arrays of invariants must come to the same bits.  The running sum is kept as doubles that do not overlap and is
rounded at the end, ties to even.

Source: Shewchuk, Adaptive precision floating-point arithmetic, Discrete Comput. Geom. 18 (1997) 305.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit

_JIT: Any = {"cache": True, "nogil": True, "error_model": "numpy"}  # no contraction: the errors of sums are computed


@njit(**_JIT)
def _add(parts, count, x):
    kept = 0
    for k in range(count):
        y = parts[k]
        if abs(x) < abs(y):
            x, y = y, x
        high = x + y
        low = y - (high - x)
        if low != 0.0:
            parts[kept] = low
            kept += 1
        x = high
    parts[kept] = x
    return kept + 1


@njit(**_JIT)
def _rounded(parts, count):
    if count == 0:
        return 0.0
    k = count - 1
    high = parts[k]
    low = 0.0
    while k > 0:
        k -= 1
        x = high
        y = parts[k]
        high = x + y
        low = y - (high - x)
        if low != 0.0:
            break
    # half-way between two doubles: what is left decides
    if k > 0 and ((low < 0.0 and parts[k - 1] < 0.0) or (low > 0.0 and parts[k - 1] > 0.0)):
        y = 2.0 * low
        x = high + y
        if y == x - high:
            high = x
    return high + 0.0


@njit(**_JIT)
def affine(values, coefficients, constants, out):
    """``out[p, m] = constants[m] + sum_c coefficients[m, c] values[p, c]``, each correctly rounded.

    Parameters
    ----------
    values : (P, C) float64
    coefficients : (M, C) int64
        Small: a coefficient k costs |k| additions.
    constants : (M,) float64
    out : (P, M) float64
    """
    room = 2
    for m in range(coefficients.shape[0]):
        need = 2
        for c in range(coefficients.shape[1]):
            need += abs(coefficients[m, c])
        room = max(room, need)
    parts = np.empty(room)
    for p in range(values.shape[0]):
        for m in range(coefficients.shape[0]):
            count = 0
            if constants[m] != 0.0:
                count = _add(parts, count, constants[m])
            for c in range(coefficients.shape[1]):
                k = coefficients[m, c]
                x = values[p, c] if k > 0 else -values[p, c]
                for _ in range(abs(k)):
                    count = _add(parts, count, x)
            out[p, m] = _rounded(parts, count)
