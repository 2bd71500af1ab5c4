"""Speed of alpha'-expansions: the exact engine, the numbers that confirm it, and recognition by integer relations.

    python benchmarks/expansion_speed.py [--json FILE]

Every row is a fresh process for the first call, tables of zeta values included ("cold"), and the best of several calls
("warm").  The yardstick is a thousand products and sums of exact rationals in the same run, since that is what the
exact engine does.  Limits are the ones the package promises on one core: five points through weight 8 in 2 s, six
through weight 6 in 10 s.
"""

from __future__ import annotations

import argparse
import json
import subprocess
import sys
import time
from fractions import Fraction
from pathlib import Path

import kn_integrate as kn
from kn_integrate.exact import Exact

CASES = [
    (4, 12, "auto"),
    (5, 8, "associator"),
    (5, 8, "auto"),
    (5, 8, "recursion"),
    (5, 12, "auto"),
    (6, 6, "associator"),
    (6, 6, "auto"),
    (6, 6, "recursion"),
    (6, 8, "auto"),
    (7, 4, "associator"),
    (7, 4, "auto"),
    (8, 4, "associator"),
    (9, 3, "associator"),
]
LIMITS = {(5, 8): 2.0, (6, 6): 10.0}


def expand(n: int, weight: int, method: str) -> None:
    kin = kn.Mandelstams.random(n, 20, denominator=30)
    kn.alpha_expansion(kin, kn.parke_taylor(*range(1, n + 1)), weight=weight, method=method)


def yardstick() -> float:
    """Seconds for a thousand exact products and sums."""
    a, b = Exact(Fraction(355, 113)), Exact(Fraction(-22, 7))
    best = float("inf")
    for _ in range(5):
        start = time.perf_counter()
        total = Exact(0)
        for _ in range(1000):
            total = a * b + b
        best = min(best, time.perf_counter() - start)
        assert total
    return best


def cold(n: int, weight: int, method: str) -> float:
    """Seconds of the first call in a fresh process, imports not counted."""
    code = (
        "import sys, time; sys.path.insert(0, sys.argv[1]); import expansion_speed as bench; import flint\n"
        f"start = time.perf_counter(); bench.expand({n}, {weight}, {method!r}); print(time.perf_counter() - start)"
    )
    root = Path(__file__).resolve().parent
    done = subprocess.run(
        [sys.executable, "-c", code, str(root)], capture_output=True, text=True, check=True, cwd=root.parent
    )
    return float(done.stdout)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--json", type=Path)
    options = parser.parse_args()
    unit = yardstick()
    rows = []
    print(f"yardstick: {unit * 1e6:.0f} us for 1000 exact products and sums")
    print(f"{'n':>2} {'weight':>6}  {'method':<11} {'cold s':>8} {'warm s':>8} {'yardsticks':>10}")
    for n, weight, method in CASES:
        first = cold(n, weight, method)
        expand(n, weight, method)
        warm = float("inf")
        for _ in range(3):
            start = time.perf_counter()
            expand(n, weight, method)
            warm = min(warm, time.perf_counter() - start)
        limit = LIMITS.get((n, weight))
        verdict = "" if limit is None else f"  limit {limit:g} s: {'met' if first <= limit else 'MISSED'}"
        print(f"{n:>2} {weight:>6}  {method:<11} {first:>8.3f} {warm:>8.4f} {warm / unit:>10.1f}{verdict}", flush=True)
        rows.append({"n": n, "weight": weight, "method": method, "cold": first, "warm": warm, "yardstick": unit})
    if options.json:
        options.json.write_text(json.dumps(rows, indent=2), encoding="utf-8")


if __name__ == "__main__":
    main()
