"""Which rule for which chord, and how many nodes: the plan before any evaluation."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import Any

import numpy as np

from .chords import ChordData
from .rules import PoleDistance, Rule, chebyshev_rule, contour_rule, radau_rule
from .rules.base import ellipse_parameter, symmetric_bend
from .rules.chebyshev import overhang_bend
from .sectors import runs_of

FAMILIES = ("radau", "overhang", "ellipse", "contour")
REACH = 0.25  # overhang of the real rule: further costs nodes, less costs digits
FRACTION = 0.4  # circle radius times cluster size; below 1/2 every run keeps a positive real part
ELLIPSE = 0.4  # exponent e of rho_e = rho^e: sampling ellipse against the singular one
MAX_NODES = 160


@dataclass(frozen=True)
class Choice:
    """The rule of one chord: family, number of nodes, and why.

    ``nodes`` counts per family: all nodes (radau, overhang, ellipse), or the circle's (contour; the segment gets
    its own share in ``segment``).
    """

    chord: tuple[int, int]
    y: PoleDistance
    size: int
    family: str
    nodes: int
    segment: int
    reason: str

    def rule(self) -> Rule:
        """Build the rule (cached)."""
        return _build(self.y, self.size, self.family, self.nodes, self.segment)

    def more(self, extra: int, group: int = 0) -> Choice:
        """The same with more nodes; a contour grows on both parts."""
        if self.family == "contour":
            return replace(self, nodes=self.nodes + 2 * extra, segment=self.segment + extra)
        step = 2 * extra if self.family == "ellipse" else extra
        return replace(self, nodes=self.nodes + step)

    @property
    def total(self) -> int:
        """Number of nodes of the rule."""
        return self.nodes + (self.segment if self.family == "contour" else 0)


@lru_cache(maxsize=4096)
def _build(y: PoleDistance, size: int, family: str, nodes: int, segment: int) -> Rule:
    if family == "radau":
        return radau_rule(y, size, nodes)
    if family == "overhang":
        return chebyshev_rule(y, size, nodes, reach=REACH)
    if family == "ellipse":
        return chebyshev_rule(y, size, nodes, rho=ellipse_rho(size))
    return contour_rule(y, size, nodes, segment, FRACTION)


def ellipse_rho(size: int) -> float:
    """The parameter of the sampling ellipse for a cluster of this size."""
    return float(ellipse_parameter(1.0 / symmetric_bend(size)) ** ELLIPSE)


def family_for(y: PoleDistance, grade: int) -> tuple[str, str]:
    """The cheapest family that is well enough conditioned at this grade, and the reason in words.

    Grade 0 is the cheapest, each further one costs more points and amplifies round-off less.
    """
    order: tuple[str, ...]
    if y.real > -0.85:
        order = ("radau", "ellipse", "contour")
        why = "Re Y > -0.85: endpoint subtraction costs one node"
    elif y.is_real:
        order = ("overhang", "ellipse", "contour")
        why = "deep real exponent: real nodes past the endpoint"
    else:
        order = ("ellipse", "contour")
        why = "deep complex exponent: nodes on an ellipse"
    grade = min(grade, len(order) - 1)
    if grade:
        why = f"raised to {order[grade]}: the cheaper rule amplified round-off too much"
    return order[grade], why


def grades(y: PoleDistance) -> int:
    """Number of grades :func:`family_for` distinguishes for this exponent."""
    return 3 if y.real > -0.85 or y.is_real else 2


def _growth(data: ChordData, index: int, t: np.ndarray[Any, Any]) -> np.ndarray[Any, Any]:
    """log |F(t)| of a one-variable model of the integrand: all gaps equal, the cluster of one chord scaled by t."""
    runs = runs_of(data.n - 2)
    a, b = runs[index]
    total = np.zeros(len(t))
    exponents = data.run_exponents.real
    for k, (c, d) in enumerate(runs):
        inside = min(b, d) - max(a, c) + 1
        if inside <= 0 or (c >= a and d <= b):
            continue
        outside = (d - c + 1) - inside
        total += exponents[k] * np.log(np.abs(1.0 + (inside / outside) * t))
    return total


_FRACTIONS = np.array([0.45, 0.55, 0.65, 0.75, 0.83, 0.9, 0.95, 0.98])


def first_count(data: ChordData, index: int, family: str, digits: float) -> tuple[int, int]:
    """Nodes that a one-variable bound predicts for this many digits; (nodes, segment nodes).

    The error of a rule exact to degree d on a function bounded by B on the Bernstein ellipse of parameter r is
    B r^-d up to a constant; the best r below the singular one is looked for.
    """
    runs = runs_of(data.n - 2)
    a, b = runs[index]
    size = b - a + 1
    y = data.chords[index]
    goal = (digits + 1.0) * math.log(10.0)
    if family == "contour":
        circle = 2 * math.ceil(0.5 * goal / -math.log(FRACTION)) + 2
        return circle, math.ceil(0.5 * goal * 0.9) + 4
    if family == "overhang":
        bend, over, rho = overhang_bend(size, REACH)
    else:
        bend, over, rho = symmetric_bend(size), 0.0, ellipse_parameter(1.0 / symmetric_bend(size))
    trial = rho**_FRACTIONS
    reach = 0.5 * (trial + 1.0 / trial)
    middle, half = 0.5 * (1.0 - over), 0.5 * (1.0 + over)
    x = np.concatenate([middle - half * reach, middle + half * reach, [0.0, 0.5, 1.0]])
    stretch = 1.0 + bend - bend * x
    level = _growth(data, index, x / stretch) - (y.real + 1.0) * np.log(np.abs(stretch))
    count = len(trial)
    bound = np.maximum(level[:count], level[count : 2 * count]) - level[2 * count :].max()
    work = goal + np.maximum(bound, 0.0)
    if family == "radau":
        nodes = math.ceil(float((work / (2.0 * np.log(trial))).min())) + 1
        return max(nodes, 6), 0
    if family == "overhang":
        return max(math.ceil(float((work / np.log(trial)).min())) + 1, 8), 0
    rate = np.log(trial) - math.log(ellipse_rho(size))
    usable = rate > 0.05
    return max(2 * math.ceil(0.5 * float((work[usable] / rate[usable]).min())) + 2, 10), 0


def initial_choices(data: ChordData, digits: float, family: str | None = None) -> list[Choice]:
    """The first plan for this many digits; ``family`` forces one rule for every chord it can serve."""
    choices = []
    for index, run in enumerate(runs_of(data.n - 2)[:-1]):
        y = data.chords[index]
        if family is None:
            name, why = family_for(y, 0)
        else:
            name, why = family, "asked for by name"
        nodes, segment = first_count(data, index, name, digits)
        choices.append(Choice(run, y, run[1] - run[0] + 1, name, min(nodes, MAX_NODES), segment, why))
    return choices


def raised(data: ChordData, choice: Choice, index: int, grade: int, digits: float) -> Choice:
    """The choice for a chord at a higher grade."""
    name, why = family_for(choice.y, grade)
    if name == choice.family:
        return choice
    nodes, segment = first_count(data, index, name, digits)
    return replace(choice, family=name, nodes=min(nodes, MAX_NODES), segment=segment, reason=why)


def plan_table(choices: Sequence[Choice]) -> list[dict[str, Any]]:
    """The plan in plain values, one entry a chord."""
    return [
        {
            "positions": list(range(choice.chord[0] + 1, choice.chord[1] + 3)),
            "Y": str(choice.y.exact),
            "rule": choice.family,
            "nodes": choice.total,
            "amplification": f"{choice.rule().amplification:.3g}",
            "reason": choice.reason,
        }
        for choice in choices
    ]
