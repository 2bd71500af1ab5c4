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
LANES = 4  # inner loops run over whole groups of this many elements: no remainders, which would not vectorise

_JIT: Any = {"cache": True, "nogil": True, "error_model": "numpy", "fastmath": {"contract"}}
_INLINE: Any = {"error_model": "numpy", "fastmath": {"contract"}}


@njit(inline="always", **_INLINE)
def fill(target, source, count):
    """Copy ``count`` nodes; the rest of the last whole vector becomes 1."""
    for p in range(count):
        target[p] = source[p]
    for p in range(count, (count + LANES - 1) // LANES * LANES):
        target[p] = 1.0


@njit(inline="always", **_INLINE)
def add_logs(table, wide, a, c0, c1, t):
    """``table += a log(c0 + c1 t)``, whole vectors."""
    if a != 0.0:
        for p in range(wide):
            table[p] += a * log(c0 + c1 * t[p])


@njit(inline="always", **_INLINE)
def advance(digits, counts, row, outer):
    """The next outer point; the last variable runs fastest."""
    u = outer - 1
    while u >= 0:
        digits[u] += 1
        if digits[u] < counts[row[u]]:
            break
        digits[u] = 0
        u -= 1


@njit(error_model="numpy", fastmath={"contract", "reassoc"})
def sums(weights, values, wide):
    """Sum of weights x values, of the moduli and of the squares, in the order that suits vector registers."""
    total = 0.0
    total_abs = 0.0
    total_square = 0.0
    for k in range(wide):
        term = weights[k] * values[k]
        total += term
        total_abs += abs(term)
        total_square += term * term
    return total, total_abs, total_square


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
    run_split,
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
    width = (nodes.shape[1] + LANES - 1) // LANES * LANES
    area = (nodes.shape[1] ** 2 + LANES - 1) // LANES * LANES
    runs_max = run_index.shape[1]
    masks_max = masks_prev.shape[1]

    digits = np.empty((outer + 1, BLOCK), dtype=np.int64)
    current = np.zeros(outer + 1, dtype=np.int64)
    t_outer = np.empty((outer + 1, BLOCK))
    w_outer = np.empty((outer + 1, BLOCK))
    before = np.empty(outer + 1)
    mono = np.empty((masks_max, BLOCK))
    coef = np.empty((runs_max, 4, BLOCK))
    base = np.empty(BLOCK)
    ti = np.empty(width)
    tj = np.empty(width)
    kept_i = np.empty(width)
    kept_j = np.empty(width)
    table_i = np.empty(width)
    table_j = np.empty(width)
    flat_i = np.empty(area)
    flat_j = np.empty(area)
    flat_w = np.empty(area)
    grid = np.empty(area)
    plane = np.empty(area)

    for c in range(first, last):
        s = chunks[c, 0]
        lo = chunks[c, 1]
        hi = chunks[c, 2]
        chord_i = variables[s, outer]
        ni = counts[chord_i]
        nj = 1
        chord_j = chord_i
        if pair == 2:
            chord_j = variables[s, outer + 1]
            nj = counts[chord_j]
        # every array is filled up to whole vectors with harmless values, so that no loop has a remainder
        fill(ti, nodes[chord_i], ni)
        fill(tj, nodes[chord_j], nj)
        wide_i = (ni + LANES - 1) // LANES * LANES
        wide_j = (nj + LANES - 1) // LANES * LANES
        nij = ni * nj
        wide = (nij + LANES - 1) // LANES * LANES
        for p in range(ni):
            for q in range(nj):
                flat_i[p * nj + q] = ti[p]
                flat_j[p * nj + q] = tj[q]
                flat_w[p * nj + q] = weights[chord_i, p] * (weights[chord_j, q] if pair == 2 else 1.0)
        for k in range(nij, wide):
            flat_i[k] = 1.0
            flat_j[k] = 1.0
            flat_w[k] = 0.0
        for k in range(wide):
            plane[k] = 0.0
        b1 = run_bounds[s, 1]
        b2 = run_bounds[s, 2]
        b3 = run_bounds[s, 3]
        b4 = run_bounds[s, 4]
        split_i = run_split[s, 1]
        split_j = run_split[s, 2]
        fastest = counts[variables[s, outer - 1]] if outer > 0 else 1
        head = np.int64(-1)
        index = lo
        for u in range(outer - 1, -1, -1):
            current[u] = index % counts[variables[s, u]]
            index //= counts[variables[s, u]]

        total_abs = 0.0
        total_square = 0.0
        marginal = out_marginal[c]
        marginal[:, :] = 0.0

        start = lo
        while start < hi:
            size = min(BLOCK, hi - start)
            for b in range(BLOCK):
                for u in range(outer):
                    digits[u, b] = current[u]
                    t_outer[u, b] = nodes[variables[s, u], current[u]]
                    w_outer[u, b] = weights[variables[s, u], current[u]]
                if b + 1 < size:  # lanes beyond the end repeat the last point: finite numbers, never used
                    advance(current, counts, variables[s], outer)
            advance(current, counts, variables[s], outer)
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
                if (start + b) // fastest != head:
                    # runs without the fastest outer variable: once for all its nodes
                    head = (start + b) // fastest
                    for p in range(wide_i):
                        kept_i[p] = 0.0
                    for q in range(wide_j):
                        kept_j[q] = 0.0
                    for r in range(b1, split_i):
                        add_logs(kept_i, wide_i, exponents[run_index[s, r]], coef[r, 0, b], coef[r, 1, b], ti)
                    for r in range(b2, split_j):
                        add_logs(kept_j, wide_j, exponents[run_index[s, r]], coef[r, 0, b], coef[r, 2, b], tj)
                for p in range(wide_i):
                    table_i[p] = base[b] + kept_i[p]
                for q in range(wide_j):
                    table_j[q] = kept_j[q]
                for r in range(split_i, b2):
                    add_logs(table_i, wide_i, exponents[run_index[s, r]], coef[r, 0, b], coef[r, 1, b], ti)
                for r in range(split_j, b3):
                    add_logs(table_j, wide_j, exponents[run_index[s, r]], coef[r, 0, b], coef[r, 2, b], tj)
                for p in range(ni):
                    row = table_i[p]
                    for q in range(nj):
                        grid[p * nj + q] = row + table_j[q]
                for k in range(nij, wide):
                    grid[k] = 0.0
                for r in range(b3, b4):
                    a = exponents[run_index[s, r]]
                    if a == 0.0:
                        continue
                    c0 = coef[r, 0, b]
                    c1 = coef[r, 1, b]
                    c2 = coef[r, 2, b]
                    c3 = coef[r, 3, b]
                    for k in range(wide):
                        x = flat_i[k]
                        grid[k] += a * log(c0 + c1 * x + flat_j[k] * (c2 + c3 * x))
                for k in range(wide):
                    grid[k] = exp(grid[k])

                weight = 1.0
                for u in range(outer):
                    before[u] = weight
                    weight *= w_outer[u, b]
                for k in range(wide):
                    plane[k] += weight * grid[k]
                inner, inner_abs, inner_square = sums(flat_w, grid, wide)
                total_abs += abs(weight) * inner_abs
                total_square += weight * weight * inner_square
                behind = inner
                for u in range(outer - 1, -1, -1):
                    marginal[u, digits[u, b]] += before[u] * behind
                    behind *= w_outer[u, b]
            start += size

        for p in range(ni):
            for q in range(nj):
                value = plane[p * nj + q]
                marginal[outer, p] += value * (weights[chord_j, q] if pair == 2 else 1.0)
                if pair == 2:
                    marginal[outer + 1, q] += value * weights[chord_i, p]
        out_abs[c] = total_abs
        out_square[c] = total_square
