"""n = 7 and the very-well-poised 5F4(1)."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass

from ..errors import InputError
from ..exact import Exact
from .cubical import Cubical
from .form import DiskForm, read_fields
from .gammas import gamma_quotient
from .pairs import PairExponents
from .working import Big, Context


@dataclass(frozen=True)
class RogersDougall(DiskForm):
    """n = 7: one factor (1 - u_1 u_2 u_3 u_4)^(-a0) whose 5F4(1) is very well poised, a Gamma product.

    Attributes
    ----------
    a0 : Exact
        Minus the long exponent.
    upper, lower : tuple[Exact, ...]
        Four numerators a_i and four denominators b_i in the order of the coordinates; c_i = b_i - a_i.
    """

    a0: Exact
    upper: tuple[Exact, ...]
    lower: tuple[Exact, ...]

    name = "seven-point very-well-poised 5F4(1)"
    source = "DLMF 16.4.9 (Rogers 1895, Dougall 1907; Bailey 1935, section 4.4; numbers from memory)"
    locus = "numerators {a, 1+a/2, b, c, d} and denominators {a/2, 1+a-b, 1+a-c, 1+a-d}"
    domain = "n = 7, the only long factor is (1 - u_1 u_2 u_3 u_4)^(-a0), " + locus + "; off the poles of the chords"

    def __post_init__(self) -> None:
        read_fields(self)
        if len(self.upper) != 4 or len(self.lower) != 4 or self.roles() is None:
            raise InputError("upper, lower", f"{self.upper}, {self.lower}", self.locus)

    def roles(self) -> tuple[Exact, Exact, Exact, Exact] | None:
        """(a, b, c, d), None when the series is not very well poised."""
        above = (self.a0, *self.upper)
        below = Counter(self.lower)
        for k, a in enumerate(above):
            rest = list(above[:k] + above[k + 1 :])
            if 1 + a / 2 not in rest:
                continue
            rest.remove(1 + a / 2)
            if below == Counter([a / 2, *(1 + a - x for x in rest)]):
                return a, rest[0], rest[1], rest[2]
        return None

    def pairs(self) -> PairExponents:
        """See :class:`Cubical`."""
        c = tuple(b - a for a, b in zip(self.upper, self.lower, strict=True))
        long = (((1, 4), -self.a0),) if self.a0 else ()
        return Cubical(self.upper, c, long).pairs()

    @classmethod
    def read_off(cls, pairs: PairExponents) -> RogersDougall | None:
        """Applies when the series is very well poised."""
        if pairs.n != 7:
            return None
        cubical = Cubical.of(pairs)
        if any(interval != (1, 4) for interval, _ in cubical.long):
            return None
        lower = tuple(a + c for a, c in zip(cubical.a, cubical.c, strict=True))
        try:
            return cls(-pairs.at(2, 6), cubical.a, lower)
        except InputError:
            return None

    def evaluate(self, ctx: Context) -> Big:
        """The betas times the sum of the series."""
        roles = self.roles()
        assert roles is not None  # checked when the form was made
        a, b, c, d = roles
        gaps = [y - x for x, y in zip(self.upper, self.lower, strict=True)]
        above = (*self.upper, *gaps, 1 + a - b, 1 + a - c, 1 + a - d, 1 + a - b - c - d)
        below = (*self.lower, 1 + a, 1 + a - b - c, 1 + a - b - d, 1 + a - c - d)
        return gamma_quotient(ctx, above, below)
