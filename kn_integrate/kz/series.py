"""The recursion from three to n legs in double precision: all basis integrals of one ordering."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..exact import Exact
from .pattern import HalfPattern, StepPattern, step_pattern
from .point import Point, split, subset_sums

EPSILON = 2.0**-52
MAX_TERMS = 20_000
LONGEST = 380  # beyond this y^k leaves the range of doubles: such exponents are left to more digits
MEETING = 3.0 - 2.0 * math.sqrt(2.0)  # y where the two series meet: z = 4y/(1+y)^2 = 1/2
# In doubles they meet next to it, at a pair y, v with 4y/(1+y)^2 + 4v/(1+v)^2 = 1 to 1e-21 (found by search; a test
# computes it again): the solution at a rounded place would be off by rho units of round-off.  LOG_TWICE = log(2 z).
LEFT, RIGHT = float.fromhex("0x1.5f641f9de7a1cp-3"), float.fromhex("0x1.5f5f1366a0c68p-3")
LOG_TWICE = 1.9839342500082909e-05


def terms_needed(decay: float, growth: float, epsilon: float, start: float = 0.0) -> int:
    """The first K beyond the maximum of ``decay^k binomial(growth + k, k)`` where that is below epsilon.

    These are the terms of ``(1 - decay)^(-growth - 1)``; with ``start`` those from there on, relative to the one there.
    """
    slope, goal = -math.log(decay), -math.log(epsilon)

    def size(k: float) -> float:
        return math.lgamma(growth + k + 1.0) - math.lgamma(k + 1.0) - slope * k

    # terms grow as long as decay (growth + k)/k > 1
    k = max(start, growth * decay / (1.0 - decay), 4.0)
    first = size(start)
    while first - size(k) < goal:
        k += max(1.0, 0.3 * (goal - first + size(k)) / slope)
        if k > MAX_TERMS:
            return MAX_TERMS
    return math.ceil(k) + 2


def growth_of(rho: complex, at_zero: NDArray[Any], at_one: NDArray[Any], at_infinity: NDArray[Any]) -> float:
    """The largest power of k, in the variable z, with which coefficients of either half can grow.

    The solution behaves like ``(1-z)^mu`` at 1 and ``z^lambda_infinity`` at infinity, with ``z^rho`` taken out; the
    matrix of the other half like the inverse, seen from 1.  Eigenvalues at infinity: sums over the pairs that a set of
    letters together with z has among themselves and with all the others.
    """
    left = max(-float(at_one.real.min()), float(at_infinity.real.max()) - rho.real)
    right = max(float(at_zero.real.max()), -float(at_infinity.real.min()))
    return max(0.0, left, right) + 0.5


def series_length(growth: float, largest: float, last: float, digits: float) -> int:
    """Terms that leave ``10^-digits``.

    At y = 1 and y = -1 exponents are twice those at z = 1 and infinity, so coefficients grow like ``k^(2 growth)``; a
    factor ``(1 - y)^(2 mu)`` with a large mu has binomial coefficients that fall only beyond a multiple of ``|mu|``;
    and a small denominator starts a new solution at its k, whose terms have all the way to go from there.

    Parameters
    ----------
    growth
        Largest exponents that make coefficients grow, in the variable z.
    largest
        Modulus of the largest exponent.
    last
        The k beyond which no denominator is small.
    digits
        At most 300 decimal digits are asked of powers in doubles; beyond, terms fall at their asymptotic rate.
    """
    short = min(digits, 300.0)
    # one decimal digit more for what else is in the coefficients
    epsilon = 10.0 ** -(short + 1.0)
    k = max(
        terms_needed(MEETING, 2.0 * growth, epsilon),
        terms_needed(MEETING, 2.0 * growth, epsilon, max(0.0, last)),
        1.1 * largest + 4 + short / 0.76,
    )
    return math.ceil(k + (digits - short) / -math.log10(MEETING))


LANES = 4


def f_vector(point: Point, noise: float, seed: int) -> NDArray[Any]:
    """All ``F_w = int prod |z_ij|^{s_ij} D_1(w)`` over ``0 < z_2 < ... < z_{n-2} < 1``, in four lanes.

    Parameters
    ----------
    point
        Massless kinematics of at least 4 legs.
    noise, seed
        Relative size and seed of the artificial rounding in lanes 1..3.

    Returns
    -------
    ((n-3)!, 4) array
        In the order of the permutations of the labels 2..n-2; lane 0 is the result; not finite at an exact resonance,
        nor for exponents in the hundreds.
    """
    s = point.table()
    generator = np.random.default_rng(seed)
    f = np.ones((1, LANES), dtype=s.dtype)
    with np.errstate(all="ignore"):
        for legs in range(3, point.n):
            f = _step(legs, point, s, f, noise, generator)
    return f


def _values(half: HalfPattern, s: NDArray[Any], root: int, letters: NDArray[np.int64]) -> NDArray[Any]:
    """Values of the off-diagonal entries of one matrix."""
    rows, m = half.words.shape
    prefix = np.zeros((rows, m), dtype=s.dtype)
    valid = half.words >= 0
    labels = letters[np.where(valid, half.words, 0)] if len(letters) else np.zeros((rows, m), dtype=np.int64)
    for p in range(m):
        mask = valid[:, p]
        here = labels[mask, p]
        value = s[root, here].copy()
        for q in range(p):
            value += s[labels[mask, q], here]
        prefix[mask, p] = value
    row_of = np.repeat(np.arange(rows), np.diff(half.start))
    found: NDArray[Any] = half.sign * prefix[row_of, half.prefix]
    return found


def _split_rows(half: HalfPattern, sums: Mapping[int, Exact], kind: Any) -> tuple[NDArray[Any], NDArray[Any]]:
    """Whole part and rest of an exact number for every row, by the letters of its word."""
    whole = np.empty(len(sums))
    rest = np.empty(len(sums), dtype=kind)
    for mask, value in sums.items():
        whole[mask], rest[mask] = split(value)
    return whole[half.members], rest[half.members]


def _step(legs: int, point: Point, s: NDArray[Any], start: NDArray[Any], noise: float, generator: Any) -> NDArray[Any]:
    from ..kernels.kz_series import left_series, right_series

    m = legs - 3
    pattern: StepPattern = step_pattern(m)
    letters = np.arange(2, legs - 1)
    z, one = legs - 1, legs
    a, b = pattern.a, pattern.b
    a_value, b_value = _values(a, s, 1, letters), _values(b, s, one, letters)
    lambdas, mus = subset_sums(point, 1, z, m), subset_sums(point, one, z, m)
    rho = point.inside(sum(1 << i for i in range(1, legs)))
    a_whole, a_rest = _split_rows(a, {mask: rho - value for mask, value in lambdas.items()}, s.dtype)
    b_whole, b_rest = _split_rows(b, mus, s.dtype)
    rho_whole, rho_rest = split(rho)
    rho_value = rho.value()
    a_diagonal = rho_value - (a_whole + a_rest)
    b_diagonal = b_whole + b_rest
    rows = len(pattern.splits)
    c = np.zeros((rows, LANES), dtype=s.dtype)
    c[pattern.full] = start
    full = point.inside(sum(1 << i for i in range(1, legs + 1)))
    infinity = np.array([(full - value).value() for value in subset_sums(point, 1, one, m).values()])
    growth = growth_of(rho_value, a_diagonal, b_diagonal, infinity)
    largest = max(float(np.abs(part).max()) for part in (a_diagonal, b_diagonal, infinity, np.array(rho_value)))
    last = max(-float((a_whole + a_rest).real.min()), -float(b_diagonal.real.min()))
    count = series_length(growth, largest, last, 18.0)
    if count > LONGEST:
        return np.full((len(pattern.target), LANES), np.nan, dtype=s.dtype)
    # twelve vectors of (rows, lanes)
    total, alternating, both, lifted, work, series, extra, u, image, first, second, tail = np.zeros(
        (12, rows, LANES), dtype=s.dtype
    )
    seeds = generator.integers(1, 2**40, 2)
    left_series(
        rho_whole, s.dtype.type(rho_rest), LEFT, count, noise, seeds[0], c, total, alternating, both, lifted, work,
        series, extra, a.start, a.column, a_value, a_whole, a_rest, a.order, b.start, b.column, b_value, b_diagonal,
    )  # fmt: skip
    shake = np.zeros((rows, LANES))
    shake[:, 1:] = noise * generator.uniform(-1.0, 1.0, (rows, LANES - 1))
    # the factor z^rho carries the rounding of rho, the sum of the two halves that of its terms
    factor = 0.5**rho_value * np.exp(LOG_TWICE * rho_value) * (1.0 + shake[0] * (1.0 + abs(rho_value)))
    right_series(
        RIGHT, count, noise, seeds[1], factor * series, u, image, first, second, tail, a.start, a.column, a_value,
        a_diagonal, b.start, b.column, b_value, b_diagonal, b_whole, b_rest, b.order,
    )  # fmt: skip
    size = abs(factor) * (abs(series) + abs(extra)) + abs(tail)
    y = factor * (series + extra) + tail + shake * size
    result: NDArray[Any] = pattern.target_sign[:, None] * y[pattern.target]
    return result
