"""The innermost plane without discs: sums of products of powers over the nodes of a Voronoi-polar rule.

Nodes are gathered into blocks, structure of arrays, so that the logarithms and the exponential run over vector
registers.  The difference to the puncture of a node's own cell is the offset itself and all others are a difference of
punctures plus that offset: no coordinates are subtracted, so nested clusters keep their digits.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit

from .sphere_rays import CELL, COLUMNS, LENGTH, ORDER, PIECE, PIECES, START, UX, UY, WEIGHT, rays
from .vecmath import exp, log, sincos

BLOCK = 512
MAX_RAYS = 8192

_JIT: Any = {"cache": True, "nogil": True, "error_model": "numpy", "fastmath": {"contract"}}


@njit(**_JIT)
def _flush(size, cell, k, gap_x, gap_y, real, imag, spins, any_spin, any_imag, dx, dy, lr, w, acc, ph, zx, zy, out):
    """Add the first ``size`` nodes of a block, all in one cell: value, sum of moduli, sum of squared moduli."""
    e = real[cell] + 2.0
    for q in range(size):
        acc[q] = e * lr[q]
    for j in range(k):
        e = 0.5 * real[j]
        if j != cell and e != 0.0:
            gx = gap_x[cell, j]
            gy = gap_y[cell, j]
            for q in range(size):
                x = gx + dx[q]
                y = gy + dy[q]
                acc[q] += e * log(x * x + y * y)
    if not any_spin and not any_imag:
        total = 0.0
        square = 0.0
        for q in range(size):
            acc[q] = w[q] * exp(acc[q])
        for q in range(size):
            total += acc[q]
            square += acc[q] * acc[q]
        out[0] += total
        out[2] += total
        out[3] += square
        return
    for q in range(size):
        zx[q] = 1.0
        zy[q] = 0.0
    if any_imag:
        e = imag[cell]
        for q in range(size):
            ph[q] = e * lr[q]
        for j in range(k):
            e = 0.5 * imag[j]
            if j != cell and e != 0.0:
                gx = gap_x[cell, j]
                gy = gap_y[cell, j]
                for q in range(size):
                    x = gx + dx[q]
                    y = gy + dy[q]
                    ph[q] += e * log(x * x + y * y)
        for q in range(size):
            y, x = sincos(ph[q])
            zx[q] = x
            zy[q] = y
    for j in range(k):
        spin = spins[j]
        sign = 1.0 if spin > 0 else -1.0
        gx = gap_x[cell, j]
        gy = gap_y[cell, j]
        for _ in range(abs(spin)):
            for q in range(size):
                x = gx + dx[q]
                y = sign * (gy + dy[q])
                # the unit phase: moduli are in the logarithms, which keeps large spins from overflowing
                norm = 1.0 / np.sqrt(x * x + y * y)
                a = zx[q]
                b = zy[q]
                zx[q] = (a * x - b * y) * norm
                zy[q] = (a * y + b * x) * norm
    re = 0.0
    im = 0.0
    size_sum = 0.0
    square = 0.0
    for q in range(size):
        acc[q] = w[q] * exp(acc[q])
    for q in range(size):
        m = acc[q]
        re += m * zx[q]
        im += m * zy[q]
        size_sum += m
        square += m * m
    out[0] += re
    out[1] += im
    out[2] += size_sum
    out[3] += square


@njit(**_JIT)
def plane_sums(d, slots, excluded, outer, half, angular, radial, gauss_x, gauss_w, real, imag, spins, fine, out):
    """Integrals of ``prod_t |y - w_t|^{e_t} (phase of (y - w_t))^{l_t} d^2y/pi`` over the bulk of many planes.

    Parameters
    ----------
    d : (M, S, S) complex
        Differences of coordinates in every state.
    slots : (k,) int
        Punctures of the plane.
    excluded, outer : (M, k), (M,)
        Radii left out, radius of the outer circle.
    half, angular, radial, gauss_x, gauss_w
        As for :func:`.sphere_rays.rays`.
    real, imag, spins : (k,)
        Exponents ``e_t`` of the moduli and integer spins ``l_t``.
    fine : bool
        For one state: a row of sums for each boundary piece instead of one for the state.
    out : (M or pieces, 4)
        Real and imaginary part, sum of moduli, sum of squared moduli; zero on entry.

    Returns
    -------
    int
        Nodes, negative when a table was too small.
    """
    k = slots.shape[0]
    table = np.empty((MAX_RAYS, COLUMNS))
    gap_x = np.empty((k, k))
    gap_y = np.empty((k, k))
    dx = np.empty(BLOCK)
    dy = np.empty(BLOCK)
    lr = np.empty(BLOCK)
    w = np.empty(BLOCK)
    acc = np.empty(BLOCK)
    ph = np.empty(BLOCK)
    zx = np.empty(BLOCK)
    zy = np.empty(BLOCK)
    any_spin = False
    any_imag = False
    for j in range(k):
        any_spin = any_spin or spins[j] != 0
        any_imag = any_imag or imag[j] != 0.0
    nodes = 0
    for m in range(d.shape[0]):
        rows, _ = rays(d[m], slots, k, excluded[m], outer[m], half, angular, radial, gauss_x, gauss_w, table)
        if rows < 0:
            return -1
        for i in range(k):
            for j in range(k):
                x = d[m, slots[i], slots[j]]
                gap_x[i, j] = x.real if i != j else 0.0
                gap_y[i, j] = x.imag if i != j else 0.0
        result = out[m]
        size = 0
        cell = 0
        piece = 0
        for r in range(rows):
            row = table[r]
            parts = int(row[PIECES])
            order = int(row[ORDER])
            if int(row[CELL]) != cell or size + parts * order > BLOCK or (fine and int(row[PIECE]) != piece):
                for q in range(size):
                    lr_q = exp(lr[q])
                    dx[q] *= lr_q
                    dy[q] *= lr_q
                _flush(
                    size, cell, k, gap_x, gap_y, real, imag, spins, any_spin, any_imag,
                    dx, dy, lr, w, acc, ph, zx, zy, result,
                )  # fmt: skip
                nodes += size
                size = 0
                cell = int(row[CELL])
                if fine:
                    piece = int(row[PIECE])
                    if piece >= out.shape[0]:
                        return -1
                    result = out[piece]
            step = row[LENGTH] / parts
            weight = row[WEIGHT] * step / np.pi
            for part in range(parts):
                base = row[START] + step * part
                for q in range(order):
                    lr[size] = base + step * gauss_x[order, q]
                    w[size] = weight * gauss_w[order, q]
                    dx[size] = row[UX]
                    dy[size] = row[UY]
                    size += 1
        for q in range(size):
            lr_q = exp(lr[q])
            dx[q] *= lr_q
            dy[q] *= lr_q
        _flush(
            size, cell, k, gap_x, gap_y, real, imag, spins, any_spin, any_imag,
            dx, dy, lr, w, acc, ph, zx, zy, result,
        )  # fmt: skip
        nodes += size
    return nodes
