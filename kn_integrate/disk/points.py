"""Small real integrals without deep chords, many at once: what the compiled points kernel needs, and its results.

:func:`integrate_small` is tried before everything else in :func:`..evaluate.integrate`, and by batches for all their
points; what it leaves undone takes the general way.  Both see the same bits.
"""

from __future__ import annotations

import math
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .rules.base import ellipse_parameter, symmetric_bend
from .rules.guess import HIGH, LARGEST, guess_tables
from .run import CHUNK
from .sectors import runs_of, sector_table

MAX_N = 7
LOWEST = -0.85  # exponent of a chord; below it other rules are better
HIGHEST = HIGH - 1.0
CALIBRATED = 8.0
MAX_RUN = 60.0
MOST_POINTS = 500_000
PIECES = 64  # points handed to a thread at a time


@dataclass(frozen=True)
class SmallResults:
    """Results for P points; rows whose ``done`` is False hold nothing.

    Attributes
    ----------
    done : (P,) bool
        The errors meet the request.
    value : (P,) float64
    errors : (P, 2) float64
        Truncation, round-off.
    points, passes : (P,) int64
    counts : (P, chords) int64
        Nodes of the rule of each chord.
    sizes : (P, chords) float64
        Sum of the moduli of its weights.
    """

    done: NDArray[np.bool_]
    value: NDArray[np.float64]
    errors: NDArray[np.float64]
    points: NDArray[np.int64]
    passes: NDArray[np.int64]
    counts: NDArray[np.int64]
    sizes: NDArray[np.float64]


@cache
def _tables(n: int) -> tuple[Any, ...]:
    """Everything of the kernel's arguments that depends on n alone."""
    from .evaluate import PROBES, probe_signs
    from .plan import FRACTIONS, log_runs

    table = sector_table(n)
    runs = runs_of(n - 2)
    sizes = [b - a + 1 for a, b in runs[:-1]]
    bends = np.array([symmetric_bend(size) for size in sizes])
    rhos = np.array([ellipse_parameter(1.0 / bend) for bend in bends])
    half = len(FRACTIONS)
    samples = 2 * half + 3
    growth = np.zeros((len(sizes), len(runs), samples))
    stretch = np.zeros((len(sizes), samples + 1))
    for c, bend in enumerate(bends.tolist()):
        trial = rhos[c] ** FRACTIONS
        reach = 0.5 * (trial + 1.0 / trial)
        x = np.concatenate([0.5 - 0.5 * reach, 0.5 + 0.5 * reach, [0.0, 0.5, 1.0]])
        size = 1.0 + bend - bend * x
        growth[c] = log_runs(n, c, x / size)
        stretch[c, :samples] = np.log(np.abs(size))
        stretch[c, samples] = math.log(rhos[c])  # the decay per node of the trial ellipses, times FRACTIONS
    chunks = np.array([(s, 0, 0) for s in range(table.count)], dtype=np.int64)
    signs = np.array([probe_signs(len(runs), k) for k in range(PROBES)])
    return (
        chunks,
        table.variables,
        table.masks_prev,
        table.masks_var,
        table.mask_count,
        table.run_index,
        table.run_bounds,
        table.run_split,
        table.term_start,
        table.term_mask,
        table.term_class,
        np.array([math.log(b - a + 1) for a, b in runs]),
        bends,
        1.0 / rhos,
        growth,
        stretch,
        np.array(FRACTIONS),
        signs,
        *guess_tables(),
    )


def eligible(n: int, exponents: NDArray[np.float64], y: NDArray[np.float64]) -> NDArray[np.bool_]:
    """Which points this way is made for: (P, runs) and (P, chords) real exponents.

    Not those on a pole, deep ones, and ones so large that errors were not calibrated there.
    """
    if n > MAX_N:
        return np.zeros(len(y), dtype=bool)
    low, high = y.min(axis=1), y.max(axis=1)
    fine = (low > LOWEST) & (high < HIGHEST) & ((low >= 0) | (high <= CALIBRATED))
    fine &= (y != 0.0).all(axis=1) & (np.abs(exponents) <= MAX_RUN).all(axis=1)
    return np.asarray(fine)


def integrate_small(
    n: int,
    exponents: NDArray[np.float64],
    y: NDArray[np.float64],
    y1: NDArray[np.float64],
    rtol: float,
    atol: NDArray[np.float64] | float,
    digits: float,
    threads: int = 1,
) -> SmallResults:
    """Integrate P points; all must be :func:`eligible`.

    Parameters
    ----------
    exponents : (P, runs)
        Exponent of every run.
    y, y1 : (P, chords)
        The exponent Y of every chord, and Y + 1, correctly rounded.
    rtol, atol
        The request.
    digits
        Decimal digits that the first plan aims at.
    threads
        Python threads; the bits do not depend on it.
    """
    from ..kernels.disk_points import integrate_points
    from .evaluate import PROBE, PROBE_DIGITS, SHARED, SIGMAS, SINGLE

    count, chords = y.shape
    done = np.zeros(count, dtype=np.uint8)
    value, errors = np.zeros(count), np.zeros((count, 2))
    points, passes = np.zeros(count, dtype=np.int64), np.zeros(count, dtype=np.int64)
    counts, sizes = np.zeros((count, chords), dtype=np.int64), np.zeros((count, chords))
    goals = ((digits + 1.0) * math.log(10.0), (PROBE_DIGITS + 1.0) * math.log(10.0))
    most = min(MOST_POINTS, CHUNK * (LARGEST + 1) ** 2)
    arguments = (*_tables(n), exponents, y, y1, rtol, float(atol), *goals, SHARED, SINGLE, SIGMAS, PROBE, float(most))
    outputs = (value, errors, points, counts, sizes, passes, done)
    if threads <= 1 or count < 2 * PIECES:
        integrate_points(0, count, *arguments, *outputs)
    else:
        with ThreadPoolExecutor(threads) as pool:
            work = [
                pool.submit(integrate_points, start, min(count, start + PIECES), *arguments, *outputs)
                for start in range(0, count, PIECES)
            ]
            for future in work:
                future.result()
    return SmallResults(done == 1, value, errors, points, passes, counts, sizes)
