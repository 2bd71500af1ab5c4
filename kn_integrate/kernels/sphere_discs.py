"""Integrals over discs about collisions: chiral Taylor coefficients, poles in closed form.

Close to a collision with disc coordinate q the integrand is ``q^A conj(q)^B f(q) g(conj q)`` with f and g analytic, and

    int_{|q|<r} d^2q/pi q^A conj(q)^B f g = r^{A+B+2} sum_k F_k G_{k+l} / (A + 1 + k),     l = A - B,

F and G the coefficients of f(r x) and g(r x): only terms whose angular dependence cancels survive, and every pole in A
is explicit.  With several discs k is a multi-index and the denominators multiply.  The conjugates of G are the
coefficients of the function with exponents conj(b), so both sets come from the same differences.

One disc: all differences are linear, ``f = prod (1 - c_i x)^{a_i}``, and f'/f gives the recursion

    f_{k+1} = 1/(k+1) sum_{j<=k} b_j f_{k-j},    b_j = - sum_i a_i c_i^{j+1}.

Several: values on a product of circles (principal logarithms: the differences stay within unit distance of 1 there),
then discrete Fourier transforms.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit

from .sphere_rays import CELL, COLUMNS, LENGTH, ORDER, PIECES, START, UX, UY, WEIGHT, rays
from .vecmath import atan_quotient, exp, log, sincos

MAX_TERMS = 128  # Taylor coefficients of one disc
MAX_RAYS = 8192
_JIT: Any = {"cache": True, "nogil": True, "error_model": "numpy", "fastmath": {"contract"}}

# Columns of the results.
RE, IM, ABS, SQUARE, TAIL = range(5)


@njit(**_JIT)
def _powers(d, pairs, e_re, e_im, spin):
    """``prod |D|^e (phase of D)^spin`` over pairs of slots: logarithm of the modulus, phase factor."""
    total = 0.0
    turn = 0.0
    phase = 1.0 + 0.0j
    for p in range(pairs.shape[0]):
        x = d[pairs[p, 0], pairs[p, 1]]
        square = x.real * x.real + x.imag * x.imag
        length = 0.5 * np.log(square)
        total += e_re[p] * length
        turn += e_im[p] * length
        if spin[p] != 0:
            unit = x / np.sqrt(square)
            if spin[p] < 0:
                unit = np.conj(unit)
            for _ in range(abs(spin[p])):
                phase *= unit
    if turn != 0.0:
        phase *= complex(np.cos(turn), np.sin(turn))
    return total, phase


@njit(**_JIT)
def _one_disc(d, r, factors, starts, terms, a, bc, mirror, shift, base, nearest, c, pa, pb, f, h, fa, ha):
    """``sum_k F_k conj(H_{k+l}) / (A+1+k)`` for one disc; value, sum of moduli, what was left out.

    ``base`` is A + 1 + k at k = ``nearest``, exact before it was rounded: the denominator next to a pole keeps its
    digits.
    """
    count = a.shape[0]
    used = 0
    for p in range(count):
        x = 0.0 + 0.0j
        for t in range(starts[p], starts[p + 1]):
            x += terms[t, 3] * d[terms[t, 1], terms[t, 2]]
        c[p] = -x * r / d[factors[p, 0], factors[p, 1]]
        pa[p] = -a[p]
        pb[p] = -bc[p]
        used += 1
    b = np.empty(MAX_TERMS, dtype=np.complex128)
    g = np.empty(MAX_TERMS, dtype=np.complex128)
    f[0] = 1.0
    h[0] = 1.0
    fa[0] = 1.0
    ha[0] = 1.0
    value = 0.0 + 0.0j
    size = 0.0
    last = 0.0
    quiet = 0
    least = max(nearest, max(-shift, 0)) + 2
    for t in range(MAX_TERMS - 1):
        # the terms of the sum that have become available
        k = t - shift if shift > 0 else t
        if k >= 0 and k + shift >= 0:
            den = base + (k - nearest)
            weight = 1.0 / abs(den)
            other = f[k + shift] if mirror else h[k + shift]
            term = f[k] * np.conj(other) / den
            value += term
            last = abs(term)
            bound = fa[k] * (fa[k + shift] if mirror else ha[k + shift]) * weight
            size += max(last, bound)
            if bound <= 2e-17 * size and k >= least:
                quiet += 1
                if quiet >= 3:
                    break
            else:
                quiet = 0
        sum_b = 0.0 + 0.0j
        sum_g = 0.0 + 0.0j
        for p in range(used):
            pa[p] *= c[p]
            sum_b += pa[p]
        b[t] = sum_b
        nxt = 0.0 + 0.0j
        grown = 0.0
        for j in range(t + 1):
            x = b[j] * f[t - j]
            nxt += x
            grown += abs(x.real) + abs(x.imag)
        f[t + 1] = nxt / (t + 1)
        fa[t + 1] = grown / (t + 1)
        if not mirror:
            for p in range(used):
                pb[p] *= c[p]
                sum_g += pb[p]
            g[t] = sum_g
            nxt = 0.0 + 0.0j
            grown = 0.0
            for j in range(t + 1):
                x = g[j] * h[t - j]
                nxt += x
                grown += abs(x.real) + abs(x.imag)
            h[t + 1] = nxt / (t + 1)
            ha[t + 1] = grown / (t + 1)
    if quiet >= 3:
        last = 0.0
    return value, size, last


@njit(**_JIT)
def _transform(values, outer, length, inner, kept, cosine, sine, result):
    """Discrete Fourier coefficients 0..kept-1 along the middle axis of (outer, length, inner)."""
    for o in range(outer):
        for k in range(kept):
            row = result[(o * kept + k) * inner : (o * kept + k + 1) * inner]
            row[:] = 0.0
            for m in range(length):
                at = (k * m) % length
                w = complex(cosine[at], -sine[at]) / length
                source = values[(o * length + m) * inner : (o * length + m + 1) * inner]
                for b in range(inner):
                    row[b] += w * source[b]


@njit(**_JIT)
def _coefficients(values, edges, length, kept, cosine, sine, work):
    """Multi-dimensional transform; the result is left in the first kept^edges entries of ``values``."""
    outer = 1
    inner = length**edges
    for _ in range(edges):
        inner //= length
        _transform(values, outer, length, inner, kept, cosine, sine, work)
        outer *= kept
        values[: outer * inner] = work[: outer * inner]


@njit(**_JIT)
def _torus(
    d, r, edge_slots, factors, starts, terms, a, bc, mirror, shifts, base, nearest, length, kept,
    phase_re, phase_im, cosine, sine, work_re, work_im, log_re, log_im, f, h, work,
):  # fmt: skip
    """The sum over a multi-index for two or more discs; value, sum of moduli with round-off of the transform."""
    edges = edge_slots.shape[0]
    grid = length**edges
    for q in range(grid):
        work_re[q] = 0.0
        work_im[q] = 0.0
        log_re[q] = 0.0
        log_im[q] = 0.0
    for p in range(a.shape[0]):
        d0 = d[factors[p, 0], factors[p, 1]]
        for q in range(grid):
            f[q] = 1.0
        for t in range(starts[p], starts[p + 1]):
            mask = terms[t, 0]
            coefficient = terms[t, 3] * d[terms[t, 1], terms[t, 2]] / d0
            for e in range(edges):
                if mask >> e & 1:
                    coefficient *= r[edge_slots[e]]
            x = coefficient.real
            y = coefficient.imag
            for q in range(grid):
                u = phase_re[mask, q]
                v = phase_im[mask, q]
                f[q] += complex(x * u - y * v, x * v + y * u)
        ar = a[p].real
        ai = a[p].imag
        br = bc[p].real
        bi = bc[p].imag
        for q in range(grid):
            u = f[q].real
            v = f[q].imag
            lr = 0.5 * log(u * u + v * v)
            li = atan_quotient(v, u)
            work_re[q] += ar * lr - ai * li
            work_im[q] += ar * li + ai * lr
            log_re[q] += br * lr - bi * li
            log_im[q] += br * li + bi * lr
    f_size = 0.0
    h_size = 0.0
    for q in range(grid):
        m = exp(work_re[q])
        s, c = sincos(work_im[q])
        f[q] = complex(m * c, m * s)
        f_size += m * m
        m = exp(log_re[q])
        s, c = sincos(log_im[q])
        h[q] = complex(m * c, m * s)
        h_size += m * m
    f_size = np.sqrt(f_size / grid)
    h_size = np.sqrt(h_size / grid)
    _coefficients(f, edges, length, kept, cosine, sine, work)
    if mirror:
        for q in range(kept**edges):
            h[q] = f[q]
    else:
        _coefficients(h, edges, length, kept, cosine, sine, work)
    value = 0.0 + 0.0j
    size = 0.0
    for q in range(kept**edges):
        rest = q
        other = 0
        scale = 1
        den = 1.0 + 0.0j
        inside = True
        for e in range(edges - 1, -1, -1):
            k = rest % kept
            rest //= kept
            m = k + shifts[e]
            inside = inside and 0 <= m < kept
            other += m * scale
            scale *= kept
            den *= base[e] + (k - nearest[e])
        if inside:
            value += f[q] * np.conj(h[other]) / den
            size += (abs(f[q]) * abs(h[other]) + f_size * abs(h[other]) + abs(f[q]) * h_size) / abs(den)
    return value, size


@njit(**_JIT)
def disc_sums(
    d, radius, slots, excluded, outer, half, angular, radial, gauss_x, gauss_w,
    pairs, e_re, e_im, spin, edge_slots, powers_re, powers_im, shifts, base, nearest,
    factors, starts, terms, a, bc, mirror, length, kept, out,
):  # fmt: skip
    """Integrals over all discs of a tree, for many states, and over the last point's bulk coordinate if it has one.

    Parameters
    ----------
    d, radius : (M, S, S), (M, S)
        Differences of slots and radii of edges.  When the last point y is in the bulk of a chart its slot is the last
        one, and its differences are filled in here.
    slots : (k,) int
        The punctures of the plane of y; empty when y sits in a disc.
    excluded, outer, half, angular, radial, gauss_x, gauss_w
        As for :func:`.sphere_bulk.plane_sums`.
    pairs, e_re, e_im, spin
        Pairs of slots, and exponents of the constant parts of the differences from y.
    edge_slots : (E,)
    powers_re, powers_im, shifts, base, nearest : (E,)
        A + B + 2; l; A + 1 + k at the integer k = nearest next to its zero.
    factors, starts, terms, a, bc : (P, 2), (P+1,), (T, 4), (P,), (P,)
        Differences that depend on disc coordinates: slots of the constant part, terms (mask, slot, origin, sign),
        exponents a and conj(b).
    mirror : bool
        conj(b) = a for all pairs.
    length, kept : int
        Nodes on every circle and coefficients kept (two or more discs).
    out : (M, 5)
        Real and imaginary part, sum of moduli, sum of squared moduli, sum of what Taylor series left out.

    Returns
    -------
    int
        Evaluations (states and nodes), negative when a table was too small.
    """
    edges = edge_slots.shape[0]
    size = d.shape[1]
    k = slots.shape[0]
    count = a.shape[0]
    c = np.empty(count, dtype=np.complex128)
    pa = np.empty(count, dtype=np.complex128)
    pb = np.empty(count, dtype=np.complex128)
    fa = np.empty(MAX_TERMS)
    ha = np.empty(MAX_TERMS)
    grid = length**edges if edges > 1 else MAX_TERMS
    f = np.empty(grid, dtype=np.complex128)
    h = np.empty(grid, dtype=np.complex128)
    work = np.empty(grid, dtype=np.complex128)
    work_re = np.empty(grid)
    work_im = np.empty(grid)
    log_re = np.empty(grid)
    log_im = np.empty(grid)
    cosine = np.empty(length)
    sine = np.empty(length)
    for q in range(length):
        cosine[q] = np.cos(2.0 * np.pi * q / length)
        sine[q] = np.sin(2.0 * np.pi * q / length)
    masks = 1 << edges if edges > 1 else 1
    phase_re = np.empty((masks, grid))
    phase_im = np.empty((masks, grid))
    if edges > 1:
        for mask in range(masks):
            for q in range(grid):
                rest = q
                turn = 0
                for e in range(edges - 1, -1, -1):
                    if mask >> e & 1:
                        turn += rest % length
                    rest //= length
                phase_re[mask, q] = cosine[turn % length]
                phase_im[mask, q] = sine[turn % length]
    table = np.empty((MAX_RAYS if k else 1, COLUMNS))
    here = np.empty((size, size), dtype=np.complex128)
    nodes = 0
    for m in range(d.shape[0]):
        result = out[m]
        result[:] = 0.0
        here[:, :] = d[m]
        rows = 1
        if k:
            rows, _ = rays(here, slots, k, excluded[m], outer[m], half, angular, radial, gauss_x, gauss_w, table)
            if rows < 0:
                return -1
        fixed_re = 0.0
        fixed_im = 0.0
        for e in range(edges):
            length_log = np.log(radius[m, edge_slots[e]])
            fixed_re += powers_re[e] * length_log
            fixed_im += powers_im[e] * length_log
        for ray in range(rows):
            row = table[ray]
            parts = int(row[PIECES]) if k else 1
            order = int(row[ORDER]) if k else 1
            step = row[LENGTH] / parts
            for part in range(parts):
                for q in range(order):
                    weight = 1.0
                    if k:
                        reach = np.exp(row[START] + step * (part + gauss_x[order, q]))
                        weight = row[WEIGHT] * step * gauss_w[order, q] * reach * reach / np.pi
                        own = slots[int(row[CELL])]
                        offset = complex(reach * row[UX], reach * row[UY])
                        for j in range(k):
                            t = slots[j]
                            gap = offset if t == own else offset + here[own, t]
                            here[size - 1, t] = gap
                            here[t, size - 1] = -gap
                    modulus, phase = _powers(here, pairs, e_re, e_im, spin)
                    modulus += fixed_re
                    if fixed_im != 0.0:
                        phase *= complex(np.cos(fixed_im), np.sin(fixed_im))
                    left = 0.0
                    if edges == 1:
                        value, total, left = _one_disc(
                            here, radius[m, edge_slots[0]], factors, starts, terms, a, bc, mirror,
                            shifts[0], base[0], nearest[0], c, pa, pb, f, h, fa, ha,
                        )  # fmt: skip
                    else:
                        value, total = _torus(
                            here, radius[m], edge_slots, factors, starts, terms, a, bc, mirror,
                            shifts, base, nearest, length, kept, phase_re, phase_im, cosine, sine,
                            work_re, work_im, log_re, log_im, f, h, work,
                        )  # fmt: skip
                    weight *= np.exp(modulus)
                    value *= weight * phase
                    total *= weight
                    result[RE] += value.real
                    result[IM] += value.imag
                    result[ABS] += total
                    result[SQUARE] += total * total
                    result[TAIL] += weight * left
                    nodes += 1
    return nodes
