r"""Residue functionals: the Taylor coefficient that stands at a pole of ``int_0^1 t^(Y-1) F(t) dt``.

Near ``Y = -N`` the integral is ``F_N / (Y + N)`` plus something regular, ``F_N`` the coefficient of ``t^N`` in F.  So
the residue of an integral in a chord exponent is the same sum over sectors, restricted to those whose tree has the
chord, with the weights of its variable replaced by a Taylor functional: for N = 0 the single node t = 0, else the
trapezoidal rule on the circle of the disc rule.  No limit is taken anywhere.

In the variable x with ``t = x/(1+b-bx)``: ``F_N`` is the coefficient of ``x^N`` in ``(1+b) (1+b-bx)^(N-1) F``, because
residues do not depend on the variable.

Source: Cauchy's formula by the trapezoidal rule, common practice.
"""

from __future__ import annotations

import numpy as np

from .base import NullGroup, Rule, bent, circle_fourier, circle_points
from .disc import disc_bend, disc_decay


def residue_rule(level: int, size: int, count: int, wide: bool = True) -> Rule:
    """The functional ``F -> F_N`` for ``N = level``.

    Parameters
    ----------
    level
        N >= 0.
    size
        Number of gaps in the cluster of the chord.
    count
        Number of nodes on the circle, even and above ``level``; 1 is enough for level 0.
    wide
        The large circle, or the one for clusters that face another cluster on a circle.
    """
    if level == 0:
        nothing = np.zeros((4, 1))
        return Rule("residue", np.zeros(1), np.ones(1), nothing, (NullGroup(0, 0.0, 1.0),), 1.0, np.zeros(1))
    bend = disc_bend(size, wide)
    x, fourier = circle_points(count), circle_fourier(count)
    t, weights = bent(x, fourier[level], 1.0 - level, bend)
    # coefficient count + N is taken for coefficient N
    _, nulls = bent(x, fourier[[-1, -2, -3, -4]], 1.0 - level, bend)
    return Rule(
        kind="residue",
        nodes=t,
        weights=weights,
        nulls=nulls,
        groups=(NullGroup(0, disc_decay(size, wide), level + 1.0),),
        amplification=float(np.abs(weights).sum()),
        noise=6.0 * np.abs(weights),
        conjugate_pairs=True,
        parameters=(("nodes", count), ("level", level), ("wide", wide)),
    )
