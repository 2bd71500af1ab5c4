"""Are the claimed errors of gradients true?  Random disk integrals with derivatives known otherwise.

    python tests/calibration/gradient_campaign.py                   the full campaign, about 2,900 cases
    python tests/calibration/gradient_campaign.py --share 0.05      a twentieth of it

``digamma``: n = 4, both derivatives of the beta function.  Closed forms (named as in ``tests/published/cases.py``): the
derivative along a random direction inside the locus, by a central difference of the closed form in many digits.
``series``: every component, by central differences of the other engine in 34 digits, also next to poles and for large
exponents.  One line for every class: how
many cases, how many ok, in how many some true error lay above the claimed one (and of those how many called themselves
ok), the smallest and the median quotient claimed/true, the share whose claimed error is at most 1e-8 of the largest
derivative among those that asked for that much, evaluations of the gradient over those of a value to the same
tolerance (median), seconds.
"""

from __future__ import annotations

import argparse
import math
import sys
import time
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass, fields, replace
from fractions import Fraction
from multiprocessing import get_context
from pathlib import Path
from typing import Any

import mpmath
import numpy as np

sys.path.insert(0, str(Path(__file__).parent.parent / "published"))

from cases import random_case
from disk_campaign import exponents_from_chords

from kn_integrate import DiskExponents, disk_gradient, disk_integral
from kn_integrate.channels import pair_order
from kn_integrate.dispatch.shifts import chord_exponents, chords_of
from kn_integrate.errors import WorkLimitError
from kn_integrate.exact import Exact

STEP = Fraction(1, 10**13)
DIGITS = 45  # of closed forms: their difference over twice the step keeps 30
SERIES_STEP = Fraction(1, 10**9)
SERIES_DIGITS = 34


@dataclass(frozen=True)
class Group:
    """One class of cases."""

    name: str
    regime: str
    count: int
    limit: float = 3e8


GROUPS = [
    Group(name, regime, count)
    for regime in ("convergent", "mild", "deep", "complex")
    for name, count in (
        ("digamma4", 100),
        ("3F2", 60),
        ("betas5", 80),
        ("betas6", 60),
        ("chain6", 40),
        ("dixon-anderson6", 60),
        ("selberg5", 80),
        ("selberg6", 60),
        ("selberg7", 6),
        ("series4", 40),
        ("series5", 40),
        ("series6", 20),
    )
] + [
    Group(name, regime, count)
    for regime in ("near poles", "large")
    for name, count in (("series4", 80), ("series5", 80), ("series6", 20))
]


@dataclass(frozen=True)
class Finding:
    """One case: errors relative to the largest derivative; ``ratio`` is the least claimed/true of its derivatives."""

    ok: bool
    claimed: float
    ratio: float
    rtol: float
    cost: float
    seconds: float


def one(group: Group, seed: int) -> Finding:
    """Run one case."""
    rng = np.random.default_rng([seed, *map(ord, group.name + group.regime)])
    start = time.perf_counter()
    rtol = float(10.0 ** -(rng.uniform(8, 12) if rng.random() < 0.7 else rng.uniform(2, 8)))
    pairs, directions, truths = _reference(group, rng)
    n = math.isqrt(2 * len(pairs)) + 1
    names = dict(zip(pair_order(n), map(str, pairs), strict=True))
    kin = DiskExponents.from_pairs(n, names)
    try:
        found = disk_gradient(kin, rtol=rtol, max_points=group.limit)
    except WorkLimitError:
        return Finding(False, math.inf, math.inf, rtol, math.nan, time.perf_counter() - start)
    value = disk_integral(kin, rtol=rtol, method="quadrature")
    largest = max(map(abs, found.derivatives))
    place = {chord: k for k, chord in enumerate(_chord_of(n, channel) for channel in found.channels)}
    ratio = math.inf
    with mpmath.workdps(40):
        for direction, truth in zip(directions, truths, strict=True):
            total, claimed = mpmath.mpf(0), 0.0
            for chord, speed in direction.items():
                number = big(speed)
                total += number * mpmath.mpmathify(found.derivatives[place[chord]])
                claimed += abs(float(abs(number))) * found.errors[place[chord]]
            if not claimed:
                continue
            true = float(abs(total - truth)) if math.isfinite(abs(complex(total))) else 0.0
            ratio = min(ratio, claimed / max(true, 1e-300))
    error = max(found.errors) / largest
    return Finding(found.ok, error, ratio, rtol, found.evaluations / value.evaluations, time.perf_counter() - start)


