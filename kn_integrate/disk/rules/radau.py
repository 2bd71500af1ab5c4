r"""The endpoint-subtracted Gauss-Jacobi rule: one node at 0, the rest Gauss nodes.

``int_0^1 x^(Y-1) G = G(0)/Y + int_0^1 x^Y (G(x) - G(0))/x dx`` is the analytic continuation of the left side to
``Re Y > -1``.  The last integral has the weight ``x^((Y+1)-1)``; N - 1 Gauss-Jacobi nodes for it give

    ``W_j = w_j / x_j``,  ``W_0 = 1/Y - sum_j W_j = ((N-1)!)^2 / (Y prod_{k=1}^{N-1} (Y+k)^2)``,

that is the Gauss-Radau rule with its preassigned node at the end where the singularity sits, continued in Y: exact
for polynomials of degree 2N - 2, the pole at Y = 0 explicit, node and weights positive for Y > 0.  For complex Y the
Gauss nodes are those of the complex-symmetric Jacobi matrix with eigenvectors normalised without conjugation.

For Re Y > 0 the product form of W_0 (the Christoffel number of the end point, a telescoping sum) keeps its relative
accuracy however small W_0 is, which integrands that are large at 0 need.

Sources: Golub and Welsch 1969 (nodes from the tridiagonal matrix); Gauss-Radau rules, common practice; recurrence
coefficients DLMF 18.9.2.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import eigh_tridiagonal

from .base import NullGroup, PoleDistance, Rule, bent, ellipse_parameter, symmetric_bend


def jacobi_matrix(count: int, y: float | complex) -> tuple[NDArray[Any], NDArray[Any]]:
    """Diagonal and squared off-diagonal of the Jacobi matrix of ``x^(y-1)`` on [0, 1].

    With ``beta = y - 1``: everything is written in y itself so that small y keeps its digits.
    """
    k = np.arange(count)
    beta = y - 1.0
    double = 2 * k + beta
    diagonal = np.empty(count, dtype=np.result_type(type(y), float))
    diagonal[0] = y / (y + 1.0)
    diagonal[1:] = 0.5 + 0.5 * beta**2 / (double[1:] * (double[1:] + 2.0))
    squares = np.empty(count - 1, dtype=diagonal.dtype)
    if count > 1:
        squares[0] = y / ((y + 1.0) ** 2 * (y + 2.0))
        k, double = k[2:], double[2:]
        squares[1:] = (k * (k + beta)) ** 2 / (double**2 * (double + 1.0) * (double - 1.0))
    return diagonal, squares


def orthonormal_values(x: NDArray[Any], y: float | complex, count: int) -> NDArray[Any]:
    """Values ``p_k(x)``, k < count, of the polynomials orthonormal for ``x^(y-1)`` on [0, 1]; shape (count, len(x))."""
    diagonal, squares = jacobi_matrix(count, y)
    off = np.sqrt(squares)
    values = np.empty((count, len(x)), dtype=np.result_type(x, diagonal))
    values[0] = np.sqrt(y)  # the total mass is 1/y
    if count > 1:
        values[1] = (x - diagonal[0]) * values[0] / off[0]
    for k in range(2, count):
        values[k] = ((x - diagonal[k - 1]) * values[k - 1] - off[k - 2] * values[k - 2]) / off[k - 1]
    return values


def gauss_jacobi(count: int, y: float | complex) -> tuple[NDArray[Any], NDArray[Any], NDArray[Any]]:
    """Nodes, weights and orthonormal values ``p_k(x_j)`` of the Gauss rule for ``x^(y-1)`` on [0, 1].

    Weights are Christoffel numbers ``1 / sum_k p_k(x_j)^2``: a sum of squares, so that small weights keep their
    relative accuracy, which eigenvector components do not.
    """
    diagonal, squares = jacobi_matrix(count, y)
    if np.iscomplexobj(diagonal):
        off = np.sqrt(squares)
        matrix = np.diag(diagonal) + np.diag(off, 1) + np.diag(off, -1)
        nodes = _polished(np.linalg.eigvals(matrix), diagonal, off, count)
        nodes = nodes[np.lexsort((nodes.imag, nodes.real))]
    elif count == 1:
        nodes = diagonal
    else:
        nodes = eigh_tridiagonal(diagonal, np.sqrt(squares), eigvals_only=True, check_finite=False)
    values = orthonormal_values(nodes, y, count)
    weights = 1.0 / (values * values).sum(axis=0)
    return nodes, weights, values


def _polished(nodes: NDArray[Any], diagonal: NDArray[Any], off: NDArray[Any], count: int) -> NDArray[Any]:
    """Two Newton steps on ``p_count``: a non-normal matrix leaves its eigenvalues less accurate than they can be."""
    for _ in range(2):
        previous, value = np.zeros_like(nodes), np.ones_like(nodes)
        d_previous, slope = np.zeros_like(nodes), np.zeros_like(nodes)
        for k in range(count):
            below = off[k - 1] ** 2 if k else 0.0
            following = (nodes - diagonal[k]) * value - below * previous
            d_following = value + (nodes - diagonal[k]) * slope - below * d_previous
            previous, value, d_previous, slope = value, following, slope, d_following
        nodes = nodes - value / slope
    return nodes


def radau_rule(y: PoleDistance, size: int, count: int) -> Rule:
    """The subtracted rule with ``count`` nodes (at least 5) for ``t^(Y-1)``, Re Y > -1.

    Parameters
    ----------
    y
        The exponent; Re Y > -1 and Y != 0.
    size
        Number of gaps in the cluster of the chord: the integrand's nearest singularity is at ``t = -1/size``.
    count
        Number of nodes, the one at 0 included.
    """
    gauss = count - 1
    y1 = y.plus(1)
    x, w, values = gauss_jacobi(gauss, y1)
    inner = w / x
    shifts = y.shifts(count)
    if y.real > 0:
        end = np.prod(np.arange(1, count) / shifts[1:]) ** 2 / shifts[0]
    else:
        # as a difference: W_0 then takes up the error of the large weight next to it, of opposite sign, whose node is
        # close to 0 and known less well than the others, so that constants stay exact
        end = 1.0 / shifts[0] - inner.sum()
    weights = np.concatenate([[end], inner])
    nodes_with_end = np.concatenate([[0.0], x])
    # how well the rule integrates low powers tells how accurate its nodes and weights came out
    powers = nodes_with_end ** np.arange(4)[:, None]
    missed = np.abs(powers @ weights - 1.0 / shifts[:4]).max() / np.abs(weights).sum()
    # coefficients of (G - G(0))/x in the orthonormal polynomials; the rule first fails at degree 2 gauss
    top = values[[-1, -2, -3, -4]] * inner
    nulls = np.concatenate([-top.sum(axis=1, keepdims=True), top], axis=1) * (np.sqrt(2.0 / abs(y1)))
    bend = symmetric_bend(size)
    t, weights = bent(nodes_with_end, weights, y1, bend)
    _, nulls = bent(nodes_with_end, nulls, y1, bend)
    rho = ellipse_parameter(1.0 / bend)
    return Rule(
        kind="radau",
        nodes=t,
        weights=weights,
        nulls=nulls,
        groups=(NullGroup(0, 1.0 / rho, gauss + 1.0, gauss - 1),),
        amplification=float(np.abs(weights).sum()),
        noise=(4.0 + 2.0 * float(missed) / 2.0**-52) * np.abs(weights),
        parameters=(("nodes", count),),
    )
