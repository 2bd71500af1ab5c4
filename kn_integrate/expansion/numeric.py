"""Multiple zeta values as numbers, to any number of digits.

The iterated integral from 0 to 1 is cut at 1/2 (path composition, with t -> 1 - t on the upper half), which leaves
nested sums that converge like 2^-k (the Hoelder convolution; Borwein, Bradley, Broadhurst, Lisonek 2001, "Special
values of multiple polylogarithms"):

    ``zeta(w) = sum over cuts w = u v of Li(u; 1/2) Li(v*; 1/2)``,  v* the reversed word with letters exchanged.

Everything is integers with a fixed number of bits after the point, so a result does not depend on any global precision.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache
from typing import Any

from .balls import Ball
from .reduction import composition_of, word_of
from .zetas import Composition, Product, ZetaSum

# Each rounding is at most one unit.  The outer sum of a polylogarithm has two in each of its `bits` terms, inner ones
# are damped by 2^-k; with at most 13 cuts and products of up to 6 zeta values (each below 1.65), 2^28 units are enough
# for 10^5 bits.
PRODUCT_ERROR = 1 << 28
GUARD = 64


@lru_cache(maxsize=4096)
def _half_polylog(indices: Composition, bits: int) -> int:
    """``sum over 0 < k1 < ... < kr of 2^-kr / prod k_i^n_i`` in units of 2^-bits, rounded down at every step."""
    if not indices:
        return 1 << bits
    sums = [0] * len(indices)  # sums[i]: the inner i + 1 indices, all below the current k
    total = 0
    last = len(indices) - 1
    k = 1
    while k <= bits + len(indices):
        below = sums[last - 1] if last else 1 << bits
        total += (below >> k) // k ** indices[last]
        for i in range(last - 1, -1, -1):
            sums[i] += (sums[i - 1] if i else 1 << bits) // k ** indices[i]
        k += 1
    return total


@lru_cache(maxsize=1024)
def fixed_zeta(indices: Composition, bits: int) -> int:
    """A convergent multiple zeta value in units of 2^-bits; off by less than 2^24 units."""
    word = word_of(indices)
    swap = str.maketrans("01", "10")
    total = 0
    for cut in range(len(word) + 1):
        lower = _half_polylog(composition_of(word[:cut]), bits)
        upper = _half_polylog(composition_of(word[cut:].translate(swap)[::-1]), bits)
        total += (lower * upper) >> bits
    return total


def fixed_product(product: Product, bits: int) -> int:
    """A product of multiple zeta values in units of 2^-bits, off by less than PRODUCT_ERROR units."""
    value = 1 << bits
    for indices in product:
        value = (value * fixed_zeta(indices, bits)) >> bits
    return value


def bits_of(digits: int) -> int:
    """Binary digits of so many decimal ones."""
    return int(digits * 3.3219280948873626) + 2


def ball_of(combination: ZetaSum, bits: int) -> Ball:
    """A combination of multiple zeta values as a number with an error bound."""
    re = im = error = 0
    for product, coefficient in combination.terms:
        fixed = fixed_product(product, bits)
        p, q, d = coefficient.as_ratio()
        re += p * fixed // d
        im += q * fixed // d
        error += (abs(p) + abs(q)) * (PRODUCT_ERROR if product else 0) // d + 1
    return Ball(re, im, error, bits)


def ball_with(digits: int, ball_at: Callable[[int], Ball], tries: int = 4) -> Ball:
    """A ball with so many correct digits: more bits are taken until the error is small beside the number.

    A number that stays within its error of zero comes back from the last try.
    """
    bits = bits_of(digits) + GUARD
    for _ in range(tries):
        ball = ball_at(bits)
        lacking = (ball.error * 10 ** (digits + 1)).bit_length() - max(abs(ball.re), abs(ball.im)).bit_length()
        if not ball.error or lacking <= 0:
            return ball
        bits += max(lacking, 16)
    return ball


def value_of(combination: ZetaSum, digits: int) -> Any:
    """The number that a combination is, as an mpmath number with ``digits`` correct digits."""
    if not combination:
        from mpmath import mp

        return mp.mpf(0)
    return ball_with(digits, lambda bits: ball_of(combination, bits)).number(digits)
