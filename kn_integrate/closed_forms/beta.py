"""The Euler beta integral and products of it."""

from __future__ import annotations

from dataclasses import dataclass

from ..errors import InputError
from ..exact import Exact
from .cubical import Cubical
from .form import DiskForm, read_fields
from .gammas import gamma_quotient
from .pairs import PairExponents
from .working import Big, Context


@dataclass(frozen=True)
class EulerBeta(DiskForm):
    """n = 4: int_0^1 x^(a-1) (1-x)^(b-1) dx = Gamma(a) Gamma(b) / Gamma(a+b).

    >>> print(EulerBeta("2/5", "3/10").value(20))
    5.11209124445735
    """

    a: Exact
    b: Exact

    name = "Euler beta"
    source = "DLMF 5.12.1"
    domain = "every n = 4 integral; off the poles a or b = 0, -1, -2, ..."

    def __post_init__(self) -> None:
        read_fields(self)

    def pairs(self) -> PairExponents:
        """z_1 = 0, z_2 = x, z_3 = 1."""
        return Cubical((self.a,), (self.b,)).pairs()

    @classmethod
    def read_off(cls, pairs: PairExponents) -> EulerBeta | None:
        """Applies to every n = 4 integral."""
        return cls(pairs.divisor(1, 2), pairs.divisor(2, 3)) if pairs.n == 4 else None

    def evaluate(self, ctx: Context) -> Big:
        """The Gamma quotient."""
        return gamma_quotient(ctx, (self.a, self.b), (self.a + self.b,))


@dataclass(frozen=True)
class BetaProduct(DiskForm):
    """Any n: no factor couples two cubical coordinates, so the integral is prod_i B(a_i, c_i)."""

    a: tuple[Exact, ...]
    c: tuple[Exact, ...]

    name = "product of Euler betas"
    source = "DLMF 5.12.1 in each cubical coordinate"
    domain = "A_ij = 0 for 2 <= i, i+2 <= j <= n-1 (after a rotation); off the poles of the chords"

    def __post_init__(self) -> None:
        read_fields(self)
        if len(self.a) != len(self.c) or not self.a:
            raise InputError("a, c", f"{len(self.a)} and {len(self.c)} numbers", "n - 3 of each")

    def pairs(self) -> PairExponents:
        """See :class:`Cubical`."""
        return Cubical(self.a, self.c).pairs()

    @classmethod
    def read_off(cls, pairs: PairExponents) -> BetaProduct | None:
        """Applies when every long exponent vanishes."""
        cubical = Cubical.of(pairs)
        return None if cubical.long else cls(cubical.a, cubical.c)

    def evaluate(self, ctx: Context) -> Big:
        """The Gamma quotient."""
        sums = [a + c for a, c in zip(self.a, self.c, strict=True)]
        return gamma_quotient(ctx, (*self.a, *self.c), sums)
