"""What continuation costs: points and seconds far outside the convergence region beside a convergent integral.

    python benchmarks/depth_cost.py

For each n random chord exponents in (0, 2) and in (-4.9, 2) (every case with one below -1), the same tolerance,
complete calls of the quadrature engine; medians over the cases that met it.  Small convergent integrals are done in one
compiled call, deep ones never: the quotient is given against that call, and against the general way that both can take.
"""

from __future__ import annotations

import statistics
import time
from collections.abc import Iterator
from contextlib import contextmanager
from fractions import Fraction

import numpy as np
from _machine import machine, yardstick

from kn_integrate.disk import evaluate
from kn_integrate.disk.evaluate import integrate_pairs
from kn_integrate.dispatch.shifts import chords_of, pair_order, pair_shift
from kn_integrate.errors import KNError
from kn_integrate.exact import Exact


def pairs_of(n: int, chords: dict[tuple[int, int], Exact]) -> tuple[Exact, ...]:
    """Pair exponents with these chord exponents."""
    adjacent = {(i, i + 1) for i in range(1, n)} | {(1, n)}
    base = [Exact(-1) if pair in adjacent else Exact(0) for pair in pair_order(n)]
    return tuple(b + h for b, h in zip(base, pair_shift(n, chords), strict=True))


def draw(n: int, rng: np.random.Generator, low: int) -> dict[tuple[int, int], Exact]:
    """Random exponents in (low/1000, 2), clear of the poles; deep ones reach below -1."""
    while True:
        found = {}
        for chord in chords_of(n):
            value = int(rng.integers(low, 2000))
            while value < 20 and abs(value - 1000 * round(value / 1000)) < 20:
                value = int(rng.integers(low, 2000))
            found[chord] = Exact(Fraction(value, 1000))
        if low >= 0 or min(y.re for y in found.values()) < -1:
            return found


@contextmanager
def general_way() -> Iterator[None]:
    """Without the compiled way of small integrals."""
    plain = evaluate._small
    evaluate._small = lambda *_: None
    try:
        yield
    finally:
        evaluate._small = plain


def measure(n: int, low: int, rtol: float, cases: int) -> tuple[float, float, int]:
    """Median points and seconds of the cases that met the tolerance, and how many did."""
    rng = np.random.default_rng([n, abs(low)])
    points, seconds = [], []
    for _ in range(cases):
        pairs = pairs_of(n, draw(n, rng, low))
        try:
            integrate_pairs(n, pairs, rtol, 0.0, max_points=1e9)
            start = time.perf_counter()
            result = integrate_pairs(n, pairs, rtol, 0.0, max_points=1e9)
        except KNError:
            continue
        if result.error <= rtol * abs(result.value):
            points.append(result.points)
            seconds.append(time.perf_counter() - start)
    return statistics.median(points), statistics.median(seconds), len(points)


def main() -> None:
    """Print the table."""
    print(machine())
    log, exp = yardstick()
    print(f"yardstick: numpy log {log * 1e9:.2f} ns, exp {exp * 1e9:.2f} ns per element\n")
    print(
        f"{'n':>2s}{'rtol':>8s}{'points':>12s}{'ms':>10s}{'general ms':>12s}{'deep points':>13s}{'deep ms':>10s}"
        f"{'met':>7s}{'/ general':>11s}{'/ compiled':>12s}"
    )
    for n, rtol, cases in ((4, 1e-10, 40), (5, 1e-10, 40), (6, 1e-8, 30), (7, 1e-5, 4)):
        flat = measure(n, 20, rtol, cases)
        with general_way():
            general = measure(n, 20, rtol, cases)
        deep = measure(n, -4900, rtol, cases)
        print(
            f"{n:2d}{rtol:8.0e}{flat[0]:12.0f}{flat[1] * 1e3:10.2f}{general[1] * 1e3:12.2f}{deep[0]:13.0f}"
            f"{deep[1] * 1e3:10.2f}{deep[2]:4d}/{cases:<2d}{deep[1] / general[1]:11.1f}{deep[1] / flat[1]:12.1f}",
            flush=True,
        )


if __name__ == "__main__":
    main()
