"""Working precision: private mpmath contexts, and raising the precision until a value has settled.

The global ``mpmath.mp`` is never touched: a caller's precision is their own, also in other threads.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeAlias

import mpmath

from ..errors import InputError, NotAvailableError
from ..exact import Exact

Context: TypeAlias = Any  # an mpmath.MPContext
Big: TypeAlias = Any  # a real or complex number of such a context

_MAX_DIGITS = 5000


def context(digits: int) -> Context:
    """A fresh mpmath context with the given number of decimal digits.

    >>> context(40).dps
    40
    """
    fresh = mpmath.ctx_mp.MPContext()
    fresh.dps = digits
    return fresh


def rounded(ctx: Context, x: Exact) -> Big:
    """The exact number rounded once to the precision of the context; real when it is real."""
    real = ctx.mpf(x.re.numerator) / x.re.denominator
    return real if x.is_real else ctx.mpc(real, ctx.mpf(x.im.numerator) / x.im.denominator)


def ordinary(value: Big) -> Any:
    """The same number, full mantissa, as an ``mpmath.mpf`` or ``mpmath.mpc`` of the global context."""
    if hasattr(value, "_mpc_"):
        return mpmath.mp.make_mpc(value._mpc_)
    return mpmath.mp.make_mpf(value._mpf_)


def settled(evaluate: Callable[[Context], Big], digits: int) -> Any:
    """Evaluate at rising precision until two results in a row agree to ``digits`` and two more.

    Cancellation (deep continuation, a nearby pole or zero) only costs further rounds.  An exact zero must come out
    as zero twice.

    Raises
    ------
    InputError
        ``digits`` outside 1..5000.
    NotAvailableError
        No agreement at 5 digits + 200 digits of working precision: the value cannot be told from zero.
    """
    if isinstance(digits, bool) or not isinstance(digits, int) or not 1 <= digits <= _MAX_DIGITS:
        raise InputError("digits", repr(digits), f"an integer from 1 to {_MAX_DIGITS}")
    working = digits + 12
    last = evaluate(context(working))
    while working < 5 * digits + 200:
        working = working + working // 4 + 12
        ctx = context(working)
        value = evaluate(ctx)
        gap = abs(value - ctx.convert(ordinary(last)))
        if gap <= abs(value) * ctx.mpf(10) ** (-digits - 2):  # NaN compares false: it never settles
            return ordinary(value)
        last = value
    raise NotAvailableError(f"the value does not settle to {digits} digits; it may be zero")
