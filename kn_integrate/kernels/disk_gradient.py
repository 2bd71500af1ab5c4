"""Tensor-product quadrature over sectors with logarithms of the runs and moved nodes, real or complex.

The traversal is that of the kernels for values.  Beside the marginal sums it returns, for every run, the sum with
``log P_run`` in the integrand, and for every variable the sum with ``(dt/dY) d/dt log F``, F the integrand: what a
derivative with respect to the exponents consists of.  One source serves real and complex arrays; logarithms are
principal ones, see the complex kernel.

Runs of one inner variable enter through tables as long as its rule, so their logarithms cost next to nothing; only the
few runs of both inner variables are worked out point by point, and their logarithms are needed for the value anyway.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit, types
from numba.extending import overload

from .disk_real import BLOCK, advance
from .vecmath import atan_quotient, exp, log, sincos

_MATHS: Any = {"error_model": "numpy", "fastmath": {"contract"}}
_SUMS: Any = {"error_model": "numpy", "fastmath": {"contract", "reassoc"}}


def _log(p: Any) -> Any:
    """Principal logarithm of a number in the right half plane."""


def _exp(p: Any) -> Any:
    """Exponential."""


@overload(_log, jit_options=_MATHS)
def _log_of(p):  # numba wants the signature of the implementation
    if isinstance(p, types.Complex):
        return lambda p: complex(0.5 * log(p.real * p.real + p.imag * p.imag), atan_quotient(p.imag, p.real))
    return lambda p: log(p)


@overload(_exp, jit_options=_MATHS)
def _exp_of(p):
    if isinstance(p, types.Complex):

        def complex_exp(p):
            m = exp(p.real)
            sine, cosine = sincos(p.imag)
            return complex(m * cosine, m * sine)

        return complex_exp
    return lambda p: exp(p)


def _over(w: Any, p: Any) -> Any:
    """Quotient; without the case distinctions that guard complex ones against overflow: runs are of order one."""


@overload(_over, jit_options=_MATHS)
def _over_of(w, p):
    if isinstance(p, types.Complex):

        def complex_over(w, p):
            m = 1.0 / (p.real * p.real + p.imag * p.imag)
            re = w.real * p.real + w.imag * p.imag
            im = w.imag * p.real - w.real * p.imag
            return complex(re * m, im * m)

        return complex_over
    return lambda w, p: w / p


@njit(**_SUMS)
def _dot(count, a, b):
    """``sum a b``."""
    total = a[0] * b[0]
    for k in range(1, count):
        total += a[k] * b[k]
    return total


@njit(**_SUMS)
def _abs_dot(count, a, b):
    """``sum |a| |b|``."""
    total = 0.0
    for k in range(count):
        total += abs(a[k]) * abs(b[k])
    return total


@njit(**_SUMS)
def _line(count, a, wf, c0, c1, t, moved):
    """Sums over a run ``P = c0 + c1 t`` of ``a wf/P`` times 1, t and the change of t."""
    s0 = wf[0] * 0.0
    s1 = wf[0] * 0.0
    sm = wf[0] * 0.0
    for p in range(count):
        q = _over(wf[p], c0 + c1 * t[p])
        s0 += q
        s1 += q * t[p]
        sm += q * moved[p]
    return a * s0, a * s1, a * c1 * sm


@njit(**_SUMS)
def _sheet(count, a, wf, c0, c1, c2, c3, x, y, moved_x, moved_y):
    """The same for ``P = c0 + c1 x + c2 y + c3 x y``: times 1, x, y, xy and the changes of x and of y."""
    s0 = wf[0] * 0.0
    s1 = wf[0] * 0.0
    s2 = wf[0] * 0.0
    s3 = wf[0] * 0.0
    si = wf[0] * 0.0
    sj = wf[0] * 0.0
    for k in range(count):
        q = _over(wf[k], c0 + c1 * x[k] + y[k] * (c2 + c3 * x[k]))
        qx = q * x[k]
        s0 += q
        s1 += qx
        s2 += q * y[k]
        s3 += qx * y[k]
        si += q * moved_x[k] * (c1 + c3 * y[k])
        sj += q * moved_y[k] * (c2 + c3 * x[k])
    return a * s0, a * s1, a * s2, a * s3, a * si, a * sj


@njit(**_MATHS)
def _add_logs(count, a, c0, c1, t, logs, table, low):
    """``logs = log(c0 + c1 t)``, ``table += a logs``; ``low`` keeps the least real part of a run met in each place."""
    for p in range(count):
        z = c0 + c1 * t[p]
        low[p] = min(low[p], z.real)
        value = _log(z)
        logs[p] = value
        table[p] += a * value


@njit(**_MATHS)
def _add_sheet(count, a, c0, c1, c2, c3, x, y, logs, table, low):
    """``logs = log(c0 + c1 x + c2 y + c3 x y)``, ``table += a logs``."""
    for k in range(count):
        z = c0 + c1 * x[k] + y[k] * (c2 + c3 * x[k])
        low[k] = min(low[k], z.real)
        value = _log(z)
        logs[k] = value
        table[k] += a * value


@njit(**_MATHS)
def _exponentials(count, table):
    for k in range(count):
        table[k] = _exp(table[k])


@njit(cache=True, nogil=True, **_MATHS)
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
    moves,
    moving,
    out_abs,
    out_marginal,
    out_marginal_abs,
    out_logs,
    out_moved,
    out_least,
):
    """Integrate chunks ``first..last-1``.

    Parameters
    ----------
    chunks .. weights
        As in the kernels for values; ``exponents``, ``nodes``, ``weights`` all real or all complex.
    moves : (rules, W)
        ``(dt/dY)/t`` of every node, of the type of the nodes.
    moving : (rules,) bool
        Rules with moves other than 0.
    out_abs : (C,) float64
        Sum of the moduli of weight x integrand.
    out_marginal : (C, V, W)
        For variable v and its node j: the sum over all other variables of weights x integrand.
    out_marginal_abs : (C, V, W) float64
        The same of the moduli.
    out_logs : (C, R)
        For every run the sum of weight x integrand x ``log P_run``.
    out_moved : (C, V)
        For every variable the sum of weight x ``dt/dY`` x derivative of the integrand in t.
    out_least : (C,) float64
        The least real part of any run.
    """
    variable_count = variables.shape[1]
    pair = min(2, variable_count)
    outer = variable_count - pair
    width = nodes.shape[1]
    runs_max = run_index.shape[1]
    masks_max = masks_prev.shape[1]
    both_max = 1
    for s in range(run_bounds.shape[0]):
        both_max = max(both_max, run_bounds[s, 4] - run_bounds[s, 3])
    zero = nodes[0, 0] * 0.0
    one = zero + 1.0

    digits = np.empty((outer + 1, BLOCK), dtype=np.int64)
    current = np.zeros(outer + 1, dtype=np.int64)
    t_outer = np.empty((outer + 1, BLOCK), dtype=nodes.dtype)
    w_outer = np.empty((outer + 1, BLOCK), dtype=nodes.dtype)
    m_outer = np.empty((outer + 1, BLOCK), dtype=nodes.dtype)
    before = np.empty(outer + 1, dtype=nodes.dtype)
    before_abs = np.empty(outer + 1)
    mono = np.empty((masks_max, BLOCK), dtype=nodes.dtype)
    contains = np.zeros((masks_max, outer + 1), dtype=np.bool_)
    coef = np.empty((runs_max, 4, BLOCK), dtype=nodes.dtype)
    shift = np.empty((outer + 1, runs_max, 4, BLOCK), dtype=nodes.dtype)
    base = np.empty(BLOCK, dtype=nodes.dtype)
    constant = np.empty((runs_max, BLOCK), dtype=nodes.dtype)
    table_i = np.empty(width, dtype=nodes.dtype)
    table_j = np.empty(width, dtype=nodes.dtype)
    logs = np.empty((runs_max, width), dtype=nodes.dtype)
    logs_both = np.empty((both_max, width * width), dtype=nodes.dtype)
    flat_i = np.empty(width * width, dtype=nodes.dtype)
    flat_j = np.empty(width * width, dtype=nodes.dtype)
    flat_w = np.empty(width * width, dtype=nodes.dtype)
    flat_mi = np.empty(width * width, dtype=nodes.dtype)
    flat_mj = np.empty(width * width, dtype=nodes.dtype)
    line_mi = np.empty(width, dtype=nodes.dtype)
    line_mj = np.empty(width, dtype=nodes.dtype)
    grid = np.empty(width * width, dtype=nodes.dtype)
    rows = np.empty(width, dtype=nodes.dtype)
    columns = np.empty(width, dtype=nodes.dtype)
    plane = np.empty(width * width, dtype=nodes.dtype)
    plane_abs = np.empty(width * width)
    low = np.empty(max(width * width, BLOCK))

    for c in range(first, last):
        s = chunks[c, 0]
        lo = chunks[c, 1]
        hi = chunks[c, 2]
        chord_i = variables[s, outer]
        ni = counts[chord_i]
        nj = 1
        chord_j = chord_i
        moving_j = False
        if pair == 2:
            chord_j = variables[s, outer + 1]
            nj = counts[chord_j]
            moving_j = moving[chord_j]
        any_moving = moving[chord_i] or moving_j
        for u in range(outer):
            any_moving = any_moving or moving[variables[s, u]]
        ti = nodes[chord_i]
        tj = nodes[chord_j]
        nij = ni * nj
        for p in range(ni):
            line_mi[p] = moves[chord_i, p] * ti[p]
        for q in range(nj):
            line_mj[q] = moves[chord_j, q] * tj[q] if pair == 2 else zero
        for p in range(ni):
            for q in range(nj):
                k = p * nj + q
                flat_i[k] = ti[p]
                flat_j[k] = tj[q]
                flat_w[k] = weights[chord_i, p] * (weights[chord_j, q] if pair == 2 else one)
                flat_mi[k] = line_mi[p]
                flat_mj[k] = line_mj[q]
                plane[k] = zero
                plane_abs[k] = 0.0
        b1 = run_bounds[s, 1]
        b2 = run_bounds[s, 2]
        b3 = run_bounds[s, 3]
        b4 = run_bounds[s, 4]
        for k in range(1, mask_count[s]):
            for u in range(outer):
                contains[k, u] = contains[masks_prev[s, k], u] or masks_var[s, k] == u
        index = lo
        for u in range(outer - 1, -1, -1):
            current[u] = index % counts[variables[s, u]]
            index //= counts[variables[s, u]]

        total_abs = 0.0
        low[:] = np.inf
        marginal = out_marginal[c]
        marginal_abs = out_marginal_abs[c]
        sums = out_logs[c]
        moved = out_moved[c]
        marginal[:, :] = zero
        marginal_abs[:, :] = 0.0
        sums[:] = zero
        moved[:] = zero

        start = lo
        while start < hi:
            size = min(BLOCK, hi - start)
            for b in range(BLOCK):
                for u in range(outer):
                    digits[u, b] = current[u]
                    t_outer[u, b] = nodes[variables[s, u], current[u]]
                    w_outer[u, b] = weights[variables[s, u], current[u]]
                    m_outer[u, b] = moves[variables[s, u], current[u]]
                if b + 1 < size:  # lanes beyond the end repeat the last point: finite numbers, never used
                    advance(current, counts, variables[s], outer)
            advance(current, counts, variables[s], outer)
            for b in range(BLOCK):
                mono[0, b] = one
                base[b] = zero
            for k in range(1, mask_count[s]):
                for b in range(BLOCK):
                    mono[k, b] = mono[masks_prev[s, k], b] * t_outer[masks_var[s, k], b]
            for r in range(b4):
                for z in range(4):
                    for b in range(BLOCK):
                        coef[r, z, b] = zero
                for x in range(term_start[s, r], term_start[s, r + 1]):
                    for b in range(BLOCK):
                        coef[r, term_class[s, x], b] += mono[term_mask[s, x], b]
                if any_moving:
                    for u in range(outer):
                        for z in range(4):
                            for b in range(BLOCK):
                                shift[u, r, z, b] = zero
                        for x in range(term_start[s, r], term_start[s, r + 1]):
                            k = term_mask[s, x]
                            if contains[k, u]:
                                for b in range(BLOCK):
                                    shift[u, r, term_class[s, x], b] += mono[k, b] * m_outer[u, b]
                if r < b1:
                    a = exponents[run_index[s, r]]
                    for b in range(BLOCK):
                        low[b] = min(low[b], coef[r, 0, b].real)
                        constant[r, b] = _log(coef[r, 0, b])
                        base[b] += a * constant[r, b]

            for b in range(size):
                for p in range(ni):
                    table_i[p] = base[b]
                for q in range(nj):
                    table_j[q] = zero
                for r in range(b1, b2):
                    a = exponents[run_index[s, r]]
                    _add_logs(ni, a, coef[r, 0, b], coef[r, 1, b], ti, logs[r], table_i, low)
                for r in range(b2, b3):
                    a = exponents[run_index[s, r]]
                    _add_logs(nj, a, coef[r, 0, b], coef[r, 2, b], tj, logs[r], table_j, low)
                for p in range(ni):
                    for q in range(nj):
                        grid[p * nj + q] = table_i[p] + table_j[q]
                for r in range(b3, b4):
                    a = exponents[run_index[s, r]]
                    c0 = coef[r, 0, b]
                    c1 = coef[r, 1, b]
                    c2 = coef[r, 2, b]
                    c3 = coef[r, 3, b]
                    _add_sheet(nij, a, c0, c1, c2, c3, flat_i, flat_j, logs_both[r - b3], grid, low)
                _exponentials(nij, grid)

                weight = one
                weight_abs = 1.0
                for u in range(outer):
                    before[u] = weight
                    before_abs[u] = weight_abs
                    weight *= w_outer[u, b]
                    weight_abs *= abs(w_outer[u, b])
                inner_abs = _abs_dot(nij, flat_w, grid)
                total_abs += weight_abs * inner_abs
                for k in range(nij):
                    value = weight * grid[k]
                    plane[k] += value
                    plane_abs[k] += abs(value)
                    grid[k] *= flat_w[k]  # from here on with the inner weights
                for p in range(ni):
                    rows[p] = zero
                for q in range(nj):
                    columns[q] = zero
                for p in range(ni):
                    for q in range(nj):
                        rows[p] += grid[p * nj + q]
                        columns[q] += grid[p * nj + q]
                inner = zero
                for p in range(ni):
                    inner += rows[p]
                behind = inner
                behind_abs = inner_abs
                for u in range(outer - 1, -1, -1):
                    marginal[u, digits[u, b]] += before[u] * behind
                    marginal_abs[u, digits[u, b]] += before_abs[u] * behind_abs
                    behind *= w_outer[u, b]
                    behind_abs *= abs(w_outer[u, b])

                for r in range(b1):
                    sums[run_index[s, r]] += weight * inner * constant[r, b]
                for r in range(b1, b2):
                    sums[run_index[s, r]] += weight * _dot(ni, rows, logs[r])
                for r in range(b2, b3):
                    sums[run_index[s, r]] += weight * _dot(nj, columns, logs[r])
                for r in range(b3, b4):
                    sums[run_index[s, r]] += weight * _dot(nij, grid, logs_both[r - b3])
                if not any_moving:
                    continue
                for r in range(b1):
                    q0 = _over(weight * inner * exponents[run_index[s, r]], coef[r, 0, b])
                    for u in range(outer):
                        moved[u] += q0 * shift[u, r, 0, b]
                for r in range(b1, b2):
                    a = weight * exponents[run_index[s, r]]
                    q0, q1, qi = _line(ni, a, rows, coef[r, 0, b], coef[r, 1, b], ti, line_mi)
                    moved[outer] += qi
                    for u in range(outer):
                        moved[u] += q0 * shift[u, r, 0, b] + q1 * shift[u, r, 1, b]
                for r in range(b2, b3):
                    a = weight * exponents[run_index[s, r]]
                    q0, q2, qj = _line(nj, a, columns, coef[r, 0, b], coef[r, 2, b], tj, line_mj)
                    moved[outer + 1] += qj
                    for u in range(outer):
                        moved[u] += q0 * shift[u, r, 0, b] + q2 * shift[u, r, 2, b]
                for r in range(b3, b4):
                    a = weight * exponents[run_index[s, r]]
                    c0 = coef[r, 0, b]
                    c1 = coef[r, 1, b]
                    c2 = coef[r, 2, b]
                    c3 = coef[r, 3, b]
                    q0, q1, q2, q3, qi, qj = _sheet(nij, a, grid, c0, c1, c2, c3, flat_i, flat_j, flat_mi, flat_mj)
                    moved[outer] += qi
                    moved[outer + 1] += qj
                    for u in range(outer):
                        moved[u] += (
                            q0 * shift[u, r, 0, b]
                            + q1 * shift[u, r, 1, b]
                            + q2 * shift[u, r, 2, b]
                            + q3 * shift[u, r, 3, b]
                        )
            start += size

        for p in range(ni):
            for q in range(nj):
                value = plane[p * nj + q]
                modulus = plane_abs[p * nj + q]
                w = weights[chord_j, q] if pair == 2 else one
                marginal[outer, p] += value * w
                marginal_abs[outer, p] += modulus * abs(w)
                if pair == 2:
                    marginal[outer + 1, q] += value * weights[chord_i, p]
                    marginal_abs[outer + 1, q] += modulus * abs(weights[chord_i, p])
        out_abs[c] = total_abs
        least = np.inf
        for k in range(len(low)):
            least = min(least, low[k])
        out_least[c] = least
