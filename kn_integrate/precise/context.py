"""python-flint keeps one working precision for the whole process: this lock sets it and puts it back."""

from __future__ import annotations

import threading
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any

from ..exact import Exact

_LOCK = threading.RLock()


@contextmanager
def flint_precision(bits: int) -> Iterator[None]:
    """Work with this many bits; other threads wait.

    >>> import flint
    >>> with flint_precision(200):
    ...     flint.ctx.prec
    200
    """
    import flint

    with _LOCK:
        before = flint.ctx.prec
        flint.ctx.prec = bits
        try:
            yield
        finally:
            flint.ctx.prec = before


def ball(x: Exact, is_complex: bool) -> Any:
    """An exact number as a flint ball in the current precision."""
    from flint import acb, arb, fmpq

    real = arb(fmpq(x.re.numerator, x.re.denominator))
    if not is_complex:
        return real
    return acb(real, arb(fmpq(x.im.numerator, x.im.denominator)))


def local_context(digits: int) -> Any:
    """An mpmath context of its own with this many digits: nothing a caller sets can change what is computed in it."""
    import mpmath

    ctx = mpmath.MPContext()
    ctx.dps = digits
    return ctx


def handed_out(value: Any) -> Any:
    """A number of a local context as an ordinary mpmath number with all its bits."""
    import mpmath

    if hasattr(value, "_mpf_"):
        return mpmath.mp.make_mpf(value._mpf_)
    return mpmath.mp.make_mpc(value._mpc_)


def as_mpmath(value: Any, bits: int) -> Any:
    """The midpoint of a flint ball as an mpmath number that holds all its bits."""
    import mpmath
    from flint import acb

    def real(x: Any) -> Any:
        mantissa, exponent = x.mid().man_exp()
        return mpmath.mp.make_mpf(mpmath.libmp.from_man_exp(int(mantissa), int(exponent), bits, "n"))

    if isinstance(value, acb):
        re, im = real(value.real), real(value.imag)
        return mpmath.mp.make_mpc((re._mpf_, im._mpf_))
    return real(value)
