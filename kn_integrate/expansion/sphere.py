"""Expansions of sphere integrals, from disk integrals through the bilinear relation of Kawai, Lewellen and Tye.

    ``J(f|g) = - sum over r, t of Z_(1,r,n,n-1)(f) S[r|t]/pi^(n-3) Z_(1,t,n-1,n)(g)``

with the momentum kernel ``S[A,j | B,j,C] = sin pi(s_1j + sum_(b in B) s_jb) S[A | B,C]`` (KLT 1986; Bjerrum-Bohr,
Damgaard, Feng, Sondergaard, Vanhove 2010, arXiv:1010.3933).  The sines are expanded exactly, ``pi^2 = 6 zeta(2)``; that
all even zeta values drop out, and odd ones are doubled (the single-valued image of the disk integral), is an outcome
here, not an input.
"""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from itertools import combinations, permutations
from math import factorial
from typing import Any

from ..errors import PoleError
from ..exact import ONE, Exact
from ..integrand import Integrand
from ..kinematics import Mandelstams
from .balls import Ball
from .disk import ZERO_SUM, Engine, disk_series, exact_engine
from .lines import Series, through_zeros
from .zetas import ZETA_ONE, ZetaSum, zeta


def sphere_series(
    kin: Mandelstams,
    f: Integrand,
    g: Integrand,
    weight: int,
    engine: Engine = exact_engine,
    zero: Any = ZERO_SUM,
    zeta2: Any = None,
) -> Series:
    """The coefficients of ``J(f|g)``; number w stands at ``alpha'^(w-(n-3))``.

    Parameters
    ----------
    kin
        Massless kinematics, ``s_ij = (alpha'/2) k_i.k_j``.
    f, g
        Moebius covariant integrands; the coefficients of g are conjugated.
    weight
        The highest weight.
    engine, zero, zeta2
        The engine for disk integrals, and zero and zeta(2) as its numbers.

    Raises
    ------
    PoleError
        When a channel vanishes and the integral has a pole there for every alpha'.
    """
    second = Integrand(type(term)(term.coefficient.conjugate(), term.powers) for term in g.terms)
    z2 = zeta(2) if zeta2 is None else zeta2

    def at(point: Mandelstams) -> Series:
        return _bilinear(point, f, second, weight, engine, zero, z2)

    try:
        return at(kin)
    except (ZeroDivisionError, PoleError):
        pass
    n = kin.n
    channels = [c for size in range(2, n - 1) for c in combinations(range(1, n), size)]
    found = through_zeros(kin, channels, weight, at)
    if found is None:
        channel = next(c for c in channels if not kin.channel(c))
        raise PoleError(channel, 0, kin.channel(channel))
    return found


def _bilinear(
    kin: Mandelstams, f: Integrand, g: Integrand, weight: int, engine: Engine, zero: Any, zeta2: Any
) -> Series:
    n = kin.n
    words = list(permutations(range(2, n - 1)))
    left = {w: disk_series(kin, f, (1, *w, n, n - 1), weight, engine, zero) for w in words}
    right = {w: disk_series(kin, g, (1, *w, n - 1, n), weight, engine, zero) for w in words}
    total: Series = [zero] * (weight + 1)
    for r in words:
        inner: Series = [zero] * (weight + 1)
        for t in words:
            kernel = _kernel(kin, r, t, weight, zero, zeta2)
            inner = [a + b for a, b in zip(inner, _multiplied(kernel, right[t]), strict=True)]
        total = [a - b for a, b in zip(total, _multiplied(left[r], inner), strict=True)]
    return total


def _multiplied(a: Series, b: Series) -> Series:
    return [_sum([a[k] * b[w - k] for k in range(w + 1)]) for w in range(len(a))]


def _sum(values: Sequence[Any]) -> Any:
    total = values[0]
    for value in values[1:]:
        total = total + value
    return total


def _kernel(kin: Mandelstams, r: tuple[int, ...], t: tuple[int, ...], weight: int, zero: Any, zeta2: Any) -> Series:
    one = ZETA_ONE if isinstance(zero, ZetaSum) else Ball.of(ONE, zero.bits)
    series: Series = [one, *[zero] * weight]
    while r:
        j = r[-1]
        place = t.index(j)
        x = sum((kin.pair(j, b) for b in t[:place]), kin.pair(1, j))
        series = _multiplied(series, _sine(x, weight, zero, one, zeta2))
        r, t = r[:-1], t[:place] + t[place + 1 :]
    return series


def _sine(x: Exact, weight: int, zero: Any, one: Any, zeta2: Any) -> Series:
    """``sin(pi x alpha')/(pi alpha')`` by weight."""
    series: Series = [zero] * (weight + 1)
    power, c = one, x
    for k in range(0, weight + 1, 2):
        series[k] = power * (c * Fraction(1, factorial(k + 1)))
        power, c = power * zeta2, c * x * x * -6
    return series


def single_valued(value: ZetaSum) -> ZetaSum:
    """The single-valued image through weight 12 for sums without generators of depth above two.

    ``sv zeta(2) = 0``, ``sv zeta(2k+1) = 2 zeta(2k+1)``, ``sv zeta(3,5) = -10 zeta(3) zeta(5)``,
    ``sv zeta(3,7) = -28 zeta(3) zeta(7) - 12 zeta(5)^2`` (Brown 2013, arXiv:1309.5309; Schnetz 2013, arXiv:1302.6445).

    Raises
    ------
    KeyError
        For zeta(3,3,5), zeta(3,9) and zeta(1,1,4,6).
    """
    z3, z5, z7 = zeta(3), zeta(5), zeta(7)
    images: dict[tuple[int, ...], ZetaSum] = {
        (2,): ZetaSum(),
        (3,): 2 * z3,
        (5,): 2 * z5,
        (7,): 2 * z7,
        (9,): 2 * zeta(9),
        (11,): 2 * zeta(11),
    }
    images |= {(3, 5): -10 * z3 * z5, (3, 7): -28 * z3 * z7 - 12 * z5 * z5}
    total = ZetaSum()
    for product, c in value.terms:
        image = ZetaSum([((), c)])
        for generator in product:
            image = image * images[generator]
        total = total + image
    return total


__all__ = ["single_valued", "sphere_series"]
