r"""The disc rule: Taylor coefficients on one circle that reaches from 0 to 1.

In the variable x with ``t = x / (1 + b - b x)`` the circle ``|x| = 1`` passes through ``t = 1`` and
``t = -1/(1 + 2b)``; the singular point 0 is its centre.  With ``b = size/2`` the images of the nearest singularities,
``t = -1/size`` and infinity, both lie at ``|x| = 1 + 2/size``, so the Taylor coefficients ``g_k`` of the integrand
(bent factor included) fall like ``(1 + 2/size)^-k`` and

    ``f.p. int_0^1 x^(Y-1) G dx = sum_k g_k / (Y + k)``

needs no second piece.  The factors ``1/(Y+k)`` never grow, however deep Y is: no rule here is better conditioned.

Two clusters that meet in one run, one on either side of its largest gap, may both be at their leftmost point; then the
run is ``1 - 2/(1 + 2b) + ...``, which vanishes for ``b = 1/2``.  With ``b = size`` (``wide=False``) the circles keep
closer to 0 on the left, runs stay away from zero, and the decay ratio becomes ``1 + 1/size``.

Source: Cauchy's integral by the trapezoidal rule, common practice; the map and the closed form are worked out above.
"""

from __future__ import annotations

import numpy as np

from .base import NullGroup, PoleDistance, Rule, bent, circle_fourier, circle_points


def disc_bend(size: int, wide: bool) -> float:
    """The bend b of the map."""
    return 0.5 * size if wide else float(size)


def disc_decay(size: int, wide: bool) -> float:
    """Ratio of successive Taylor coefficients when nothing else is near."""
    return 1.0 / (1.0 + 1.0 / disc_bend(size, wide))


def disc_rule(y: PoleDistance, size: int, count: int, wide: bool = True) -> Rule:
    """The disc rule with an even number of nodes for ``t^(Y-1)``, any Y but 0, -1, -2, ...

    Parameters
    ----------
    y, size, count
        As for the other families.
    wide
        The large circle, or the one for clusters that face another cluster on a circle.
    """
    bend = disc_bend(size, wide)
    x = circle_points(count)
    shifts = y.shifts(count)
    fourier = circle_fourier(count)
    weights = (1.0 / shifts) @ fourier
    noise = 2.0 * ((1.0 / np.abs(shifts)) @ np.abs(fourier))
    ratio = disc_decay(size, wide)
    # coefficient count + k is taken for coefficient k: the error is g_(count+k) (1/(Y+k) - 1/(Y+count+k))
    scale = float((ratio ** np.arange(count) / np.abs(shifts)).sum())
    y1 = y.plus(1)
    t, weights = bent(x, weights, y1, bend)
    noise = np.abs(bent(x, noise, y1, bend)[1]) + 4.0 * np.abs(weights)
    _, nulls = bent(x, fourier[[-1, -2, -3, -4]] * scale, y1, bend)
    total = float(np.abs(weights).sum())
    return Rule(
        kind="disc",
        nodes=t,
        weights=weights,
        nulls=nulls,
        groups=(NullGroup(0, ratio, 1.0),),
        amplification=total,
        noise=noise,
        conjugate_pairs=y.is_real,
        parameters=(("nodes", count), ("wide", wide)),
    )
