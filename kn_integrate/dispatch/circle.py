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

from ..estimate import Estimate
from ..exact import Exact, read
from ..precise.context import handed_out
from .shifts import Chord


@dataclass(frozen=True)
class Circle:
    """A circle in h about 0.

    Attributes
    ----------
    radius : float
    count : int
        Points on it, even.
    outside : float
        Smallest |h| of a pole off the centre.
    """

    radius: float
    count: int
    outside: float


@dataclass(frozen=True)
class Laurent:
    """Laurent coefficients ``c[k]`` for k = low..high with bounds on their errors."""

    low: int
    values: tuple[Any, ...]
    errors: tuple[float, ...]
    evaluations: int
    circle: Circle
    symmetric: bool

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


def choose_circle(places: Sequence[float], digits: float, orders: int = 0) -> Circle:
    """A radius inside the nearest pole off the centre, and how many points it takes.

    Parameters
    ----------
    places
        |h| of the poles on the line; those at 0 are what the circle is for.
    digits
        Wanted digits, relative to the largest value on the circle.
    orders
        Largest |k| of the coefficients wanted; high ones keep more digits on a larger circle.
    """
    outside = min((p for p in places if p > 0), default=1.0)
    fraction = 0.3 if orders <= 3 else 0.5
    count = 2 * math.ceil(0.5 * (digits + 1.5) * math.log(10.0) / -math.log(fraction)) + 2 * orders
    return Circle(fraction * outside, max(count, 16), outside)


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
    quality = circle.radius / circle.outside
    middle = max(float(abs(scaled(k))) for k in (half - 1, half, -half + 1))
    epsilon = 10.0 ** -min(digits, 300)
    found, bounds = [], []
    for k in range(low, high + 1):
        alias = 10.0 * max(middle, epsilon * largest) * quality ** (half - abs(k))
        value = scaled(k)
        scale = radius**-k
        found.append(handed_out((value.real if symmetric else value) * scale))
        bounds.append((error + alias) * float(scale))
    return Laurent(low, tuple(found), tuple(bounds), evaluations, circle, symmetric)
