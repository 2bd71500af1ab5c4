"""Direct sphere integrals against the bilinear of disk integrals: two routes that share definitions only.

    python tests/calibration/sphere_routes_campaign.py [--five 150] [--six 15]

Random exact kinematics, real and complex, Parke-Taylor integrands that differ left and right (spins), with up to three
channels past their first poles.  One line per class: cases, differences above the sum of both claimed errors, the least
and the median quotient of claimed and true error of the direct integral, its median claimed error, seconds.
"""

from __future__ import annotations

import argparse
import sys
import time
from fractions import Fraction

import numpy as np

import kn_integrate as kn
from kn_integrate.channels import planar_channels
from kn_integrate.exact import Exact

KINDS = ("real", "spins", "complex", "past poles")


def point(n: int, kind: str, rng: np.random.Generator) -> kn.Mandelstams:
    """Random kinematics of a kind: invariants in (-1/4, 9/20), off the poles."""
    planar = {}
    channels = planar_channels(tuple(range(1, n + 1)))
    for c in channels:
        value = 0
        while abs(value) < 30:
            value = int(rng.integers(-250, 450))
        imaginary = Fraction(int(rng.integers(-300, 300)), 1000) if kind == "complex" else Fraction(0)
        planar[c] = Exact(Fraction(value, 1000), imaginary)
    if kind == "past poles":
        for k in rng.permutation(len(channels))[: int(rng.integers(1, 4))]:
            planar[channels[k]] = planar[channels[k]] - 1
    return kn.Mandelstams.from_planar(n, planar)


def run(n: int, kind: str, count: int, rtol: float, seed: int = 3) -> dict[str, float]:
    """Compare ``count`` cases."""
    rng = np.random.default_rng([n, KINDS.index(kind), seed])
    ratios, claimed, wrong = [], [], 0
    start = time.perf_counter()
    for _ in range(count):
        kin = point(n, kind, rng)
        f = kn.parke_taylor(*range(1, n + 1))
        g = f if kind in ("real", "past poles") else kn.parke_taylor(1, *(rng.permutation(n - 1) + 2).tolist())
        try:
            one = kn.sphere_integral(kin, f, g, method="klt", rtol=1e-11)
            other = kn.sphere_integral(kin, f, g, method="direct", rtol=rtol)
        except (kn.PoleError, kn.WorkLimitError):
            continue
        difference = abs(one.value - other.value)
        wrong += difference > one.error + other.error
        ratios.append(other.error / max(difference, one.error, 1e-300))
        claimed.append(other.error / abs(one.value))
    return {
        "cases": len(ratios),
        "beyond": wrong,
        "least": float(np.min(ratios)) if ratios else float("nan"),
        "median": float(np.median(ratios)) if ratios else float("nan"),
        "claimed": float(np.median(claimed)) if claimed else float("nan"),
        "seconds": time.perf_counter() - start,
    }


def main() -> int:
    """Print the table; 1 when any difference lies beyond the claimed errors."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--five", type=int, default=160)
    parser.add_argument("--six", type=int, default=16)
    options = parser.parse_args()
    print(f"{'n':>2s} {'kind':12s}{'cases':>6s}{'beyond':>7s}{'least':>9s}{'median':>9s}{'claimed':>9s}{'sec':>8s}")
    bad = 0
    for n, count, rtol in ((5, options.five, 1e-6), (6, options.six, 1e-2)):
        for kind in KINDS:
            r = run(n, kind, (count + 3) // 4, rtol)
            bad += int(r["beyond"])
            print(
                f"{n:2d} {kind:12s}{r['cases']:6d}{r['beyond']:7d}{r['least']:9.2g}{r['median']:9.2g}"
                f"{r['claimed']:9.1e}{r['seconds']:8.1f}",
                flush=True,
            )
    return 1 if bad else 0


if __name__ == "__main__":
    sys.exit(main())