def big(number: Exact) -> Any:
    """An exact number in the working precision of mpmath."""
    re, im = (mpmath.mpf(part.numerator) / part.denominator for part in (number.re, number.im))
    return mpmath.mpc(re, im) if number.im else re


def _chord_of(n: int, channel: tuple[int, ...]) -> tuple[int, int]:
    inside = set(channel)
    if n in inside:
        inside = set(range(1, n + 1)) - inside
    return min(inside), max(inside)


Direction = dict[tuple[int, int], Exact]


def _reference(group: Group, rng: np.random.Generator) -> tuple[tuple[Exact, ...], list[Direction], list[Any]]:
    """Exponents, directions in the exponents of the chords, and the derivatives of the integral along them."""
    if group.name.startswith("series"):
        return _by_series(int(group.name[-1]), group.regime, rng)
    if group.name == "digamma4":
        form = random_case("beta", rng, group.regime).form
        pairs = tuple(form.pairs().flat)
        y = chord_exponents(4, pairs)
        with mpmath.workdps(40):
            a, b = big(y[1, 2]), big(y[2, 3])
            value, joint = mpmath.beta(a, b), mpmath.digamma(a + b)
            truths = [value * (mpmath.digamma(x) - joint) for x in (a, b)]
        return pairs, [{(1, 2): Exact(1)}, {(2, 3): Exact(1)}], truths
    form = random_case(group.name, rng, group.regime).form
    changes = {
        item.name: _direction(getattr(form, item.name), rng) for item in fields(form) if item.name not in ("count", "w")
    }
    up, down = (
        replace(form, **{name: _moved(getattr(form, name), change, h) for name, change in changes.items()})
        for h in (STEP, -STEP)
    )
    n = form.pairs().n
    first, second = (chord_exponents(n, tuple(moved.pairs().flat)) for moved in (up, down))
    direction = {chord: (first[chord] - second[chord]) * (1 / (2 * STEP)) for chord in chords_of(n)}
    ends = up.value(DIGITS), down.value(DIGITS)
    with mpmath.workdps(DIGITS):
        truth = (ends[0] - ends[1]) / 2 * mpmath.mpf(STEP.denominator)
    return tuple(form.pairs().flat), [direction], [truth]


def _direction(value: Any, rng: np.random.Generator) -> Any:
    if isinstance(value, Exact):
        return int(rng.integers(-3, 4))
    if isinstance(value, tuple):
        return tuple(_direction(item, rng) for item in value)
    return 0


def _moved(value: Any, change: Any, h: Fraction) -> Any:
    if isinstance(value, tuple):
        return tuple(_moved(item, c, h) for item, c in zip(value, change, strict=True))
    return value + change * h if change else value


RANGES = {
    "convergent": (20, 3000),
    "mild": (-900, 2000),
    "deep": (-4899, 2000),
    "complex": (-2500, 2500),
    "near poles": (-2499, 2000),
    "large": (-14000, 40000),
}


def _random_exponent(regime: str, rng: np.random.Generator) -> Exact:
    """Y of one chord, off the poles by 1/50; next to one (down to 1e-10) now and then in the regime that says so."""
    low, high = RANGES[regime]
    while True:
        re = Fraction(int(rng.integers(low, high)), 1000)
        im = Fraction(int(rng.integers(-1999, 2000)), 1000) if regime == "complex" else Fraction(0)
        if regime == "near poles" and re < 0 and rng.random() < 0.5:
            away = Fraction(int(rng.integers(10, 100)), 10 ** int(rng.integers(3, 12)))
            aside = away * int(rng.integers(-3, 4)) if rng.random() < 0.3 else Fraction(0)
            return Exact(round(re) + (away if rng.random() < 0.5 else -away), aside)
        if pole_distance(Exact(re, im)) >= Fraction(1, 50):
            return Exact(re, im)


