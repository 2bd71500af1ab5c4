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

_JIT: Any = dict(cache=True, nogil=True, error_model="numpy", fastmath={"contract"})


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
    nulls,
    out_sum,
    out_abs,
    out_null,
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
    counts : (chords,) int64; nodes, weights : (chords, W) float64; nulls : (chords, Z, W) float64
        The rule of every chord in the variable t; ``nulls`` are further functionals on the same nodes.
    out_sum, out_abs : (C,) float64
        Sum of weight x integrand, and of its modulus.
    out_null : (C, V, Z) float64
        The sum with the weights of variable v replaced by its z-th null functional; v in the order of ``variables``.
    """
    variable_count = variables.shape[1]
    null_count = nulls.shape[1]
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
    row_sum = np.empty(width)
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
        b0 = run_bounds[s, 0]
        b1 = run_bounds[s, 1]
        b2 = run_bounds[s, 2]
        b3 = run_bounds[s, 3]
        b4 = run_bounds[s, 4]

        total = 0.0
        total_abs = 0.0
        total_null = np.zeros((variable_count, null_count))

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

                for q in range(nj):
                    col_sum[q] = 0.0
                inner = 0.0
                inner_abs = 0.0
                for p in range(ni):
                    w = wi[p]
                    acc = 0.0
                    acc_abs = 0.0
                    for q in range(nj):
                        g = grid[p * nj + q]
                        acc += wj[q] * g
                        acc_abs += abs(wj[q]) * g
                        col_sum[q] += w * g
                    row_sum[p] = acc
                    inner += w * acc
                    inner_abs += abs(w) * acc_abs

                weight = 1.0
                for u in range(outer):
                    weight *= weights[variables[s, u], digits[u, b]]
                total += weight * inner
                total_abs += abs(weight) * inner_abs
                for z in range(null_count):
                    acc = 0.0
                    for p in range(ni):
                        acc += nulls[chord_i, z, p] * row_sum[p]
                    total_null[outer, z] += weight * acc
                    if pair == 2:
                        acc = 0.0
                        for q in range(nj):
                            acc += nulls[chord_j, z, q] * col_sum[q]
                        total_null[outer + 1, z] += weight * acc
                    for u in range(outer):
                        product = inner
                        for u2 in range(outer):
                            if u2 == u:
                                product *= nulls[variables[s, u], z, digits[u, b]]
                            else:
                                product *= weights[variables[s, u2], digits[u2, b]]
                        total_null[u, z] += product
            start += size

        out_sum[c] = total
        out_abs[c] = total_abs
        for v in range(variable_count):
            for z in range(null_count):
                out_null[c, v, z] = total_null[v, z]
