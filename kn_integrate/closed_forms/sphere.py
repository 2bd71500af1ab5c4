"""Sphere integrals: the complex beta integral with spin, and the complex Selberg integral.

The integrand is prod z_ij^(a_ij) conj(z_ij)^(ab_ij) with integer a_ij - ab_ij, measure d^2z/pi (d^2z = dx dy) for
every puncture that is integrated; rows of a and of ab sum to -2.
"""

from __future__ import annotations

from abc import abstractmethod
from dataclasses import dataclass
from itertools import combinations, permutations
from typing import Any, TypeVar

from ..errors import InputError, PoleError
from ..exact import ONE, Exact, read, read_integer
from .cubical import Cubical
from .form import ClosedForm, read_fields
from .gammas import gamma_quotient, is_pole
from .pairs import PairExponents
from .working import Big, Context

S = TypeVar("S", bound="SphereForm")


def spin_ratio(ctx: Context, x: Exact, xb: Exact) -> Big:
    """Gamma(x) / Gamma(1 - xb) for integer x - xb, also where both are infinite.

    From the reflection formula (DLMF 5.5.3) it equals (-1)^(x-xb) Gamma(xb) / Gamma(1-x).
    """
    if is_pole(x) and not is_pole(xb):
        return (-1) ** int((x - xb).re) * gamma_quotient(ctx, (xb,), (1 - x,))
    return gamma_quotient(ctx, (x,), (1 - xb,))


class SphereForm(ClosedForm):
    """A closed form of one sphere integral."""

    domain = "everywhere by continuation, except where a subset of punctures has both divisor exponents in 0, -1, ..."

    @property
    @abstractmethod
    def left(self) -> PairExponents:
        """Exponents of z_ij."""

    @property
    @abstractmethod
    def right(self) -> PairExponents:
        """Exponents of conj(z_ij)."""

    @classmethod
    @abstractmethod
    def read_off(cls: type[S], left: PairExponents, right: PairExponents) -> S | None:
        """The form with these very exponents, labels as they stand; None when it does not apply."""

    @classmethod
    def match(cls: type[S], left: Any, right: Any) -> S | None:
        """Look for this form among the labellings of the punctures: any three may sit at 0, 1 and infinity.

        Only for labellings that bring no sign: with spin the labels must stand as they are.
        """
        left, right = PairExponents.of(left), PairExponents.of(right)
        if left.n != right.n:
            raise InputError("right", f"{right.n} punctures", f"{left.n} as on the left")
        found = cls.read_off(left, right)
        if found is not None or left != right:
            return found
        n = left.n
        for zero, one, infinity in permutations(range(1, n + 1), 3):
            inner = [k for k in range(1, n + 1) if k not in (zero, one, infinity)]
            image = left.image([zero, *inner, one, infinity])
            found = cls.read_off(image, image)
            if found is not None:
                return found
        return None

    def refuse_poles(self) -> None:
        """Raise PoleError when both divisor exponents of a subset of punctures are 0, -1, -2, ..."""
        left, right = self.left, self.right
        n = left.n
        for size in range(2, n - 1):
            for subset in combinations(range(1, n), size):
                pair = [_subset_divisor(side, subset) for side in (left, right)]
                if is_pole(pair[0]) and is_pole(pair[1]):
                    level = int(min(-pair[0].re, -pair[1].re))
                    raise PoleError(
                        subset, level, pair[0], f"pole at punctures {subset}: the divisor exponents are {pair}"
                    )


def _subset_divisor(pairs: PairExponents, subset: tuple[int, ...]) -> Exact:
    total: Exact = (len(subset) - 1) * ONE
    for i, j in combinations(subset, 2):
        total = total + pairs.at(i, j)
    return total


