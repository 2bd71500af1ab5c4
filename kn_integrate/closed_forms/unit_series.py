"""q+1Fq at unit argument, continued in its parameters.

The series sum_k t_k with t_{k+1}/t_k = P(k)/Q(k) converges only where the excess s = sum(b) - sum(a) has Re s > 0.
Its sum is meromorphic in the parameters, and a finite partial sum plus the *formal* remainder has the same
continuation: write the remainder as T(k) = t_k tau(k).  From T(k) - T(k+1) = t_k,

    Q(k) tau(k) - P(k) tau(k+1) = Q(k),

which fixes tau(k) ~ sum_p e_p k^(1-p) order by order (method of undetermined coefficients for a first-order
difference equation, Noerlund 1924; DLMF 2.9).  The coefficient e_p is obtained by dividing by s + p, which is where
the poles of the continuation come from.
"""

from __future__ import annotations

from collections.abc import Sequence
from math import comb

from ..errors import PoleError
from ..exact import ONE, ZERO, Exact
from .gammas import is_pole
from .working import Big, Context, rounded


def _polynomial(ctx: Context, roots: Sequence[Exact]) -> list[Big]:
    """Coefficients of prod (k + root), the leading one first."""
    coefficients = [ctx.one]
    for root in roots:
        x = rounded(ctx, root)
        shifted = [*coefficients, ctx.zero]
        for i, c in enumerate(coefficients):
            shifted[i + 1] += x * c
        coefficients = shifted
    return coefficients


def _remainder(ctx: Context, a: Sequence[Exact], b: Sequence[Exact], excess: Exact, k: int, terms: int) -> Big:
    """tau(k), see the module docstring, to the given number of terms."""
    p = _polynomial(ctx, a)
    q = _polynomial(ctx, [ONE, *b])
    degree = len(a)
    e: list[Big] = []
    f: list[Big] = []  # tau(k+1) = sum_m f[m] k^(1-m)
    x = ctx.mpf(k)
    power, total = x, ctx.zero
    for m in range(1, terms + 1):
        # order k^(degree + 1 - m) of the difference equation; e[m-1] enters with the factor s + m - 1
        known = q[m - 1] if m <= degree + 1 else ctx.zero
        for i in range(2, min(m, degree) + 1):
            known += p[i] * f[m - i] - q[i] * e[m - i]
        # f[m-1] and f[m], both without the unknown e[m-1]
        before = sum((e[j] * _binomial(1 - j, m - 1 - j) for j in range(m - 1)), ctx.zero)
        known += p[1] * before
        known += sum((e[j] * _binomial(1 - j, m - j) for j in range(m - 1)), ctx.zero)
        e.append(known / rounded(ctx, excess + (m - 1)))
        f.append(before + e[m - 1])
        total += e[m - 1] * power
        power /= x
    return total


def _binomial(top: int, k: int) -> int:
    """The binomial coefficient (top choose k) for any integer top.

    >>> _binomial(-2, 3), _binomial(1, 2)
    (-4, 0)
    """
    return comb(top, k) if top >= 0 else (-1) ** k * comb(k - top - 1, k)


def unit_series(ctx: Context, a: Sequence[Exact], b: Sequence[Exact]) -> Big:
    """sum_k prod (a_i)_k / (k! prod Gamma(b_j + k)), continued in the parameters.

    This is q+1Fq(a; b; 1) / prod Gamma(b_j), which has no poles in the b_j (DLMF 16.2.5).

    Parameters
    ----------
    a, b
        q + 1 and q exact parameters.

    Raises
    ------
    PoleError
        When the excess sum(b) - sum(a) is 0, -1, -2, ... and the series does not end by itself.

    Notes
    -----
    Truncation and round-off both fall with the precision of ``ctx``; the caller compares two precisions.
    """
    ends = [int(-x.re) for x in a if is_pole(x)]
    start = max([0, *(int(1 - x.re) for x in b if is_pole(x))])
    if ends and min(ends) < start:
        return ctx.zero
    excess = sum(b, ZERO) - sum(a, ZERO)
    if not ends and is_pole(excess):
        raise PoleError((), int(-excess.re), excess, f"the hypergeometric excess is {excess}: no value at argument 1")
    upper = [rounded(ctx, x) for x in a]
    lower = [rounded(ctx, x) for x in b]
    term = ctx.one
    for x in upper:
        for k in range(start):
            term *= x + k
    for k in range(2, start + 1):
        term /= k
    for x in lower:
        term *= ctx.rgamma(x + start)
    if ends:
        stop = min(ends)
    else:
        stop = start + ctx.dps + int(3 * max(abs(x) for x in [*a, *b])) + 2
    total = ctx.zero
    for k in range(start, stop):
        total += term
        for x in upper:
            term *= x + k
        for x in lower:
            term /= x + k
        term /= k + 1
    if ends:
        return total + term
    return total + term * _remainder(ctx, a, b, excess, stop, int(0.9 * ctx.dps) + 4)
