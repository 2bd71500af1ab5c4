"""A gradient beside the central differences it replaces, in the same run.

    python benchmarks/gradient_speed.py [--points 5] [--large]

For random kinematics, real in the convergent region and past a pole, and complex: seconds and integrand evaluations of
one ``disk_gradient`` at rtol 1e-8, and of the n(n-3) integrals at rtol 1e-12 that central differences take (step 1e-4
of the distance to the next pole), with the true error of both relative to the largest derivative.  The truth comes from
differences of the series engine in 30 digits.  Medians over the points; shortest of several timings each, warm.
"""

from __future__ import annotations

import argparse
import statistics
import time
from fractions import Fraction
from typing import Any

import mpmath
import numpy as np
from _machine import best_of, machine

import kn_integrate as kn
from kn_integrate.channels import planar_channels
from kn_integrate.exact import Exact

STEP, TRUE_STEP = Fraction(1, 10_000), Fraction(1, 10**9)
REGIMES = {"convergent": (100, 2000, 0), "past a pole": (-1600, 1500, 0), "complex": (100, 1500, 800)}


def random_point(n: int, regime: str, rng: np.random.Generator) -> dict[tuple[int, ...], Exact]:
    """Planar invariants, multiples of 1/1000 at least 1/10 away from the poles."""
    low, high, size = REGIMES[regime]
    found = {}
    for channel in planar_channels(tuple(range(1, n + 1))):
        while True:
            x = int(rng.integers(low, high))
            if abs(x - min(0, round(x / 1000)) * 1000) >= 100:
                break
        found[channel] = Exact(Fraction(x, 1000), Fraction(int(rng.integers(-size, size + 1)), 1000))
    return found


def room(x: Exact) -> Fraction:
    """The distance of the next pole, at most 1."""
    nearest = min(0, round(float(x.re)))
    return min(Fraction(1), Fraction(abs((x - nearest).value())))


def differences(n: int, planar: dict[tuple[int, ...], Exact], f: Any, step: Fraction, **options: Any) -> Any:
    """Derivatives by central differences, and the evaluations that took."""
    found, evaluations = [], 0
    for channel, x in planar.items():
        h = step * room(x)
        ends = []
        for sign in (1, -1):
            moved = kn.Mandelstams.from_planar(n, {**planar, channel: x + sign * h})
            result = kn.disk_integral(moved, f, **options)
            ends.append(result.value)
            evaluations += result.evaluations
        with mpmath.workdps(40):
            found.append((ends[0] - ends[1]) / (2 * mpmath.mpf(h.numerator) / h.denominator))
    return found, evaluations


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--points", type=int, default=5)
    parser.add_argument("--large", action="store_true", help="past a pole at n = 7 too, where differences take minutes")
    options = parser.parse_args()
    print(machine())
    print(f"{'':17s}{'gradient':>36s}{'central differences':>32s}{'quotient of':>20s}")
    print(
        f"{'n':>2s} {'regime':14s}{'ms':>12s}{'evaluations':>13s}{'true':>11s}"
        f"{'ms':>9s}{'evaluations':>13s}{'true':>10s}{'ms':>9s}{'evaluations':>12s}"
    )
    for n in (4, 5, 6, 7):
        f = kn.parke_taylor(*range(1, n + 1))
        for regime in REGIMES:
            if n == 7 and regime == "past a pole" and not options.large:
                continue
            rng = np.random.default_rng([n, *map(ord, regime)])
            rows = []
            for _ in range(options.points):
                planar = random_point(n, regime, rng)
                kin = kn.Mandelstams.from_planar(n, planar)
                gradient = kn.disk_gradient(kin, f, rtol=1e-8)
                peer = {"rtol": 1e-12, "method": "quadrature"}
                start = time.perf_counter()
                numbers, evaluations = differences(n, planar, f, STEP, **peer)
                other = time.perf_counter() - start
                truth, _ = differences(n, planar, f, TRUE_STEP, digits=30, method="kz")
                size = max(abs(complex(t)) for t in truth)
                errors = [
                    max(abs(complex(a) - complex(t)) for a, t in zip(values, truth, strict=True)) / size
                    for values in (gradient.derivatives, numbers)
                ]
                seconds = best_of(lambda kin=kin, f=f: kn.disk_gradient(kin, f, rtol=1e-8), 3)
                if other < 1.0:  # seconds; the first call will do where it is longer
                    other = best_of(lambda n=n, p=planar, f=f, o=peer: differences(n, p, f, STEP, **o), 2)
                rows.append((seconds * 1e3, gradient.evaluations, errors[0], other * 1e3, evaluations, errors[1]))
            a, b, c, d, e, g = (statistics.median(column) for column in zip(*rows, strict=True))
            quotients = [statistics.median(row[3 + k] / row[k] for row in rows) for k in (0, 1)]
            print(
                f"{n:2d} {regime:14s}{a:12.2f}{b:13,.0f}{c:11.0e}{d:9.2f}{e:13,.0f}{g:10.0e}"
                f"{quotients[0]:9.1f}{quotients[1]:12.1f}",
                flush=True,
            )


if __name__ == "__main__":
    main()
