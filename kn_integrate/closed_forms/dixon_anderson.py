"""Interlacing points: the inner ones integrated by Dixon and Anderson, the outer ones by Euler or Selberg."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations

from ..errors import InputError
from ..exact import ONE, ZERO, Exact
from .form import DiskForm, read_fields
from .gammas import gamma_quotient
from .pairs import PairExponents
from .selberg import ordered_selberg
from .working import Big, Context


@dataclass(frozen=True)
class DixonAnderson(DiskForm):
    """n = 2m + 2: points 0 = a_0 < l_1 < a_1 < l_2 < ... < l_m < a_m = 1 with infinity last.

    The integrand is prod |l_i - a_j|^(s_j - 1) prod (l_j - l_i) times prod_{0<j<m} a_j^p (1-a_j)^q and
    prod |a_i - a_j|^w.  Over the l it gives
    prod Gamma(s_j)/Gamma(sum s) prod_{i<j} (a_j - a_i)^(s_i + s_j - 1); what is left over the inner a is a beta
    (m = 2) or, with equal inner s, a Selberg integral.

    Attributes
    ----------
    s : tuple[Exact, ...]
        m + 1 numbers, m >= 2; those of the inner a equal to each other.
    p, q, w : Exact
        w must be 0 for m = 2, where there is no pair of inner a.
    """

    s: tuple[Exact, ...]
    p: Exact
    q: Exact
    w: Exact = ZERO

    name = "Dixon-Anderson integral"
    source = "Dixon 1905; Anderson 1991 (review: Forrester and Warnaar 2008, arXiv:0710.3981); DLMF 5.12.1, 5.14.4"
    domain = (
        "even n >= 6, interlacing points with exponents s_j - 1 towards each a_j and 1 among the l (after a rotation); "
        "off the poles of the chords"
    )

    def __post_init__(self) -> None:
        read_fields(self)
        if len(self.s) < 3 or len(set(self.s[1:-1])) != 1:
            raise InputError("s", f"{self.s}", "three numbers or more, the inner ones equal")
        if len(self.s) == 3 and self.w:
            raise InputError("w", str(self.w), "0 when there is a single inner point")

    def pairs(self) -> PairExponents:
        """The a at odd positions, the l at even ones."""
        m = len(self.s) - 1
        last = 2 * m + 1
        finite: dict[tuple[int, int], Exact] = {}
        for low in range(2, last, 2):
            for j, s in enumerate(self.s):
                odd = 2 * j + 1
                finite[min(low, odd), max(low, odd)] = s - 1
        for i, j in combinations(range(2, last, 2), 2):
            finite[i, j] = ONE
        for i in range(3, last, 2):
            finite[1, i] = self.p
            finite[i, last] = self.q
        for i, j in combinations(range(3, last, 2), 2):
            finite[i, j] = self.w
        return PairExponents.from_finite(2 * m + 2, finite)

    @classmethod
    def read_off(cls, pairs: PairExponents) -> DixonAnderson | None:
        """Applies when the exponents have the interlacing pattern."""
        n = pairs.n
        if n % 2 or n < 6:
            return None
        s = tuple(pairs.at(2, odd) + 1 for odd in range(1, n, 2))
        if len(set(s[1:-1])) != 1:
            return None
        form = cls(s, pairs.at(1, 3), pairs.at(3, n - 1), pairs.at(3, 5) if n > 6 else ZERO)
        return form if form.pairs() == pairs else None

    def evaluate(self, ctx: Context) -> Big:
        """The Dixon-Anderson factor times the ordered Selberg integral of the inner a."""
        first, inner, last = self.s[0], self.s[1], self.s[-1]
        density = gamma_quotient(ctx, self.s, (sum(self.s, ZERO),))
        gamma = inner + (self.w - 1) / 2
        count = len(self.s) - 2
        alpha, beta = first + inner + self.p, inner + last + self.q
        if count == 1:
            return density * gamma_quotient(ctx, (alpha, beta), (alpha + beta,))
        return density * ordered_selberg(ctx, count, alpha, beta, gamma)
