"""Are the claimed errors of the disk quadrature true?  Random integrals with known values, and identities.

    python tests/calibration/disk_campaign.py                   the full campaign, about 6,000 cases
    python tests/calibration/disk_campaign.py --share 0.05      a twentieth of it

Every class of cases prints one line: how many, how many were ok, how many true errors lay above the claimed ones (and
of those how many called themselves ok), the smallest and the median quotient claimed/true, and the share whose claimed
error is at most 1e-8 of the value among those that asked for that much.  Cases are seeded one by one, so any of them
can be run again alone.
"""

from __future__ import annotations

import argparse
import math
import sys
import time
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from fractions import Fraction
from multiprocessing import get_context
from pathlib import Path

import mpmath
import numpy as np

sys.path.insert(0, str(Path(__file__).parent.parent / "published"))

from cases import random_case

from kn_integrate.disk.evaluate import integrate_pairs
from kn_integrate.dispatch.shifts import chords_of, pair_order, pair_shift
from kn_integrate.errors import WorkLimitError
from kn_integrate.exact import Exact

EPSILON = 2.0**-52


@dataclass(frozen=True)
class Group:
    """One class of cases."""

    name: str
    regime: str
    count: int
    limit: float = 3e8  # integrand evaluations


CLOSED = [
    Group(kind, regime, count)
    for regime in ("convergent", "mild", "deep", "complex")
    for kind, count in (
        ("beta", 150),
        ("3F2", 200),
        ("betas5", 150),
        ("betas6", 120),
        ("chain6", 120),
        ("dixon-anderson6", 120),
        ("selberg5", 150),
        ("selberg6", 120),
        ("selberg7", 12),
        ("dougall7", 12),
    )
]
IDENTITIES = [
    Group(f"{what}{n}", regime, count)
    for regime in ("real", "complex")
    for n, count in ((4, 300), (5, 300), (6, 300), (7, 20))
    for what in ("u", "cyclic", "reflection")
]
GROUPS = CLOSED + IDENTITIES


@dataclass(frozen=True)
class Finding:
    """One case: claimed and true error relative to the size of the value, and whether it called itself ok."""

    ok: bool
    claimed: float
    true: float
    rtol: float
    seconds: float


def tolerance(rng: np.random.Generator, n: int) -> float:
    """Tolerances of all sizes, less strict where a case costs much."""
    strict = 12 if n <= 6 else 10
    return float(10.0 ** -(rng.uniform(8, strict) if rng.random() < 0.7 else rng.uniform(3, 8)))


def one(group: Group, seed: int) -> Finding:
    """Run one case."""
    rng = np.random.default_rng([seed, *map(ord, group.name + group.regime)])
    start = time.perf_counter()
    try:
        ok, claimed, true, rtol = _identity(group, rng) if group in IDENTITIES else _closed(group, rng)
    except WorkLimitError:
        ok, claimed, true, rtol = False, math.inf, 0.0, 1e-8
    return Finding(ok, claimed, true, rtol, time.perf_counter() - start)


def _closed(group: Group, rng: np.random.Generator) -> tuple[bool, float, float, float]:
    case = random_case(group.name, rng, group.regime)
    rtol = tolerance(rng, case.n)
    result = integrate_pairs(case.n, tuple(case.pairs.flat), rtol, 0.0, max_points=group.limit)
    value = case.value(25)
    size = abs(value) or mpmath.mpf(1)  # an exact zero is measured absolutely
    with mpmath.workdps(30):
        true = float(abs(mpmath.mpmathify(result.value) - value) / size) if math.isfinite(abs(result.value)) else 0.0
    return result.error <= rtol * abs(result.value), float(result.error / size), true, rtol


def exponents_from_chords(n: int, chords: dict[tuple[int, int], Exact]) -> tuple[Exact, ...]:
    """Pair exponents with the given divisor exponents: those of all Y = 0 (adjacent pairs -1), shifted."""
    adjacent = {(i, i + 1) for i in range(1, n)} | {(1, n)}
    base = [Exact(-1) if pair in adjacent else Exact(0) for pair in pair_order(n)]
    return tuple(b + h for b, h in zip(base, pair_shift(n, chords), strict=True))


def random_chords(n: int, rng: np.random.Generator, is_complex: bool) -> dict[tuple[int, int], Exact]:
    """Y of every chord in (-4.9, 2), off the poles by 1/50, with |Im Y| < 2 if complex."""

    def number() -> Exact:
        while True:
            re = Fraction(int(rng.integers(-4899, 2000)), 1000)
            im = Fraction(int(rng.integers(-1999, 2000)), 1000) if is_complex else Fraction(0)
            if abs(re - min(0, round(re))) >= Fraction(1, 50) or abs(im) >= Fraction(1, 50):
                return Exact(re, im)

    return {chord: number() for chord in chords_of(n)}


