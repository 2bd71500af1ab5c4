"""Sums of disk integrals by the KZ recursion, to a tolerance, in double or multiple precision."""

from __future__ import annotations

import math
import zlib
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import permutations
from typing import Any, Protocol

import numpy as np

from ..channels import pair_order
from ..errors import NotAvailableError, PoleError
from ..estimate import Estimate, judge
from ..exact import ZERO, Exact
from .currents import amputated, amputated_lanes, closed_words
from .pattern import entry_count
from .point import Point, subset_sums
from .series import f_vector

NOISE = 2.0**-42
SAFETY = 24.0  # on what stochastic rounding shows, calibrated in tests/calibration
PARTS = 0.25  # weight of the spread of single parts, which is too large where their errors cancel
UNIT = 2.0**-53
MAX_LEGS, MAX_PRECISE_LEGS = 11, 9
MAX_WORKING_DIGITS = 4000
MARGIN = 3.0
MAX_FOR_DOUBLE = (400.0, 150.0)  # working digits spent on a value that will be a double; n <= 7, above
CIRCLE, RADIUS = 32, 0.3  # points and relative radius of the mean over a circle, double precision
PRECISE_CIRCLE = 8


class Term(Protocol):
    """One absolute-value integral of a sum."""

    @property
    def coefficient(self) -> Exact:
        """Exact factor."""

    @property
    def pairs(self) -> tuple[Exact, ...]:
        """Exponents in the order (1,2), (1,3), ..., (n-1,n), rows -2."""


@dataclass(frozen=True)
class _Value:
    value: Any
    error: float
    terms: int


def massless_point(n: int, pairs: tuple[Exact, ...]) -> Point:
    """The massless kinematics at which ``Z_P(PT(P))`` is the absolute-value integral with these exponents."""
    shifted = [value + 1 if j - i in (1, n - 1) else value for (i, j), value in zip(pair_order(n), pairs, strict=True)]
    return Point(n, tuple(shifted))


def integrate_terms(
    n: int,
    terms: Sequence[Term],
    *,
    rtol: float,
    atol: float = 0.0,
    digits: int | None = None,
    escalate: bool = True,
) -> Estimate:
    """Value of ``sum_k c_k I(A_k)`` in canonical ordering.

    Parameters
    ----------
    n
        4 to 11 legs (9 in multiple precision).
    terms
        Coefficients and exponents.
    rtol, atol
        The request for the sum.
    digits
        Decimal digits; the value is then an mpmath number.
    escalate
        Whether to go on in multiple precision when double precision does not meet the tolerance.

    Raises
    ------
    PoleError
        When a term sits on a pole; ``channel`` are positions.
    NotAvailableError
        Beyond 11 legs, or beyond 9 in multiple precision.

    Notes
    -----
    The error in double precision is that of stochastic rounding (Parker 1997, *Monte Carlo arithmetic*; from memory)
    with a calibrated factor; in multiple precision two working precisions are compared.
    """
    if n > (MAX_LEGS if digits is None else MAX_PRECISE_LEGS):
        limit = MAX_LEGS if digits is None else f"{MAX_PRECISE_LEGS} with digits="
        raise NotAvailableError(f"method 'kz' goes up to n = {limit}")
    groups: dict[tuple[Exact, ...], Exact] = {}
    for term in terms:
        groups[term.pairs] = groups.get(term.pairs, ZERO) + term.coefficient
    points = [(c, massless_point(n, pairs)) for pairs, c in groups.items() if c]
    for _, point in points:
        _refuse_poles(point)
    real = all(c.is_real and point.is_real for c, point in points)
    if digits is None:
        total = _double_sum(points, real)
        status = judge(total.value, total.error, rtol, atol, total.error)
        target = max(atol, rtol * abs(total.value)) if math.isfinite(abs(total.value)) else 0.0
        if total.error <= target or not escalate or n > MAX_PRECISE_LEGS:
            details = {"choice": "double precision", "integrals": len(points), "roundoff": total.error}
            return Estimate(total.value, total.error, status, "kz", total.terms, rtol, atol, None, details)
        return _escalated(points, real, rtol, atol, None, total)
    return _escalated(points, real, rtol, atol, digits, None)


