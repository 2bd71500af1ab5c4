"""Which rule for which chord, and how many nodes: the plan before any evaluation."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import Any

import numpy as np

from .chords import ChordData
from .rules import PoleDistance, Rule, chebyshev_rule, contour_rule, disc_rule, radau_rule, residue_rule
from .rules.base import ellipse_parameter, symmetric_bend
from .rules.chebyshev import overhang_bend
from .rules.disc import disc_bend, disc_decay
from .run import Layout
from .sectors import runs_of, sector_table

FAMILIES = ("radau", "overhang", "ellipse", "disc", "small disc", "contour")
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

    def rule(self, faced: bool = False) -> Rule:
        """Build the rule (cached).

        ``faced``: in this sector a cluster on a circle stands on the other side; a disc then takes its small circle
        and the larger number of nodes that goes with it.
        """
        if self.family == "disc" and faced:
            return _build(self.y, self.size, "small disc", _small_count(self.size, self.nodes), 0)
        if self.family == "residue" and self.level and faced:
            return _build(self.y, self.size, "small residue", _small_count(self.size, self.nodes), 0)
        return _build(self.y, self.size, self.family, self.nodes, self.segment)

    def more(self, extra: int, group: int = 0) -> Choice:
        """The same with more nodes; a contour grows on both parts."""
        if self.family == "contour":
            return replace(self, nodes=self.nodes + 2 * extra, segment=self.segment + extra)
        step = 2 * extra if self.family in ("ellipse", "disc", "small disc", "residue") else extra
        return replace(self, nodes=self.nodes + step)

    @property
    def level(self) -> int:
        """The level of the pole that a residue is taken at."""
        return -int(self.y.exact)

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
    if family in ("disc", "small disc"):
        return disc_rule(y, size, nodes, wide=family == "disc")
    if family in ("residue", "small residue"):
        return residue_rule(-int(y.exact), size, nodes, wide=family == "residue")
    return contour_rule(y, size, nodes, segment, FRACTION)


def _small_count(size: int, nodes: int) -> int:
    """Nodes on the small circle that give what ``nodes`` give on the large one."""
    ratio = math.log(disc_decay(size, True)) / math.log(disc_decay(size, False))
    return 2 * math.ceil(0.5 * nodes * ratio)


def ellipse_rho(size: int) -> float:
    """The parameter of the sampling ellipse for a cluster of this size."""
    return float(ellipse_parameter(1.0 / symmetric_bend(size)) ** ELLIPSE)


_LADDERS: dict[str, tuple[str, ...]] = {
    "mild": ("radau", "ellipse", "disc", "small disc", "contour"),
    "deep real": ("overhang", "ellipse", "disc", "small disc", "contour"),
    "deep complex": ("ellipse", "disc", "small disc", "contour"),
}


def ladder(y: PoleDistance) -> tuple[str, ...]:
    """The families that serve an exponent, each better conditioned and dearer than the one before."""
    if y.real > -0.85:
        return _LADDERS["mild"]
    return _LADDERS["deep real"] if y.is_real else _LADDERS["deep complex"]


def amplification(y: PoleDistance, family: str) -> float:
    """log10 of how much a rule amplifies round-off, as fitted to one-variable integrals of size-1..4 clusters."""
    depth = max(0.0, -y.real)
    if family == "radau":
        return 0.1 + 3.0 * depth
    if family == "overhang":
        return 0.6 + 1.3 * depth
    if family == "ellipse":
        return 0.1 + 0.7 * depth
    if family in ("disc", "small disc"):
        return 0.2 + 0.2 * depth
    return 0.2 + 0.45 * depth


def log_runs(n: int, index: int, t: np.ndarray[Any, Any]) -> np.ndarray[Any, Any]:
    """log |P_run(t)|, shape (runs, len(t)), of a one-variable model of the integrand.

    All gaps are equal, and the cluster of one chord is scaled by t; 0 for runs that do not meet it or lie inside.
    """
    runs = runs_of(n - 2)
    a, b = runs[index]
    found = np.zeros((len(runs), len(t)))
    for k, (c, d) in enumerate(runs):
        inside = min(b, d) - max(a, c) + 1
        if inside <= 0 or (c >= a and d <= b):
            continue
        outside = (d - c + 1) - inside
        found[k] = np.log(np.abs(1.0 + (inside / outside) * t))
    return found


def _growth(data: ChordData, index: int, t: np.ndarray[Any, Any]) -> np.ndarray[Any, Any]:
    """log |F(t)| of the model of :func:`log_runs`."""
    total: np.ndarray[Any, Any] = data.run_exponents.real @ log_runs(data.n, index, t)
    return total


FRACTIONS = np.array([0.45, 0.55, 0.65, 0.75, 0.83, 0.9, 0.95, 0.98])


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
    trial = rho**FRACTIONS
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
        return max(nodes, 5), 0
    if family == "overhang":
        return max(math.ceil(float((work / np.log(trial)).min())) + 1, 8), 0
    if family == "small disc":
        nodes, segment = first_count(data, index, "disc", digits)
        return _small_count(size, nodes), segment
    if family == "disc":
        # the circle is |x| = 1 about 0; compare with the model on the real ends of larger circles
        bend = disc_bend(size, True)
        radii = (1.0 / disc_decay(size, True)) ** FRACTIONS
        x = np.concatenate([-radii, radii, [0.0, 0.5, 1.0]])
        stretch = 1.0 + bend - bend * x
        level = _growth(data, index, x / stretch) - (y.real + 1.0) * np.log(np.abs(stretch))
        bound = np.maximum(level[:count], level[count : 2 * count]) - level[2 * count :].max()
        return max(2 * math.ceil(0.5 * float(((goal + np.maximum(bound, 0.0)) / np.log(radii)).min())) + 2, 10), 0
    rate = np.log(trial) - math.log(ellipse_rho(size))
    usable = rate > 0.05
    return max(2 * math.ceil(0.5 * float((work[usable] / rate[usable]).min())) + 2, 10), 0


def initial_choices(
    data: ChordData,
    digits: float,
    family: str | None = None,
    residues: frozenset[int] = frozenset(),
    budget_digits: float | None = None,
) -> list[Choice]:
    """The first plan for this many digits; ``family`` forces one family for every chord it can serve.

    ``budget_digits``: the digits that round-off must leave, when nodes are planned for fewer at first.

    Chords in ``residues`` sit on a pole and get the functional of the residue there; then only sectors whose tree has
    all of them count, and chords of no such sector get no rule that is ever built.

    Every chord starts with its cheapest family.  As long as some sector would amplify round-off beyond the tolerance,
    the chord of that sector that amplifies most is given the next family of its ladder.
    """
    runs = runs_of(data.n - 2)[:-1]
    if family is not None:
        names = [family if family != "radau" or y.real > -1.0 else "contour" for y in data.chords]
        return [
            _residue_choice(data, k, digits) if k in residues else _choice(data, k, name, digits, "asked for by name")
            for k, name in enumerate(names)
        ]
    ladders = [ladder(y) for y in data.chords]
    grade = [0] * len(runs)
    strength = np.array([amplification(y, steps[0]) for y, steps in zip(data.chords, ladders, strict=True)])
    strength[list(residues)] = 0.5
    variables = sector_table(data.n).variables[sectors_with(data.n, residues)]
    budget = 14.5 - (
        digits if budget_digits is None else budget_digits
    )  # a decade for the error to stay below the tolerance, and a bit for sums of many terms
    for _ in range(3 * len(runs)):
        totals = strength[variables].sum(axis=1)
        row = variables[int(totals.argmax())]
        movable = [
            c for c in row.tolist() if ladders[c][grade[c]] != "disc" and data.chords[c].real < 0 and c not in residues
        ]
        if totals.max() <= budget or not movable:
            break
        c = max(movable, key=lambda c: strength[c])
        grade[c] += 1
        strength[c] = amplification(data.chords[c], ladders[c][grade[c]])
    why = ["cheapest", "raised once, round-off", "raised twice, round-off"]
    return [
        _residue_choice(data, k, digits)
        if k in residues
        else _choice(data, k, ladders[k][grade[k]], digits, why[grade[k]])
        for k in range(len(runs))
    ]


def sectors_with(n: int, chords: frozenset[int]) -> np.ndarray[Any, Any]:
    """The sectors whose tree has all these chords."""
    variables = sector_table(n).variables
    keep = np.ones(len(variables), dtype=bool)
    for c in chords:
        keep &= (variables == c).any(axis=1)
    return np.flatnonzero(keep)


def _residue_choice(data: ChordData, index: int, digits: float) -> Choice:
    run = runs_of(data.n - 2)[index]
    y, size = data.chords[index], run[1] - run[0] + 1
    level = -int(y.exact)
    nodes = 1
    if level:
        nodes = max(first_count(data, index, "disc", digits)[0], 2 * level + 8)
    return Choice(run, y, size, "residue", min(nodes, MAX_NODES), 0, f"residue at level {level}")


def thinned(data: ChordData, choices: Sequence[Choice], digits: float) -> list[Choice]:
    """The same families with the nodes that a first plan would take for fewer digits."""
    found = []
    for k, choice in enumerate(choices):
        if choice.family == "residue":
            found.append(choice)
            continue
        nodes, segment = first_count(data, k, choice.family, digits)
        found.append(replace(choice, nodes=min(nodes, choice.nodes), segment=min(segment, choice.segment)))
    return found


def _choice(data: ChordData, index: int, family: str, digits: float, reason: str) -> Choice:
    run = runs_of(data.n - 2)[index]
    nodes, segment = first_count(data, index, family, digits)
    return Choice(run, data.chords[index], run[1] - run[0] + 1, family, min(nodes, MAX_NODES), segment, reason)


def raised(data: ChordData, choice: Choice, index: int, digits: float, reason: str, at_least: str = "") -> Choice:
    """The choice for a chord one step up its ladder (to ``at_least`` if that is further); the same at its end."""
    steps = ladder(choice.y)
    place = steps.index(choice.family)
    target = max(place + 1, steps.index(at_least) if at_least else 0)
    if target >= len(steps):
        return choice
    return _choice(data, index, steps[target], digits, reason)


def layout_of(n: int, choices: Sequence[Choice]) -> Layout:
    """Rules and rows for all sectors: discs that face another disc take their small circle.

    With residues among the choices, only the sectors that have all their chords.
    """
    table = sector_table(n)
    residues = frozenset(c for c, choice in enumerate(choices) if choice.family == "residue")
    sectors = sectors_with(n, residues)
    used = set(np.unique(table.variables[sectors]).tolist())
    chord = sorted(used)
    rules = [choices[c].rule() for c in chord]
    place = np.full(len(choices), -1, dtype=np.int32)
    place[chord] = np.arange(len(chord))
    rows = place[table.variables]
    is_disc = np.array(
        [choice.family == "disc" or (choice.family == "residue" and choice.level > 0) for choice in choices]
    )
    if is_disc.any():
        on_disc = is_disc[table.variables]
        other = np.take_along_axis(on_disc, np.maximum(table.sibling, 0), axis=1) & (table.sibling >= 0)
        faced = on_disc & other
        if faced.any():
            for c in sorted(used & set(np.unique(table.variables[faced]).tolist())):
                rows[faced & (table.variables == c)] = len(rules)
                rules.append(choices[c].rule(faced=True))
                chord.append(c)
    return Layout(tuple(rules), np.array(chord), rows, sectors)


def plan_table(choices: Sequence[Choice]) -> list[dict[str, Any]]:
    """The plan in plain values, one entry for each chord that has a rule."""
    n = max(choice.chord[1] for choice in choices) + 3
    residues = frozenset(c for c, choice in enumerate(choices) if choice.family == "residue")
    used = set(np.unique(sector_table(n).variables[sectors_with(n, residues)]).tolist())
    return [
        {
            "positions": list(range(choice.chord[0] + 1, choice.chord[1] + 3)),
            "Y": str(choice.y.exact),
            "rule": choice.family,
            "nodes": choice.total,
            "amplification": f"{choice.rule().amplification:.3g}",
            "reason": choice.reason,
        }
        for c, choice in enumerate(choices)
        if c in used
    ]
