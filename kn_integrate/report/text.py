"""Numbers as text: all digits of a value, and a value cut where its error begins.

Everything is done in exact rational and decimal arithmetic, so that no printed digit comes from a rounding of the
printing itself, and multiple-precision numbers need no working precision of anybody's context.
"""

from __future__ import annotations

import math
import numbers
from decimal import MAX_EMAX, MIN_EMIN, ROUND_CEILING, ROUND_HALF_EVEN, Context, Decimal
from fractions import Fraction
from typing import Any

from ..exact import Exact

_GUARD = 10  # digits beyond the requested ones, so that the text never limits what was computed
_FIXED_BELOW = 16  # decimal exponents from here on are written as 1.23e+20
_FIXED_ABOVE = -5  # and below here as 1.23e-9


def number_text(value: Any, digits: int | None = None) -> str:
    """All digits of a number, in the form that the package reads back (``0.37``, ``1e-09``, ``0.3+0.2j``).

    Doubles get the shortest text that gives the same double again; multiple-precision numbers their full mantissa
    and never fewer than ``digits``; exact numbers stay fractions.

    >>> number_text(0.1), number_text(0.5 - 2j), number_text(Fraction(1, 3))
    ('0.1', '0.5-2.0j', '1/3')
    """
    real, imag = _parts(value)
    if imag is None:
        return _real_text(real, digits)
    text = _real_text(imag, digits)
    return f"{_real_text(real, digits)}{'' if text[0] == '-' else '+'}{text}j"


def error_text(error: Any) -> str:
    """An error rounded up to one significant digit.

    >>> error_text(3.2e-12), error_text(0.0), error_text(float("inf"))
    ('4e-12', '0', 'inf')
    """
    if not is_finite(error):
        return _real_text(error, None)
    return _digit_text(_one_digit_up(_decimal_error(error)))


def value_with_error(value: Any, error: Any, digits: int | None = None) -> str:
    """The value down to the decimal place of its error, and the error rounded up to one digit.

    The digits cut off are themselves an error, so the printed bound covers them too, unless they are below a
    thousandth of it.

    Parameters
    ----------
    value
        Real or complex, of any type that the package computes with.
    error
        A bound on the modulus of the difference to the truth.
    digits
        The requested decimal digits, which matter where the error is zero or not finite: all digits are printed then.

    Examples
    --------
    >>> value_with_error(25.914922073927123, 3.2e-12)
    '25.914922073927 +- 4e-12'
    >>> value_with_error(1.25 - 0.5j, 1e-3), value_with_error(3.1e-9, 2e-8), value_with_error(1.5, 0.0)
    ('(1.250 - 0.500j) +- 1e-3', '0 +- 3e-8', '1.5 +- 0')
    """
    real, imag = _parts(value)
    parts = [real] if imag is None else [real, imag]
    if error == 0 or not is_finite(error) or not all(is_finite(part) for part in parts):
        return f"{_join([_real_text(part, digits) for part in parts])} +- {error_text(error)}"
    bound = _decimal_error(error)
    exact = [_fraction(part) for part in parts]
    place = _one_digit_up(bound).adjusted()
    while True:
        shown = [_round_to(part, place) for part in exact]
        total = max(_one_digit_up(bound), _one_digit_up(_NEGLIGIBLE.add(bound, _distance(exact, shown))))
        if total.adjusted() <= place:
            total = max(total, Decimal(1).scaleb(place))
            return f"{_join([_placed_text(part, place) for part in shown])} +- {_digit_text(total)}"
        place = total.adjusted()  # 9.6e-5 becomes 1e-4: one place less is known then


def is_finite(value: Any) -> bool:
    """True for a finite real or complex number of any type."""
    real, imag = _parts(value)
    return all(_is_finite_real(part) for part in (real, 0.0 if imag is None else imag))


def _is_finite_real(value: Any) -> bool:
    if hasattr(value, "_mpf_"):
        _sign, mantissa, exponent, _bits = value._mpf_
        return bool(mantissa) or not exponent  # infinities and nan have no mantissa but a marker for exponent
    return isinstance(value, (int, Fraction)) or math.isfinite(value)


