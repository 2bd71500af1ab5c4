"""Random integrals whose value is known in closed form, in several regimes of the chord exponents.

``random_case(kind, rng, regime)`` returns exact exponents (multiples of 1/1000, kept a stated distance away from
every pole) with the closed form that gives their value.  The value is not computed here: ``case.value(digits)`` does.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from kn_integrate.closed_forms import (
    BetaProduct,
    DiskForm,
    DixonAnderson,
    EulerBeta,
    FivePoint,
    HypergeometricChain,
    PairExponents,
    RogersDougall,
    Selberg,
)
from kn_integrate.exact import Exact

GRID = 1000
CLEARANCE = Fraction(1, 50)  # smallest distance of a chord exponent from 0, -1, -2, ...


@dataclass(frozen=True)
class Regime:
    """Where the real parts of the chord exponents lie, and how large their imaginary parts may be.

    ``reaches``: at least one chord exponent must have a real part below this, so that a regime is not won by luck.
    """

    low: Fraction
    high: Fraction
    reaches: Fraction | None = None
    imaginary: Fraction = Fraction(0)


REGIMES = {
    "convergent": Regime(Fraction(0), Fraction(4)),
    "mild": Regime(Fraction(-1), Fraction(4), reaches=Fraction(0)),
    "deep": Regime(Fraction(-49, 10), Fraction(2), reaches=Fraction(-1)),
    "complex": Regime(Fraction(-2), Fraction(3), imaginary=Fraction(6)),
}


@dataclass(frozen=True)
class Case:
    """One integral with a known value."""

    kind: str
    regime: str
    form: DiskForm

    @property
    def pairs(self) -> PairExponents:
        """Exponents in the order (1,2), (1,3), ..., (n-1,n)."""
        return self.form.pairs()

    @property
    def n(self) -> int:
        return self.pairs.n

    def value(self, digits: int = 25):
        """The closed-form value as an mpmath number."""
        return self.form.value(digits)

    def exponents(self) -> dict[tuple[int, int], str]:
        """{(i, j): text} for all i < j: what ``DiskExponents.from_pairs`` takes."""
        n = self.n
        return {(i, j): str(self.pairs.at(i, j)) for i in range(1, n + 1) for j in range(i + 1, n + 1)}


class _Draw:
    """Exact random numbers of one regime."""

    def __init__(self, rng: np.random.Generator, regime: Regime) -> None:
        self.rng = rng
        self.regime = regime

    def _between(self, low: Fraction, high: Fraction) -> Fraction:
        return Fraction(int(self.rng.integers(int(low * GRID) + 1, int(high * GRID))), GRID)

    def number(self, low: Fraction | int, high: Fraction | int, parts: int = 1) -> Exact:
        """A number with real part in (low, high); ``parts`` of it stay within the imaginary range of the regime."""
        size = self.regime.imaginary / parts
        imaginary = self._between(-size, size) if size else Fraction(0)
        return Exact(self._between(Fraction(low), Fraction(high)), imaginary)

    def exponent(self) -> Exact:
        """A chord exponent of the regime."""
        return self.number(self.regime.low, self.regime.high)

    def narrow(self, parts: int) -> Exact:
        """A number of which ``parts`` add up to a chord exponent that is likely to lie in the regime."""
        low, high = self.regime.low, self.regime.high
        middle = (low + high) / (2 * parts)
        half = (high - low) / (parts + 1)
        return self.number(max(low, middle - half), min(high, middle + half))


def _beta(draw: _Draw) -> DiskForm:
    return EulerBeta(draw.exponent(), draw.exponent())


def _five(draw: _Draw) -> DiskForm:
    # five independent chord exponents: a1, a2, c1, c2 and the excess
    a1, a2, c1, c2, excess = (draw.exponent() for _ in range(5))
    return FivePoint(c1 + c2 - excess, a1, a2, a1 + c1, a2 + c2)


def _product(n: int) -> Callable[[_Draw], DiskForm]:
    def make(draw: _Draw) -> DiskForm:
        return BetaProduct(
            tuple(draw.exponent() for _ in range(n - 3)), tuple(draw.narrow((n - 2) // 2) for _ in range(n - 3))
        )

    return make


def _chain(n: int) -> Callable[[_Draw], DiskForm]:
    def make(draw: _Draw) -> DiskForm:
        size = n - 3
        a = tuple(draw.exponent() for _ in range(size))
        c = tuple(draw.narrow(2) for _ in range(size))
        first = int(draw.rng.integers(1, size))
        last = int(draw.rng.integers(first + 1, size + 1))
        # the chord that closes on the interval has exponent sum(c) + L
        excess = draw.exponent()
        long = excess
        for x in c[first - 1 : last]:
            long = long - x
        return HypergeometricChain(a, c, (((first, last), long),))

    return make


def _dixon_anderson(draw: _Draw) -> DiskForm:
    s = tuple(draw.narrow(2) for _ in range(3))
    alpha, beta = draw.exponent(), draw.exponent()
    return DixonAnderson(s, alpha - s[0] - s[1], beta - s[1] - s[2])


def _dougall(draw: _Draw) -> DiskForm:
    a = draw.number(-1, 3)
    b, c, d = (draw.narrow(2) for _ in range(3))
    upper = (b, c, d, 1 + a / 2)
    lower = (1 + a - c, 1 + a - d, a / 2, 1 + a - b)
    return RogersDougall(a, upper, lower)


def _selberg(n: int) -> Callable[[_Draw], DiskForm]:
    def make(draw: _Draw) -> DiskForm:
        count = n - 3
        regime = draw.regime
        # (k-1)(1 + k gamma) is the exponent of k points that collide, k alpha + k(k-1) gamma that of k points at 0
        low = max(Fraction(-1, 2), (regime.low / (count - 1) - 1) / count)
        gamma = draw.number(
            low, min(Fraction(1, 2), (regime.high / (count - 1) - 1) / count + Fraction(1, 4)), 2 * count * (count - 1)
        )
        spread = max(Fraction(1), Fraction(count, 2))
        edge = [draw.number(regime.low / spread, regime.high / spread, 2 * count) for _ in range(2)]
        return Selberg(count, edge[0], edge[1], gamma)

    return make


KINDS: dict[str, Callable[[_Draw], DiskForm]] = {
    "beta": _beta,
    "3F2": _five,
    "betas5": _product(5),
    "betas6": _product(6),
    "betas7": _product(7),
    "betas8": _product(8),
    "chain6": _chain(6),
    "chain7": _chain(7),
    "dixon-anderson6": _dixon_anderson,
    "dougall7": _dougall,
    "selberg5": _selberg(5),
    "selberg6": _selberg(6),
    "selberg7": _selberg(7),
    "selberg8": _selberg(8),
}


def fits(pairs: PairExponents, regime: Regime, clearance: Fraction = CLEARANCE) -> bool:
    """Whether every chord exponent lies in the regime, clear of the poles."""
    reached = regime.reaches is None
    for _, value in pairs.chords():
        if not regime.low < value.re < regime.high or abs(value.im) > regime.imaginary:
            return False
        nearest = min(0, round(value.re))
        if abs(value.re - nearest) < clearance and abs(value.im) < clearance:
            return False
        if regime.reaches is not None and value.re < regime.reaches:
            reached = True
    return reached


def random_case(kind: str, rng: np.random.Generator, regime: str = "convergent", tries: int = 200_000) -> Case:
    """A random integral of a kind in a regime, by rejection.

    Parameters
    ----------
    kind
        A key of KINDS.
    rng
        ``numpy.random.default_rng(seed)``; the same state gives the same case.
    regime
        ``"convergent"`` (every Y > 0), ``"mild"`` (Y > -1, some Y < 0), ``"deep"`` (Y in (-4.9, 2), some Y < -1) or
        ``"complex"`` (Re Y in (-2, 3), |Im Y| < 6).
    """
    make = KINDS[kind]
    draw = _Draw(rng, REGIMES[regime])
    for _ in range(tries):
        form = make(draw)
        if fits(form.pairs(), draw.regime):
            return Case(kind, regime, form)
    raise RuntimeError(f"no {kind} case in regime {regime} after {tries} tries")