@dataclass(frozen=True)
class ComplexBeta(SphereForm):
    """n = 4: (1/pi) int d^2z z^(a-1) zb^(ab-1) (1-z)^(b-1) (1-zb)^(bb-1), spins a - ab and b - bb integer.

    The value is Gamma(a) Gamma(b) Gamma(1-ab-bb) / (Gamma(a+b) Gamma(1-ab) Gamma(1-bb)).  The third factor has the
    barred numbers above and the others below; the symmetric-looking quotient has the wrong sign at odd total spin.
    The pairs are z_1 = 0, z_2 = z, z_3 = 1 with (z_3 - z_2), not (z_2 - z_3), to the power b - 1.

    >>> print(ComplexBeta("0.3", "0.3", "0.35", "0.35").value(20))
    7.79115274709352
    """

    a: Exact
    ab: Exact
    b: Exact
    bb: Exact

    name = "complex beta"
    source = "Virasoro 1969, Shapiro 1970; with spin: Gelfand, Graev, Retakh 2004; Neretin, arXiv:2212.09112, eq. 1.7"
    domain = "every n = 4 sphere integral; off the points with both of (a, ab), (b, bb) or (c, cb) in 0, -1, -2, ..."

    def __post_init__(self) -> None:
        read_fields(self)
        for name, spin in (("a - ab", self.a - self.ab), ("b - bb", self.b - self.bb)):
            if not spin.is_integer:
                raise InputError(name, str(spin), "an integer spin")

    @property
    def left(self) -> PairExponents:
        """Exponents of z."""
        return Cubical((self.a,), (self.b,)).pairs()

    @property
    def right(self) -> PairExponents:
        """Exponents of conj(z)."""
        return Cubical((self.ab,), (self.bb,)).pairs()

    @classmethod
    def read_off(cls, left: PairExponents, right: PairExponents) -> ComplexBeta | None:
        """Applies to every n = 4 integral."""
        if left.n != 4:
            return None
        return cls(left.at(1, 2) + 1, right.at(1, 2) + 1, left.at(2, 3) + 1, right.at(2, 3) + 1)

    def evaluate(self, ctx: Context) -> Big:
        """Three ratios, each with its own spin."""
        c, cb = 1 - self.a - self.b, 1 - self.ab - self.bb
        return spin_ratio(ctx, self.a, self.ab) * spin_ratio(ctx, self.b, self.bb) * spin_ratio(ctx, cb, c)


@dataclass(frozen=True)
class ComplexSelberg(SphereForm):
    """n = N + 3: prod |z_i|^(2a-2) |1-z_i|^(2b-2) prod |z_ij|^(4g), d^2z/pi over all of C^N (no 1/N!).

    With D(x) = Gamma(x)/Gamma(1-x) the value is
    N! D(1-g)^N prod_{j<N} D((j+1)g) D(a+jg) D(b+jg) D(1-a-b-(N+j-1)g).
    """

    count: int
    a: Exact
    b: Exact
    g: Exact

    name = "complex Selberg integral"
    source = "Dotsenko and Fateev 1985, eq. B.9 (number from memory); Aomoto 1987"
    domain = "equal exponents of every integrated puncture towards 0 and 1 and of every pair of them; off the poles"

    def __post_init__(self) -> None:
        count = read_integer(self.count, "count", "an integer >= 1")
        if count < 1:
            raise InputError("count", str(count), "an integer >= 1")
        for name in ("a", "b", "g"):
            object.__setattr__(self, name, read(getattr(self, name), name)[0])

    @property
    def left(self) -> PairExponents:
        """Exponents of z, the same as those of conj(z)."""
        finite: dict[tuple[int, int], Exact] = {}
        for i in range(2, self.count + 2):
            finite[1, i] = self.a - 1
            finite[i, self.count + 2] = self.b - 1
        for i, j in combinations(range(2, self.count + 2), 2):
            finite[i, j] = 2 * self.g
        return PairExponents.from_finite(self.count + 3, finite)

    @property
    def right(self) -> PairExponents:
        """Exponents of conj(z)."""
        return self.left

    @classmethod
    def read_off(cls, left: PairExponents, right: PairExponents) -> ComplexSelberg | None:
        """Applies when both sides have the symmetry of the integrated punctures."""
        n = left.n
        g = left.at(2, 3) / 2 * (1 if n > 4 else 0)
        form = cls(n - 3, left.at(1, 2) + 1, left.at(2, n - 1) + 1, g)
        return form if form.left == left == right else None

    def evaluate(self, ctx: Context) -> Big:
        """x Gamma(x) = Gamma(1+x) turns D(1-g) D((j+1)g) (j+1) into a quotient without a false pole at g = 0."""
        a, b, g = self.a, self.b, self.g
        above, below = [], []
        for j in range(self.count):
            c = 1 - a - b - (self.count + j - 1) * g
            above += [1 - g, 1 + (j + 1) * g, a + j * g, b + j * g, c]
            below += [1 + g, 1 - (j + 1) * g, 1 - a - j * g, 1 - b - j * g, 1 - c]
        return gamma_quotient(ctx, above, below)