def _parts(value: Any) -> tuple[Any, Any]:
    """Real and imaginary part; None for the latter of a number of a real type."""
    if isinstance(value, Exact):
        return value.re, value.im if value.im else None
    if hasattr(value, "_mpf_") or isinstance(value, Fraction):
        return value, None
    if hasattr(value, "_mpc_"):
        return value.real, value.imag
    if isinstance(value, numbers.Integral):
        return int(value), None
    if isinstance(value, numbers.Real):
        return float(value), None
    number = complex(value)
    return number.real, number.imag


def _real_text(value: Any, digits: int | None) -> str:
    if isinstance(value, (int, Fraction)):
        return str(value)
    if hasattr(value, "_mpf_"):
        _sign, _mantissa, _exponent, bits = value._mpf_
        if not _is_finite_real(value):
            return repr(float(value))
        return _decimal_text(_fraction(value), max((digits or 15) + _GUARD, math.ceil(bits * math.log10(2)) + 2))
    return repr(float(value))


def _fraction(value: Any) -> Fraction:
    if hasattr(value, "_mpf_"):
        sign, mantissa, exponent, _bits = value._mpf_
        size = Fraction(int(mantissa)) * Fraction(2) ** int(exponent)
        return -size if sign else size
    return Fraction(value)


def _context(precision: int, rounding: str) -> Context:
    return Context(prec=precision, rounding=rounding, Emin=MIN_EMIN, Emax=MAX_EMAX, traps=[])


_NEGLIGIBLE = _context(4, ROUND_HALF_EVEN)  # sums in it do not see a term below a thousandth of the other


def _divide(value: Fraction, precision: int, rounding: str) -> Decimal:
    return _context(precision, rounding).divide(Decimal(value.numerator), Decimal(value.denominator))


def _decimal_text(value: Fraction, precision: int) -> str:
    number = _divide(value, precision, ROUND_HALF_EVEN).normalize(_context(precision, ROUND_HALF_EVEN))
    if not _FIXED_ABOVE <= number.adjusted() < precision:
        return format(number, "e")
    text = format(number, "f")
    return text if "." in text else text + ".0"


def _decimal_error(error: Any) -> Decimal:
    """The error as a decimal no smaller than it; a double counts as its shortest text, as people write it."""
    if hasattr(error, "_mpf_") or isinstance(error, Fraction):
        return _divide(_fraction(error), 20, ROUND_CEILING)
    return Decimal(repr(float(error)))


def _one_digit_up(number: Decimal) -> Decimal:
    return _context(1, ROUND_CEILING).plus(number)


def _digit_text(number: Decimal) -> str:
    return format(number, ".0e") if number else "0"


def _round_to(value: Fraction, place: int) -> Fraction:
    unit = Fraction(10) ** place
    return round(value / unit) * unit


def _distance(exact: list[Fraction], shown: list[Fraction]) -> Decimal:
    """Modulus of the difference."""
    square = sum(((a - b) ** 2 for a, b in zip(exact, shown, strict=True)), Fraction(0))
    return _divide(square, 20, ROUND_CEILING).sqrt(_context(20, ROUND_CEILING))


def _placed_text(value: Fraction, place: int) -> str:
    """A multiple of 10**place, with every digit down to that place."""
    if not value:
        return "0"
    number = Decimal(int(value / Fraction(10) ** place)).scaleb(place, _context(10**6, ROUND_HALF_EVEN))
    if place <= 0 and _FIXED_ABOVE <= number.adjusted() < _FIXED_BELOW:
        return format(number, "f")
    return format(number, f".{number.adjusted() - place}e")


def _join(parts: list[str]) -> str:
    if len(parts) == 1:
        return parts[0]
    real, imag = parts
    return f"({real} - {imag[1:]}j)" if imag.startswith("-") else f"({real} + {imag}j)"
