"""Direct sphere integrals: error against seconds for n = 4, 5, 6, beside quasi-Monte Carlo on the same integral.

``python benchmarks/sphere_speed.py [largest n]`` (n = 6 takes minutes).  One core.  Times depend on the machine and on
what else it does, so a yardstick is printed with them: seconds for numpy to take a logarithm and an exponential of one
element, measured in the same run.  Truths are complex Selberg integrals (Dotsenko and Fateev 1985), convergent ones,
because quasi-Monte Carlo has no continuation.
"""

from __future__ import annotations

import sys
import time
from functools import partial
from itertools import combinations

import numpy as np
from scipy.stats import qmc

from kn_integrate.closed_forms.sphere import ComplexSelberg
from kn_integrate.exact import Exact
from kn_integrate.integrals import SphereTerm
from kn_integrate.sphere.data import Numbers, SphereData
from kn_integrate.sphere.direct import integrate_terms
from kn_integrate.sphere.rules import orders_of
from kn_integrate.sphere.sweep import Sweeper

CASES = {4: ("0.3", "0.35", "0.05"), 5: ("0.3", "0.25", "0.05"), 6: ("0.3", "0.25", "0.05")}
ORDERS = {4: (4, 6, 8, 10, 12, 14), 5: (4, 6, 8, 10, 12), 6: (2, 3, 4)}
TOLERANCES = {4: (1e-4, 1e-8, 1e-10, 1e-12), 5: (1e-4, 1e-6, 1e-8, 1e-10, 1e-12), 6: (1e-2,)}


def yardstick() -> float:
    """Seconds for numpy to do log and exp of one element, the best of several."""
    x = np.linspace(0.5, 2.0, 100_000)
    best = np.inf
    for _ in range(20):
        begin = time.perf_counter()
        np.exp(np.log(x))
        best = min(best, time.perf_counter() - begin)
    return best / x.size


def quasi_monte_carlo(form: ComplexSelberg, log2_points: int) -> float:
    """The integral by scrambled Sobol points, every plane mapped by tangent polar coordinates about 0."""
    n = form.count + 3
    points = qmc.Sobol(2 * form.count, rng=np.random.default_rng(1)).random_base2(log2_points)
    u, phi = points[:, ::2], 2 * np.pi * points[:, 1::2]
    # radius r = t/(1-t), t = u^2: density tamed at 0 and infinity; d^2z/pi = 2 r dr dphi/(2 pi)
    t = u**2
    radius = t / (1 - t)
    weight = np.prod(2 * radius * 2 * u / (1 - t) ** 2, axis=1)
    z = np.empty((len(points), n - 1), dtype=complex)
    z[:, 0], z[:, -1], z[:, 1:-1] = 0.0, 1.0, radius * np.exp(1j * phi)
    log = np.zeros(len(points))
    for i, j in combinations(range(1, n), 2):
        log += 2 * float(form.left.at(i, j).re) * np.log(np.abs(z[:, i - 1] - z[:, j - 1]))
    return float(np.mean(weight * np.exp(log)))


def timed(function, repeats: int):
    best, value = np.inf, None
    for _ in range(repeats):
        begin = time.perf_counter()
        value = function()
        best = min(best, time.perf_counter() - begin)
    return best, value


def main() -> None:
    largest = int(sys.argv[1]) if len(sys.argv) > 1 else 5
    unit = yardstick()
    print(f"yardstick: numpy log+exp {unit * 1e9:.2f} ns per element\n")
    for n in range(4, largest + 1):
        form = ComplexSelberg(n - 3, *CASES[n])
        truth = float(form.value(20))
        pairs = tuple(form.left.at(*pair) for pair in combinations(range(1, n + 1), 2))
        zero = (0,) * len(pairs)
        term = SphereTerm(Exact(1), pairs, zero, zero)
        repeats = {4: 20, 5: 3, 6: 1}[n]
        sweeper = Sweeper(Numbers(SphereData(n, pairs, pairs)))
        sweeper.run(orders_of(ORDERS[n][0]))  # compile
        print(f"n = {n}   one pass at fixed orders      points   seconds   yardsticks/point   true error")
        for order in ORDERS[n]:
            seconds, sweep = timed(partial(sweeper.run, orders_of(order)), repeats)
            true = abs(sweep.total()[0] / truth - 1)
            print(f"{order:>30} {sweep.points:>12d} {seconds:9.4f} {seconds / sweep.points / unit:18.2f} {true:12.1e}")
        print(f"n = {n}   to a tolerance, with its error   points   seconds   claimed      true error  status")
        for rtol in TOLERANCES[n]:
            seconds, found = timed(partial(integrate_terms, n, [term], rtol=rtol), repeats)
            true = abs(found.value / truth - 1)
            claimed = found.error / abs(found.value)
            numbers = f"{found.evaluations:>12d} {seconds:9.4f} {claimed:10.1e} {true:14.1e}"
            print(f"{rtol:>30.0e} {numbers}  {found.status.name}")
        print(f"n = {n}   Sobol points                  points   seconds   true error")
        for log2 in (14, 17, 20):
            seconds, value = timed(partial(quasi_monte_carlo, form, log2), 1)
            print(f"{'':>30} {2**log2:>12d} {seconds:9.4f} {abs(value / truth - 1):12.1e}")
        print()


if __name__ == "__main__":
    main()
