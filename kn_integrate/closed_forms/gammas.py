"""Quotients of Gamma functions at exact arguments."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable

from ..errors import KNError
from ..exact import ONE, Exact
from .working import Big, Context, rounded


class UndefinedError(KNError):
    """A closed form has no value at its parameters: a Gamma function sits on a pole that nothing cancels."""


def is_pole(x: Exact) -> bool:
    """True where Gamma has a pole: 0, -1, -2, ..."""
    return x.is_integer and x.re <= 0


def gamma_quotient(ctx: Context, above: Iterable[Exact], below: Iterable[Exact]) -> Big:
    """prod Gamma(above) / prod Gamma(below); equal arguments cancel before anything is evaluated.

    A pole below gives an exact zero.

    Raises
    ------
    UndefinedError
        When an argument above is 0, -1, -2, ...

    Examples
    --------
    >>> from kn_integrate.closed_forms.working import context
    >>> print(gamma_quotient(context(20), [5 * ONE], [3 * ONE]))
    12.0
    """
    upper, lower = Counter(above), Counter(below)
    common = upper & lower
    upper, lower = upper - common, lower - common
    for x in upper:
        if is_pole(x):
            raise UndefinedError(f"Gamma({x}) in the numerator has no value")
    if any(is_pole(x) for x in lower):
        return ctx.zero
    value = ctx.one
    for x, power in upper.items():
        value *= ctx.gamma(rounded(ctx, x)) ** power
    for x, power in lower.items():
        value *= ctx.rgamma(rounded(ctx, x)) ** power
    return value


def rising(x: Exact, count: int) -> Exact:
    """The Pochhammer symbol (x)_count, exactly.

    >>> rising(2 * ONE, 3)
    Exact('24')
    """
    product = ONE
    for k in range(count):
        product = product * (x + k)
    return product
