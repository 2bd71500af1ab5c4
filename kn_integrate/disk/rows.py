"""Sums of small real disk integrals at many points, from arrays of exponents; a single call is an array of one.

That both take this way is what makes a batch give the bits of single calls.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..errors import Status
from ..estimate import Estimate
from .chords import ChordData, chord_data
from .points import SmallResults, eligible, integrate_small
from .run import EPSILON
from .sectors import runs_of
from .terms import PLANS_SHOWN, Term, digits_of

QUICK_N = 6  # largest number of punctures
MANY_TERMS = 12  # longer sums are planned before anything is computed

Rows = tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]  # exponents of runs, Y, Y + 1


@dataclass(frozen=True)
class RowResults:
    """The sum at P points; rows whose ``done`` is False hold nothing.

    Attributes
    ----------
    done : (P,) bool
    value, truncation, roundoff, moduli : (P,) float64
        The sum, its errors, and the sum of the moduli of its terms.
    evaluations : (P,) int64
    terms : tuple of SmallResults
        Term by term, for the points ``places`` only.
    places : (K,) int64
    """

    done: NDArray[np.bool_]
    value: NDArray[np.float64]
    truncation: NDArray[np.float64]
    roundoff: NDArray[np.float64]
    moduli: NDArray[np.float64]
    evaluations: NDArray[np.int64]
    terms: tuple[SmallResults, ...]
    places: NDArray[np.int64]

    @property
    def error(self) -> NDArray[np.float64]:
        """Bounds on the errors."""
        return self.truncation + self.roundoff


def rows_of(data: Sequence[ChordData]) -> Rows | None:
    """Exponents of one integral at several points as arrays; None when one is complex."""
    if not all(each.is_real for each in data):
        return None
    exponents = np.array([each.run_exponents for each in data])
    y = np.array([[chord.value for chord in each.chords] for each in data])
    y1 = np.array([[chord.plus(1) for chord in each.chords] for each in data])
    return exponents, y, y1


def integrate_rows(
    n: int, rows: Sequence[Rows], factors: Sequence[Any], rtol: float, atol: float, threads: int = 1
) -> RowResults:
    """The sum of ``factors[k]`` times the integrals ``rows[k]``, as far as the errors come out as asked.

    Parameters
    ----------
    n
        Number of punctures.
    rows
        For every term the exponents at all points.
    factors
        The coefficients; complex ones are left to others.
    rtol, atol
        The request.
    threads
        Python threads; the bits do not depend on it.
    """
    count = len(rows[0][1])
    real = all(not isinstance(factor, complex) for factor in factors)
    served = np.full(count, n <= QUICK_N and len(rows) <= MANY_TERMS and real)
    for exponents, y, _ in rows:
        served &= eligible(n, exponents, y)
    places = np.flatnonzero(served)
    done = np.zeros(count, dtype=bool)
    value, moduli = np.zeros(count), np.zeros(count)
    truncation, roundoff = np.full(count, np.inf), np.full(count, np.inf)
    evaluations = np.zeros(count, dtype=np.int64)
    results: list[SmallResults] = []
    if len(places):
        single = len(rows) == 1
        for row, factor in zip(rows, factors, strict=True):
            share = atol / abs(factor) if single else 0.0
            exponents, y, y1 = (np.ascontiguousarray(part[places]) for part in row)
            results.append(integrate_small(n, exponents, y, y1, rtol, share, digits_of(rtol), threads))
        fine = np.logical_and.reduce([result.done for result in results])
        # in the order of `terms`, so that both ways to a sum round alike
        total, cut, rounding, size = np.zeros((4, len(places)))
        for factor, result in zip(factors, results, strict=True):
            total += factor * result.value
            cut += abs(factor) * result.errors[:, 0]
            rounding += abs(factor) * result.errors[:, 1]
            size += abs(factor) * np.abs(result.value)
        rounding = rounding + (len(rows) + 3) * EPSILON * size
        fine &= cut + rounding <= np.maximum(atol, rtol * np.abs(total))
        done[places] = fine
        value[places], moduli[places] = total, size
        truncation[places], roundoff[places] = cut, rounding
        evaluations[places] = np.sum([result.points for result in results], axis=0)
    return RowResults(done, value, truncation, roundoff, moduli, evaluations, tuple(results), places)


def quick_sum(n: int, terms: Sequence[Term], rtol: float, atol: float) -> Estimate | None:
    """The sum at one point; None when it is not one for this way, or did not come out as asked."""
    if n > QUICK_N or not 1 <= len(terms) <= MANY_TERMS:
        return None
    data = [chord_data(n, term.pairs) for term in terms]
    rows = [rows_of([each]) for each in data]
    if any(row is None for row in rows):
        return None
    found = integrate_rows(n, [row for row in rows if row], [term.coefficient.value() for term in terms], rtol, atol)
    if not found.done[0]:
        return None
    value = found.value[0].item()
    truncation, roundoff = found.truncation[0].item(), found.roundoff[0].item()
    details: dict[str, Any] = {
        "terms": len(terms),
        "truncation": truncation,
        "roundoff": roundoff,
        "cancellation": found.moduli[0].item() / abs(value) if value else 1.0,
        "plan": [
            {"coefficient": str(term.coefficient), "chords": _plan(each, result), "passes": int(result.passes[0])}
            for term, each, result in zip(terms[:PLANS_SHOWN], data, found.terms, strict=False)
        ],
    }
    evaluations = int(found.evaluations[0])
    return Estimate(value, truncation + roundoff, Status.OK, "quadrature", evaluations, rtol, atol, None, details)


def _plan(data: ChordData, result: SmallResults) -> list[dict[str, Any]]:
    """The plan of a term in plain values, as ``plan.plan_table`` gives it."""
    return [
        {
            "positions": list(range(run[0] + 1, run[1] + 3)),
            "Y": str(chord.exact),
            "rule": "radau",
            "nodes": int(nodes),
            "amplification": f"{size:.3g}",
            "reason": "cheapest",
        }
        for run, chord, nodes, size in zip(
            runs_of(data.n - 2)[:-1], data.chords, result.counts[0], result.sizes[0], strict=True
        )
    ]
