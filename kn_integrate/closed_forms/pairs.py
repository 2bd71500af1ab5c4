"""The exponents of a disk integral in absolute-value form, and the dihedral group that leaves it unchanged.

For points in the order z_1 < z_2 < ... < z_n the integral of ``prod_{i<j} |z_ij|^{A_ij}`` modulo SL(2,R) needs row
sums of -2 and is unchanged when the positions are rotated or reflected: they only sit on a circle.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations
from typing import Any

from ..errors import InputError, PoleError
from ..exact import ZERO, Exact, read


def _points(count: int) -> int:
    n = 4
    while n * (n - 1) // 2 < count:
        n += 1
    if n * (n - 1) // 2 != count:
        raise InputError("exponents", f"{count} numbers", "n(n-1)/2 of them with n >= 4, in the order (1,2),(1,3),...")
    return n


@dataclass(frozen=True, slots=True)
class PairExponents:
    """Exponents A_ij of ``prod |z_ij|^{A_ij}`` for the positions 1..n, every row summing to -2.

    Attributes
    ----------
    n : int
    flat : tuple[Exact, ...]
        n(n-1)/2 numbers in the order (1,2), (1,3), ..., (n-1,n).

    Raises
    ------
    InputError
        When a row does not sum to -2, or the count of numbers is not n(n-1)/2.

    Examples
    --------
    >>> beta = PairExponents.from_finite(4, {(1, 2): "-3/5", (2, 3): "-7/10"})
    >>> beta.at(4, 2), beta.divisor(1, 2)
    (Exact('-7/10'), Exact('2/5'))
    """

    n: int
    flat: tuple[Exact, ...]

    def __post_init__(self) -> None:
        if self.n < 4 or len(self.flat) != self.n * (self.n - 1) // 2:
            raise InputError("exponents", f"{len(self.flat)} numbers for n = {self.n}", "n(n-1)/2 numbers, n >= 4")
        for i in range(1, self.n + 1):
            row = sum((self.at(i, j) for j in range(1, self.n + 1) if j != i), ZERO)
            if row != -2:
                raise InputError("exponents", f"the row of position {i} sums to {row}", "-2 for every row")

    @classmethod
    def of(cls, values: PairExponents | Sequence[Any]) -> PairExponents:
        """Read a flat sequence of numbers in the order (1,2), (1,3), ..., (n-1,n)."""
        if isinstance(values, PairExponents):
            return values
        numbers = tuple(read(value, f"exponents[{k}]")[0] for k, value in enumerate(values))
        return cls(_points(len(numbers)), numbers)

    @classmethod
    def from_finite(cls, n: int, finite: Mapping[tuple[int, int], Any]) -> PairExponents:
        """Complete the exponents given among z_1 = 0, z_2, ..., z_{n-1} = 1 (missing ones are 0).

        Position n is at infinity and takes what the rows leave over; z_{n-1} - z_1 = 1 in this gauge, so its exponent
        is whatever makes the last row right too.
        """
        table: dict[tuple[int, int], Exact] = {}
        for (i, j), value in finite.items():
            if not 1 <= i < j <= n - 1 or (i, j) == (1, n - 1):
                raise InputError("exponents", f"pair ({i}, {j})", f"1 <= i < j <= {n - 1}, without (1, {n - 1})")
            table[i, j] = read(value, f"exponents ({i}, {j})")[0]
        table[1, n - 1] = -(n - 2) - sum(table.values(), ZERO)
        for i in range(1, n):
            finite_row = sum((value for pair, value in table.items() if i in pair), ZERO)
            table[i, n] = -2 - finite_row
        return cls(n, tuple(table.get(pair, ZERO) for pair in combinations(range(1, n + 1), 2)))

    def at(self, i: int, j: int) -> Exact:
        """A_ij, in either order of the positions."""
        i, j = (i, j) if i < j else (j, i)
        return self.flat[(i - 1) * (2 * self.n - i) // 2 + j - i - 1]

    def divisor(self, first: int, last: int) -> Exact:
        """Y of the consecutive positions first..last: the integrand is t^(Y-1) dt where they collide."""
        inside = sum((self.at(a, b) for a, b in combinations(range(first, last + 1), 2)), ZERO)
        exponent: Exact = inside + (last - first)
        return exponent

    def chords(self) -> Iterator[tuple[tuple[int, ...], Exact]]:
        """All n(n-3)/2 pairs (positions of the channel, Y), each channel by the side that misses position n."""
        for first in range(1, self.n - 1):
            for last in range(first + 1, self.n):
                if (first, last) != (1, self.n - 1):
                    yield tuple(range(first, last + 1)), self.divisor(first, last)

    @property
    def converges(self) -> bool:
        """True when the integral converges absolutely: Re Y > 0 for every chord."""
        return all(value.re > 0 for _, value in self.chords())

    def refuse_poles(self) -> None:
        """Raise PoleError when some chord has Y = 0, -1, -2, ...; ``at`` carries Y itself."""
        for channel, value in self.chords():
            if value.is_integer and value.re <= 0:
                raise PoleError(
                    channel,
                    int(-value.re),
                    value,
                    f"pole at positions {'.'.join(map(str, channel))}: the divisor exponent Y is {value}",
                )

    def image(self, order: Sequence[int]) -> PairExponents:
        """Exponents after moving the point of position order[k-1] to position k."""
        pairs = combinations(range(self.n), 2)
        return PairExponents(self.n, tuple(self.at(order[i], order[j]) for i, j in pairs))

    def dihedral(self) -> Iterator[tuple[tuple[int, ...], PairExponents]]:
        """The 2n (order, image) pairs of the rotations and reflections, the identity first."""
        forward = tuple(range(1, self.n + 1))
        for order in (forward, forward[::-1]):
            for shift in range(self.n):
                turned = order[shift:] + order[:shift]
                yield turned, self.image(turned)
