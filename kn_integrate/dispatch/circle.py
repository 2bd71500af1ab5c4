r"""Values at points where single terms have poles but their sum has none, and Laurent coefficients along a line.

Along a line ``s + h v`` in kinematic space the sum is a Laurent series in h.  On a circle ``|h| = r`` that keeps
clear of every pole its coefficients are exact up to aliasing,

    ``c_k r^k = (1/N) sum_j f(s + r w_j v) w_j^-k  -  (c_(k+N) r^(k+N) + c_(k-N) r^(k-N) + ...)``,

and aliasing falls like the N-th power of r over the distance of the next pole.  Nothing is a limit, and no digits
are lost however close to the poles the centre lies.

Source: Cauchy's formula by the trapezoidal rule, common practice (Trefethen and Weideman 2014, SIAM Review 56).
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import mpmath

from ..errors import InputError
from ..estimate import Estimate
from ..exact import Exact, read
from .shifts import Chord


@dataclass(frozen=True)
class Circle:
    """A circle in h about 0 with the poles sorted into those inside and those outside.

    Attributes
    ----------
    radius : float
    count : int
        Points on it, even.
    inside, outside : float
        Largest |h| of a pole inside (0 when they all sit at the centre), smallest |h| of one outside.
    """

    radius: float
    count: int
    inside: float
    outside: float


@dataclass(frozen=True)
class Laurent:
    """Laurent coefficients ``c[k]`` for k = low..high with bounds on their errors."""

    low: int
    values: tuple[Any, ...]
    errors: tuple[float, ...]
    evaluations: int
    circle: Circle

    def coefficient(self, k: int) -> tuple[Any, float]:
        """Value and error bound of ``c_k``."""
        return self.values[k - self.low], self.errors[k - self.low]


def pole_places(
    exponents: Mapping[Chord, Sequence[Exact]], speed: Mapping[Chord, Exact], reach: int = 3
) -> list[float]:
    """|h| of the poles on the line: where ``Y + h v`` of a chord is 0, -1, -2, ... for the terms' exponents Y."""
    found = []
    for chord, ys in exponents.items():
        v = speed.get(chord)
        if v is None or not v:
            continue
        for y in ys:
            nearest = round(-float(y.re))
            for level in range(max(0, nearest - reach), max(0, nearest + reach) + 1):
                found.append(abs((-(y + level) / v).value()))
    return found


def choose_circle(places: Sequence[float], digits: float, least: float = 0.0) -> Circle:
    """A radius between the poles to enclose (|h| <= least) and the next ones, and how many points it takes.

    Raises
    ------
    InputError
        When poles inside and outside are too close for any circle.
    """
    inside = max((p for p in places if p <= least), default=0.0)
    outside = min((p for p in places if p > least), default=1.0)
    radius = max(0.3 * outside, math.sqrt(inside * outside))
    quality = max(radius / outside, inside / radius)
    if quality > 0.8:
        raise InputError("kinematics", f"poles at distance {inside:.3g} and {outside:.3g}", "a point off the poles")
    count = 2 * math.ceil(0.5 * (digits + 1.5) * math.log(10.0) / -math.log(quality))
    return Circle(radius, max(count, 16), inside, outside)


def laurent(
    evaluate: Callable[[Exact], Estimate],
    circle: Circle,
    low: int,
    high: int,
    symmetric: bool,
    digits: int = 16,
) -> Laurent:
    """Laurent coefficients of ``evaluate(h)`` about h = 0.

    Parameters
    ----------
    evaluate
        The function; called with exact h on the circle.
    circle
        Where to sample.
    low, high
        The coefficients wanted.
    symmetric
        True when ``f(conj h) = conj f(h)``: only the upper half is evaluated.
    digits
        Working digits; the values may be doubles or mpmath numbers.
    """
    ctx = mpmath.MPContext()
    ctx.dps = digits + 15
    count, half = circle.count, circle.count // 2
    radius = ctx.mpf(circle.radius)
    values: list[Any] = [ctx.mpc(0)] * count
    errors = [0.0] * count
    evaluations = 0
    for j in range(half if symmetric else count):
        point = radius * ctx.expjpi(ctx.mpf(2 * j + 1) / count)
        estimate = evaluate(read(point, "h")[0])
        evaluations += estimate.evaluations
        values[j], errors[j] = ctx.mpc(estimate.value), estimate.error
        if symmetric:
            values[count - 1 - j], errors[count - 1 - j] = ctx.conj(values[j]), estimate.error
    error = sum(errors) / count
    largest = float(max(abs(value) for value in values))
    root = [ctx.expjpi(ctx.mpf(k) / count) for k in range(2 * count)]

    def scaled(k: int) -> Any:
        return sum((values[j] * root[-k * (2 * j + 1) % (2 * count)] for j in range(count)), ctx.mpc(0)) / count

    # what lies in the middle of the spectrum tells the size of the aliases, carried on at the theoretical rate
    quality = max(circle.radius / circle.outside, circle.inside / circle.radius)
    middle = max(float(abs(scaled(k))) for k in (half - 1, half, -half + 1))
    epsilon = 10.0 ** -min(digits, 300)
    found, bounds = [], []
    for k in range(low, high + 1):
        alias = 10.0 * max(middle, epsilon * largest) * quality ** (half - abs(k))
        value = scaled(k)
        scale = radius**-k
        found.append((value.real if symmetric else value) * scale)
        bounds.append((error + alias) * float(scale))
    return Laurent(low, tuple(found), tuple(bounds), evaluations, circle)
