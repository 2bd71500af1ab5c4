r"""Interpolation in Chebyshev polynomials with moments that are meromorphic in Y.

Let ``y`` run over [-1, 1] as x runs over [-a, 1], a >= 0.  The moments

    ``M_k(Y) = f.p. int_0^1 x^(Y-1) T_k(y(x)) dx``

continue to every Y but 0, -1, -2, ..., and integrating by parts once with
``T'_{k+1}/(k+1) - T'_{k-1}/(k-1) = 2 T_k`` gives the recurrence

    ``M_{k+1} (Y+k+1)/(k+1) = -2 c M_k - M_{k-1} (k-1-Y)/(k-1) + 1/(k+1) - 1/(k-1)``,  ``c = (1-a)/(1+a)``,

stable forwards for Re Y < 0.  Two choices of sampling:

*overhang*: real Chebyshev nodes on [-a, 1] with a > 0.  The singular point 0 lies inside the interval, so moments
grow like ``k^(-Re Y)`` only (at the end of an interval it would be ``k^(-2 Re Y)``), and all arithmetic stays real.

*ellipse*: nodes on the Bernstein ellipse with parameter rho_e > 1 around [0, 1].  Coefficient k is then known to
round-off times ``rho_e^-k``, which tames the growth of the moments; the price is that nodes come closer to the
singularities of the integrand.

Source: Chebyshev interpolation and product integration with modified moments, common practice (see Trefethen,
*Approximation Theory and Approximation Practice*, for coefficients on ellipses).
"""

from __future__ import annotations

from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .base import (
    NullGroup,
    PoleDistance,
    Rule,
    bent,
    circle_fourier,
    circle_points,
    ellipse_parameter,
    symmetric_bend,
)

NOISE = 2.0  # rounding units that moments and phases are taken to be off


def chebyshev_moments(y: PoleDistance, a: float, count: int) -> NDArray[Any]:
    """``M_k``, k < count (at least 3), for the interval [-a, 1]."""
    shifts = y.shifts(count + 1)
    moments = np.empty(count, dtype=shifts.dtype)
    slope, offset = 2.0 / (1.0 + a), -(1.0 - a) / (1.0 + a)  # y = slope x + offset
    i0, i1, i2 = 1.0 / shifts[0], 1.0 / shifts[1], 1.0 / shifts[2]
    moments[0] = i0
    moments[1] = slope * i1 + offset * i0
    moments[2] = 2 * (slope * slope * i2 + 2 * slope * offset * i1 + offset * offset * i0) - i0
    value = shifts[0]
    for k in range(2, count - 1):
        right = 2.0 * offset * moments[k] - moments[k - 1] * (k - 1 - value) / (k - 1) + 1.0 / (k + 1) - 1.0 / (k - 1)
        moments[k + 1] = right * (k + 1) / shifts[k + 1]
    return moments


@lru_cache(maxsize=256)
def overhang_bend(size: int, reach: float) -> tuple[float, float, float]:
    """Bend b, overhang a in x, and Bernstein parameter for real nodes on ``t`` in ``[-reach/size, 1]``.

    b is chosen so that the images of ``t = -1/size`` and of infinity are equally far from [-a, 1].
    """
    tau = reach / size

    def gap(b: float) -> float:
        a = tau * (1 + b) / (1 - b * tau)
        left = (1 + b) / (size - b) - a
        return left - 1.0 / b

    low, high = 1e-9, size * (1 - 1e-12)
    for _ in range(200):
        mid = 0.5 * (low + high)
        if gap(mid) < 0:
            low = mid
        else:
            high = mid
    b = 0.5 * (low + high)
    a = tau * (1 + b) / (1 - b * tau)
    return b, a, ellipse_parameter((1.0 / b) / (1.0 + a))


