"""Disk integrals that are hypergeometric series at argument 1 in cubical coordinates."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from ..errors import InputError
from ..exact import Exact, read
from .cubical import Cubical
from .form import DiskForm, read_fields
from .gammas import gamma_quotient
from .pairs import PairExponents
from .unit_series import unit_series
from .working import Big, Context


def block(ctx: Context, long: Exact, a: Sequence[Exact], c: Sequence[Exact]) -> Big:
    """int prod u_i^(a_i-1) (1-u_i)^(c_i-1) (1 - u_1...u_q)^long du: q betas times q+1Fq(-long, a; a+c; 1).

    Expand the last factor in powers of the product and integrate each term (DLMF 16.5.2 iterated).
    """
    sums = [x + y for x, y in zip(a, c, strict=True)]
    return gamma_quotient(ctx, (*a, *c), ()) * unit_series(ctx, [-long, *a], sums)


@dataclass(frozen=True)
class FivePoint(DiskForm):
    """n = 5, every exponent: B(a1, b1-a1) B(a2, b2-a2) 3F2(a0, a1, a2; b1, b2; 1), continued.

    The integral is int x^(a1-1) (1-x)^(b1-a1-1) y^(a2-1) (1-y)^(b2-a2-1) (1-xy)^(-a0), z_3 = y, z_2 = xy.  Rotating
    the five positions gives five such series (Thomae's relations, DLMF 16.4.11); the one with the largest real
    excess is evaluated.

    >>> amplitude = FivePoint("9/20", "3/10", "7/20", "7/10", "17/20")
    >>> print(amplitude.value(25))
    25.914922073927
    """

    a0: Exact
    a1: Exact
    a2: Exact
    b1: Exact
    b2: Exact

    name = "five-point 3F2(1)"
    source = "DLMF 16.5.2; Bardakci and Ruegg 1968"
    domain = "every n = 5 integral; off the poles of the five chords"

    def __post_init__(self) -> None:
        read_fields(self)

    @property
    def excess(self) -> Exact:
        """b1 + b2 - a0 - a1 - a2: the series converges as it stands where its real part is positive."""
        excess: Exact = self.b1 + self.b2 - self.a0 - self.a1 - self.a2
        return excess

    def pairs(self) -> PairExponents:
        """See :class:`Cubical`; a0 is minus the exponent of z_24."""
        long = (((1, 2), -self.a0),) if self.a0 else ()
        return Cubical((self.a1, self.a2), (self.b1 - self.a1, self.b2 - self.a2), long).pairs()

    @classmethod
    def read_off(cls, pairs: PairExponents) -> FivePoint | None:
        """Applies to every n = 5 integral."""
        if pairs.n != 5:
            return None
        cubical = Cubical.of(pairs)
        (a1, a2), (c1, c2) = cubical.a, cubical.c
        return cls(-pairs.at(2, 4), a1, a2, a1 + c1, a2 + c2)

    def rotations(self) -> tuple[FivePoint, ...]:
        """The five forms of the same integral, itself first."""
        found = []
        for _, image in list(self.pairs().dihedral())[:5]:
            form = FivePoint.read_off(image)
            assert form is not None
            found.append(form)
        return tuple(found)

    def evaluate_here(self, ctx: Context) -> Big:
        """This very series, whatever its excess."""
        return block(ctx, -self.a0, (self.a1, self.a2), (self.b1 - self.a1, self.b2 - self.a2))

    def evaluate(self, ctx: Context) -> Big:
        """The rotation with the largest real excess (the first of them)."""
        return max(self.rotations(), key=lambda form: form.excess.re).evaluate_here(ctx)


@dataclass(frozen=True)
class HypergeometricChain(DiskForm):
    """Any n: factors (1 - u_i...u_j)^L on intervals that do not overlap; a product of betas and q+1Fq(1).

    Attributes
    ----------
    a, c : tuple[Exact, ...]
        n - 3 numbers each, see :class:`Cubical`.
    long : tuple[tuple[tuple[int, int], Exact], ...]
        ((i, j), L_ij), intervals 1 <= i < j <= n - 3 in rising order.
    """

    a: tuple[Exact, ...]
    c: tuple[Exact, ...]
    long: tuple[tuple[tuple[int, int], Exact], ...]

    name = "product of betas and q+1Fq(1)"
    source = "DLMF 16.5.2 iterated in cubical coordinates"
    domain = (
        "the intervals of the nonzero long exponents do not overlap (after a rotation); off the poles of the chords"
    )

    def __post_init__(self) -> None:
        if len(self.a) != len(self.c) or not self.a:
            raise InputError("a, c", f"{len(self.a)} and {len(self.c)} numbers", "n - 3 of each")
        for name in ("a", "c"):
            numbers = tuple(read(x, f"{name}[{k}]")[0] for k, x in enumerate(getattr(self, name)))
            object.__setattr__(self, name, numbers)
        long = tuple(((i, j), read(x, f"long ({i}, {j})")[0]) for (i, j), x in self.long)
        object.__setattr__(self, "long", long)
        ends = [0, *(edge for pair, _ in long for edge in pair)]
        if ends != sorted(set(ends)) or ends[-1] > len(self.a):
            raise InputError("long", f"intervals {[pair for pair, _ in long]}", "1 <= i < j <= n - 3, rising, apart")

    def pairs(self) -> PairExponents:
        """See :class:`Cubical`."""
        return Cubical(self.a, self.c, self.long).pairs()

    @classmethod
    def read_off(cls, pairs: PairExponents) -> HypergeometricChain | None:
        """Applies when the intervals with a nonzero exponent do not overlap, and there is one at least."""
        cubical = Cubical.of(pairs)
        if not cubical.long or cubical.blocks() is None:
            return None
        return cls(cubical.a, cubical.c, cubical.long)

    def evaluate(self, ctx: Context) -> Big:
        """Block by block; a coordinate outside every interval is a beta."""
        value = ctx.one
        inside: set[int] = set()
        for (i, j), long in self.long:
            inside.update(range(i, j + 1))
            value *= block(ctx, long, self.a[i - 1 : j], self.c[i - 1 : j])
        for k in range(1, len(self.a) + 1):
            if k not in inside:
                a, c = self.a[k - 1], self.c[k - 1]
                value *= gamma_quotient(ctx, (a, c), (a + c,))
        return value
