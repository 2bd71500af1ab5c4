"""Quadrature against the series engine at random chord exponents in (-4.9, 2): two routes that share no code.

    python tests/calibration/engines_campaign.py [--share X]

The series value is asked for 1e-14 (in multiple precision where needed), so a difference above the claimed error of the
quadrature is an error that was claimed too small.  One line per n and kind: cases, claimed errors that were too small,
how many of those called themselves ok, the least and the median quotient claimed/true.
"""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parent))
sys.path.insert(0, str(Path(__file__).parent.parent / "published"))

from disk_campaign import exponents_from_chords, random_chords

from kn_integrate.disk.evaluate import integrate_pairs
from kn_integrate.errors import WorkLimitError
from kn_integrate.exact import ONE
from kn_integrate.integrals import DiskTerm
from kn_integrate.kz.integral import integrate_terms

CASES = {4: 1500, 5: 1500, 6: 250, 7: 10}


def compare(n: int, is_complex: bool, count: int, seed: int = 5) -> dict[str, float]:
    """Run random cases; figures by name."""
    rng = np.random.default_rng([n, is_complex, seed])
    ratios, small, wrong = [], 0, 0
    for _ in range(count):
        pairs = exponents_from_chords(n, random_chords(n, rng, is_complex))
        rtol = float(10.0 ** -rng.uniform(3, 11 if n < 7 else 6))
        try:
            one = integrate_pairs(n, pairs, rtol, 0.0, max_points=3e7 if n < 7 else 3e8)
        except WorkLimitError:
            continue
        if not np.isfinite(one.error):
            continue
        other = integrate_terms(n, [DiskTerm(ONE, pairs)], rtol=1e-14)
        difference = abs(one.value - other.value)
        ratios.append(one.error / max(difference, other.error, 1e-300))
        too_small = difference > one.error + other.error
        small += too_small
        wrong += too_small and one.error <= rtol * abs(one.value)
    least, median = (float(np.min(ratios)), float(np.median(ratios))) if ratios else (np.nan, np.nan)
    return {"cases": len(ratios), "too small": small, "ok but wrong": wrong, "least": least, "median": median}


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--share", type=float, default=1.0)
    options = parser.parse_args()
    total, bad = 0, 0
    for n, count in CASES.items():
        for is_complex in (True, False):
            figures = compare(n, is_complex, max(1, round(options.share * count)))
            total += int(figures["cases"])
            bad += int(figures["ok but wrong"])
            print(n, "complex" if is_complex else "real", figures, flush=True)
    sys.exit(1 if bad else 0)
