"""Are the claimed errors of batches true?  Many small integrals with known values, in few calls.

    python tests/calibration/batch_campaign.py                  the full campaign, about 50,000 cases
    python tests/calibration/batch_campaign.py --share 0.02     a fiftieth of it

Four punctures: B(a, b) from random exponents in (-0.84, 9), also close to poles and of very different size.  Five and
six: the loci with Gamma-function values of the disk campaign, convergent and mildly divergent.  Columns: cases, those
done in compiled code, ok, claimed errors that were too small, of those how many called themselves ok, the smallest and
the median quotient claimed/true.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Callable, Iterator
from fractions import Fraction
from pathlib import Path
from typing import Any

import mpmath
import numpy as np

sys.path.insert(0, str(Path(__file__).parent.parent / "published"))

from cases import random_case

import kn_integrate as kn
from kn_integrate.batch import at_once

EPSILON = 2.0**-52
LOCI = [
    (kind, regime, count)
    for regime in ("convergent", "mild")
    for kind, count in (
        ("betas5", 5000),
        ("selberg5", 5000),
        ("3F2", 1500),
        ("betas6", 2000),
        ("dixon-anderson6", 2000),
        ("selberg6", 2000),
    )
]
TOLERANCES = (1e-4, 1e-6, 1e-8, 1e-10, 1e-11, 1e-12)
Case = tuple[kn.DiskExponents, Callable[[], Any]]


def four_point(rng: np.random.Generator) -> Case:
    """B(a, b) at random exponents."""

    def number() -> Fraction:
        kind = rng.integers(4)
        if kind == 0:
            return Fraction(int(rng.integers(-840, 9000)), 1000)
        if kind == 1:
            return Fraction(int(rng.integers(-840, 1500)), 1000)
        size = Fraction(10) ** -int(rng.integers(2, 13))  # next to the pole at 0
        return size * int(rng.integers(100, 1000)) / 100 * int(rng.choice([-1, 1]))

    a, b = number() or Fraction(1, 2), number() or Fraction(1, 3)
    table = {(1, 2): a - 1, (3, 4): a - 1, (2, 3): b - 1, (1, 4): b - 1, (1, 3): -a - b, (2, 4): -a - b}

    def truth() -> Any:
        with mpmath.workdps(40):
            return mpmath.beta(mpmath.mpf(a.numerator) / a.denominator, mpmath.mpf(b.numerator) / b.denominator)

    return kn.DiskExponents.from_pairs(4, table), truth


def locus(kind: str, regime: str, rng: np.random.Generator) -> Case:
    """A case of the disk campaign."""
    case = random_case(kind, rng, regime)
    return kn.DiskExponents(case.n, tuple(case.pairs.flat)), lambda: case.value(25)


def batches(share: float, seed: int) -> Iterator[tuple[str, float, list[Case]]]:
    """Names, tolerances and cases."""
    for tolerance in TOLERANCES:
        rng = np.random.default_rng([seed, 4, round(-np.log10(tolerance))])
        count = max(1, round(share * 2000))
        yield "beta4", tolerance, [four_point(rng) for _ in range(count)]
    for kind, regime, total in LOCI:
        for tolerance in TOLERANCES:
            rng = np.random.default_rng([seed, *map(ord, kind + regime), round(-np.log10(tolerance))])
            count = max(1, round(share * total / len(TOLERANCES)))
            yield f"{kind} {regime}", tolerance, [locus(kind, regime, rng) for _ in range(count)]


def campaign(share: float, seed: int) -> dict[str, int]:
    """Run a share of every class, print the table, return the totals."""
    names = ("cases", "compiled", "ok", "small", "wrong", "least", "median")
    print(f"{'class':28s}{'rtol':>7s}" + "".join(f"{name:>9s}" for name in names))
    totals = {"cases": 0, "compiled": 0, "too small": 0, "ok but wrong": 0}
    for name, rtol, cases in batches(share, seed):
        points = [point for point, _ in cases]
        batch = kn.disk_batch(points, rtol=rtol)
        compiled = int(at_once(points, rtol=rtol)[0].sum())
        ratios, small, wrong = [], 0, 0
        for k, (_, truth) in enumerate(cases):
            if not np.isfinite(batch.value[k]):
                continue
            with mpmath.workdps(30):
                true = float(abs(mpmath.mpf(batch.value[k].item()) - truth()))
            beyond = bool(true > batch.error[k])
            small += beyond
            wrong += beyond and bool(batch.ok[k])
            ratios.append(batch.error[k] / max(true, EPSILON / 4 * abs(batch.value[k])))
        totals["cases"] += len(cases)
        totals["compiled"] += compiled
        totals["too small"] += small
        totals["ok but wrong"] += wrong
        ratios.sort()
        print(
            f"{name:28s}{rtol:7.0e}{len(cases):9d}{compiled:9d}{int(batch.ok.sum()):9d}{small:9d}{wrong:9d}"
            f"{ratios[0]:9.2g}{ratios[len(ratios) // 2]:9.2g}",
            flush=True,
        )
    print(totals)
    return totals


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--share", type=float, default=1.0)
    parser.add_argument("--seed", type=int, default=1)
    options = parser.parse_args()
    outcome = campaign(options.share, options.seed)
    sys.exit(1 if outcome["too small"] else 0)
