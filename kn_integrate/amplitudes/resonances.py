r"""What is exchanged: residues of the four-tachyon amplitudes as polynomials in the angle, and their partial waves.

At level N the open string has ``alpha' s = N - 1``, where the four-tachyon integral is
``B(-1 - alpha' s, -1 - alpha' t) -> -R_N/(alpha' s - N + 1)``, ``R_N = prod_{k=1..N} (alpha' t + 1 + k)/N!``.  The
closed string has ``alpha' s/4 = N - 1`` and the square of the same with ``alpha' -> alpha'/4``.  With
``t = -(s + 4 m)(1 - x)/2``, x the cosine of the scattering angle and -m the mass square of the tachyon, R_N is a
polynomial in x of degree N (2N): no spin above that is exchanged.  In D dimensions a particle of spin l contributes a
Gegenbauer polynomial ``C_l^((D-3)/2)(x)`` with a coefficient that unitarity wants non-negative.  (Veneziano 1968; the
bound D <= 26 of the no-ghost theorem of Brower 1972 and Goddard and Thorn 1972.)
"""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

from ..errors import InputError
from ..exact import read_integer

Polynomial = tuple[Fraction, ...]  # coefficients of 1, x, x^2, ...


def exchange_residue(level: int, string: str = "open") -> Polynomial:
    """R_N as coefficients of 1, x, x^2, ... in the cosine of the scattering angle, exactly.

    Examples
    --------
    >>> [str(c) for c in exchange_residue(2)]
    ['-1/8', '0', '25/8']
    """
    n = read_integer(level, "level", "an integer, at least 0")
    if n < 0:
        raise InputError("level", n, "an integer, at least 0")
    if string not in ("open", "closed"):
        raise InputError("string", repr(string), "'open' or 'closed'")
    # alpha' t (a quarter of it for closed strings) is -(N + 3)(1 - x)/2 in both cases
    half = Fraction(n + 3, 2)
    result: Polynomial = (Fraction(1),)
    for k in range(1, n + 1):
        result = _times(result, ((1 + k - half) / k, half / k))
    return result if string == "open" else _times(result, result)


def partial_waves(polynomial: Sequence[Fraction | int], dimension: int) -> Polynomial:
    """The coefficients of spins 0, 1, 2, ... of a polynomial in the cosine of the angle, in D dimensions.

    Parameters
    ----------
    polynomial
        Coefficients of 1, x, x^2, ...
    dimension
        D, at least 4.

    Returns
    -------
    tuple of Fraction
        c_l of ``sum_l c_l G_l(x)`` with the Gegenbauer polynomials normalised to ``G_l(1) = 1``.

    Examples
    --------
    >>> [str(c) for c in partial_waves(exchange_residue(2), 26)]
    ['0', '0', '3']
    """
    d = read_integer(dimension, "dimension", "an integer, at least 4")
    if d < 4:
        raise InputError("dimension", d, "an integer, at least 4")
    rest = [Fraction(c) for c in polynomial]
    found = [Fraction(0)] * len(rest)
    basis = _zonal(len(rest), d)
    for spin in range(len(rest) - 1, -1, -1):
        c = rest[spin] / basis[spin][spin]
        found[spin] = c
        for power, b in enumerate(basis[spin]):
            rest[power] -= c * b
    return tuple(found)


def _zonal(count: int, d: int) -> list[Polynomial]:
    """``(l + d - 4) G_l = (2 l + d - 5) x G_(l-1) - (l - 1) G_(l-2)``, which keeps ``G_l(1) = 1``."""
    found: list[Polynomial] = [(Fraction(1),), (Fraction(0), Fraction(1))]
    for spin in range(2, count):
        ahead = _times(found[-1], (Fraction(0), Fraction(2 * spin + d - 5)))
        behind = [(spin - 1) * c for c in found[-2]] + [Fraction(0)] * 2
        found.append(tuple((a - b) / (spin + d - 4) for a, b in zip(ahead, behind, strict=True)))
    return found[:count]


def _times(a: Polynomial, b: Polynomial) -> Polynomial:
    result = [Fraction(0)] * (len(a) + len(b) - 1)
    for i, x in enumerate(a):
        for j, y in enumerate(b):
            result[i + j] += x * y
    return tuple(result)
