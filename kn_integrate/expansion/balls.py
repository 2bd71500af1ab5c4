"""Complex numbers with a fixed number of bits after the point and an error bound: integers only.

No global precision is involved, so results are the same bits in any thread, and next to any other library.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

from ..exact import Exact


@dataclass(frozen=True, slots=True)
class Ball:
    """``(re + i im) 2^-bits``, off by less than ``error 2^-bits`` in real and in imaginary part each.

    >>> one = Ball.of(Exact(1), 10)
    >>> (one / 3 * 3 - one).contains_zero()
    True
    """

    re: int
    im: int
    error: int
    bits: int

    @staticmethod
    def of(number: Exact, bits: int) -> Ball:
        """An exact number, rounded down."""
        p, q, d = number.as_ratio()
        return Ball((p << bits) // d, (q << bits) // d, 0 if d == 1 else 1, bits)

    def __add__(self, other: Any) -> Ball:
        if other.__class__ is not Ball:
            return NotImplemented
        return Ball(self.re + other.re, self.im + other.im, self.error + other.error, self.bits)

    def __neg__(self) -> Ball:
        return Ball(-self.re, -self.im, self.error, self.bits)

    def __sub__(self, other: Any) -> Ball:
        return NotImplemented if other.__class__ is not Ball else self + -other

    def __mul__(self, other: Any) -> Ball:
        if other.__class__ is Ball:
            re = (self.re * other.re - self.im * other.im) >> self.bits
            im = (self.re * other.im + self.im * other.re) >> self.bits
            mine, yours = abs(self.re) + abs(self.im), abs(other.re) + abs(other.im)
            spread = mine * other.error + yours * self.error + 2 * self.error * other.error
            return Ball(re, im, (spread >> self.bits) + 2, self.bits)
        p, q, d = (other if other.__class__ is Exact else Exact(other)).as_ratio()
        re, im = (self.re * p - self.im * q) // d, (self.re * q + self.im * p) // d
        return Ball(re, im, -(-self.error * (abs(p) + abs(q)) // d) + (d != 1), self.bits)

    __rmul__ = __mul__

    def __truediv__(self, other: Any) -> Ball:
        inverse: Exact = Exact(1) / other
        return self * inverse

    def times_power_of_two(self, exponent: int) -> Ball:
        """Exactly ``2^exponent`` times the ball: only the place of the point moves."""
        return Ball(self.re, self.im, self.error, self.bits - exponent)

    def contains_zero(self) -> bool:
        """Whether zero is within the error."""
        return abs(self.re) <= self.error and abs(self.im) <= self.error

    @property
    def magnitude(self) -> int:
        """A bound of the modulus, in units of 2^-bits."""
        return abs(self.re) + abs(self.im) + 2 * self.error

    def number(self, digits: int) -> Any:
        """The midpoint as an mpmath number with so many digits, real when the imaginary part is exactly zero."""
        from mpmath import libmp, mp

        precision = int(digits * 3.3219280948873626) + 10
        raw = [libmp.from_man_exp(part, -self.bits, precision) for part in (self.re, self.im)]
        return mp.make_mpc(tuple(raw)) if self.im else mp.make_mpf(raw[0])

    def error_number(self) -> float:
        """The bound on the modulus of the error as a float, rounded up (zero only for exact numbers)."""
        if not self.error:
            return 0.0
        excess = max(0, self.error.bit_length() - 60)
        mantissa = (self.error >> excess) + 1
        exponent = excess - self.bits
        if exponent > 900:
            return math.inf
        return max(1.4142135623730952 * mantissa * 2.0 ** max(exponent, -1100), 5e-324)
