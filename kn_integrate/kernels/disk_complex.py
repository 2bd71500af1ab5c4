"""Tensor-product quadrature over sectors, complex nodes, weights and exponents.

The same traversal as the real kernel with real and imaginary parts in separate arrays, which is what vectorises.
Logarithms are principal ones, which is the right branch as long as every run keeps a positive real part; the least
real part met is returned so that the caller can tell.  (A run is affine in each variable, so its real part is positive
on the convex hull of the nodes, and the branch is the continuation from the real cube, whenever it is positive at
all tensor nodes.)
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit

from .vecmath import atan_quotient, exp, log, sincos

BLOCK = 16

_JIT: Any = {"cache": True, "nogil": True, "error_model": "numpy", "fastmath": {"contract"}}


@njit(**_JIT)
def _add_log(lanes, a_re, a_im, p_re, p_im, x_re, x_im, low):
    """``x += a log p`` over the first lanes; ``low`` keeps the least real part of p met in each lane."""
    for k in range(lanes):
        u = p_re[k]
        v = p_im[k]
        low[k] = min(low[k], u)
        l_re = 0.5 * log(u * u + v * v)
        l_im = atan_quotient(v, u)
        x_re[k] += a_re * l_re - a_im * l_im
        x_im[k] += a_re * l_im + a_im * l_re


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
    out_least,
):
    """Integrate chunks ``first..last-1``; parameters as in the real kernel.

    ``exponents``, ``nodes``, ``weights`` and ``out_marginal`` are complex; ``out_least`` : (C,) receives the least real
    part of any run.
    """
    variable_count = variables.shape[1]
    pair = min(2, variable_count)
    outer = variable_count - pair
    width = nodes.shape[1]
    runs_max = run_index.shape[1]
    masks_max = masks_prev.shape[1]
    area = max(width * width, BLOCK)

    digits = np.empty((outer + 1, BLOCK), dtype=np.int64)
    t_re = np.empty((outer + 1, BLOCK))
    t_im = np.empty((outer + 1, BLOCK))
    mono_re = np.empty((masks_max, BLOCK))
    mono_im = np.empty((masks_max, BLOCK))
    coef_re = np.empty((runs_max, 4, BLOCK))
    coef_im = np.empty((runs_max, 4, BLOCK))
    base_re = np.empty(BLOCK)
    base_im = np.empty(BLOCK)
    fi_re = np.empty(area)
    fi_im = np.empty(area)
    fj_re = np.empty(area)
    fj_im = np.empty(area)
    low = np.empty(area)
    p_re = np.empty(area)
    p_im = np.empty(area)
    ti_re = np.empty(width)
    ti_im = np.empty(width)
    tj_re = np.empty(width)
    tj_im = np.empty(width)
    g_re = np.empty(area)
    g_im = np.empty(area)
    size_g = np.empty(area)
    col_re = np.empty(width)
    col_im = np.empty(width)
    wj_re = np.empty(width)
    wj_im = np.empty(width)
    wj_abs = np.empty(width)

    for c in range(first, last):
        s = chunks[c, 0]
        lo = chunks[c, 1]
        hi = chunks[c, 2]
        chord_i = variables[s, outer]
        ni = counts[chord_i]
        wi = weights[chord_i]
        if pair == 2:
            chord_j = variables[s, outer + 1]
            nj = counts[chord_j]
        else:
            chord_j = chord_i
            nj = 1
        for q in range(nj):
            w = weights[chord_j, q] if pair == 2 else 1.0 + 0.0j
            wj_re[q] = w.real
            wj_im[q] = w.imag
            wj_abs[q] = abs(w)
        nij = ni * nj
        for p in range(ni):
            for q in range(nj):
                fi_re[p * nj + q] = nodes[chord_i, p].real
                fi_im[p * nj + q] = nodes[chord_i, p].imag
                if pair == 2:
                    fj_re[p * nj + q] = nodes[chord_j, q].real
                    fj_im[p * nj + q] = nodes[chord_j, q].imag
                else:
                    fj_re[p * nj + q] = 1.0
                    fj_im[p * nj + q] = 0.0
        b1 = run_bounds[s, 1]
        b2 = run_bounds[s, 2]
        b3 = run_bounds[s, 3]
        b4 = run_bounds[s, 4]

        total_abs = 0.0
        total_square = 0.0
        marginal = out_marginal[c]
        marginal[:, :] = 0.0
        for k in range(area):
            low[k] = np.inf

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
                    t_re[u, b] = nodes[variables[s, u], d].real
                    t_im[u, b] = nodes[variables[s, u], d].imag
            for b in range(BLOCK):
                mono_re[0, b] = 1.0
                mono_im[0, b] = 0.0
                base_re[b] = 0.0
                base_im[b] = 0.0
            for k in range(1, mask_count[s]):
                k0 = masks_prev[s, k]
                u = masks_var[s, k]
                for b in range(BLOCK):
                    x = mono_re[k0, b]
                    y = mono_im[k0, b]
                    mono_re[k, b] = x * t_re[u, b] - y * t_im[u, b]
                    mono_im[k, b] = x * t_im[u, b] + y * t_re[u, b]
            for r in range(b4):
                a = exponents[run_index[s, r]]
                if a == 0.0:
                    continue
                for z in range(4):
                    for b in range(BLOCK):
                        coef_re[r, z, b] = 0.0
                        coef_im[r, z, b] = 0.0
                for x in range(term_start[s, r], term_start[s, r + 1]):
                    k = term_mask[s, x]
                    z = term_class[s, x]
                    for b in range(BLOCK):
                        coef_re[r, z, b] += mono_re[k, b]
                        coef_im[r, z, b] += mono_im[k, b]
                if r < b1:
                    _add_log(BLOCK, a.real, a.imag, coef_re[r, 0], coef_im[r, 0], base_re, base_im, low)

            for b in range(size):
                for p in range(ni):
                    ti_re[p] = base_re[b]
                    ti_im[p] = base_im[b]
                for q in range(nj):
                    tj_re[q] = 0.0
                    tj_im[q] = 0.0
                for r in range(b1, b2):
                    a = exponents[run_index[s, r]]
                    if a == 0.0:
                        continue
                    c0r = coef_re[r, 0, b]
                    c0i = coef_im[r, 0, b]
                    c1r = coef_re[r, 1, b]
                    c1i = coef_im[r, 1, b]
                    for p in range(ni):
                        x = fi_re[p * nj]
                        y = fi_im[p * nj]
                        p_re[p] = c0r + c1r * x - c1i * y
                        p_im[p] = c0i + c1r * y + c1i * x
                    _add_log(ni, a.real, a.imag, p_re, p_im, ti_re, ti_im, low)
                for r in range(b2, b3):
                    a = exponents[run_index[s, r]]
                    if a == 0.0:
                        continue
                    c0r = coef_re[r, 0, b]
                    c0i = coef_im[r, 0, b]
                    c2r = coef_re[r, 2, b]
                    c2i = coef_im[r, 2, b]
                    for q in range(nj):
                        x = fj_re[q]
                        y = fj_im[q]
                        p_re[q] = c0r + c2r * x - c2i * y
                        p_im[q] = c0i + c2r * y + c2i * x
                    _add_log(nj, a.real, a.imag, p_re, p_im, tj_re, tj_im, low)
                for p in range(ni):
                    for q in range(nj):
                        g_re[p * nj + q] = ti_re[p] + tj_re[q]
                        g_im[p * nj + q] = ti_im[p] + tj_im[q]
                for r in range(b3, b4):
                    a = exponents[run_index[s, r]]
                    if a == 0.0:
                        continue
                    c0r = coef_re[r, 0, b]
                    c0i = coef_im[r, 0, b]
                    c1r = coef_re[r, 1, b]
                    c1i = coef_im[r, 1, b]
                    c2r = coef_re[r, 2, b]
                    c2i = coef_im[r, 2, b]
                    c3r = coef_re[r, 3, b]
                    c3i = coef_im[r, 3, b]
                    for k in range(nij):
                        x = fi_re[k]
                        y = fi_im[k]
                        ar = c2r + c3r * x - c3i * y
                        ai = c2i + c3r * y + c3i * x
                        v = fj_re[k]
                        w = fj_im[k]
                        p_re[k] = c0r + c1r * x - c1i * y + ar * v - ai * w
                        p_im[k] = c0i + c1r * y + c1i * x + ar * w + ai * v
                    _add_log(nij, a.real, a.imag, p_re, p_im, g_re, g_im, low)
                for k in range(nij):
                    m = exp(g_re[k])
                    sine, cosine = sincos(g_im[k])
                    size_g[k] = m
                    g_re[k] = m * cosine
                    g_im[k] = m * sine

                weight = 1.0 + 0.0j
                for u in range(outer):
                    weight *= weights[variables[s, u], digits[u, b]]
                for q in range(nj):
                    col_re[q] = 0.0
                    col_im[q] = 0.0
                inner = 0.0 + 0.0j
                inner_abs = 0.0
                inner_square = 0.0
                for p in range(ni):
                    ur = wi[p].real
                    ui = wi[p].imag
                    acc_re = 0.0
                    acc_im = 0.0
                    acc_abs = 0.0
                    acc_square = 0.0
                    for q in range(nj):
                        k = p * nj + q
                        x = g_re[k]
                        y = g_im[k]
                        acc_re += wj_re[q] * x - wj_im[q] * y
                        acc_im += wj_re[q] * y + wj_im[q] * x
                        m = wj_abs[q] * size_g[k]
                        acc_abs += m
                        acc_square += m * m
                        col_re[q] += ur * x - ui * y
                        col_im[q] += ur * y + ui * x
                    row = complex(acc_re, acc_im)
                    marginal[outer, p] += weight * row
                    inner += wi[p] * row
                    m = abs(wi[p])
                    inner_abs += m * acc_abs
                    inner_square += m * m * acc_square
                if pair == 2:
                    for q in range(nj):
                        marginal[outer + 1, q] += weight * complex(col_re[q], col_im[q])
                m = abs(weight)
                total_abs += m * inner_abs
                total_square += m * m * inner_square
                for u in range(outer):
                    product = inner
                    for u2 in range(outer):
                        if u2 != u:
                            product *= weights[variables[s, u2], digits[u2, b]]
                    marginal[u, digits[u, b]] += product
            start += size

        out_abs[c] = total_abs
        out_square[c] = total_square
        least = np.inf
        for k in range(area):
            least = min(least, low[k])
        out_least[c] = least
