"""How the Gauss rule for ``x^(y-1)`` on [0, 1] changes with y, real or complex; mathematics in ``disk.rules.logs``."""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit

_JIT: Any = {"cache": True, "nogil": True, "error_model": "numpy"}


@njit(**_JIT)
def gauss_slopes(nodes, y, moves, logs):
    """Derivatives in y of the nodes, and of the logarithms of the weights.

    Parameters
    ----------
    nodes : (N,)
        The zeros of the N-th polynomial.
    y : scalar of the type of the nodes
    moves, logs : (N,)
        Receive the derivatives.
    """
    count = len(nodes)
    zero = y * 0.0
    beta = y - 1.0
    diagonal = np.empty(count, dtype=nodes.dtype)
    off = np.empty(count, dtype=nodes.dtype)
    d_diagonal = np.empty(count, dtype=nodes.dtype)
    d_off = np.empty(count, dtype=nodes.dtype)
    for k in range(count):
        # 0.5 + 0.5 beta^2 / (d (d + 2)) for the diagonal; for k = 0 without the factor beta that cancels
        d = 2.0 * k + beta
        if k == 0:
            diagonal[k] = y / (y + 1.0)
            d_diagonal[k] = 1.0 / ((y + 1.0) * (y + 1.0))
        else:
            q = d * (d + 2.0)
            diagonal[k] = 0.5 + 0.5 * beta * beta / q
            d_diagonal[k] = beta * (q - beta * (d + 1.0)) / (q * q)
        # squares j^2 (j + beta)^2 / (d^2 (d + 1)(d - 1)) of the off-diagonal, j = k + 1
        if k == 0:
            square = y / ((y + 1.0) * (y + 1.0) * (y + 2.0))
            log_slope = 1.0 / y - 2.0 / (y + 1.0) - 1.0 / (y + 2.0)
        else:
            j = k + 1.0
            d = 2.0 * j + beta
            root = j * (j + beta) / d
            square = root * root / ((d + 1.0) * (d - 1.0))
            log_slope = 2.0 / (j + beta) - 2.0 / d - 1.0 / (d + 1.0) - 1.0 / (d - 1.0)
        off[k] = np.sqrt(square)
        d_off[k] = 0.5 * log_slope * off[k]
    start = np.sqrt(y)
    d_start = 0.5 / start
    for j in range(count):
        # value, d/dx and d/dy of p_k and of p_(k-1), orthonormal; sums over k < count of p p, p p_x and p p_y
        x = nodes[j]
        p = start
        p_x = zero
        p_y = d_start
        q = zero
        q_x = zero
        q_y = zero
        b = zero
        d_b = zero
        norm = zero
        along = zero
        across = zero
        for k in range(count):
            norm += p * p
            along += p * p_x
            across += p * p_y
            arm = x - diagonal[k]
            new = (arm * p - b * q) / off[k]
            new_x = (p + arm * p_x - b * q_x) / off[k]
            new_y = (arm * p_y - d_diagonal[k] * p - b * q_y - d_b * q - d_off[k] * new) / off[k]
            q = p
            q_x = p_x
            q_y = p_y
            p = new
            p_x = new_x
            p_y = new_y
            b = off[k]
            d_b = d_off[k]
        moves[j] = -p_y / p_x
        logs[j] = -2.0 * (across + moves[j] * along) / norm