def predict(n: int, terms: Sequence[Term], *, rtol: float, digits: int | None = None) -> float:
    """Seconds on one core, very roughly; infinite where the method is not available."""
    if n > (MAX_LEGS if digits is None else MAX_PRECISE_LEGS):
        return math.inf
    entries = sum(entry_count(m) for m in range(n - 3))
    if digits is None:
        spread = max((abs(p.value()) for term in terms for p in term.pairs), default=1.0)
        series = 30 + 0.45 * n * spread
        cost = 2.5e-4 * (n - 3) + 1.1e-8 * entries * series
        return len(terms) * cost * (1.0 if all(p.is_real for t in terms for p in t.pairs) else 2.5)
    return len(terms) * (2e-3 * (n - 3) + 2.4 * 4 * 1.5e-7 * entries * 3.0 * (digits + 20))


def memory(n: int) -> float:
    """Bytes that the index structures and entries of the largest step take."""
    return 2.0 * entry_count(n - 4) * (4 + 1 + 1 + 8)


def _refuse_poles(point: Point) -> None:
    for (i, j), x in point.planar().items():
        if x.is_integer and x <= 0:
            raise PoleError(tuple(range(i, j + 1)), -int(x), x)


# --- double precision -----------------------------------------------------------------------------------------------


def _double_sum(points: Sequence[tuple[Exact, Point]], real: bool) -> _Value:
    value: Any = 0.0
    error, count = 0.0, 0
    for coefficient, point in points:
        factor = coefficient.value()
        part = _double(point)
        value += factor * part.value
        error += abs(factor) * part.error + 4 * UNIT * abs(factor * part.value)
        count += part.terms
    return _Value(value, error, count)


