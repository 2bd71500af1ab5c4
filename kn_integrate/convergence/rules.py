"""The disk rules on one integral at increasing numbers of nodes, without adaptivity."""

from __future__ import annotations

import math
import time
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from ..disk.chords import ChordData, chord_data
from ..disk.plan import FAMILIES, Choice, initial_choices, layout_of
from ..disk.run import run
from ..disk.terms import Term

MAX_POINTS = 3e8
FREE_POINTS = 1e5


@dataclass(frozen=True)
class RuleResult:
    """One pass: points, mean nodes per variable, seconds, value, and the error its null functionals show."""

    evaluations: int
    nodes: float
    seconds: float
    value: complex
    claimed: float


def applicable(n: int, terms: Sequence[Term]) -> tuple[str, ...]:
    """The families that serve every chord of every term by themselves (``"auto"``, the mixed plan, always does)."""
    chords = [y for term in terms for y in chord_data(n, term.pairs).chords]
    names = ["auto"]
    if all(y.real > -0.85 for y in chords):
        names.append("radau")
    if all(y.is_real and y.real > -3 for y in chords):
        names.append("overhang")
    return (*names, "ellipse", "small disc", "contour")


def run_rule(
    name: str, n: int, terms: Sequence[Term], digits: Sequence[float], cap: float, remarks: list[str]
) -> Iterator[tuple[float, RuleResult]]:
    """Passes planned for increasing numbers of digits; why they end early goes to ``remarks``."""
    data = [chord_data(n, term.pairs) for term in terms]
    first = layout_of(n, _plan(data[0], digits[0], name))
    if first.points <= FREE_POINTS:
        run(data[0], first)  # kernels are compiled once after an installation: not what is timed here
    stop = time.perf_counter() + cap
    before = None
    for goal in digits:
        plans = [_plan(part, goal, name) for part in data]
        layouts = [layout_of(n, plan) for plan in plans]
        if sum(layout.points for layout in layouts) > MAX_POINTS or time.perf_counter() > stop:
            remarks.append(f"stopped before {goal:g} digits: {'time' if time.perf_counter() > stop else 'points'}")
            return
        if plans == before:  # already more accurate than asked
            continue
        before = plans
        start = time.perf_counter()
        outcomes = [run(part, layout) for part, layout in zip(data, layouts, strict=True)]
        seconds = time.perf_counter() - start
        factors = [term.coefficient.value() for term in terms]
        value = complex(sum(f * o.value for f, o in zip(factors, outcomes, strict=True)))
        claimed = sum(abs(f) * float(o.truncation.sum()) for f, o in zip(factors, outcomes, strict=True))
        points = sum(o.points for o in outcomes)
        if not math.isfinite(abs(value)):
            remarks.append(f"stopped at {goal:g} digits: no finite value")
            return
        yield goal, RuleResult(points, _mean_nodes(plans[0]), seconds, value, claimed)


def _plan(data: ChordData, digits: float, name: str) -> list[Choice]:
    if name != "auto" and name not in FAMILIES:
        raise ValueError(f"no family {name!r}")
    return initial_choices(data, digits, None if name == "auto" else name)


def _mean_nodes(plan: Sequence[Choice]) -> float:
    return float(np.mean([choice.total for choice in plan]))


def predicted_rate(name: str, n: int, terms: Sequence[Term]) -> float:
    """Decimal digits per node that the nearest singularities allow, for the slowest chord of the first term."""
    data = chord_data(n, terms[0].pairs)
    rates = []
    for choice in _plan(data, 10.0, name):
        rule = choice.rule()
        share = 1.0 if choice.family != "contour" else 0.5
        power = 2.0 if choice.family == "radau" else 1.0
        slowest = max(group.ratio for group in rule.groups)
        rates.append(-math.log10(slowest) * power * share)
    return min(rates)
