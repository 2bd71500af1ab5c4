"""Campaign: direct sphere integrals against closed forms, and against themselves in another frame.

``python -m tests.calibration.sphere_direct_campaign [cases4] [cases5] [cases6] [seed]`` prints, for every regime, how
many results were ok, how often the true error was above the claimed one (and by how much at worst), and the same among
results that called themselves ok.  The test beside this file runs a seeded sample.

n = 4: every exponent and spin, by the complex beta integral.  n = 5, 6: the complex Selberg integral in a random
labelling; and n = 5 with generic exponents and spins, where the truth is a run at a much tighter tolerance with other
punctures at 0, 1 and infinity (so that nothing but the value is common).
"""

from __future__ import annotations

import sys
from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from itertools import combinations

import numpy as np

from kn_integrate.closed_forms.sphere import ComplexBeta, ComplexSelberg
from kn_integrate.errors import PoleError
from kn_integrate.exact import Exact
from kn_integrate.integrals import SphereTerm
from kn_integrate.sphere.direct import integrate_terms

GRID = 1000
TOLERANCES = {4: (1e-3, 1e-5, 1e-8, 1e-10, 1e-12), 5: (1e-3, 1e-5, 1e-7, 1e-9), 6: (1e-2, 1e-3)}
REGIMES = {"convergent": (0, 1, 0), "mild": (-1, 2, 0), "deep": (-4, 3, 0), "complex": (-2, 2, 8)}


@dataclass(frozen=True)
class Trial:
    n: int
    regime: str
    rtol: float
    ok: bool
    claimed: float
    true: float
    size: float

    @property
    def ratio(self) -> float:
        """True over claimed error; 1 is still a bound."""
        return self.true / self.claimed if self.claimed > 0 else np.inf


def number(rng: np.random.Generator, low: float, high: float, imaginary: float = 0) -> Exact:
    """A multiple of 1/1000 at least 1/50 away from the integers, with an imaginary part."""
    while True:
        value = Fraction(int(rng.integers(int(low * GRID), int(high * GRID) + 1)), GRID)
        if abs(value - round(value)) >= Fraction(1, 50):
            break
    size = int(imaginary * GRID)
    return Exact(value, Fraction(int(rng.integers(-size, size + 1)), GRID) if size else 0)


def labelled(n: int, pairs: tuple[Exact, ...], left: tuple[int, ...], right: tuple[int, ...], order: list[int]):
    """Term with puncture k of the given exponents called ``order[k-1]``, signs included."""
    index = {pair: k for k, pair in enumerate(combinations(range(1, n + 1), 2))}
    s, p, q = list(pairs), list(left), list(right)
    sign = 1
    for (i, j), k in index.items():
        x, y = order[i - 1], order[j - 1]
        to = index[min(x, y), max(x, y)]
        s[to], p[to], q[to] = pairs[k], left[k], right[k]
        if x > y and (left[k] + right[k]) % 2:
            sign = -sign
    return SphereTerm(Exact(sign), tuple(s), tuple(p), tuple(q))


def beta_case(rng: np.random.Generator, regime: str):
    """A four-point integral with spins, and its value."""
    low, high, imaginary = REGIMES[regime]
    while True:
        a, b = number(rng, low, high, imaginary), number(rng, low, high, imaginary)
        c = 1 - a - b
        if min(abs(c.re - round(c.re)), 1) >= Fraction(1, 50) or not c.is_real:
            break
    spins = [int(x) for x in rng.integers(-3, 4, 2)] if rng.random() < 0.6 else [0, 0]
    form = ComplexBeta(a, a + spins[0], b, b + spins[1])
    # left exponents are s, the spins are all in the right powers
    rights = [form.right.at(*pair) - form.left.at(*pair) for pair in combinations(range(1, 5), 2)]
    pairs = tuple(form.left.at(*pair) for pair in combinations(range(1, 5), 2))
    # all three differences z_1 - z_2, z_1 - z_3, z_2 - z_3 are turned round in the closed form; their spins add to 0
    term = labelled(4, pairs, (0,) * 6, tuple(int(x.re) for x in rights), [int(x) for x in rng.permutation(4) + 1])
    return term, complex(form.value(25))


def selberg_case(rng: np.random.Generator, n: int, regime: str):
    """A Selberg integral in a random labelling, and its value."""
    low, high, imaginary = REGIMES[regime]
    count = n - 3
    while True:
        a, b = number(rng, low, high, imaginary), number(rng, low, high, imaginary)
        g = Exact(Fraction(int(rng.integers(-200, 301)), GRID))
        if regime == "convergent":
            a, b, g = a / count, b / count, g / 3
        form = ComplexSelberg(count, a, b, g)
        pairs = tuple(form.left.at(*pair) for pair in combinations(range(1, n + 1), 2))
        try:
            value = complex(form.value(25))
        except PoleError:
            continue
        if np.isfinite(value) and _clear(n, pairs):
            break
    zero = (0,) * len(pairs)
    return labelled(n, pairs, zero, zero, [int(x) for x in rng.permutation(n) + 1]), value


