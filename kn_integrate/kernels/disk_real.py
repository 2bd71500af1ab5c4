"""Tensor-product quadrature over sectors, real nodes and exponents.

One call works on a list of chunks; a chunk is a range of outer grid points of one sector and owns one row of the
output, so that any distribution of chunks over threads gives the same bits.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit

from .vecmath import exp, log

BLOCK = 16  # outer points whose run coefficients are worked out together, so that that part vectorises too

_JIT: Any = {"cache": True, "nogil": True, "error_model": "numpy", "fastmath": {"contract"}}


@njit(**_JIT)
def integrate_chunks(
    first,
    last,
    chunks,
    variables,
    masks_prev,
    masks_var,
    mask_count,
    run_index,
    run_bounds,
    term_start,
    term_mask,
    term_class,
    exponents,
    counts,
    nodes,
    weights,
    out_abs,
    out_square,
    out_marginal,
):
    """Integrate chunks ``first..last-1``.

    Parameters
    ----------
    chunks : (C, 3) int64
        Sector, first outer point, one past the last outer point.
    variables .. term_class
        The sector table, see ``disk.sectors``.
    exponents : (runs,) float64
        The exponent of every run.
    counts : (rules,) int64; nodes, weights : (rules, W) float64
        The rules in the variable t; ``variables`` holds row numbers of them.
    out_abs, out_square : (C,) float64
        Sum of the moduli and of the squares of weight x integrand.
    out_marginal : (C, V, W) float64
        For variable v and its node j: the sum over all other variables of weights x integrand.  Any functional on the
        nodes of one variable, the rule itself included, is a combination of these.
    """
    variable_count = variables.shape[1]
    pair = min(2, variable_count)
    outer = variable_count - pair
    width = nodes.shape[1]
    runs_max = run_index.shape[1]
    masks_max = masks_prev.shape[1]

    digits = np.empty((outer + 1, BLOCK), dtype=np.int64)
    t_outer = np.empty((outer + 1, BLOCK))
    mono = np.empty((masks_max, BLOCK))
    coef = np.empty((runs_max, 4, BLOCK))
    base = np.empty(BLOCK)
    flat_i = np.empty(width * width)
    flat_j = np.empty(width * width)
    table_i = np.empty(width)
    table_j = np.empty(width)
    grid = np.empty(width * width)
    col_sum = np.empty(width)

    for c in range(first, last):
        s = chunks[c, 0]
        lo = chunks[c, 1]
        hi = chunks[c, 2]
        chord_i = variables[s, outer]
        ni = counts[chord_i]
        ti = nodes[chord_i]
        wi = weights[chord_i]
        if pair == 2:
            chord_j = variables[s, outer + 1]
            nj = counts[chord_j]
            tj = nodes[chord_j]
            wj = weights[chord_j]
        else:
            chord_j = chord_i
            nj = 1
            tj = np.ones(1)
            wj = np.ones(1)
        nij = ni * nj
        for p in range(ni):
            for q in range(nj):
                flat_i[p * nj + q] = ti[p]
                flat_j[p * nj + q] = tj[q]
        b1 = run_bounds[s, 1]
        b2 = run_bounds[s, 2]
        b3 = run_bounds[s, 3]
        b4 = run_bounds[s, 4]

        total_abs = 0.0
        total_square = 0.0
        marginal = out_marginal[c]
        marginal[:, :] = 0.0

        start = lo
        while start < hi:
            size = min(BLOCK, hi - start)
            for b in range(BLOCK):
                # lanes beyond the end repeat the last point: finite numbers, never used
                index = start + min(b, size - 1)
                for u in range(outer - 1, -1, -1):
                    n_u = counts[variables[s, u]]
                    d = index % n_u
                    index //= n_u
                    digits[u, b] = d
                    t_outer[u, b] = nodes[variables[s, u], d]
            for b in range(BLOCK):
                mono[0, b] = 1.0
                base[b] = 0.0
            for k in range(1, mask_count[s]):
                k0 = masks_prev[s, k]
                u = masks_var[s, k]
                for b in range(BLOCK):
                    mono[k, b] = mono[k0, b] * t_outer[u, b]
            for r in range(b4):
                a = exponents[run_index[s, r]]
                if a == 0.0:
                    continue
                for z in range(4):
                    for b in range(BLOCK):
                        coef[r, z, b] = 0.0
                for x in range(term_start[s, r], term_start[s, r + 1]):
                    k = term_mask[s, x]
                    z = term_class[s, x]
                    for b in range(BLOCK):
                        coef[r, z, b] += mono[k, b]
                if r < b1:
                    for b in range(BLOCK):
                        base[b] += a * log(coef[r, 0, b])

            for b in range(size):
                for p in range(ni):
                    table_i[p] = base[b]
                for q in range(nj):
                    table_j[q] = 0.0
                for r in range(b1, b2):
                    a = exponents[run_index[s, r]]
                    if a == 0.0:
                        continue
                    c0 = coef[r, 0, b]
                    c1 = coef[r, 1, b]
                    for p in range(ni):
                        table_i[p] += a * log(c0 + c1 * ti[p])
                for r in range(b2, b3):
                    a = exponents[run_index[s, r]]
                    if a == 0.0:
                        continue
                    c0 = coef[r, 0, b]
                    c2 = coef[r, 2, b]
                    for q in range(nj):
                        table_j[q] += a * log(c0 + c2 * tj[q])
                for p in range(ni):
                    head = table_i[p]
                    for q in range(nj):
                        grid[p * nj + q] = head + table_j[q]
                for r in range(b3, b4):
                    a = exponents[run_index[s, r]]
                    if a == 0.0:
                        continue
                    c0 = coef[r, 0, b]
                    c1 = coef[r, 1, b]
                    c2 = coef[r, 2, b]
                    c3 = coef[r, 3, b]
                    for k in range(nij):
                        x = flat_i[k]
                        y = flat_j[k]
                        grid[k] += a * log(c0 + c1 * x + y * (c2 + c3 * x))
                for k in range(nij):
                    grid[k] = exp(grid[k])

                weight = 1.0
                for u in range(outer):
                    weight *= weights[variables[s, u], digits[u, b]]
                for q in range(nj):
                    col_sum[q] = 0.0
                inner = 0.0
                inner_abs = 0.0
                inner_square = 0.0
                for p in range(ni):
                    w = wi[p]
                    acc = 0.0
                    acc_abs = 0.0
                    acc_square = 0.0
                    for q in range(nj):
                        term = wj[q] * grid[p * nj + q]
                        acc += term
                        acc_abs += abs(term)
                        acc_square += term * term
                        col_sum[q] += w * grid[p * nj + q]
                    marginal[outer, p] += weight * acc
                    inner += w * acc
                    inner_abs += abs(w) * acc_abs
                    inner_square += w * w * acc_square
                if pair == 2:
                    for q in range(nj):
                        marginal[outer + 1, q] += weight * col_sum[q]
                total_abs += abs(weight) * inner_abs
                total_square += weight * weight * inner_square
                for u in range(outer):
                    product = inner
                    for u2 in range(outer):
                        if u2 != u:
                            product *= weights[variables[s, u2], digits[u2, b]]
                    marginal[u, digits[u, b]] += product
            start += size

        out_abs[c] = total_abs
        out_square[c] = total_square