def pole_distance(y: Exact) -> Fraction:
    """The larger part of the distance of the nearest pole."""
    return max(abs(y.re - min(0, round(y.re))), abs(y.im))


def _by_series(n: int, regime: str, rng: np.random.Generator) -> tuple[tuple[Exact, ...], list[Direction], list[Any]]:
    chords = {chord: _random_exponent(regime, rng) for chord in chords_of(n)}
    directions, truths = [], []
    for chord, y in chords.items():
        step = SERIES_STEP * min(Fraction(1), pole_distance(y))
        values = []
        for h in (step, -step):
            moved = exponents_from_chords(n, {**chords, chord: y + h})
            kin = DiskExponents.from_pairs(n, dict(zip(pair_order(n), map(str, moved), strict=True)))
            values.append(disk_integral(kin, digits=SERIES_DIGITS, method="kz").value)
        with mpmath.workdps(SERIES_DIGITS + 5):
            truths.append((values[0] - values[1]) / 2 * step.denominator / step.numerator)
        directions.append({chord: Exact(1)})
    return exponents_from_chords(n, chords), directions, truths


def summary(findings: list[Finding]) -> dict[str, float]:
    """The figures of one class."""
    ratios = sorted(f.ratio for f in findings if math.isfinite(f.ratio))
    strict = [f for f in findings if f.rtol <= 1e-8]
    costs = sorted(f.cost for f in findings if math.isfinite(f.cost))
    return {
        "cases": len(findings),
        "ok": sum(f.ok for f in findings),
        "too small": sum(f.ratio < 1.0 for f in findings),
        "ok but wrong": sum(f.ok and f.ratio < 1.0 for f in findings),
        "least": ratios[0] if ratios else math.nan,
        "median": ratios[len(ratios) // 2] if ratios else math.nan,
        "useful": sum(f.claimed <= 1e-8 for f in strict) / max(1, len(strict)),
        "cost": costs[len(costs) // 2] if costs else math.nan,
        "seconds": sum(f.seconds for f in findings),
    }


HEAD = (
    f"{'class':18s}{'regime':12s}{'cases':>6s}{'ok':>6s}{'small':>6s}{'wrong':>6s}"
    f"{'least':>9s}{'median':>9s}{'useful':>8s}{'cost':>6s}{'sec':>7s}"
)


def line(group: Group, s: dict[str, float]) -> str:
    """One line of the table."""
    return (
        f"{group.name:18s}{group.regime:12s}{s['cases']:6d}{s['ok']:6d}{s['too small']:6d}{s['ok but wrong']:6d}"
        f"{s['least']:9.2g}{s['median']:9.2g}{s['useful']:8.2f}{s['cost']:6.1f}{s['seconds']:7.1f}"
    )


def campaign(share: float, seed: int, workers: int, groups: list[Group] | None = None) -> dict[str, int]:
    """Run a share of every class, print the table, return the totals."""
    totals = {"cases": 0, "ok": 0, "too small": 0, "ok but wrong": 0}
    print(HEAD)
    with ProcessPoolExecutor(workers, mp_context=get_context("spawn")) as pool:
        for group in GROUPS if groups is None else groups:
            count = max(1, round(share * group.count))
            figures = summary(list(pool.map(one, [group] * count, range(seed, seed + count), chunksize=4)))
            for name in totals:
                totals[name] += int(figures[name])
            print(line(group, figures), flush=True)
    print(totals)
    return totals


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--share", type=float, default=1.0)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--workers", type=int, default=2)
    parser.add_argument("--only", default="", help="classes whose name or regime contains this")
    options = parser.parse_args()
    chosen = [g for g in GROUPS if options.only in f"{g.name} {g.regime}"]
    outcome = campaign(options.share, options.seed, options.workers, chosen)
    sys.exit(1 if outcome["ok but wrong"] or outcome["too small"] > 1e-3 * outcome["cases"] else 0)
