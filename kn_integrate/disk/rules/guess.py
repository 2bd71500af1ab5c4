"""Starting values for the nodes of compiled Gauss-Jacobi rules: interpolation in the exponent.

Node j of the rule with N nodes for ``x^(y-1)`` is a smooth function of y > 0.  It is interpolated in Chebyshev points
of ``u = y/(y + c)``, c = N/2 + 1, in which the nodes are almost straight lines; 16 terms give five digits and more for
N up to 40, and two Newton steps do the rest.  Found by trial; nothing depends on it but the number of Newton steps.
"""

from __future__ import annotations

from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import eigh_tridiagonal

from .radau import jacobi_matrix

TERMS = 16
LARGEST = 33  # nodes of the largest rule
LOW, HIGH = 0.1, 13.0  # range of y


def _nodes(count: int, y: float) -> NDArray[Any]:
    diagonal, squares = jacobi_matrix(count, y)
    if count == 1:
        return diagonal
    found: NDArray[Any] = eigh_tridiagonal(diagonal, squares**0.5, eigvals_only=True, check_finite=False)
    return found


@cache
def guess_tables() -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """``tables[N, k, j]`` and ``spans[N] = (c, low, high)`` for 3 <= N <= LARGEST; see ``kernels.radau``."""
    tables = np.zeros((LARGEST + 1, TERMS, LARGEST))
    spans = np.zeros((LARGEST + 1, 3))
    k = np.arange(TERMS)
    angles = np.pi * (k + 0.5) / TERMS
    cosines = np.cos(np.outer(k, angles)) * (2.0 / TERMS)
    cosines[0] *= 0.5
    for count in range(3, LARGEST + 1):
        c = 0.5 * count + 1.0
        low, high = LOW / (LOW + c), HIGH / (HIGH + c)
        u = low + 0.5 * (high - low) * (np.cos(angles) + 1.0)
        tables[count, :, :count] = cosines @ np.array([_nodes(count, y) for y in c * u / (1.0 - u)])
        spans[count] = c, low, high
    tables.setflags(write=False)
    spans.setflags(write=False)
    return tables, spans
