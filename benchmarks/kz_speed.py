"""Speed of the KZ engine in double and multiple precision, beside quadrature.

    python benchmarks/kz_speed.py [--large] [--digits]

Complete calls of the series engine on the Selberg integral with exponents (1/3, 1/5, 1/7) (value: DLMF 5.14.4), error
estimate included; the first call of a size builds index structures and is shown apart.  The peer is the quadrature
engine at rtol 1e-10 on the same integral in the same run.
"""

from __future__ import annotations

import argparse
import time

import mpmath
from _machine import best_of, machine, yardstick

from kn_integrate.closed_forms import Selberg
from kn_integrate.disk.evaluate import integrate_pairs
from kn_integrate.exact import ONE
from kn_integrate.integrals import DiskTerm
from kn_integrate.kz.integral import integrate_terms


def main() -> None:
    """Print the tables."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument(
        "--large", action="store_true", help="n = 10 and 11 too (11 builds its structures for a minute)"
    )
    parser.add_argument("--digits", action="store_true", help="multiple precision up to n = 9 as well")
    options = parser.parse_args()
    print(machine())
    log, exp = yardstick()
    print(f"yardstick: numpy log {log * 1e9:.2f} ns, exp {exp * 1e9:.2f} ns per element\n")
    print(f"{'n':>2s}{'first call s':>14s}{'ms':>10s}{'true':>9s}{'claimed':>9s}{'quadrature ms':>15s}")
    for n in (5, 6, 7, 8, 9, 10, 11) if options.large else (5, 6, 7, 8, 9):
        form = Selberg(n - 3, "1/3", "1/5", "1/7")
        pairs = tuple(form.pairs().flat)
        terms = [DiskTerm(ONE, pairs)]
        start = time.perf_counter()
        result = integrate_terms(n, terms, rtol=1e-12, escalate=False)
        first = time.perf_counter() - start
        seconds = best_of(lambda terms=terms, n=n: integrate_terms(n, terms, rtol=1e-12, escalate=False), 3)
        truth = form.value(30)
        error = float(abs(mpmath.mpf(result.value) - truth) / abs(truth))
        peer = "-"
        if n <= 8:
            peer = f"{best_of(lambda pairs=pairs, n=n: integrate_pairs(n, pairs, 1e-10, 0.0), 3) * 1e3:.2f}"
        claimed = result.error / abs(result.value)
        print(f"{n:2d}{first:14.2f}{seconds * 1e3:10.2f}{error:9.1e}{claimed:9.1e}{peer:>15s}", flush=True)
    print(f"\n{'n':>2s}{'digits':>8s}{'s':>10s}{'true':>10s}")
    for n in (5, 6, 7, 8, 9) if options.digits else (5, 6, 7, 8):
        for digits in (50, 100):
            if n == 9 and digits == 100:
                continue
            form = Selberg(n - 3, "1/3", "1/5", "1/7")
            terms = [DiskTerm(ONE, tuple(form.pairs().flat))]
            start = time.perf_counter()
            result = integrate_terms(n, terms, rtol=10.0**-digits, digits=digits)
            seconds = time.perf_counter() - start
            with mpmath.workdps(digits + 30):
                truth = form.value(digits + 25)
                error = mpmath.nstr(abs(result.value - truth) / abs(truth), 2)
            print(f"{n:2d}{digits:8d}{seconds:10.3f}{error:>10s}", flush=True)


if __name__ == "__main__":
    main()
