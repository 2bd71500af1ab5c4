"""Are the claimed errors of the KZ engine true?  Closed forms, and random deep exponents against multiple precision.

    python tests/calibration/kz_campaign.py [--share X] [--only TEXT]

Columns as in ``disk_campaign.py``.  Classes named ``deep..`` have chord exponents drawn from (-2.6, 0.3) or (-5, 5);
their truth is the same recursion at 25 digits, an independent check of the rounding only (the engine itself is checked
against closed forms and quadrature).
"""

from __future__ import annotations

import argparse
import sys
import time
from concurrent.futures import ProcessPoolExecutor
from fractions import Fraction
from multiprocessing import get_context
from pathlib import Path

import mpmath
import numpy as np

sys.path.insert(0, str(Path(__file__).parent))
sys.path.insert(0, str(Path(__file__).parent.parent / "published"))

from cases import random_case
from disk_campaign import HEAD, Finding, Group, exponents_from_chords, line, summary

from kn_integrate.dispatch.shifts import chords_of
from kn_integrate.exact import ONE, Exact
from kn_integrate.integrals import DiskTerm
from kn_integrate.kz.integral import integrate_terms

GROUPS = [
    Group(kind, regime, count)
    for regime in ("convergent", "mild", "deep", "complex")
    for kind, count in (
        ("beta", 150),
        ("3F2", 150),
        ("betas5", 150),
        ("betas6", 150),
        ("dixon-anderson6", 150),
        ("selberg6", 150),
        ("selberg7", 50),
        ("dougall7", 50),
    )
] + [
    Group(f"deep{n}", f"{low},{high}", count)
    for low, high in (("-2.6", "0.3"), ("-5", "5"))
    for n, count in ((5, 200), (6, 200), (7, 60), (8, 10))
]


def one(group: Group, seed: int) -> Finding:
    """Run one case in double precision only."""
    rng = np.random.default_rng([seed, *map(ord, group.name + group.regime)])
    start = time.perf_counter()
    if group.name.startswith("deep"):
        n = int(group.name[-1])
        low, high = (int(1000 * Fraction(x)) for x in group.regime.split(","))
        chords = {c: Exact(Fraction(_off_pole(rng, low, high), 1000)) for c in chords_of(n)}
        pairs = exponents_from_chords(n, chords)
        truth = integrate_terms(n, [DiskTerm(ONE, pairs)], rtol=1e-25, digits=25).value
    else:
        case = random_case(group.name, rng, group.regime)
        n, pairs, truth = case.n, tuple(case.pairs.flat), case.value(25)
    rtol = float(10.0 ** -rng.uniform(6, 14))
    result = integrate_terms(n, [DiskTerm(ONE, pairs)], rtol=rtol, escalate=False)
    with mpmath.workdps(30):
        size = abs(truth) or mpmath.mpf(1)  # an exact zero is measured absolutely
        true = float(abs(mpmath.mpmathify(result.value) - truth) / size)
    claimed = float(result.error / size)
    return Finding(result.ok, claimed, true, rtol, time.perf_counter() - start)


def _off_pole(rng: np.random.Generator, low: int, high: int) -> int:
    while True:
        value = int(rng.integers(low + 1, high))
        if value > 20 or abs(value - 1000 * round(value / 1000)) >= 20:
            return value


def campaign(share: float, seed: int, workers: int, only: str = "") -> dict[str, int]:
    """Run a share of every class, print the table, return the totals."""
    totals = {"cases": 0, "too small": 0, "ok but wrong": 0}
    print(HEAD)
    with ProcessPoolExecutor(workers, mp_context=get_context("spawn")) as pool:
        for group in GROUPS:
            if only not in f"{group.name} {group.regime}":
                continue
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
    parser.add_argument("--only", default="")
    options = parser.parse_args()
    outcome = campaign(options.share, options.seed, options.workers, options.only)
    sys.exit(1 if outcome["ok but wrong"] or outcome["too small"] > 1e-3 * outcome["cases"] else 0)
