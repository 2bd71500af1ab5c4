"""Speed of disk quadrature: seconds, points, time per point, beside a yardstick and a general-purpose integrator.

    python benchmarks/disk_speed.py [--large] [--json FILE]

Every row is a complete call (planning, integration, error estimate, ok = True at the tolerance), one core unless said,
best of several, warm.  The yardstick is numpy's vectorised log and exp per element in the same run; "logs" is the
number of logarithms per point that the factorisation of the integrand leaves (a run that depends on one of the two
inner variables, or on neither, is shared by a row or all of the inner grid), a point costs one exponential besides, and
"yardsticks" is the time per point in units of that.  At n = 5 and 6 a single call is mostly set-up; see the batch.
The peer is scipy's nested adaptive quadrature on the same integral, at the accuracy it reaches.
Integrals: Selberg with exponents (0.37, 0.41, 0.23), whose value is known in closed form (DLMF 5.14.4); the batch:
five-point Parke-Taylor integrals at random planar invariants between 0.1 and 1.5.
"""

from __future__ import annotations

import argparse
import json
import time

import mpmath
import numpy as np
from _machine import best_of, machine, peak_memory, yardstick

import kn_integrate as kn
from kn_integrate.closed_forms import Selberg
from kn_integrate.disk.evaluate import integrate_pairs
from kn_integrate.disk.sectors import sector_table


def logs_per_point(n: int, counts: list[int]) -> float:
    """Logarithms per point of the kernel with these numbers of nodes per chord."""
    table = sector_table(n)
    nodes = np.array(counts, dtype=float)[table.variables]
    points = nodes.prod(axis=1)
    ni = nodes[:, -2] if n > 4 else np.ones(table.count)
    nj = nodes[:, -1]
    ends = table.run_bounds.astype(float)
    fixed, on_i, on_j, both = (ends[:, k + 1] - ends[:, k] for k in range(4))
    return float(((both + on_i / nj + on_j / ni + fixed / (ni * nj)) * points).sum() / points.sum())


def batch_row(count: int = 10_000) -> dict[str, float]:
    """Many five-point integrals in one call, beside single calls."""
    points = kn.PlanarPoints(5, np.random.default_rng(1).uniform(0.1, 1.5, (count, 5)))
    few = kn.PlanarPoints(5, points.values[:200])
    f = kn.parke_taylor(1, 2, 3, 4, 5)
    seconds = best_of(lambda: kn.disk_batch(points, f, rtol=1e-12), 3)
    twice = best_of(lambda: kn.disk_batch(points, f, rtol=1e-12, threads=2), 3)
    single = best_of(lambda: [kn.disk_integral(kin, f, rtol=1e-12) for kin in few], 3) / len(few)
    batch = kn.disk_batch(points, f, rtol=1e-12)
    return {
        "count": count,
        "ok": int(batch.ok.sum()),
        "microseconds": seconds / count * 1e6,
        "two threads": twice / count * 1e6,
        "single": single * 1e6,
    }


def row(n: int, rtol: float, log: float, exp: float, threads: int = 1) -> dict[str, float]:
    """Measure one integral."""
    form = Selberg(n - 3, "0.37", "0.41", "0.23")
    pairs = tuple(form.pairs().flat)
    truth = form.value(30)
    result = integrate_pairs(n, pairs, rtol, 0.0, threads=threads)
    repeat = 5 if n <= 8 else 1
    seconds = best_of(lambda: integrate_pairs(n, pairs, rtol, 0.0, threads=threads), repeat) if n <= 9 else None
    if seconds is None:
        start = time.perf_counter()
        integrate_pairs(n, pairs, rtol, 0.0, threads=threads)
        seconds = time.perf_counter() - start
    with mpmath.workdps(30):
        error = float(abs(mpmath.mpf(result.value) - truth) / truth)
    per_point = seconds / result.points
    return {
        "n": n,
        "rtol": rtol,
        "threads": threads,
        "seconds": seconds,
        "points": result.points,
        "ns per point": per_point * 1e9,
        "logs": (logs := logs_per_point(n, [choice.total for choice in result.choices])),
        "yardsticks": per_point / (logs * log + exp),
        "true error": error,
        "claimed": result.error / abs(result.value),
        "ok": result.error <= rtol * abs(result.value),
    }


def peer(n: int, cap: float) -> list[dict[str, float]]:
    """scipy's nested adaptive quadrature on the same integral."""
    from kn_integrate.convergence.peers import run_peer
    from kn_integrate.exact import ONE
    from kn_integrate.integrals import DiskTerm

    form = Selberg(n - 3, "0.37", "0.41", "0.23")
    truth = float(form.value(20))
    results, _ = run_peer("nested adaptive", n, [DiskTerm(ONE, tuple(form.pairs().flat))], cap)
    return [
        {"n": n, "setting": r.setting, "seconds": r.seconds, "true error": abs(r.value - truth) / truth}
        for r in results
    ]


def main() -> None:
    """Print the tables."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--large", action="store_true", help="n = 9 and 10 too (half a minute)")
    parser.add_argument("--json", default=None)
    options = parser.parse_args()
    log, exp = yardstick()
    print(machine())
    print(f"yardstick: numpy log {log * 1e9:.2f} ns, exp {exp * 1e9:.2f} ns per element\n")
    print(
        f"{'n':>2s}{'rtol':>8s}{'threads':>8s}{'ms':>10s}{'points':>12s}{'ns/point':>10s}{'logs':>6s}{'yardsticks':>11s}"
        f"{'true':>9s}{'claimed':>9s}  ok"
    )
    cases = [(n, rtol, 1) for n in (5, 6, 7, 8) for rtol in (1e-10, 1e-12)]
    cases.append((8, 1e-12, 2))
    if options.large:
        cases += [(9, 1e-10, 1), (9, 1e-12, 1), (9, 1e-12, 2), (10, 1e-8, 1)]
    rows = []
    for n, rtol, threads in cases:
        r = row(n, rtol, log, exp, threads)
        rows.append(r)
        print(
            f"{n:2d}{rtol:8.0e}{threads:8d}{r['seconds'] * 1e3:10.3f}{int(r['points']):12d}{r['ns per point']:10.2f}"
            f"{r['logs']:6.2f}{r['yardsticks']:11.2f}{r['true error']:9.1e}{r['claimed']:9.1e}  {bool(r['ok'])}",
            flush=True,
        )
    print(f"peak memory so far {peak_memory() / 2**20:.0f} MiB")
    many = batch_row()
    print(
        f"\nbatch of {many['count']} five-point integrals at 1e-12, {many['ok']} ok: {many['microseconds']:.1f} us each"
        f" ({many['two threads']:.1f} us with two threads); single calls {many['single']:.0f} us each"
    )
    print("\nscipy nested adaptive quadrature, the same integrals:")
    peers = [p for n in (5, 6) for p in peer(n, 20.0)]
    for p in peers:
        print(f"{p['n']:2d}  {p['setting']:>14s}{p['seconds'] * 1e3:12.1f} ms   true error {p['true error']:.1e}")
    if options.json:
        with open(options.json, "w", encoding="utf-8") as file:
            json.dump(
                {"machine": machine(), "log": log, "exp": exp, "rows": rows, "batch": many, "peers": peers},
                file,
                default=float,
            )


if __name__ == "__main__":
    main()
