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
LONGEST = 1000  # beyond this 2^-k leaves the range of doubles: such exponents are left to more digits
HALF = 0.5  # where the two series meet


def terms_needed(decay: float, growth: float, epsilon: float) -> int:
    """The first K beyond the maximum of ``decay^K K^growth`` where it is below ``epsilon``."""
    slope = -math.log(decay)
    k = max(4.0, growth / slope + 1.0)
    goal = -math.log(epsilon)
    while slope * k - growth * math.log(k) < goal:
        k += max(1.0, 0.3 * (goal - slope * k + growth * math.log(k)) / slope)
        if k > MAX_TERMS:
            return MAX_TERMS
    return math.ceil(k) + 2


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
    growth = max(0.0, float(a_diagonal.real.max())) + max(0.0, -float(b_diagonal.real.min()))
    # a factor like (1 - x)^mu with a large mu has binomial coefficients that fall only beyond k = |mu|
    largest = max(float(np.abs(a_diagonal).max()), float(np.abs(b_diagonal).max()), abs(rho_value))
    count = max(terms_needed(HALF, growth, 1e-18), math.ceil(largest) + 62)
    if count > LONGEST:
        return np.full((len(pattern.target), LANES), np.nan, dtype=s.dtype)
    total, work, series, extra, u, tail = (np.zeros((rows, LANES), dtype=s.dtype) for _ in range(6))
    seeds = generator.integers(1, 2**40, 2)
    left_series(
        rho_whole, s.dtype.type(rho_rest), HALF, count, noise, seeds[0], c, total, work, series, extra,
        a.start, a.column, a_value, a_whole, a_rest, a.order, b.start, b.column, b_value, b_diagonal,
    )  # fmt: skip
    shake = np.zeros((rows, LANES))
    shake[:, 1:] = noise * generator.uniform(-1.0, 1.0, (rows, LANES - 1))
    # the factor x^rho carries the rounding of rho, the sum of the two halves that of its terms
    factor = HALF**rho_value * (1.0 + shake[0] * (1.0 + abs(rho_value)))
    right_series(
        1.0 - HALF, count, noise, seeds[1], factor * series, u, tail,
        a.start, a.column, a_value, a_diagonal, b.start, b.column, b_value, b_whole, b_rest, b.order,
    )  # fmt: skip
    size = abs(factor) * (abs(series) + abs(extra)) + abs(tail)
    y = factor * (series + extra) + tail + shake * size
    result: NDArray[Any] = pattern.target_sign[:, None] * y[pattern.target]
    return result
