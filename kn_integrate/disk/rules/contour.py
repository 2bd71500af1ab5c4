r"""The contour rule: a circle around 0 and the segment from it to 1.

The regularised path (the twisted cycle) from 1 to a circle of radius r, once around 0 and back, divided by
``exp(2 pi i Y) - 1``, is the analytic continuation of ``int_0^1 t^(Y-1) F(t) dt``.  On the circle everything can be
done in closed form: with the Taylor coefficients ``f_k`` of F, known from N samples on ``|t| = r`` by a discrete
Fourier transform,

    ``f.p. int_0^r t^(Y-1) F dt = sum_k f_k r^(Y+k) / (Y+k)``,

which shows the poles and nothing else.  From r to 1 Gauss-Legendre nodes in ``log t`` take over.

Radius.  Let ``r = fraction/size`` with size the number of gaps of the cluster.  A run sum is ``1 + L + R`` with L and R
the parts to the left and right of its largest gap, each ``t_v`` times a partial sum of the subtree of v of modulus at
most ``size(v)`` when all moduli are at most 1.  On the circle of v such a part has modulus at most ``fraction``; on the
segment it is a positive multiple of a partial sum of the same kind one level down, whose real part is at least
``-fraction`` by induction.  Hence every run has real part at least ``1 - 2 fraction``: any subset of the chords may be
on circles at once if ``fraction < 1/2``, and principal logarithms are the right branch.

Source: regularised (twisted) cycles, Aomoto and Kita, *Theory of Hypergeometric Functions*; the trapezoidal rule on
circles, common practice.
"""

from __future__ import annotations

import math
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .base import NullGroup, PoleDistance, Rule, circle_fourier, circle_points


@lru_cache(maxsize=64)
def _legendre(count: int) -> tuple[NDArray[Any], NDArray[Any], NDArray[Any]]:
    nodes, weights = np.polynomial.legendre.leggauss(count)
    k = np.arange(count)
    values = np.polynomial.legendre.legvander(nodes, count - 1).T * np.sqrt(k + 0.5)[:, None]
    return nodes, weights, values


def contour_rule(y: PoleDistance, size: int, circle_count: int, segment_count: int, fraction: float = 0.4) -> Rule:
    """The contour rule for ``t^(Y-1)``, any Y but 0, -1, -2, ...

    Parameters
    ----------
    y, size
        As for the other families.
    circle_count, segment_count
        Nodes on the circle (even, so that they come in conjugate pairs) and on the segment.
    fraction
        Radius times size, below 1/2.
    """
    radius = fraction / size
    value = complex(y.value)
    shifts = y.shifts(circle_count)
    fourier = circle_fourier(circle_count)  # F[k] = f_k radius^k
    power = radius**value
    circle_weights = power * ((1.0 / shifts) @ fourier)
    circle_noise = 2.0 * abs(power) * ((1.0 / np.abs(shifts)) @ np.abs(fourier)) + 4.0 * np.abs(circle_weights)
    # what coefficient k >= circle_count does: it is aliased onto k - circle_count, whose factor is 1/(Y + k - count)
    decay = fraction ** np.arange(circle_count)
    scale = abs(power) * float((decay / np.abs(shifts)).sum())
    circle_nulls = fourier[[-1, -2, -3, -4]] * (scale / (1.0 - fraction))
    circle = radius * circle_points(circle_count)

    half = -0.5 * math.log(radius)
    legendre_x, legendre_w, legendre_p = _legendre(segment_count)
    log_t = half * (legendre_x - 1.0)
    t = np.exp(log_t)
    density = np.exp(log_t * value)
    segment_weights = half * legendre_w * density
    segment_nulls = legendre_p[[-1, -2, -3, -4]] * segment_weights * math.sqrt(2.0)
    # in the variable of the segment the integrand is singular at log(1/size) +- i pi at the nearest
    height = math.pi / half
    centre = (math.log(1.0 / size) + half) / half
    z = complex(min(max(centre, -1.0), 1.0), height)
    root = z + np.sqrt(z * z - 1.0)
    rho = max(abs(root), 1.0 / abs(root))

    count = circle_count + segment_count
    nulls = np.zeros((8, count), dtype=complex)
    nulls[:4, :circle_count] = circle_nulls
    nulls[4:, circle_count:] = segment_nulls
    weights = np.concatenate([circle_weights, segment_weights])
    return Rule(
        kind="contour",
        nodes=np.concatenate([circle, t]),
        weights=weights,
        nulls=nulls,
        groups=(
            NullGroup(0, fraction, 1.0),
            NullGroup(4, 1.0 / rho, segment_count + 1.0),
        ),
        amplification=float(np.abs(weights).sum()),
        # t^Y on the segment is an exponential of Y log t, whose rounding grows with that product
        noise=np.concatenate([circle_noise, (4.0 + 2.0 * abs(value) * np.abs(log_t)) * np.abs(segment_weights)]),
        conjugate_pairs=y.is_real,
        parameters=(("circle", circle_count), ("segment", segment_count), ("fraction", fraction)),
    )
