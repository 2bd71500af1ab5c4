"""Speed of disk quadrature: seconds, points, time per point, beside a yardstick and a general-purpose integrator.

    python benchmarks/disk_speed.py [--large] [--json FILE]

Every row is a complete call (planning, integration, error estimate, ok = True at the tolerance), one core unless said,
best of several, warm.  The yardstick is numpy's vectorised log and exp per element in the same run; a point costs
``logs`` logarithms and one exponential, and the last column is the time per point in units of that.
The peer is scipy's nested adaptive quadrature on the same integral, at the accuracy it reaches.
Integrals: Selberg with exponents (0.37, 0.41, 0.23), whose value is known in closed form (DLMF 5.14.4).
"""

from __future__ import annotations

import argparse
import json
import time

import mpmath
from _machine import best_of, machine, yardstick

from kn_integrate.closed_forms import Selberg
from kn_integrate.disk.evaluate import integrate_pairs
from kn_integrate.disk.sectors import sector_table


def logs_per_point(n: int) -> float:
    """Logarithms per point of the kernel: runs that depend on the inner pair of variables, averaged over sectors."""
    table = sector_table(n)
    inner = table.run_bounds[:, 4] - table.run_bounds[:, 1]
    return float(inner.mean())


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
        "yardsticks": per_point / (logs_per_point(n) * log + exp),
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
        f"{'n':>2s}{'rtol':>8s}{'threads':>8s}{'ms':>10s}{'points':>12s}{'ns/point':>10s}{'yardsticks':>11s}"
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
            f"{r['yardsticks']:11.2f}{r['true error']:9.1e}{r['claimed']:9.1e}  {bool(r['ok'])}",
            flush=True,
        )
    print("\nscipy nested adaptive quadrature, the same integrals:")
    peers = [p for n in (5, 6) for p in peer(n, 20.0)]
    for p in peers:
        print(f"{p['n']:2d}  {p['setting']:>14s}{p['seconds'] * 1e3:12.1f} ms   true error {p['true error']:.1e}")
    if options.json:
        with open(options.json, "w", encoding="utf-8") as file:
            json.dump({"machine": machine(), "log": log, "exp": exp, "rows": rows, "peers": peers}, file, default=float)


if __name__ == "__main__":
    main()
