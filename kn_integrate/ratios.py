"""Numbers of every origin as exact ratios of integers: texts, binary floats, multiple-precision numbers, balls.

Every function returns ``(numerator, denominator)`` with a positive denominator, not always in lowest terms, and raises
:class:`InputError` under the caller's name for the input.
"""

from __future__ import annotations

import math
import re
from typing import Any, TypeAlias

from .errors import InputError

Ratio: TypeAlias = tuple[int, int]

EXPECTED = (
    "a finite number: int, Fraction, Decimal, '3/10', '0.37', '0.3+0.2j', float, complex, or an mpmath / flint number"
)
MAX_EXPONENT = 5000  # a decimal exponent beyond this is a slip, and would cost unbounded memory
MAX_BINARY_EXPONENT = 4 * MAX_EXPONENT
MAX_TEXT = 20_000

# Digits are spelled out: \d would let the digits of other scripts in.  Blanks may surround signs and '/', never
# separate digits, so "1 2" is not 12.
_REAL = r"(?:[0-9]+\s*/\s*[0-9]+|(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?)"
_TEXT = re.compile(rf"(?:([+-]?)\s*({_REAL}))?(?:\s*([+-]?)\s*({_REAL})?([ij]))?")


def shown(value: object) -> str:
    """A value for an error message: short, and with its type where that is what is wrong."""
    try:
        text = repr(value)
    except Exception:  # whatever a foreign object does in its repr must not hide the real complaint
        text = "a value"
    text = text if len(text) <= 100 else text[:97] + "..."
    return text if isinstance(value, (str, int, float, complex)) else f"{text} ({type(value).__name__})"


def flint_name(value: Any) -> str:
    """The class name of a flint number, recognised without importing that library; empty for anything else."""
    kind = type(value)
    return kind.__name__ if kind.__module__.partition(".")[0] == "flint" else ""


# --- text -----------------------------------------------------------------------------------------------------------


def ratio_text(p: int, d: int) -> str:
    """``"3/10"``, in lowest terms, or ``"3"``.

    >>> ratio_text(6, 20), ratio_text(-4, 2)
    ('3/10', '-2')
    """
    common = math.gcd(p, d)
    p, d = p // common, d // common
    return _int_text(p) if d == 1 else f"{_int_text(p)}/{_int_text(d)}"


def _int_text(value: int) -> str:
    try:
        return str(value)
    except ValueError:  # Python refuses integers of several thousand digits, a guard for servers
        from flint import fmpz

        return str(fmpz(value))


def _text_int(digits: str) -> int:
    try:
        return int(digits)
    except ValueError:
        from flint import fmpz

        return int(fmpz(digits))


def _text_real(text: str, negative: bool, field: str, whole: str) -> Ratio:
    """The ratio of a matched unsigned real text."""
    top, slash, bottom = text.partition("/")
    if slash:
        p, d = _text_int(top.strip()), _text_int(bottom.strip())
        if not d:
            raise InputError(field, shown(whole), "a denominator that is not zero")
    else:
        digits, _, power = text.lower().partition("e")
        # six characters of exponent are more than enough to see that it is too large
        exponent = 0 if not power else int(power) if len(power) <= 6 else MAX_EXPONENT + 1
        if abs(exponent) > MAX_EXPONENT:
            raise InputError(field, shown(whole), f"a decimal exponent within +-{MAX_EXPONENT}")
        before, _, after = digits.partition(".")
        exponent -= len(after)
        p, d = _text_int(before + after), 1
        if exponent >= 0:
            p *= 10**exponent
        else:
            d = 10**-exponent
    return (-p if negative else p), d


def text_ratios(text: str, field: str) -> tuple[Ratio, Ratio]:
    """Real and imaginary part of ``"3/10"``, ``"0.37"``, ``"1e-6"``, ``"0.3 + 1/2j"``, ``"-j"``, ``"(1+2j)"``.

    >>> text_ratios("0.3-1/2j", "s12")
    ((3, 10), (-1, 2))
    """
    stripped = text.strip() if len(text) <= MAX_TEXT else ""
    if stripped.startswith("(") and stripped.endswith(")"):
        stripped = stripped[1:-1].strip()  # as Python prints its complex numbers
    match = _TEXT.fullmatch(stripped)
    if not stripped or match is None:
        raise InputError(field, shown(text), EXPECTED)
    sign, real, imag_sign, imag, unit = match.groups()
    if real is not None and unit and not imag_sign:
        if imag is not None:  # two numbers and no sign between them: "3 5j", "1.5.5j"
            raise InputError(field, shown(text), EXPECTED)
        sign, real, imag_sign, imag = "", None, sign, real  # "3j": the digits belong to the imaginary part
    zero = (0, 1)
    return (
        zero if real is None else _text_real(real, sign == "-", field, text),
        zero if not unit else _text_real(imag or "1", imag_sign == "-", field, text),
    )


# --- numbers of other libraries -------------------------------------------------------------------------------------


def _binary(sign: int, mantissa: int, exponent: int, field: str, found: object) -> Ratio:
    if not -MAX_BINARY_EXPONENT <= exponent <= MAX_BINARY_EXPONENT:
        raise InputError(field, shown(found), f"a binary exponent within +-{MAX_BINARY_EXPONENT}")
    mantissa = -int(mantissa) if sign else int(mantissa)
    return (mantissa << exponent, 1) if exponent >= 0 else (mantissa, 1 << -exponent)


def mpf_ratio(raw: tuple[Any, ...], field: str, found: object) -> Ratio:
    """Of the raw (sign, mantissa, exponent, bits) inside an mpmath number."""
    sign, mantissa, exponent, _bits = raw
    if not mantissa and exponent:
        raise InputError(field, shown(found), EXPECTED)  # infinities and nan
    return _binary(int(sign), int(mantissa), int(exponent), field, found)


def ball_ratio(ball: Any, field: str, found: object) -> Ratio:
    """Of a real flint ball that has no radius."""
    if not ball.is_exact() or not ball.is_finite():
        raise InputError(field, shown(found), "an exact finite ball (radius zero)")
    mantissa, exponent = ball.man_exp()
    return _binary(0, int(mantissa), int(exponent), field, found)


def float_ratio(value: Any, field: str, found: object) -> Ratio:
    """Of any floating-point type that knows its exact ratio; float() would drop digits of the wider ones."""
    try:
        p, d = value.as_integer_ratio()
    except (AttributeError, ValueError, OverflowError):  # no ratio, nan, infinity
        raise InputError(field, shown(found), EXPECTED) from None
    return int(p), int(d)
