"""One disk integral ``I(A)``: plan, run, look at the errors, improve what limits, stop."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any


from ..errors import WorkLimitError
from ..exact import Exact
from .chords import ChordData, chord_data
from .plan import MAX_NODES, Choice, grades, initial_choices, plan_table, raised
from .run import EPSILON, Outcome, predicted_points, run
from .sectors import runs_of

SAFETY = 8.0  # on the extrapolated truncation error; the calibration campaign reports what it buys
MAX_PASSES = 12
DEFAULT_MAX_POINTS = 2e10


@dataclass(frozen=True)
class Integral:
    """The value of ``I(A)`` with its error split by origin.

    Attributes
    ----------
    value : float | complex
    truncation, roundoff : float
        The two parts of the bound on the error.
    points : int
        Integrand evaluations of all passes.
    choices : tuple of Choice
        The plan of the pass that gave the value.
    passes : int
    """

    value: float | complex
    truncation: float
    roundoff: float
    points: int
    choices: tuple[Choice, ...]
    passes: int

    @property
    def error(self) -> float:
        """Bound on the error."""
        return self.truncation + self.roundoff

    def plan(self) -> list[dict[str, Any]]:
        """The plan in plain values."""
        return plan_table(self.choices)


def _roundoff(data: ChordData, choices: list[Choice], outcome: Outcome) -> float:
    """Bound on the round-off: every term carries the errors of its weights, exponents and logarithms.

    An exponent rounded to double shifts a run's factor by ``eps |A| |log P|``, and P lies between 1 and the number of
    gaps in the run; weights of the (n-3)-fold product add up.
    """
    runs = runs_of(data.n - 2)
    spread = sum(abs(a) * math.log(b - c + 1) for a, (c, b) in zip(data.run_exponents.tolist(), runs, strict=True))
    noise = sorted((choice.rule().noise for choice in choices), reverse=True)[: data.n - 3]
    return EPSILON * (8.0 + spread + sum(noise)) * outcome.absolute


def integrate(
    data: ChordData,
    rtol: float,
    atol: float,
    *,
    max_points: float = DEFAULT_MAX_POINTS,
    threads: int = 1,
    family: str | None = None,
) -> Integral:
    """Integrate to a tolerance; no chord may be on a pole.

    Raises
    ------
    WorkLimitError
        When the first plan already needs more than ``max_points``.
    """
    digits = min(-math.log10(max(rtol, 1e-15)), 15.0) if rtol > 0 else 15.0
    choices = initial_choices(data, digits, family)
    grade = [0] * len(choices)
    best: Integral | None = None
    spent = 0
    for attempt in range(1, MAX_PASSES + 1):
        rules = [choice.rule() for choice in choices]
        needed = predicted_points(data.n, rules)
        if spent + needed > max_points:
            if best is None:
                raise WorkLimitError(needed, max_points, "points", "raise max_points=, relax rtol=, or use method='kz'")
            break
        outcome = run(data, rules, threads)
        spent += outcome.points
        if not outcome.finite:
            # nodes of several chords together left the region where the branch is known: use the safer rule
            change = False
            for c, choice in enumerate(choices):
                if choice.family in ("ellipse", "overhang") or (choice.family == "radau" and not choice.y.is_real):
                    if family is None and grade[c] + 1 < grades(choice.y):
                        grade[c] = grades(choice.y) - 1
                        choices[c] = raised(data, choice, c, grade[c], digits)
                        change = True
            if not change:
                break
            continue
        roundoff = _roundoff(data, choices, outcome)
        truncation = SAFETY * float(outcome.truncation.sum())
        candidate = Integral(outcome.value, truncation, roundoff, spent, tuple(choices), attempt)
        if best is None or candidate.error < best.error:
            best = candidate
        target = max(atol, rtol * abs(outcome.value))
        if candidate.error <= target:
            return candidate
        improved = False
        if roundoff > 0.4 * target and family is None:
            improved = _raise_grades(data, choices, grade, digits)
        goal = max(target, 2.0 * roundoff)
        share = 0.5 * goal / (SAFETY * len(choices))
        for c, choice in enumerate(choices):
            excess = float(outcome.truncation[c]) / share if share > 0 else math.inf
            if choice.family != rules[c].kind or excess <= 1.0:
                continue
            per_node = -math.log(min(float(outcome.decay[c]), 0.98)) * (
                2.0 if choice.family in ("radau", "ellipse", "contour") else 1.0
            )
            extra = min(max(1, math.ceil(math.log(min(excess, 1e30)) / per_node)), 12)
            if choice.total + extra <= MAX_NODES:
                choices[c] = choice.more(extra)
                improved = True
        if not improved:
            break
    if best is None:
        return Integral(math.nan, math.inf, math.inf, spent, tuple(choices), MAX_PASSES)
    return Integral(best.value, best.truncation, best.roundoff, spent, best.choices, best.passes)


def _raise_grades(data: ChordData, choices: list[Choice], grade: list[int], digits: float) -> bool:
    """Move the chords whose rules amplify most to a better conditioned family; False when none is left."""
    open_chords = [c for c, choice in enumerate(choices) if grade[c] + 1 < grades(choice.y) and choice.y.real < 0.5]
    if not open_chords:
        return False
    strength = {c: choices[c].rule().amplification * abs(choices[c].y.value) for c in open_chords}
    top = max(strength.values())
    for c in open_chords:
        if strength[c] >= top / 30.0:
            grade[c] += 1
            choices[c] = raised(data, choices[c], c, grade[c], digits)
    return True


def integrate_pairs(n: int, pairs: tuple[Exact, ...], rtol: float, atol: float, **options: Any) -> Integral:
    """:func:`integrate` from pair exponents in canonical ordering."""
    return integrate(chord_data(n, pairs), rtol, atol, **options)
