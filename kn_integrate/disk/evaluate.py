"""One disk integral ``I(A)``: plan, run, look at the errors, improve what limits, stop."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..errors import NotAvailableError, WorkLimitError
from ..exact import Exact
from .chords import ChordData, chord_data
from .plan import MAX_NODES, Choice, amplification, initial_choices, layout_of, plan_table, raised, thinned
from .points import eligible, integrate_small
from .run import EPSILON, Layout, Outcome, run
from .sectors import runs_of

# Extrapolated truncation errors of the chords are multiplied by SHARED, the largest one by SHARED + SINGLE: that one is
# much too small happens, that many are at once does not.  The calibration campaign reports what the factors buy.
SHARED, SINGLE = 4.0, 12.0
CALIBRATED = 8.0  # chord exponents up to this size have been compared with known values
MAX_EXPONENT = 120.0  # above this a double-precision integrand overflows or loses everything
MAX_PASSES = 12
DEFAULT_MAX_POINTS = 2e10
# A better conditioned plan may cost this many times the first one (or this many points).  Beyond that a small value of
# an oscillating integral would buy half a digit at a hundredfold price.
DEARER, CHEAP_POINTS = 30.0, 3e7


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


def _bound_of(errors: NDArray[np.float64]) -> float:
    """A bound on the truncation error from the extrapolated errors of the chords."""
    return float(SHARED * errors.sum() + SINGLE * errors.max(initial=0.0))


def _caution(data: ChordData) -> float:
    """A factor on all errors where exponents lie outside the calibrated range, 1 inside.

    Claimed errors were compared with true ones for chord exponents between -8 and 8.  Farther out, most of all at deep
    poles, single ones were found too small; the factor covers what was seen up to 60 and grows with the distance.
    """
    low = min(y.real for y in data.chords)
    high = max(y.real for y in data.chords)
    beyond = 0.4 * max(0.0, -low - CALIBRATED) + (0.05 * max(0.0, high - CALIBRATED) if low < 0 else 0.0)
    return float(10.0 ** min(beyond, 30.0))


def _spread(data: ChordData) -> float:
    """A bound on ``sum |A log P|`` over the runs: how large the logarithm of the integrand can be."""
    runs = runs_of(data.n - 2)
    return float(sum(abs(a) * math.log(b - c + 1) for a, (c, b) in zip(data.run_exponents.tolist(), runs, strict=True)))


def _worst_roundoff(data: ChordData, outcome: Outcome) -> float:
    """Bound on the round-off if all errors conspired: every term carries those of its weights and exponents."""
    return _caution(data) * EPSILON * ((8.0 + _spread(data)) * outcome.absolute + outcome.weight_noise_sum)


PROBE = 2.0**-24  # relative size of the trial perturbation of the exponents
PROBES = 2
PROBE_DIGITS = 4.0
MAX_STEPS = 12  # growth of one rule from one pass to the next
# Above this many points a plan is made from what a cheaper pass with this share of the digits shows.
SCOUTED_POINTS, SCOUT_SHARE = 5e5, 0.4
SIGMAS = 9.0


def _likely_roundoff(data: ChordData, outcome: Outcome) -> float:
    """Round-off of weights and of single terms as independent errors add up, several standard deviations.

    Errors of a weight are common to all terms with its node, so they are taken on the marginal sums.
    """
    return _caution(data) * SIGMAS * EPSILON * (outcome.weight_noise + (4.0 + 0.5 * _spread(data)) * outcome.square)


@cache
def probe_signs(size: int, k: int) -> NDArray[np.float64]:
    """Relative changes of ``size`` exponents, moduli in [1/2, 1]; fixed: the same input gives the same."""
    generator = np.random.default_rng([20240229, k])
    signs: NDArray[np.float64] = generator.uniform(0.5, 1.0, size) * generator.choice([-1.0, 1.0], size)
    return signs


def _exponent_rounding(data: ChordData, choices: Sequence[Choice], threads: int) -> tuple[float, int]:
    """What the rounding of exponents to double costs: an error that is smooth in all variables, so it is measured.

    The integral is done with exponents perturbed by fixed pseudo-random amounts far above round-off, and the change
    scaled down.  A derivative to one digit is enough, so this is done with few nodes.  Returns the error and the
    evaluations spent.
    """
    layout = layout_of(data.n, thinned(data, choices, PROBE_DIGITS))
    outcome = run(data, layout, threads)
    if not outcome.finite:
        layout = layout_of(data.n, choices)
        outcome = run(data, layout, threads)
    largest, points = 0.0, outcome.points
    for k in range(PROBES):
        signs = probe_signs(len(data.run_exponents), k)
        shaken = replace(data, run_exponents=data.run_exponents * (1.0 + PROBE * signs))
        trial = run(shaken, layout, threads)
        points += trial.points
        largest = max(largest, abs(trial.value - outcome.value) / PROBE)
    return SIGMAS * EPSILON * largest, points


def integrate(
    data: ChordData,
    rtol: float,
    atol: float,
    *,
    max_points: float = DEFAULT_MAX_POINTS,
    threads: int = 1,
    family: str | None = None,
    residues: frozenset[int] = frozenset(),
) -> Integral:
    """Integrate to a tolerance; no chord may be on a pole but those whose residue is taken.

    Parameters
    ----------
    data
        Exponents.
    rtol, atol
        Stop when the error is at most ``max(atol, rtol |value|)``.
    max_points
        Integrand evaluations that may be spent over all passes.
    threads
        Python threads; the result does not depend on it.
    family
        Use this family of rules for every chord instead of choosing.
    residues
        Chords, by their index among the runs, that sit on a pole: the result is the (iterated) residue in their
        exponents.

    Raises
    ------
    WorkLimitError
        When the first plan already needs more than ``max_points``.
    """
    largest = max(max(abs(y.value) for y in data.chords), float(np.abs(data.run_exponents).max()))
    if largest > MAX_EXPONENT:
        raise NotAvailableError(
            f"quadrature in double precision takes exponents up to {MAX_EXPONENT:g} (found {largest:.3g}); "
            "use method='kz' or digits="
        )
    digits = min(-math.log10(max(rtol, 1e-15)), 15.0) if rtol > 0 else 15.0
    if family is None and not residues and data.is_real:
        small = _small(data, rtol, atol, digits, max_points)
        if small is not None:
            return small
    caution = _caution(data)
    choices = initial_choices(data, digits, family, residues)
    best: _Pass | None = None
    spent = 0
    first_points = layout_of(data.n, choices).points
    if first_points > max_points:
        hint = "raise max_points=, relax rtol=, or use method='kz'"
        raise WorkLimitError(first_points, max_points, "points", hint)
    affordable = max(DEARER * first_points, CHEAP_POINTS)
    if first_points > SCOUTED_POINTS:
        choices = initial_choices(data, SCOUT_SHARE * digits, family, residues, budget_digits=digits)
    may_raise = family is None
    for attempt in range(1, MAX_PASSES + 1):
        layout = layout_of(data.n, choices)
        if spent + layout.points > max_points:
            if best is None:
                hint = "raise max_points=, relax rtol=, or use method='kz'"
                raise WorkLimitError(spent + layout.points, max_points, "points", hint)
            break
        outcome = run(data, layout, threads)
        spent += outcome.points
        if not outcome.finite:
            # nodes of several chords together left the region where the branch is known: use the safest rule there is
            safer = [_safer(data, choice, c, digits) if may_raise else choice for c, choice in enumerate(choices)]
            if best is not None and (safer == choices or layout_of(data.n, safer).points > affordable):
                may_raise = False  # go on from the best pass, with more nodes only
                further = _proposal(data, best, max(atol, rtol * abs(best.outcome.value)), digits, None)
            else:
                further = safer if safer != choices else None
            if further is None:
                break
            choices = further
            continue
        worst = _worst_roundoff(data, outcome)
        truncation = caution * _bound_of(outcome.truncation)
        target = max(atol, rtol * abs(outcome.value))
        likely = min(worst, _likely_roundoff(data, outcome))
        if worst <= 0.1 * target or (worst <= target and truncation + worst <= target):
            likely = worst  # no need to look closer
        current = _Pass(outcome, layout, tuple(choices), attempt, truncation, likely, likely == worst)
        if best is None or truncation + likely < best.truncation + best.roundoff:
            best = current
        if truncation + likely <= target:
            if not current.settled:
                current, points = _settled(data, current, threads)
                spent += points
                best = current
            if truncation + current.roundoff <= target:
                break
        further = _proposal(data, current, target, digits, affordable if may_raise else None)
        if further is None:
            break
        choices = further
    if best is None:
        return Integral(math.nan, math.inf, math.inf, spent, tuple(choices), MAX_PASSES)
    if not best.settled:
        best, points = _settled(data, best, threads)
        spent += points
    return Integral(best.outcome.value, best.truncation, best.roundoff, spent, best.choices, best.attempt)


def _small(data: ChordData, rtol: float, atol: float, digits: float, max_points: float) -> Integral | None:
    """The result of the way for small integrals, where it serves and suffices."""
    exponents = data.run_exponents.reshape(1, -1)
    y = np.array([[chord.value for chord in data.chords]])
    if not eligible(data.n, exponents, y)[0]:
        return None
    y1 = np.array([[chord.plus(1) for chord in data.chords]])
    found = integrate_small(data.n, exponents, y, y1, rtol, atol, digits)
    if not found.done[0] or found.points[0] > max_points:
        return None
    runs = runs_of(data.n - 2)
    choices = tuple(
        Choice(run, chord, run[1] - run[0] + 1, "radau", nodes, 0, "cheapest")
        for run, chord, nodes in zip(runs[:-1], data.chords, found.counts[0].tolist(), strict=True)
    )
    truncation, roundoff = found.errors[0].tolist()
    return Integral(found.value[0].item(), truncation, roundoff, int(found.points[0]), choices, int(found.passes[0]))


@dataclass(frozen=True)
class _Pass:
    """One pass and what is known of its errors; ``settled`` when the round-off is a bound and not a lower part."""

    outcome: Outcome
    layout: Layout
    choices: tuple[Choice, ...]
    attempt: int
    truncation: float
    roundoff: float
    settled: bool


def _settled(data: ChordData, current: _Pass, threads: int) -> tuple[_Pass, int]:
    """The pass with its round-off completed to a bound, and the evaluations that took."""
    worst = _worst_roundoff(data, current.outcome)
    rounding, points = _exponent_rounding(data, current.choices, threads)
    return replace(current, roundoff=min(worst, current.roundoff + rounding), settled=True), points


def _increments(n: int, symmetric: bool, current: _Pass, goal: float) -> dict[int, int]:
    """How many steps each chord's rule should grow so that the bound, extrapolated, is at most ``goal``.

    Greedy: the next step goes to the chord that takes off most error for the points it adds.  A symmetric integral
    keeps symmetric rules, for then half of its sectors suffice.
    """
    errors = current.outcome.truncation.copy()
    shares = current.layout.shares(len(errors))
    steps = np.zeros(len(errors), dtype=np.int64)
    gain = np.zeros(len(errors))
    for c, choice in enumerate(current.choices):
        rate = -math.log(min(max(float(current.outcome.decay[c]), 1e-9), 0.98))
        gain[c] = -math.expm1(-rate * (1.0 if choice.family == "overhang" else 2.0))
    active = (errors > 0) & (shares > 0)
    while active.any() and _bound_of(errors[active]) > goal:
        c = int(np.where(active, errors * gain / np.maximum(shares, 1e-300), -1.0).argmax())
        errors[c] *= 1.0 - gain[c]
        steps[c] += 1
        if steps[c] >= MAX_STEPS:
            active[c] = False
    if symmetric:
        runs = runs_of(n - 2)[:-1]
        mirrored = [runs.index((n - 3 - b, n - 3 - a)) for a, b in runs]
        steps = np.maximum(steps, steps[mirrored])
    return {c: int(k) for c, k in enumerate(steps) if k}


def _proposal(
    data: ChordData, current: _Pass, target: float, digits: float, affordable: float | None
) -> list[Choice] | None:
    """The next plan: better conditioned rules where round-off limits, more nodes where truncation does.

    ``affordable`` bounds the points of a plan with other rules; None keeps the rules.  None when nothing is left to do.
    """
    choices = list(current.choices)
    new = list(choices)
    improved = False
    if affordable is not None and current.roundoff > 0.3 * target:
        stronger = _raise_strongest(data, new, digits)
        if stronger != choices and layout_of(data.n, stronger).points <= affordable:
            new, improved = stronger, True
    goal = 0.8 * max(target, current.roundoff)
    for c, extra in _increments(data.n, data.is_symmetric, current, goal / _caution(data)).items():
        if new[c].family == choices[c].family and choices[c].total + extra <= MAX_NODES:
            new[c] = choices[c].more(extra)
            improved = True
    return new if improved else None


def _safer(data: ChordData, choice: Choice, index: int, digits: float) -> Choice:
    """One step towards nodes that keep runs in the right half plane: small circles, then the contour."""
    if choice.family in ("contour", "overhang", "residue") or (choice.family == "radau" and choice.y.is_real):
        return choice
    return raised(data, choice, index, digits, "nodes of several chords together met a zero of a run", "small disc")


def _raise_strongest(data: ChordData, choices: list[Choice], digits: float) -> list[Choice]:
    """The chords whose rules amplify most, one step up their ladders, as far as that helps."""
    open_chords = [
        c
        for c, choice in enumerate(choices)
        if choice.y.real < 0.5 and choice.family not in ("disc", "small disc", "contour", "residue")
    ]
    if not open_chords:
        return choices
    strength = {c: amplification(choices[c].y, choices[c].family) for c in open_chords}
    top = max(strength.values())
    new = list(choices)
    for c in open_chords:
        if strength[c] >= top - 0.7:
            new[c] = raised(data, choices[c], c, digits, "raised after a pass that lost too many digits")
    return new


def integrate_pairs(n: int, pairs: tuple[Exact, ...], rtol: float, atol: float, **options: Any) -> Integral:
    """:func:`integrate` from pair exponents in canonical ordering."""
    return integrate(chord_data(n, pairs), rtol, atol, **options)
