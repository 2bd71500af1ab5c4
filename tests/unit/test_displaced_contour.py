r"""The integral of one puncture along the real line, displaced into the upper half plane, vanishes.

For fixed other punctures the integrand ``prod_j (z - z_j)^{s_j} / ...`` is analytic above the real axis and falls like
``z^-2`` (Moebius weight), so ``int dz`` along ``Im z = d`` is zero for every d > 0.  As d -> 0 the factor
``(z - z_j)^{s_j}`` becomes ``|z - z_j|^{s_j}`` times ``exp(i pi s_j)`` for z left of z_j: the phases of the monodromy
relations (Plahte 1970), derived here by numbers instead of assumed: the displaced integral is computed by the
trapezoidal rule, its pieces by the disk engine.
"""

from __future__ import annotations

import cmath
import math
from fractions import Fraction

import numpy as np
import pytest

import kn_integrate as kn

PI = math.pi


def along(shift: float, places, powers, count: int = 4000):
    """int dz prod_j (z - z_j)^{powers_j} along Im z = shift, principal branches; z = c + w tan(theta), trapezoidal."""
    center = sum(places) / len(places)
    theta = (np.arange(count) + 0.5) * PI / count - PI / 2
    width = 1.0
    z = center + width * np.tan(theta) + 1j * shift
    log = sum(p * np.log(z - place) for place, p in zip(places, powers, strict=True))
    jacobian = width / np.cos(theta) ** 2
    return complex((np.exp(log) * jacobian).sum() * PI / count)


@pytest.mark.parametrize("shift", [0.4, 0.7, 1.5])
def test_the_displaced_integral_vanishes(shift):
    # four points: z_2 along the line, z_1 = 0, z_3 = 1, z_4 = infinity; powers add up to -2 + (power at infinity)
    a, b = -0.7, -0.8
    value = along(shift, [0.0, 1.0], [a, b], 200_000)
    # the integrand falls like |z|^(a+b): the part beyond the grid is bounded by the last cell
    tail = (200_000 / PI) ** (1 + a + b)
    assert abs(value) < 10 * tail
    five = along(shift, [0.0, 0.4, 1.0], [-0.9, -0.8, -1.0], 20_000)
    assert abs(five) < 1e-4


def test_four_point_monodromy_from_the_displaced_line():
    # pieces of the real line with the phases that the displaced integrand has there: exp(i pi s_j) left of z_j
    s12, s23 = Fraction(3, 10), Fraction(9, 20)
    kin = kn.Mandelstams.from_planar(4, {(1, 2): s12, (2, 3): s23})
    f = kn.parke_taylor(1, 2, 3, 4)
    z1234 = kn.disk_integral(kin, f, ordering=(1, 2, 3, 4))
    z2134 = kn.disk_integral(kin, f, ordering=(2, 1, 3, 4))
    z1324 = kn.disk_integral(kin, f, ordering=(1, 3, 2, 4))
    # phases found by following (z - z_j)^s along the line z = x + i d from right to left, not put in by hand
    phases = {}
    for name, x in (("right", 2.0), ("middle", 0.5), ("left", -1.0)):
        z = complex(x, 1e-12)
        phases[name] = cmath.exp(1j * (float(s12) * cmath.phase(z) + float(s23) * cmath.phase(z - 1)))
    total = phases["left"] * z2134.value + phases["middle"] * z1234.value + phases["right"] * z1324.value
    bound = z1234.error + z2134.error + z1324.error
    assert abs(total) <= bound + 1e-11 * abs(z1234.value)


def test_five_point_monodromy_from_the_displaced_line():
    kin = kn.Mandelstams.from_planar(5, {(1, 2): "3/10", (2, 3): "2/5", (3, 4): "1/2", (4, 5): "7/20", (5, 1): "9/20"})
    f = kn.parke_taylor(1, 2, 3, 4, 5)
    # puncture 2 moves along the line past 1, 3, 4 (5 at infinity), which stand in this order at 0 < 0.4 < 1
    places = {1: 0.0, 3: 0.4, 4: 1.0}
    domains = [((2, 1, 3, 4, 5), -1.0), ((1, 2, 3, 4, 5), 0.2), ((1, 3, 2, 4, 5), 0.7), ((1, 3, 4, 2, 5), 2.0)]
    total, bound, size = 0.0 + 0.0j, 0.0, 0.0
    for order, x in domains:
        z = complex(x, 1e-12)
        exponent = sum(float(kin.pair(2, j)) * cmath.phase(z - place) for j, place in places.items())
        piece = kn.disk_integral(kin, f, ordering=order)
        total += cmath.exp(1j * exponent) * piece.value
        bound += piece.error
        size = max(size, abs(piece.value))
    assert abs(total) <= bound + 1e-11 * size


def test_the_phases_are_those_of_the_published_relation():
    # Z(1,2,..,n) + e^{i pi s12} Z(2,1,3,..) + ... = 0 (Bjerrum-Bohr, Damgaard, Vanhove 2009; Stieberger 2009), 1 moving
    kin = kn.Mandelstams.random(5, 4, low=-1, high=1)
    f = kn.parke_taylor(1, 3, 2, 4, 5)
    total, bound, size, phase = 0.0 + 0.0j, 0.0, 0.0, 0.0
    for k in range(4):
        order = (*range(2, 2 + k), 1, *range(2 + k, 6))
        if k:
            phase += float(kin.pair(1, 1 + k))
        piece = kn.disk_integral(kin, f, ordering=order)
        total += cmath.exp(1j * PI * phase) * piece.value
        bound += piece.error
        size = max(size, abs(piece.value))
    assert abs(total) <= bound + 1e-13 * size
