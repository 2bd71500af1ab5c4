"""Multiple zeta values as numbers, to any number of digits.

The iterated integral from 0 to 1 is cut at 1/2 (path composition, with t -> 1 - t on the upper half), which leaves nested
sums that converge like 2^-k (Borwein, Bradley, Broadhurst, Lisonek 2001, "Special values of multiple polylogarithms",
the Hoelder convolution):

    ``zeta(w) = sum over cuts w = u v of Li(u; 1/2) Li(v*; 1/2)``,  v* the reversed word with letters exchanged.

Everything is integers with a fixed number of bits after the point, so a result does not depend on any global precision.
"""

from __future__ import annotations

from functools import lru_cache
from typing import Any

from .reduction import composition_of, word_of
from .zetas import Composition, Product, ZetaSum

GUARD = 40  # bits for the accumulated roundings; each of the < 2^20 additions is off by at most one unit


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
    """A convergent multiple zeta value in units of 2^-bits; off by less than 2^(GUARD / 2) units."""
    word = word_of(indices)
    swap = str.maketrans("01", "10")
    total = 0
    for cut in range(len(word) + 1):
        lower = _half_polylog(composition_of(word[:cut]), bits)
        upper = _half_polylog(composition_of(word[cut:].translate(swap)[::-1]), bits)
        total += (lower * upper) >> bits
    return total


def fixed_product(product: Product, bits: int) -> int:
    """A product of multiple zeta values in units of 2^-bits."""
    value = 1 << bits
    for indices in product:
        value = (value * fixed_zeta(indices, bits)) >> bits
    return value


def bits_of(digits: int) -> int:
    """Binary digits of so many decimal ones."""
    return int(digits * 3.3219280948873626) + 2


def value_of(combination: ZetaSum, digits: int) -> Any:
    """The number that a combination is, as an mpmath number; absolute error below 10^-digits of its largest term."""
    from mpmath import libmp, mp

    bits = bits_of(digits) + GUARD
    parts = [0, 0]
    for product, coefficient in combination.terms:
        fixed = fixed_product(product, bits)
        p, q, d = coefficient.as_ratio()
        parts[0] += p * fixed // d
        parts[1] += q * fixed // d
    precision = bits_of(digits)
    raw = [libmp.from_man_exp(part, -bits, precision) for part in parts]
    return mp.make_mpf(raw[0]) if combination.is_real else mp.make_mpc(tuple(raw))
