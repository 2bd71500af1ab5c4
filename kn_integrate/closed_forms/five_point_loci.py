"""Subspaces of n = 5 where the 3F2(1) sums to Gamma functions, so that the integral is a Gamma product.

Every form is B(a1, b1-a1) B(a2, b2-a2) 3F2(a0, a1, a2; b1, b2; 1) on a classical locus.  The betas bring
1/(Gamma(b1) Gamma(b2)), which cancels against the summation theorem before anything is evaluated; the quotients below
are written after that cancellation.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import permutations
from typing import ClassVar, TypeVar

from ..errors import InputError
from ..exact import Exact
from .form import DiskForm
from .gammas import gamma_quotient, rising
from .hypergeometric import FivePoint
from .pairs import PairExponents
from .working import Big, Context, rounded

L = TypeVar("L", bound="FivePointLocus")
Roles = tuple[Exact, ...]


def _assignments(five: FivePoint) -> Iterator[tuple[Exact, Exact, Exact, Exact, Exact]]:
    """(a, b, c, e, f) over all orders of the numerators and of the denominators."""
    for a, b, c in permutations((five.a0, five.a1, five.a2)):
        for e, f in ((five.b1, five.b2), (five.b2, five.b1)):
            yield a, b, c, e, f


@dataclass(frozen=True)
class FivePointLocus(DiskForm):
    """A Gamma product on a locus of the five-point integral; InputError off the locus."""

    five: FivePoint

    locus: ClassVar[str]

    def __post_init__(self) -> None:
        if self.roles(self.five) is None:
            raise InputError("five", f"{self.five}", self.locus)

    @classmethod
    def roles(cls, five: FivePoint) -> Roles | None:
        """The parameters in the roles of the summation theorem, None off its locus."""
        raise NotImplementedError

    def pairs(self) -> PairExponents:
        """Those of the five-point integral."""
        return self.five.pairs()

    @classmethod
    def read_off(cls: type[L], pairs: PairExponents) -> L | None:
        """Applies on the locus."""
        five = FivePoint.read_off(pairs)
        return None if five is None or cls.roles(five) is None else cls(five)

    def _betas(self) -> Roles:
        """Arguments of the four Gamma functions in the numerators of the two betas."""
        five = self.five
        return five.a1, five.b1 - five.a1, five.a2, five.b2 - five.a2

    def _roles(self) -> Roles:
        roles = self.roles(self.five)
        assert roles is not None  # checked when the form was made
        return roles


class Dixon(FivePointLocus):
    """Well-poised: {b1, b2} = {1+a-b, 1+a-c}."""

    name = "five-point integral on Dixon's locus"
    source = "DLMF 16.4.4 (Dixon 1903; number from memory)"
    locus = "numerators a, b, c (in some order) with denominators 1+a-b and 1+a-c"
    domain = "n = 5, " + locus + "; off the poles of the chords"

    @classmethod
    def roles(cls, five: FivePoint) -> Roles | None:
        """(a, b, c)."""
        for a, b, c, e, f in _assignments(five):
            if e == 1 + a - b and f == 1 + a - c:
                return a, b, c
        return None

    def evaluate(self, ctx: Context) -> Big:
        """Gamma(1+a/2)/Gamma(1+a) is rewritten by duplication, which removes a false pole at even a < 0."""
        a, b, c = self._roles()
        above = (*self._betas(), 1 + a / 2 - b - c)
        below = ((1 + a) / 2, 1 + a - b - c, 1 + a / 2 - b, 1 + a / 2 - c)
        return gamma_quotient(ctx, above, below) * ctx.sqrt(ctx.pi) * ctx.power(2, -rounded(ctx, a))


class Watson(FivePointLocus):
    """{b1, b2} = {(a+b+1)/2, 2c}."""

    name = "five-point integral on Watson's locus"
    source = "DLMF 16.4.6 (Watson 1925; number from memory)"
    locus = "numerators a, b, c (in some order) with denominators (a+b+1)/2 and 2c"
    domain = "n = 5, " + locus + "; off the poles of the chords"

    @classmethod
    def roles(cls, five: FivePoint) -> Roles | None:
        """(a, b, c)."""
        for a, b, c, e, f in _assignments(five):
            if 2 * e == a + b + 1 and f == 2 * c:
                return a, b, c
        return None

    def evaluate(self, ctx: Context) -> Big:
        """Gamma(c+1/2)/Gamma(2c) is rewritten by duplication."""
        a, b, c = self._roles()
        above = (*self._betas(), c + (1 - a - b) / 2)
        below = (c, (a + 1) / 2, (b + 1) / 2, c + (1 - a) / 2, c + (1 - b) / 2)
        return gamma_quotient(ctx, above, below) * ctx.pi * ctx.power(2, 1 - 2 * rounded(ctx, c))


class Whipple(FivePointLocus):
    """a + b = 1 and b1 + b2 = 1 + 2c."""

    name = "five-point integral on Whipple's locus"
    source = "DLMF 16.4.7 (Whipple 1925; number from memory)"
    locus = "numerators a, 1-a, c (in some order) with denominators summing to 1 + 2c"
    domain = "n = 5, " + locus + "; off the poles of the chords"

    @classmethod
    def roles(cls, five: FivePoint) -> Roles | None:
        """(a, c, e, f)."""
        for a, b, c, e, f in _assignments(five):
            if a + b == 1 and e + f == 1 + 2 * c:
                return a, c, e, f
        return None

    def evaluate(self, ctx: Context) -> Big:
        """The Gamma quotient."""
        a, c, e, f = self._roles()
        below = ((a + e) / 2, (1 - a + e) / 2, (a + f) / 2, (1 - a + f) / 2)
        return gamma_quotient(ctx, self._betas(), below) * ctx.pi * ctx.power(2, 1 - 2 * rounded(ctx, c))


class PfaffSaalschuetz(FivePointLocus):
    """Excess 1 and z_24 (or its image) with a non-negative integer exponent m, so that the series ends."""

    name = "five-point integral on the locus of Pfaff and Saalschuetz"
    source = "DLMF 16.4.3 (Pfaff 1797, Saalschuetz 1890; number from memory)"
    locus = "a0 = -m with m = 0, 1, 2, ... and b1 + b2 - a0 - a1 - a2 = 1"
    domain = "n = 5, " + locus + "; off the poles of the chords"

    _longest = 10**4  # a longer product is not worth the exact arithmetic

    @classmethod
    def roles(cls, five: FivePoint) -> Roles | None:
        """(a0,)."""
        short = five.a0.is_integer and -cls._longest <= five.a0.re <= 0
        return (five.a0,) if short and five.excess == 1 else None

    def evaluate(self, ctx: Context) -> Big:
        """(b1-a1)_m (b1-a2)_m / ((b1)_m (b1-a1-a2)_m), with (b1-a1-a2)_m = (-1)^m (b2)_m on the locus."""
        five = self.five
        m = int(-five.a0.re)
        factor = (-1) ** m * rising(five.b1 - five.a1, m) * rising(five.b1 - five.a2, m)
        return gamma_quotient(ctx, self._betas(), (five.b1 + m, five.b2 + m)) * rounded(ctx, factor)


class Gauss(FivePointLocus):
    """A numerator equals a denominator, which leaves a 2F1(1)."""

    name = "five-point integral with a cancelling parameter"
    source = "DLMF 15.4.20 (Gauss 1812)"
    locus = "one of a0, a1, a2 equal to b1 or b2"
    domain = "n = 5, " + locus + "; off the poles of the chords"

    @classmethod
    def roles(cls, five: FivePoint) -> Roles | None:
        """(a, b, c, f): a and b over c remain, f has gone."""
        for a, b, gone, c, f in _assignments(five):
            if gone == f:
                return a, b, c, f
        return None

    def evaluate(self, ctx: Context) -> Big:
        """The Gamma quotient."""
        a, b, c, f = self._roles()
        return gamma_quotient(ctx, (*self._betas(), c - a - b), (f, c - a, c - b))


LOCI: tuple[type[FivePointLocus], ...] = (Dixon, Watson, Whipple, PfaffSaalschuetz, Gauss)
