"""Recognising a number as a rational combination of multiple zeta values, and how sure one can be.

The integers ``c_0 value + sum c_i z_i = 0`` of smallest size are found by lattice reduction (Lenstra, Lenstra, Lovasz
1982; integer relations from lattices: Hastad, Just, Lagarias, Schnorr 1989).  Any real number has approximate relations
with large integers; what tells a true one is that it uses far fewer digits than the value was known to.  The expected
number of accidental relations with all d + 1 integers up to H in size, at a value known to within e, is below
``(2 H + 1)^(d+1) e / max(1, |value|)``; minus its decimal logarithm is called the margin.  A relation counts as found
when the margin is at least ``MARGIN``; otherwise the number stays a number.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

from ..errors import InputError
from ..exact import ZERO, Exact, read
from ..ratios import shown
from .balls import Ball
from .numeric import GUARD, PRODUCT_ERROR, bits_of, fixed_product
from .zetas import Product, ZetaSum, basis, read_weight

MARGIN = 10.0


@dataclass(frozen=True)
class Recognition:
    """The outcome of a search for a relation.

    Attributes
    ----------
    exact : ZetaSum | None
        The combination; None when there is none with a sufficient margin.
    digits : float
        Decimal digits after the point to which the value was known.
    height : float
        Decimal digits of the largest integer in the relation.
    margin : float
        Minus the decimal logarithm of the expected number of accidental relations of this height.
    """

    exact: ZetaSum | None
    digits: float
    height: float
    margin: float

    @property
    def found(self) -> bool:
        """Whether there is a relation with a sufficient margin."""
        return self.exact is not None

    def __str__(self) -> str:
        if self.exact is None:
            return f"not recognised from {self.digits:.0f} digits"
        return (
            f"{self.exact} (from {self.digits:.0f} digits, integers of up to {self.height:.0f} digits, "
            f"chance of an accident 1e-{self.margin:.0f})"
        )


def recognise(value: Any, weight: int | tuple[int, ...], *, digits: int) -> Recognition:
    """Look for ``value`` as a rational combination of the multiple zeta values of one weight, or of several.

    Parameters
    ----------
    value
        A real or complex number in any notation; all its digits count.
    weight
        0 to 12; weight 0 means a rational number.  Several weights make a longer relation, which takes more digits.
    digits
        The value is right to within ``10^-digits`` (absolutely).

    Raises
    ------
    InputError
        For a bad weight, a number that cannot be read, and digits that are not positive.

    Examples
    --------
    >>> print(recognise("2.40411380631918857079947632302289998153", 3, digits=38))
    2*zeta(3) (from 38 digits, integers of up to 0 digits, chance of an accident 1e-37)
    >>> recognise("0.123456789101112131415161718192021222324", 3, digits=38).found
    False
    """
    number = read(value, "value")[0]
    weights = weight if isinstance(weight, tuple) else (weight,)
    for each in weights:
        read_weight(each)
    if isinstance(digits, bool) or not isinstance(digits, int) or not 1 <= digits <= 100_000:
        raise InputError("digits", shown(digits), "a number of correct digits from 1 to 100000")
    bits = bits_of(digits) + GUARD
    ball = Ball.of(number, bits)
    return recognise_ball(Ball(ball.re, ball.im, ball.error + 10 * (1 << bits) // 10 ** (digits + 1), bits), weights)


def recognise_ball(ball: Ball, weights: Iterable[int]) -> Recognition:
    """Look for a ball's number as a rational combination of the multiple zeta values of some weights."""
    products = tuple(product for weight in dict.fromkeys(weights) for product in basis(weight))
    parts = [_search(part, ball.error, ball.bits, products) for part in ((ball.re, ball.im) if ball.im else (ball.re,))]
    digits = min(part.digits for part in parts)
    height = max(part.height for part in parts)
    margin = min(part.margin for part in parts)
    exact = None
    if all(part.found for part in parts):
        exact = ZetaSum()
        for part, unit in zip(parts, (Exact(1), Exact(0, 1)), strict=False):
            assert part.exact is not None
            exact = exact + part.exact * unit
    return Recognition(exact, digits, height, margin)


def _search(value: int, error: int, bits: int, products: tuple[Product, ...]) -> Recognition:
    """A relation for one real number in units of 2^-bits."""
    from flint import fmpz_mat

    error = max(error, PRODUCT_ERROR)  # the zeta values are not better than that
    drop = error.bit_length()  # digits below the error would only disturb the lattice
    numbers = [value, *(fixed_product(product, bits) for product in products)]
    size = len(numbers)
    lattice = fmpz_mat(size, size + 1)
    for i, number in enumerate(numbers):
        lattice[i, i] = 1
        lattice[i, size] = number >> drop
    digits = (bits - drop) * math.log10(2)
    best = Recognition(None, digits, digits, 0.0)
    for row in lattice.lll().tolist():
        c = [int(entry) for entry in row[:size]]
        if not c[0]:
            continue
        height = max(abs(entry) for entry in c)
        rest = sum(a * b for a, b in zip(c, numbers, strict=True))
        if abs(rest) > abs(c[0]) * error + sum(map(abs, c)) * PRODUCT_ERROR:
            continue
        accidents = size * math.log10(2 * height + 1) - digits - max(0.0, _log10(abs(value)) - bits * math.log10(2))
        if -accidents > max(best.margin, 0.0):
            exact = None
            if -accidents >= MARGIN:
                sign = -1 if c[0] > 0 else 1
                found = {p: Exact.from_ratio(sign * k, 0, abs(c[0])) for p, k in zip(products, c[1:], strict=True)}
                exact = ZetaSum({p: k for p, k in found.items() if k != ZERO})
            best = Recognition(exact, digits, math.log10(height), -accidents)
    return best


def _log10(value: int) -> float:
    return math.log10(value) if value else 0.0
