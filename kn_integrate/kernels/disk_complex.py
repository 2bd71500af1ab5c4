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

from .disk_real import BLOCK, LANES, advance
from .vecmath import atan_quotient, exp, log, sincos

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
def _line(lanes, c_re, c_im, kind, b, x_re, x_im, p_re, p_im):
    """``p = c_0 + c_kind x``."""
    c0r = c_re[0, b]
    c0i = c_im[0, b]
    c1r = c_re[kind, b]
    c1i = c_im[kind, b]
    for k in range(lanes):
        x = x_re[k]
        y = x_im[k]
        p_re[k] = c0r + c1r * x - c1i * y
        p_im[k] = c0i + c1r * y + c1i * x


@njit(error_model="numpy", fastmath={"contract", "reassoc"})
def sums(w_re, w_im, w_abs, g_re, g_im, size, wide):
    """Sum of weights x values, of the moduli and of their squares, in the order that suits vector registers."""
    re = 0.0
    im = 0.0
    total_abs = 0.0
    total_square = 0.0
    for k in range(wide):
        re += w_re[k] * g_re[k] - w_im[k] * g_im[k]
        im += w_re[k] * g_im[k] + w_im[k] * g_re[k]
        m = w_abs[k] * size[k]
        total_abs += m
        total_square += m * m
    return re, im, total_abs, total_square


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
    out_least,
):
    """Integrate chunks ``first..last-1``; parameters as in the real kernel.

    ``exponents``, ``nodes``, ``weights`` and ``out_marginal`` are complex; ``out_least`` : (C,) receives the least real
    part of any run.
    """
    variable_count = variables.shape[1]
    pair = min(2, variable_count)
    outer = variable_count - pair
    width = (nodes.shape[1] + LANES - 1) // LANES * LANES
    runs_max = run_index.shape[1]
    masks_max = masks_prev.shape[1]
    area = max((nodes.shape[1] ** 2 + LANES - 1) // LANES * LANES, BLOCK)

    digits = np.empty((outer + 1, BLOCK), dtype=np.int64)
    current = np.zeros(outer + 1, dtype=np.int64)
    t_re = np.empty((outer + 1, BLOCK))
    t_im = np.empty((outer + 1, BLOCK))
    w_outer = np.empty((outer + 1, BLOCK), dtype=np.complex128)
    before = np.empty(outer + 1, dtype=np.complex128)
    mono_re = np.empty((masks_max, BLOCK))
    mono_im = np.empty((masks_max, BLOCK))
    coef_re = np.empty((runs_max, 4, BLOCK))
    coef_im = np.empty((runs_max, 4, BLOCK))
    base_re = np.empty(BLOCK)
    base_im = np.empty(BLOCK)
    i_re = np.empty(width)
    i_im = np.empty(width)
    j_re = np.empty(width)
    j_im = np.empty(width)
    fi_re = np.empty(area)
    fi_im = np.empty(area)
    fj_re = np.empty(area)
    fj_im = np.empty(area)
    fw_re = np.empty(area)
    fw_im = np.empty(area)
    fw_abs = np.empty(area)
    low = np.empty(area)
    p_re = np.empty(area)
    p_im = np.empty(area)
    kept_i_re = np.empty(width)
    kept_i_im = np.empty(width)
    kept_j_re = np.empty(width)
    kept_j_im = np.empty(width)
    ti_re = np.empty(width)
    ti_im = np.empty(width)
    tj_re = np.empty(width)
    tj_im = np.empty(width)
    g_re = np.empty(area)
    g_im = np.empty(area)
    size_g = np.empty(area)
    plane_re = np.empty(area)
    plane_im = np.empty(area)

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
        # every array is filled up to whole vectors with the first node, so that no loop has a remainder
        wide_i = (ni + LANES - 1) // LANES * LANES
        wide_j = (nj + LANES - 1) // LANES * LANES
        nij = ni * nj
        wide = (nij + LANES - 1) // LANES * LANES
        for p in range(wide_i):
            z = nodes[chord_i, p if p < ni else 0]
            i_re[p] = z.real
            i_im[p] = z.imag
        for q in range(wide_j):
            z = nodes[chord_j, q if q < nj else 0]
            j_re[q] = z.real
            j_im[q] = z.imag
        for k in range(wide):
            p = k // nj if k < nij else 0
            q = k % nj if k < nij else 0
            fi_re[k] = i_re[p]
            fi_im[k] = i_im[p]
            fj_re[k] = j_re[q]
            fj_im[k] = j_im[q]
            w = 0.0 + 0.0j
            if k < nij:
                w = weights[chord_i, p]
                if pair == 2:
                    w *= weights[chord_j, q]
            fw_re[k] = w.real
            fw_im[k] = w.imag
            fw_abs[k] = abs(w)
            plane_re[k] = 0.0
            plane_im[k] = 0.0
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
        for k in range(area):
            low[k] = np.inf

        start = lo
        while start < hi:
            size = min(BLOCK, hi - start)
            for b in range(BLOCK):
                for u in range(outer):
                    digits[u, b] = current[u]
                    t_re[u, b] = nodes[variables[s, u], current[u]].real
                    t_im[u, b] = nodes[variables[s, u], current[u]].imag
                    w_outer[u, b] = weights[variables[s, u], current[u]]
                if b + 1 < size:  # lanes beyond the end repeat the last point: finite numbers, never used
                    advance(current, counts, variables[s], outer)
            advance(current, counts, variables[s], outer)
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
                if (start + b) // fastest != head:
                    # runs without the fastest outer variable: once for all its nodes
                    head = (start + b) // fastest
                    kept_i_re[:wide_i] = 0.0
                    kept_i_im[:wide_i] = 0.0
                    kept_j_re[:wide_j] = 0.0
                    kept_j_im[:wide_j] = 0.0
                    for r in range(b1, split_i):
                        a = exponents[run_index[s, r]]
                        if a != 0.0:
                            _line(wide_i, coef_re[r], coef_im[r], 1, b, i_re, i_im, p_re, p_im)
                            _add_log(wide_i, a.real, a.imag, p_re, p_im, kept_i_re, kept_i_im, low)
                    for r in range(b2, split_j):
                        a = exponents[run_index[s, r]]
                        if a != 0.0:
                            _line(wide_j, coef_re[r], coef_im[r], 2, b, j_re, j_im, p_re, p_im)
                            _add_log(wide_j, a.real, a.imag, p_re, p_im, kept_j_re, kept_j_im, low)
                for p in range(wide_i):
                    ti_re[p] = base_re[b] + kept_i_re[p]
                    ti_im[p] = base_im[b] + kept_i_im[p]
                for q in range(wide_j):
                    tj_re[q] = kept_j_re[q]
                    tj_im[q] = kept_j_im[q]
                for r in range(split_i, b2):
                    a = exponents[run_index[s, r]]
                    if a != 0.0:
                        _line(wide_i, coef_re[r], coef_im[r], 1, b, i_re, i_im, p_re, p_im)
                        _add_log(wide_i, a.real, a.imag, p_re, p_im, ti_re, ti_im, low)
                for r in range(split_j, b3):
                    a = exponents[run_index[s, r]]
                    if a != 0.0:
                        _line(wide_j, coef_re[r], coef_im[r], 2, b, j_re, j_im, p_re, p_im)
                        _add_log(wide_j, a.real, a.imag, p_re, p_im, tj_re, tj_im, low)
                for p in range(ni):
                    for q in range(nj):
                        g_re[p * nj + q] = ti_re[p] + tj_re[q]
                        g_im[p * nj + q] = ti_im[p] + tj_im[q]
                for k in range(nij, wide):
                    g_re[k] = 0.0
                    g_im[k] = 0.0
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
                    for k in range(wide):
                        x = fi_re[k]
                        y = fi_im[k]
                        ar = c2r + c3r * x - c3i * y
                        ai = c2i + c3r * y + c3i * x
                        v = fj_re[k]
                        w = fj_im[k]
                        p_re[k] = c0r + c1r * x - c1i * y + ar * v - ai * w
                        p_im[k] = c0i + c1r * y + c1i * x + ar * w + ai * v
                    _add_log(wide, a.real, a.imag, p_re, p_im, g_re, g_im, low)
                for k in range(wide):
                    m = exp(g_re[k])
                    sine, cosine = sincos(g_im[k])
                    size_g[k] = m
                    g_re[k] = m * cosine
                    g_im[k] = m * sine

                weight = 1.0 + 0.0j
                for u in range(outer):
                    before[u] = weight
                    weight *= w_outer[u, b]
                u_re = weight.real
                u_im = weight.imag
                for k in range(wide):
                    plane_re[k] += u_re * g_re[k] - u_im * g_im[k]
                    plane_im[k] += u_re * g_im[k] + u_im * g_re[k]
                re, im, inner_abs, inner_square = sums(fw_re, fw_im, fw_abs, g_re, g_im, size_g, wide)
                m = abs(weight)
                total_abs += m * inner_abs
                total_square += m * m * inner_square
                behind = complex(re, im)
                for u in range(outer - 1, -1, -1):
                    marginal[u, digits[u, b]] += before[u] * behind
                    behind *= w_outer[u, b]
            start += size

        for p in range(ni):
            for q in range(nj):
                value = complex(plane_re[p * nj + q], plane_im[p * nj + q])
                marginal[outer, p] += value * (weights[chord_j, q] if pair == 2 else 1.0 + 0.0j)
                if pair == 2:
                    marginal[outer + 1, q] += value * weights[chord_i, p]
        out_abs[c] = total_abs
        out_square[c] = total_square
        least = np.inf
        for k in range(area):
            least = min(least, low[k])
        out_least[c] = least