def crossing(n: int, chord: tuple[int, int]) -> list[tuple[int, int]]:
    """The chords that cross a chord."""
    inside = set(range(chord[0], chord[1] + 1))
    found = []
    for other in chords_of(n):
        cluster = set(range(other[0], other[1] + 1))
        if (inside & cluster) and (inside - cluster) and (cluster - inside) and len(inside | cluster) < n:
            found.append(other)
    return found


def rotated(n: int, pairs: tuple[Exact, ...], by: list[int]) -> tuple[Exact, ...]:
    """The same exponents with position i called by[i-1]."""
    table = dict(zip(pair_order(n), pairs, strict=True))
    image = {}
    for (i, j), value in table.items():
        a, b = by[i - 1], by[j - 1]
        image[min(a, b), max(a, b)] = value
    return tuple(image[pair] for pair in pair_order(n))


def _identity(group: Group, rng: np.random.Generator) -> tuple[bool, float, float, float]:
    what, n = group.name[:-1], int(group.name[-1])
    chords = random_chords(n, rng, group.regime == "complex")
    rtol = tolerance(rng, n)
    pairs = exponents_from_chords(n, chords)
    if what == "u":
        every = chords_of(n)
        chord = every[int(rng.integers(len(every)))]
        raised = {**chords, chord: chords[chord] + 1}
        others = dict(chords)
        for other in crossing(n, chord):
            others[other] = others[other] + 1
        signed = [
            (1, pairs),
            (-1, exponents_from_chords(n, raised)),
            (-1, exponents_from_chords(n, others)),
        ]
    elif what == "cyclic":
        step = int(rng.integers(1, n))
        signed = [(1, pairs), (-1, rotated(n, pairs, [(i + step - 1) % n + 1 for i in range(1, n + 1)]))]
    else:
        signed = [(1, pairs), (-1, rotated(n, pairs, list(range(n, 0, -1))))]
    results = []
    for sign, exponents in signed:
        if any(y.is_integer and y <= 0 for y in _chords(n, exponents)):
            return True, 0.0, 0.0, rtol  # a shift of the identity hit a pole exactly; nothing to compare
        results.append((sign, integrate_pairs(n, exponents, rtol, 0.0, max_points=group.limit)))
    size = max(abs(result.value) for _, result in results) or 1.0
    residual = abs(sum(sign * result.value for sign, result in results)) / size
    claimed = sum(result.error for _, result in results) / size + 4 * EPSILON
    ok = all(result.error <= rtol * abs(result.value) for _, result in results)
    return ok, float(claimed), float(residual), rtol


def _chords(n: int, pairs: tuple[Exact, ...]) -> list[Exact]:
    from kn_integrate.dispatch.shifts import chord_exponents

    return list(chord_exponents(n, pairs).values())


def summary(group: Group, findings: list[Finding]) -> dict[str, float]:
    """The figures of one class."""
    ratios = sorted(f.claimed / max(f.true, EPSILON / 4) for f in findings)
    return {
        "cases": len(findings),
        "ok": sum(f.ok for f in findings),
        "too small": sum(f.true > f.claimed for f in findings),
        "ok but wrong": sum(f.ok and f.true > f.claimed for f in findings),
        "least": ratios[0] if ratios else math.nan,
        "median": ratios[len(ratios) // 2] if ratios else math.nan,
        "useful": _useful(findings),
        "seconds": sum(f.seconds for f in findings),
    }


def _useful(findings: list[Finding]) -> float:
    strict = [f for f in findings if f.rtol <= 1e-8]
    return sum(f.claimed <= 1e-8 for f in strict) / max(1, len(strict))


HEAD = (
    f"{'class':18s}{'regime':12s}{'cases':>6s}{'ok':>6s}{'small':>6s}{'wrong':>6s}"
    f"{'least':>9s}{'median':>9s}{'useful':>8s}{'sec':>7s}"
)


def line(group: Group, s: dict[str, float]) -> str:
    """One line of the table."""
    return (
        f"{group.name:18s}{group.regime:12s}{s['cases']:6d}{s['ok']:6d}{s['too small']:6d}{s['ok but wrong']:6d}"
        f"{s['least']:9.2g}{s['median']:9.2g}{s['useful']:8.2f}{s['seconds']:7.1f}"
    )


def campaign(share: float, seed: int, workers: int, groups: list[Group] | None = None) -> dict[str, int]:
    """Run a share of every class, print the table, return the totals."""
    totals = {"cases": 0, "too small": 0, "ok but wrong": 0}
    print(HEAD)
    with ProcessPoolExecutor(workers, mp_context=get_context("spawn")) as pool:
        for group in GROUPS if groups is None else groups:
            count = max(1, round(share * group.count))
            findings = list(pool.map(one, [group] * count, range(seed, seed + count), chunksize=4))
            s = summary(group, findings)
            for name in totals:
                totals[name] += int(s[name])
            print(line(group, s), flush=True)
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
