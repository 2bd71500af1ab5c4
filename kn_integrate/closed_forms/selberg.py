"""The Selberg integral on the ordered points 0 < z_2 < ... < z_{n-2} < 1, and Aomoto's insertion."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations
from math import comb, factorial

from ..errors import InputError
from ..exact import ONE, Exact, read, read_integer
from .form import ClosedForm, DiskForm
from .gammas import gamma_quotient
from .pairs import PairExponents
from .working import Big, Context, rounded


def ordered_selberg(ctx: Context, count: int, alpha: Exact, beta: Exact, gamma: Exact) -> Big:
    """S_N(alpha, beta, gamma) / N! (DLMF 5.14.4): the integral over one ordering of the N points."""
    above, below = [], []
    for j in range(count):
        above += [alpha + j * gamma, beta + j * gamma, 1 + (j + 1) * gamma]
        below += [alpha + beta + (count + j - 1) * gamma, 1 + gamma]
    return gamma_quotient(ctx, above, below) / factorial(count)


def _pairs(count: int, alpha: Exact, beta: Exact, gamma: Exact, marked: tuple[int, ...] = ()) -> PairExponents:
    finite: dict[tuple[int, int], Exact] = {}
    for i in range(2, count + 2):
        finite[1, i] = alpha - 1 + (1 if i in marked else 0)
        finite[i, count + 2] = beta - 1
    for i, j in combinations(range(2, count + 2), 2):
        finite[i, j] = 2 * gamma
    return PairExponents.from_finite(count + 3, finite)


def _read(form: Selberg | AomotoInsertion) -> None:
    count = read_integer(form.count, "count", "an integer >= 1")
    if count < 1:
        raise InputError("count", str(count), "an integer >= 1")
    object.__setattr__(form, "count", count)
    for name in ("alpha", "beta", "gamma"):
        object.__setattr__(form, name, read(getattr(form, name), name)[0])


@dataclass(frozen=True)
class Selberg(DiskForm):
    """n = N + 3: prod z_i^(alpha-1) (1-z_i)^(beta-1) prod |z_ij|^(2 gamma) over 0 < z_2 < ... < z_{N+1} < 1.

    >>> print(Selberg(2, "0.4", "0.3", "0.2").value(20))
    8.32434879771182
    """

    count: int
    alpha: Exact
    beta: Exact
    gamma: Exact

    name = "Selberg integral"
    source = "Selberg 1944; DLMF 5.14.4, divided by N!"
    domain = (
        "equal exponents of every inner point towards 0 and towards 1, and of every pair of inner points "
        "(after a rotation); off the poles of the chords"
    )

    def __post_init__(self) -> None:
        _read(self)

    def pairs(self) -> PairExponents:
        """Inner points at positions 2..n-2."""
        return _pairs(self.count, self.alpha, self.beta, self.gamma)

    @classmethod
    def read_off(cls, pairs: PairExponents) -> Selberg | None:
        """Applies when the exponents have the symmetry of the inner points."""
        count = pairs.n - 3
        gamma = pairs.at(2, 3) / 2 * (1 if count > 1 else 0)
        form = cls(count, pairs.at(1, 2) + 1, pairs.at(2, pairs.n - 1) + 1, gamma)
        return form if form.pairs() == pairs else None

    def evaluate(self, ctx: Context) -> Big:
        """The Gamma quotient."""
        return ordered_selberg(ctx, self.count, self.alpha, self.beta, self.gamma)


@dataclass(frozen=True)
class AomotoInsertion(ClosedForm):
    """The ordered Selberg integral of the elementary symmetric polynomial e_k(z): a sum of disk integrals.

    Aomoto's average of z_1...z_k over all orderings is prod_{j=1..k} (alpha + (N-j) gamma) /
    (alpha + beta + (2N-j-1) gamma); symmetrising replaces the product by e_k / (N choose k).
    """

    count: int
    alpha: Exact
    beta: Exact
    gamma: Exact
    k: int

    name = "Aomoto insertion"
    source = "Aomoto 1987; DLMF 5.14.4 with m > 0"
    domain = "the sum over all choices of k inner points that carry one more power of z; off the poles of the terms"

    def __post_init__(self) -> None:
        _read(self)
        k = read_integer(self.k, "k", f"an integer from 0 to {self.count}")
        if not 0 <= k <= self.count:
            raise InputError("k", str(k), f"an integer from 0 to {self.count}")

    def terms(self) -> tuple[PairExponents, ...]:
        """The exponents of the integrals whose sum is the value."""
        chosen = combinations(range(2, self.count + 2), self.k)
        return tuple(_pairs(self.count, self.alpha, self.beta, self.gamma, marked) for marked in chosen)

    def refuse_poles(self) -> None:
        """Raise PoleError when a term has a pole."""
        for term in self.terms():
            term.refuse_poles()

    def evaluate(self, ctx: Context) -> Big:
        """The Selberg value times Aomoto's factors, which are exact rationals."""
        factor = comb(self.count, self.k) * ONE
        for j in range(1, self.k + 1):
            above = self.alpha + (self.count - j) * self.gamma
            below = self.alpha + self.beta + (2 * self.count - j - 1) * self.gamma
            factor = factor * above / below
        return rounded(ctx, factor) * ordered_selberg(ctx, self.count, self.alpha, self.beta, self.gamma)
