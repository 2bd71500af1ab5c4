"""A quadrature rule for a plane with punctures: Voronoi cells in logarithmic polar coordinates.

The plane is cut into the Voronoi cells of its punctures, inside an outer circle about the first puncture; a disc about
every puncture is left out.  A cell is star-shaped about its puncture p, so its points are p + e^s u(theta) with s from
the logarithm of the excluded radius to that of the boundary:

                 \\   arc of the outer circle   /
                  \\___________________________/
                   |            .'           |
        bisector   |        (excluded        |  bisector
                   |          disc)          |

A boundary piece on a bisector (half distance h, direction phi of the neighbour) is parametrised by sigma with
tan(theta - phi) = sinh sigma, R = h cosh sigma, dtheta = dsigma / cosh sigma, which spreads the far part of a long
bisector evenly; a piece on the circle by theta itself.  Gauss-Legendre in every piece; long pieces are split.
The pieces do not depend on the orders, so the sums over one piece can be compared between orders.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit

from .vecmath import exp, log, sincos

_JIT: Any = {"cache": True, "nogil": True, "error_model": "numpy", "fastmath": {"contract"}}

# Longest pieces, in sigma, in theta, and in the logarithm of the radius.
_SIGMA, _ARC, _RADIAL = 1.4, 1.2, 1.2
# Distance of the nearest singularity from the real axis that the thinning of short pieces assumes.
_CLEAR_ANGULAR, _CLEAR_RADIAL = 1.0, 0.8
_TINY = 1e-13

# Columns of the table of rays.
CELL, UX, UY, START, LENGTH, WEIGHT, PIECES, ORDER, PIECE = range(9)
COLUMNS = 9
MAX_BREAKS = 128


@njit(**_JIT)
def _asinh(x):
    """Inverse hyperbolic sine; the sums of rays spend their time here, and the library function is a slow call."""
    size = log(abs(x) + np.sqrt(x * x + 1.0))
    return -size if x < 0.0 else size


@njit(**_JIT)
def _order(full, length, longest, clear):
    """Nodes for a piece as accurate as ``full`` nodes on the longest one: equal exponents of geometric convergence.

    Never below half: two nodes more on the longest piece are then one more on every piece, and comparing two orders
    tests all pieces.
    """
    if length >= longest:
        return full
    ratio = _asinh(2.0 * clear / longest) / _asinh(2.0 * clear / max(length, 1e-3))
    return max(2, min(full, int(np.ceil(full * max(ratio, 0.5)))))


@njit(**_JIT)
def _circle(ux, uy, cx, cy, outer):
    """Distance to the outer circle, centre (cx, cy), along a unit vector."""
    along = cx * ux + cy * uy
    across = cx * uy - cy * ux
    return along + np.sqrt(max(outer * outer - across * across, 0.0))


@njit(**_JIT)
def rays(d, slots, k, excluded, outer, half, angular, radial, gauss_x, gauss_w, table):
    """Fill the table of rays of a plane.

    Parameters
    ----------
    d : (S, S) complex
        Differences of coordinates, ``d[s, t] = w_s - w_t``.
    slots : (k,) int
        The punctures of this plane; the outer circle is centred at the first.
    excluded : (k,)
        Radii left out about the punctures.
    outer : float
        Radius of the outer circle.
    half : bool
        Only directions with non-negative imaginary part (all punctures real).
    angular, radial : int
        Gauss-Legendre orders of the longest pieces.
    gauss_x, gauss_w : (orders, nodes)
        Nodes and weights on (0, 1).
    table : (rows, COLUMNS)
        Output: cell, direction, log of the excluded radius, log of the boundary over it, angular weight, number and
        order of the radial pieces, number of the boundary piece.

    Returns
    -------
    int, int
        Rays, boundary pieces.  Rays -1 when the table is too small.
    """
    h = np.empty(k)
    phi = np.empty(k)
    nx = np.empty(k)
    ny = np.empty(k)
    breaks = np.empty(MAX_BREAKS)
    kinds = np.empty(MAX_BREAKS, dtype=np.int64)
    rows = 0
    piece = 0
    for i in range(k):
        cx = d[slots[0], slots[i]].real
        cy = d[slots[0], slots[i]].imag
        for j in range(k):
            if j != i:
                x = d[slots[j], slots[i]]
                size = abs(x)
                h[j] = 0.5 * size
                phi[j] = np.arctan2(x.imag, x.real)
                nx[j] = x.real / size
                ny[j] = x.imag / size
        # every direction in which the active constraint may change
        count = 0
        for j in range(k):
            if j == i:
                continue
            for m in range(j + 1, k):
                if m == i:
                    continue
                det = nx[j] * ny[m] - ny[j] * nx[m]
                if abs(det) > _TINY:
                    vx = (h[j] * ny[m] - h[m] * ny[j]) / det
                    vy = (nx[j] * h[m] - nx[m] * h[j]) / det
                    breaks[count] = np.arctan2(vy, vx)
                    count += 1
            across = h[j] - (cx * nx[j] + cy * ny[j])
            rest = outer * outer - across * across
            if rest > 0.0:
                rest = np.sqrt(rest)
                for sign in (-1.0, 1.0):
                    vx = cx + across * nx[j] - sign * rest * ny[j]
                    vy = cy + across * ny[j] + sign * rest * nx[j]
                    breaks[count] = np.arctan2(vy, vx)
                    count += 1
        if half:
            # directions of [0, pi] only; an angle of -pi is the direction pi
            kept = 0
            for b in range(count):
                if 0.0 < breaks[b] < np.pi:
                    breaks[kept] = breaks[b]
                    kept += 1
            breaks[kept] = 0.0
            breaks[kept + 1] = np.pi
            count = kept + 2
        for b in range(1, count):
            value = breaks[b]
            at = b - 1
            while at >= 0 and breaks[at] > value:
                breaks[at + 1] = breaks[at]
                at -= 1
            breaks[at + 1] = value
        if not half:
            breaks[count] = breaks[0] + 2.0 * np.pi
            intervals = count
        else:
            intervals = count - 1
        for b in range(intervals):
            uy, ux = sincos(0.5 * (breaks[b] + breaks[b + 1]))
            best = -1
            least = _circle(ux, uy, cx, cy, outer)
            for j in range(k):
                if j != i:
                    cosine = nx[j] * ux + ny[j] * uy
                    if cosine > 1e-12 and h[j] < least * cosine:
                        least = h[j] / cosine
                        best = j
            kinds[b] = best
        # merge neighbours with the same constraint; on a full turn begin where it changes
        first = 0
        if not half:
            for b in range(intervals):
                if kinds[b] != kinds[(b - 1) % intervals]:
                    first = b
                    break
        b = 0
        log_e = np.log(excluded[i])
        while b < intervals:
            at = (first + b) % intervals
            kind = kinds[at]
            lo = breaks[at]
            width = breaks[at + 1] - breaks[at]
            b += 1
            while b < intervals and kinds[(first + b) % intervals] == kind:
                nxt = (first + b) % intervals
                width += breaks[nxt + 1] - breaks[nxt]
                b += 1
            hi = lo + width
            if width < _TINY:
                continue
            if kind >= 0:
                # bring both ends next to phi before the tangent
                turn = 2.0 * np.pi * np.round((0.5 * (lo + hi) - phi[kind]) / (2.0 * np.pi))
                start = _asinh(np.tan(lo - turn - phi[kind]))
                stop = _asinh(np.tan(hi - turn - phi[kind]))
                longest = _SIGMA
            else:
                start = lo
                stop = hi
                longest = _ARC
            parts = max(1, int(np.ceil((stop - start) / longest - 1e-9)))
            step = (stop - start) / parts
            order = _order(angular, step, longest, _CLEAR_ANGULAR if kind >= 0 else 0.4)
            for part in range(parts):
                left = start + part * step
                # the radial split follows the longest ray of the piece, so that it is the same for all of them
                top = 0.0
                for probe in range(3):
                    t = left + 0.5 * probe * step
                    if kind >= 0:
                        grown = exp(t)
                        reach = 0.5 * h[kind] * (grown + 1.0 / grown)
                    else:
                        uy, ux = sincos(t)
                        reach = _circle(ux, uy, cx, cy, outer)
                    top = max(top, reach)
                length = max(log(top) - log_e, 0.0)
                pieces = max(1, int(np.ceil(length / _RADIAL - 1e-9)))
                radial_order = _order(radial, length / pieces, _RADIAL, _CLEAR_RADIAL)
                if rows + order > table.shape[0]:
                    return -1, piece
                for q in range(order):
                    t = left + step * gauss_x[order, q]
                    weight = step * gauss_w[order, q]
                    if kind >= 0:
                        grown = exp(t)
                        cosh = 0.5 * (grown + 1.0 / grown)
                        cosine = 1.0 / cosh
                        sine = 0.5 * (grown - 1.0 / grown) * cosine
                        weight *= cosine
                        ux = nx[kind] * cosine - ny[kind] * sine
                        uy = ny[kind] * cosine + nx[kind] * sine
                        reach = h[kind] * cosh
                    else:
                        uy, ux = sincos(t)
                        reach = _circle(ux, uy, cx, cy, outer)
                    row = table[rows]
                    row[CELL] = i
                    row[UX] = ux
                    row[UY] = uy
                    row[START] = log_e
                    row[LENGTH] = max(log(reach) - log_e, 0.0)
                    row[WEIGHT] = weight
                    row[PIECES] = pieces
                    row[ORDER] = radial_order
                    row[PIECE] = piece
                    rows += 1
                piece += 1
    return rows, piece


@njit(**_JIT)
def count_nodes(table, rows):
    """Nodes on the first ``rows`` rays."""
    total = 0
    for r in range(rows):
        total += int(table[r, PIECES]) * int(table[r, ORDER])
    return total


@njit(**_JIT)
def expand(table, rows, gauss_x, gauss_w, cell, offset, weight, piece):
    """Nodes of the rays: own cell, complex offset from its puncture, weight of ``d^2w/pi``, number of the piece."""
    at = 0
    for r in range(rows):
        row = table[r]
        parts = int(row[PIECES])
        order = int(row[ORDER])
        step = row[LENGTH] / parts
        for part in range(parts):
            for q in range(order):
                radius = np.exp(row[START] + step * (part + gauss_x[order, q]))
                cell[at] = int(row[CELL])
                offset[at] = complex(radius * row[UX], radius * row[UY])
                weight[at] = row[WEIGHT] * step * gauss_w[order, q] * radius * radius / np.pi
                piece[at] = int(row[PIECE])
                at += 1
    return at