def _double(point: Point) -> _Value:
    """One integral with its error; a mean over a circle at an exact resonance."""
    found = _double_once(point)
    if math.isfinite(abs(found.value)) or not is_resonant(point):
        return found
    direction, room = way_out(point)
    radius = RADIUS * room
    total, error, count, largest = 0.0 + 0.0j, 0.0, 0, 0.0
    half = range(CIRCLE // 2) if point.is_real else range(CIRCLE)
    for k in half:
        angle = 2.0 * math.pi * (k + 0.5) / CIRCLE
        h = Exact(Fraction(radius * math.cos(angle)), Fraction(radius * math.sin(angle)))
        part = _double_once(point.moved(tuple(h * v for v in direction)))
        total += part.value
        error += part.error
        count += part.terms
        largest = max(largest, abs(part.value))
    mean = total / len(half)
    value: Any = mean.real if point.is_real else mean
    alias = 10.0 * largest * RADIUS**CIRCLE
    return _Value(value, error / len(half) + alias, count)


def _double_once(point: Point) -> _Value:
    seed = zlib.crc32(repr([str(p) for p in point.pairs]).encode())  # the same input, the same bits
    parts = _contracted(point, f_vector(point, NOISE, seed), seed)
    lanes = parts.sum(axis=0)
    value = lanes[0].item()
    spread = float(np.abs(lanes[1:] - lanes[0]).max())  # a NaN stays one
    # three lanes can be close to the first by luck; the single parts are as many chances to notice
    single = float(np.sqrt((np.abs(parts[:, 1:] - parts[:, :1]) ** 2).sum(axis=0)).max())
    spread = max(spread, PARTS * single)
    count = sum(entry_count(m) for m in range(point.n - 3))
    return _Value(value, SAFETY * (UNIT / NOISE) * spread + 4 * UNIT * abs(value), count)


def _contracted(point: Point, f: Any, seed: int) -> Any:
    """The parts of ``sum_w N(1 2..n-1 | 1 w n-1) F_w``, shape (words, lanes); noise as in :func:`f_vector`."""
    n = point.n
    letters = tuple(range(1, n))
    generator = np.random.default_rng(seed)
    numbers, targets = closed_words(n - 1)

    def noisy(size: int) -> Any:
        shake = np.ones((size, f.shape[1]))
        shake[:, 1:] += NOISE * generator.uniform(-1.0, 1.0, (size, f.shape[1] - 1))
        return shake

    known: dict[tuple[int, ...], Any] = {}

    def channel(labels: tuple[int, ...]) -> Any:
        if labels not in known:
            known[labels] = point.channel(labels).value() * noisy(1)[0]
        return known[labels]

    with np.errstate(all="ignore"):
        weights = amputated_lanes(letters, channel)[numbers]
        return weights * f[targets] * (1.0 + n * (noisy(len(numbers)) - 1.0))


def is_resonant(point: Point) -> bool:
    """Whether some denominator ``k + rho - lambda`` or ``k + mu`` of the recursion is exactly zero."""
    for legs in range(3, point.n):
        m, z, one = legs - 3, legs - 1, legs
        rho = point.inside(sum(1 << i for i in range(1, legs)))
        sums = [rho - value for value in subset_sums(point, 1, z, m).values()]
        sums += list(subset_sums(point, one, z, m).values())
        if any(d.is_integer and d < 0 for d in sums):
            return True
    return False


def way_out(point: Point) -> tuple[tuple[Exact, ...], float]:
    """A generic massless direction for every pair, and the distance along it to the nearest physical pole."""
    n = point.n
    planar = point.planar()
    speeds = {chord: Fraction(3, 10) + Fraction((89 * k + 37) % 70, 100) for k, chord in enumerate(planar)}

    def x(i: int, j: int) -> Fraction:
        return speeds.get((i, j), Fraction(0)) if i < j else Fraction(0)

    moves = {}
    for i in range(1, n):
        for j in range(i + 1, n):
            moves[i, j] = x(i, j) - x(i + 1, j) - x(i, j - 1) + (x(i + 1, j - 1) if j - i > 1 else 0)
    for i in range(1, n):
        moves[i, n] = -sum((v for pair, v in moves.items() if i in pair and n not in pair), Fraction(0))
    room = 1.0
    for chord, value in planar.items():
        nearest = max(0, round(-value.re))
        for level in (nearest - 1, nearest, nearest + 1):
            if level >= 0:
                room = min(room, abs((value + level).value()) / float(speeds[chord]))
    return tuple(Exact(moves[pair]) for pair in pair_order(n)), room


# --- multiple precision ---------------------------------------------------------------------------------------------


def _escalated(
    points: Sequence[tuple[Exact, Point]],
    real: bool,
    rtol: float,
    atol: float,
    digits: int | None,
    first: _Value | None,
) -> Estimate:
    """Two working precisions: the low one shows how many digits the kinematics cost, the high one gives the value.

    Rounding and truncation are proportional to 10^-(working digits) with a factor that belongs to the kinematics; the
    difference of the two values measures it, and ``MARGIN`` digits stay in reserve.
    """
    import mpmath

    wanted = float(digits) if digits is not None else max(16.0, -math.log10(rtol) + 1.0)
    lost = 6.0 + 1.5 * points[0][1].n
    if first is not None and math.isfinite(abs(first.value)) and first.value:
        lost = max(lost, 2.0 + math.log10(max(first.error / abs(first.value) / UNIT, 1.0)))
    ctx = mpmath.MPContext()
    count = 0
    steps: list[float] = []
    while True:
        rough, working = 12.0 + lost, wanted + lost + MARGIN
        low, some = _precise_sum(points, real, rough)
        high, more = _precise_sum(points, real, working)
        count += some + more
        steps += [round(rough), round(working)]
        ctx.dps = int(working) + 5
        size = float(abs(high))
        difference = float(abs(ctx.mpmathify(low) - ctx.mpmathify(high)))
        linear = difference <= 1e-3 * size
        scale = 10.0 ** max(MARGIN - (working - rough), -300.0)
        error = (difference + 10.0 ** -min(rough, 300.0) * size) * (scale if linear else 1.0)
        if (linear and error <= max(atol, rtol * size)) or working > MAX_WORKING_DIGITS:
            break
        enough = MAX_FOR_DOUBLE[points[0][1].n > 7] if digits is None else 3 * digits + MAX_FOR_DOUBLE[1]
        if working > enough:  # a zero, for all that these digits can tell
            break
        if error <= atol:  # a zero: the values themselves are below what was asked
            break
        short = math.log10(error / max(rtol * size, atol, 1e-300)) if linear else 10.0
        lost += max(10.0, short)
    value: Any = high
    if digits is None:
        value = float(high) if real else complex(high)
        error += UNIT * abs(value) * 2 + 5e-324  # never zero: the value itself may have underflowed
    status = judge(complex(value), error, rtol, atol, error)
    details = {"choice": "multiple precision", "integrals": len(points), "working digits": steps}
    return Estimate(value, error, status, "kz", count, rtol, atol, digits, details)


def _precise_sum(points: Sequence[tuple[Exact, Point]], real: bool, working: float) -> tuple[Any, int]:
    """The sum with this many working digits, as an mpmath number; and the series terms spent."""
    from ..precise.context import as_mpmath, ball, flint_precision

    bits = int(working * 3.3220) + 20
    count = 0
    with flint_precision(bits):
        total: Any = None
        for coefficient, point in points:
            value, terms = _precise(point, working, not real)
            count += terms
            part = ball(coefficient, not real) * value
            total = part if total is None else total + part
        return as_mpmath(total, bits), count


def _precise(point: Point, working: float, is_complex: bool) -> tuple[Any, int]:
    from ..precise.context import ball

    entries = sum(entry_count(m) for m in range(point.n - 3))
    known: dict[int, Any] = {}

    def inside(mask: int) -> Any:
        if mask not in known:
            known[mask] = ball(point.inside(mask), is_complex)
        return known[mask]

    if not is_resonant(point):
        return _precise_once(point.n, inside, working, is_complex), entries
    from flint import acb, arb

    direction, room = way_out(point)
    radius = arb(room) * arb(10) ** (-arb(int(working + 10)) / PRECISE_CIRCLE)
    way = Point(point.n, direction)
    half = range(PRECISE_CIRCLE // 2) if point.is_real else range(PRECISE_CIRCLE)
    total = acb(0)
    for k in half:
        angle = arb(2 * k + 1) / PRECISE_CIRCLE
        h = radius * acb(angle.cos_pi(), angle.sin_pi())
        moved: dict[int, Any] = {}

        def there(mask: int, h: Any = h, moved: dict[int, Any] = moved) -> Any:
            if mask not in moved:
                moved[mask] = ball(point.inside(mask), True) + h * ball(way.inside(mask), True)
            return moved[mask]

        total += _precise_once(point.n, there, working, True)
    mean = total / len(half)
    if point.is_real:
        mean = acb(mean.real)
    return (mean if is_complex else mean.real), entries * len(half)


def _precise_once(n: int, inside: Callable[[int], Any], working: float, is_complex: bool) -> Any:
    from flint import acb, arb

    from .multiprecision import f_vector as precise_vector

    zero, one = (acb(0), acb(1)) if is_complex else (arb(0), arb(1))
    f = precise_vector(n, inside, zero, one, working)
    words = {word: k for k, word in enumerate(permutations(range(2, n - 1)))}
    current = amputated(tuple(range(1, n)), lambda labels: inside(sum(1 << label for label in labels)), zero, one)
    total = zero
    for word, weight in current.items():
        if word[0] == 1 and word[-1] == n - 1:
            total = total + weight * f[words[word[1:-1]]]
    return total