def _overhang(y: PoleDistance, size: int, count: int, reach: float) -> Rule:
    bend, a, rho = overhang_bend(size, reach)
    moments = chebyshev_moments(y, a, count + 3)
    waves = circle_fourier(2 * count)[:count, :count].real * (
        2 * count
    )  # cos(k theta_j), theta_j = pi (2j+1)/(2 count)
    coefficients = waves * (2.0 / count)
    coefficients[0] *= 0.5
    weights = moments[:count] @ coefficients
    noise = NOISE * (np.abs(moments[:count]) @ np.abs(coefficients))
    # an error in coefficient k >= count costs |M_k| directly and |M_(2 count - k)| by aliasing
    scale = float(np.abs(moments[count - 3 : count + 3]).max()) * 2.0
    nulls = coefficients[[count - 1, count - 2, count - 3, count - 4]] * (scale / (1.0 - 1.0 / rho))
    x = 0.5 * (1.0 + a) * (waves[1] + 1.0) - a
    y1 = y.plus(1)
    t, weights = bent(x, weights, y1, bend)
    noise = np.abs(bent(x, noise, y1, bend)[1]) + 4.0 * np.abs(weights)
    _, nulls = bent(x, nulls, y1, bend)
    return Rule(
        kind="overhang",
        nodes=t,
        weights=weights,
        nulls=nulls,
        groups=(NullGroup(0, 1.0 / rho, 1.0),),
        amplification=float(np.abs(weights).sum()),
        noise=noise,
        parameters=(("nodes", count), ("reach", reach)),
    )


def _ellipse(y: PoleDistance, size: int, count: int, rho_e: float) -> Rule:
    bend = symmetric_bend(size)
    rho = ellipse_parameter(1.0 / bend)
    moments = chebyshev_moments(y, 0.0, count + 1)
    k = np.arange(count)
    # F[k] G = rho_e^k times the coefficient of w^k on |w| = rho_e, aliased with k - count
    points, fourier = circle_points(count), circle_fourier(count)
    # the interpolant's coefficients c_k: pairs (k, count - k) share two equations; the half-step in the angle makes
    # w^count = -rho_e^count, hence the minus signs
    damp = rho_e ** (-2.0 * k)
    scaled = np.empty_like(fourier)  # rho_e^k c_k
    scaled[0] = fourier[0]
    det = 1.0 - rho_e ** (-2.0 * count)
    for m in range(1, count):
        scaled[m] = 2.0 * (fourier[m] + damp[count - m] * fourier[count - m]) / det
    middle = count // 2
    scaled[middle] = 2.0 * fourier[middle] / (1.0 - rho_e ** (-count))
    tamed = moments[:count] * rho_e ** (-k.astype(float))
    weights = tamed @ scaled
    noise = NOISE * (np.abs(tamed) @ np.abs(scaled))
    ratio = rho_e / rho
    scale = float((np.abs(tamed) * np.minimum(1.0, ratio) ** k).sum()) + float(abs(tamed[-1]))
    nulls = scaled[[count - 1, count - 2, count - 3, count - 4]] * (scale / max(1e-3, 1.0 - ratio))
    x = 0.5 + 0.25 * (rho_e * points + points.conj() / rho_e)
    y1 = y.plus(1)
    t, weights = bent(x, weights, y1, bend)
    noise = np.abs(bent(x, noise, y1, bend)[1]) + 4.0 * np.abs(weights)
    _, nulls = bent(x, nulls, y1, bend)
    return Rule(
        kind="ellipse",
        nodes=t,
        weights=weights,
        nulls=nulls,
        groups=(NullGroup(0, ratio, 1.0),),
        amplification=float(np.abs(weights).sum()),
        noise=noise,
        conjugate_pairs=y.is_real,
        parameters=(("nodes", count), ("rho", rho_e)),
    )


def chebyshev_rule(y: PoleDistance, size: int, count: int, reach: float = 0.0, rho: float = 1.0) -> Rule:
    """An interpolatory rule with ``count`` nodes for ``t^(Y-1)``, any Y but 0, -1, -2, ...

    Parameters
    ----------
    y, size, count
        As for the other families.
    reach
        Real nodes down to ``t = -reach/size`` (0 < reach < 1/2); with ``rho = 1``.
    rho
        Parameter of the sampling ellipse around [0, 1] in the bent variable, above 1; with ``reach = 0``.
    """
    if (rho > 1.0) == (reach > 0.0):
        raise ValueError("give either reach > 0 or rho > 1")
    if rho > 1.0 and count % 2:
        raise ValueError("an ellipse takes an even number of nodes, so that they come in conjugate pairs")
    return _ellipse(y, size, count, rho) if rho > 1.0 else _overhang(y, size, count, reach)
