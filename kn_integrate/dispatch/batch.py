"""Many kinematic points of one disk integral: all small ones in compiled code, the others one by one.

What a point gets is what a single call gets, bit for bit: both take their exponents correctly rounded from the same
exact numbers, and the same compiled way (``disk.points``) first.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from fractions import Fraction
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..disk.chords import chord_data, exact_runs
from ..disk.rows import Rows
from ..disk.sectors import runs_of
from ..disk.terms import Term
from ..exact import Exact

MOST_COPIES = 8


def affine_rows(
    n: int,
    values: NDArray[np.float64],
    terms_at: Callable[[Sequence[Fraction]], Sequence[Term]],
) -> tuple[list[Rows], list[Any]] | None:
    """Exponents of every term at points given by doubles, and the coefficients of the terms.

    The exponents are affine in the invariants.  The map is read off at the origin and at the unit vectors; None when
    it has coefficients that are not small whole numbers, or constants that are no doubles.

    Parameters
    ----------
    values : (P, C)
    terms_at
        The terms at exact invariants.
    """
    from ..kernels.exact_sums import affine

    size = values.shape[1]
    unit = [Fraction(0)] * size
    origin = terms_at(unit)
    moved = [terms_at([*unit[:c], Fraction(1), *unit[c + 1 :]]) for c in range(size)]
    found: list[Rows] = []
    for k, term in enumerate(origin):
        start = _numbers(n, term.pairs)
        ends = [_numbers(n, terms[k].pairs) for terms in moved]
        if start is None or any(end is None for end in ends):
            return None
        coefficients = np.zeros((len(start), size), dtype=np.int64)
        for c, end in enumerate(ends):
            assert end is not None
            for m, (a, b) in enumerate(zip(start, end, strict=True)):
                if (b - a).denominator != 1 or abs(b - a) > MOST_COPIES:
                    return None
                coefficients[m, c] = int(b - a)
        constants = np.array([float(a) for a in start])
        if any(Fraction(x) != a for x, a in zip(constants.tolist(), start, strict=True)):
            return None
        out = np.empty((len(values), len(start)))
        affine(values, coefficients, constants, out)
        runs, chords = (n - 1) * (n - 2) // 2, n * (n - 3) // 2
        parts = np.split(out, [runs, runs + chords], axis=1)
        found.append((np.ascontiguousarray(parts[0]), np.ascontiguousarray(parts[1]), np.ascontiguousarray(parts[2])))
    return found, [term.coefficient.value() for term in origin]


def _numbers(n: int, pairs: Sequence[Exact]) -> list[Fraction] | None:
    """Exponents of runs, Y and Y + 1, exact; None when one is complex."""
    data = chord_data(n, tuple(pairs))
    if not data.is_real:
        return None
    exponents = exact_runs(n, tuple(pairs))
    runs = [exponents[run].re for run in runs_of(n - 2)]
    chords = [chord.exact.re for chord in data.chords]
    return [*runs, *chords, *(y + 1 for y in chords)]
