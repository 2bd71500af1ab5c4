"""From exponents of pairs to what a sector needs: exponents of runs, and the exact divisor exponent of every chord."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..exact import Exact
from .rules.base import PoleDistance
from .sectors import Run, runs_of


@dataclass(frozen=True)
class ChordData:
    """The exponents of one integral ``I(A)`` in canonical ordering.

    Attributes
    ----------
    n : int
    run_exponents : (runs,) array
        Exponent of every run, in the order of ``sectors.runs_of(n - 2)``; real or complex.
    chords : tuple of PoleDistance
        Exponent Y of every chord, the runs but the last; exact.
    """

    n: int
    run_exponents: NDArray[Any]
    chords: tuple[PoleDistance, ...]

    @property
    def is_real(self) -> bool:
        """True when every exponent is real."""
        return not np.iscomplexobj(self.run_exponents)

    @property
    def is_symmetric(self) -> bool:
        """True when reversing the order of the punctures changes nothing."""
        m = self.n - 2
        place = {run: k for k, run in enumerate(runs_of(m))}
        image = [place[m - 1 - b, m - 1 - a] for a, b in runs_of(m)]
        return bool((self.run_exponents == self.run_exponents[image]).all()) and all(
            self.chords[k].exact == self.chords[image[k]].exact for k in range(len(self.chords))
        )

    def on_pole(self) -> list[tuple[Run, int]]:
        """The runs whose chord sits exactly on a pole, with the level N (Y = -N)."""
        found = []
        for run, y in zip(runs_of(self.n - 2), self.chords, strict=False):
            if y.exact.is_integer and y.exact.re <= 0:
                found.append((run, int(-y.exact.re)))
        return found


def exact_chords(n: int, pairs: tuple[Exact, ...]) -> dict[Run, Exact]:
    """The divisor exponent Y of every run but the full one."""
    exponent = exact_runs(n, pairs)
    return _chords(n, exponent)


def exact_runs(n: int, pairs: tuple[Exact, ...]) -> dict[Run, Exact]:
    """The exponent of every run: run (a, b) is the pair (a+1, b+2)."""
    m = n - 2
    exponent: dict[Run, Exact] = {}
    for a in range(m):
        # pair (i, j), i < j, stands at (i-1) n - i(i+1)/2 + j - 1; here i = a + 1, j = b + 2
        base = a * n - (a + 1) * (a + 2) // 2
        for b in range(a, m):
            exponent[a, b] = pairs[base + b + 1]
    return exponent


def _chords(n: int, exponent: dict[Run, Exact]) -> dict[Run, Exact]:
    total: dict[Run, Exact] = {}
    runs = runs_of(n - 2)
    for a, b in runs:
        # sum over the runs inside (a, b), by inclusion and exclusion
        value = exponent[a, b]
        if b > a:
            value = value + total[a + 1, b] + total[a, b - 1]
            if b - a > 1:
                value = value - total[a + 1, b - 1]
        total[a, b] = value
    return {(a, b): total[a, b] + (b - a + 1) for a, b in runs[:-1]}


def chord_data(n: int, pairs: tuple[Exact, ...]) -> ChordData:
    """Build :class:`ChordData` from pair exponents in the order (1,2), (1,3), ..., (n-1,n), rows -2."""
    exponent = exact_runs(n, pairs)
    chords = tuple(PoleDistance(y) for y in _chords(n, exponent).values())
    numbers = [exponent[run].value() for run in runs_of(n - 2)]
    kind = complex if any(isinstance(x, complex) for x in numbers) else float
    return ChordData(n, np.array(numbers, dtype=kind), chords)