def _clear(n: int, pairs: tuple[Exact, ...]) -> bool:
    """No cluster within 1/100 of a pole."""
    index = {pair: k for k, pair in enumerate(combinations(range(1, n + 1), 2))}
    for size in range(2, n - 1):
        for cluster in combinations(range(1, n + 1), size):
            end = sum((pairs[index[pair]] for pair in combinations(cluster, 2)), Exact(size - 1))
            if end.is_real and end.re < Fraction(1, 100) and abs(end.re - round(end.re)) < Fraction(1, 100):
                return False
    return True


def generic_case(rng: np.random.Generator, regime: str):
    """Five points, generic exponents, spins; the value is left to another frame."""
    low, high, imaginary = REGIMES[regime]
    pairs5 = list(combinations(range(1, 6), 2))
    while True:
        # five divisor exponents in cyclic order fix massless-type rows: s_{i,i+1} + [Parke-Taylor -1]
        x = [number(rng, low, high, imaginary / 2) for _ in range(5)]
        s = {}
        for k in range(5):
            i, j = k, (k + 1) % 5
            s[min(i, j) + 1, max(i, j) + 1] = x[k] - 1
            i, j = k, (k + 2) % 5
            s[min(i, j) + 1, max(i, j) + 1] = x[(k + 3) % 5] - x[k] - x[(k + 1) % 5]
        pairs = tuple(s[pair] for pair in pairs5)
        if _clear(5, pairs):
            break
    right = [0] * 10
    if rng.random() < 0.6:
        # a closed walk on the punctures changes no row sum
        i, j, k, m = (int(v) + 1 for v in rng.permutation(5)[:4])
        for p, q, step in ((i, j, 1), (j, k, -1), (k, m, 1), (m, i, -1)):
            right[pairs5.index((min(p, q), max(p, q)))] += step
    return SphereTerm(Exact(1), pairs, (0,) * 10, tuple(right))


def trial(n: int, regime: str, rtol: float, term: SphereTerm, truth: complex, slack: float = 0.0) -> Trial:
    found = integrate_terms(n, [term], rtol=rtol)
    true = abs(complex(found.value) - truth)
    return Trial(n, regime, rtol, found.ok, found.error + slack, true, abs(truth))


def trials4(count: int, seed: int) -> Iterator[Trial]:
    rng = np.random.default_rng([seed, 4])
    for k in range(count):
        regime = list(REGIMES)[k % len(REGIMES)]
        term, truth = beta_case(rng, regime)
        yield trial(4, regime, float(rng.choice(TOLERANCES[4])), term, truth, 1e-16 * abs(truth))


def trials_selberg(n: int, count: int, seed: int, regimes: tuple[str, ...] = tuple(REGIMES)) -> Iterator[Trial]:
    rng = np.random.default_rng([seed, n])
    for k in range(count):
        regime = regimes[k % len(regimes)]
        term, truth = selberg_case(rng, n, regime)
        yield trial(n, regime, float(rng.choice(TOLERANCES[n])), term, truth, 1e-16 * abs(truth))


def trials_generic(count: int, seed: int) -> Iterator[Trial]:
    rng = np.random.default_rng([seed, 55])
    for k in range(count):
        regime = list(REGIMES)[k % len(REGIMES)]
        term = generic_case(rng, regime)
        rtol = float(rng.choice(TOLERANCES[5]))
        frame = [int(x) + 1 for x in rng.permutation(5)]
        truth = integrate_terms(5, [term], rtol=rtol * 1e-4, frame=frame)
        yield trial(5, "generic " + regime, rtol, term, complex(truth.value), truth.error)


def report(found: list[Trial]) -> str:
    """A table by regime."""
    lines = [
        f"{'regime':>22} {'cases':>6} {'ok':>6} {'above':>6} {'worst ratio':>12} {'median':>8} {'ok but above':>13}"
    ]
    for n, regime in sorted({(t.n, t.regime) for t in found}):
        mine = [t for t in found if (t.n, t.regime) == (n, regime)]
        ratios = np.array([t.ratio for t in mine])
        wrong = sum(t.ok and t.ratio > 1 for t in mine)
        lines.append(
            f"{f'n={n} {regime}':>22} {len(mine):6d} {sum(t.ok for t in mine):6d} {int((ratios > 1).sum()):6d} "
            f"{ratios.max():12.3g} {np.median(ratios):8.2g} {wrong:13d}"
        )
    return "\n".join(lines)


def main() -> None:
    numbers = [int(x) for x in sys.argv[1:]]
    four, five, six, seed = (numbers + [2000, 200, 0, 1][len(numbers) :])[:4]
    groups = [
        trials4(four, seed),
        trials_selberg(5, five // 2, seed),
        trials_generic(five // 2, seed),
        trials_selberg(6, six, seed, ("convergent", "mild")),
    ]
    for group in groups:
        found: list[Trial] = []
        try:
            for result in group:
                found.append(result)
                if result.ratio > 0.5 or result.n == 6:
                    print(result, flush=True)
        except KeyboardInterrupt:
            print("interrupted")
        if found:
            print(report(found), flush=True)


if __name__ == "__main__":
    main()
