"""Exact complex rational numbers: what every kinematic input becomes.

Ints, fractions, decimal strings, floats and multiple-precision numbers are all rational (a float is its binary
value), so nothing a caller can write down needs rounding before an engine asks for a working precision.
"""

from __future__ import annotations

import math
import numbers
import re
from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction
from typing import Any, TypeAlias

from .errors import InputError

Number: TypeAlias = Any  # whatever `read` accepts; see its docstring

_EXPECTED = "a finite number: int, Fraction, Decimal, '3/10', '0.37', '0.3+0.2j', float, complex, or an mpmath / flint number"
_MAX_EXPONENT = 5000  # a decimal or binary exponent beyond this is a slip, and would cost unbounded memory
_REAL = r"(?:\d+/\d+|(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)"
_TEXT = re.compile(rf"^(?P<re>[+-]?{_REAL})?(?:(?P<im>[+-]?(?:{_REAL})?)[ij])?$")


@dataclass(frozen=True, slots=True)
class Exact:
    """A complex number with rational real and imaginary parts.

    >>> Exact(Fraction(1, 2)) + Exact(Fraction(1, 3), Fraction(1))
    Exact('5/6+1j')
    """

    re: Fraction
    im: Fraction = Fraction(0)

    def __add__(self, other: Exact | int | Fraction) -> Exact:
        o = _coerce(other)
        return Exact(self.re + o.re, self.im + o.im)

    __radd__ = __add__

    def __neg__(self) -> Exact:
        return Exact(-self.re, -self.im)

    def __sub__(self, other: Exact | int | Fraction) -> Exact:
        o = _coerce(other)
        return Exact(self.re - o.re, self.im - o.im)

    def __rsub__(self, other: int | Fraction) -> Exact:
        return _coerce(other) - self

    def __mul__(self, other: Exact | int | Fraction) -> Exact:
        o = _coerce(other)
        if not self.im and not o.im:
            return Exact(self.re * o.re)
        return Exact(self.re * o.re - self.im * o.im, self.re * o.im + self.im * o.re)

    __rmul__ = __mul__

    def __truediv__(self, other: Exact | int | Fraction) -> Exact:
        o = _coerce(other)
        if not o.im:
            return Exact(self.re / o.re, self.im / o.re)
        norm = o.re * o.re + o.im * o.im
        return self * Exact(o.re / norm, -o.im / norm)

    def __eq__(self, other: object) -> bool:
        if isinstance(other, (int, Fraction)):
            return self.im == 0 and self.re == other
        if isinstance(other, Exact):
            return self.re == other.re and self.im == other.im
        if isinstance(other, (float, complex)):
            z = complex(other)
            return math.isfinite(z.real) and math.isfinite(z.imag) and self.re == z.real and self.im == z.imag
        return NotImplemented

    def __hash__(self) -> int:
        return hash(self.re) if not self.im else hash((self.re, self.im))

    def __bool__(self) -> bool:
        return bool(self.re) or bool(self.im)

    def __abs__(self) -> float:
        return abs(complex(self))

    def __complex__(self) -> complex:
        return complex(float(self.re), float(self.im))

    def __float__(self) -> float:
        if self.im:
            raise TypeError("a complex number has no float value")
        return float(self.re)

    def conjugate(self) -> Exact:
        """The complex conjugate."""
        return Exact(self.re, -self.im)

    @property
    def is_real(self) -> bool:
        """True when the imaginary part is exactly zero."""
        return not self.im

    @property
    def is_integer(self) -> bool:
        """True for an exact real integer."""
        return not self.im and self.re.denominator == 1

    def value(self) -> float | complex:
        """The nearest double, real where the number is real."""
        return complex(self) if self.im else float(self.re)

    def __str__(self) -> str:
        if not self.im:
            return str(self.re)
        imag = f"{self.im}j"
        if not self.re:
            return imag
        return f"{self.re}{'' if imag.startswith('-') else '+'}{imag}"

    def __repr__(self) -> str:
        return f"Exact({str(self)!r})"


ZERO = Exact(Fraction(0))
ONE = Exact(Fraction(1))


def _coerce(value: Exact | int | Fraction) -> Exact:
    if isinstance(value, Exact):
        return value
    if isinstance(value, (int, Fraction)) and not isinstance(value, bool):
        return Exact(Fraction(value))
    raise TypeError(f"cannot combine an exact number with {type(value).__name__}")


def _real_text(text: str, field: str, whole: str) -> Fraction:
    exponent = re.search(r"[eE]([+-]?\d+)$", text)
    if exponent and abs(int(exponent.group(1))) > _MAX_EXPONENT:
        raise InputError(field, repr(whole), f"a decimal exponent within +-{_MAX_EXPONENT}")
    try:
        return Fraction(text)
    except (ValueError, ZeroDivisionError):
        raise InputError(field, repr(whole), _EXPECTED) from None


def _from_text(text: str, field: str) -> Exact:
    stripped = text.strip().replace(" ", "")
    match = _TEXT.match(stripped)
    if not stripped or len(stripped) > 4000 or match is None:
        raise InputError(field, repr(text if len(text) <= 60 else text[:57] + "..."), _EXPECTED)
    real_text, imag_text = match.group("re"), match.group("im")
    if real_text is not None and imag_text == "":
        # "3j" is matched as re="3", im="" : the digits belong to the imaginary part
        real_text, imag_text = None, real_text
    elif real_text is not None and imag_text is not None and imag_text[0] not in "+-":
        raise InputError(field, repr(text), _EXPECTED)
    if imag_text in ("+", "-", ""):
        imag_text += "1"
    real = Fraction(0) if real_text is None else _real_text(real_text, field, text)
    imag = Fraction(0) if imag_text is None else _real_text(imag_text, field, text)
    return Exact(real, imag)


def _from_binary(sign: int, mantissa: int, exponent: int, field: str, found: object) -> Fraction:
    if abs(exponent) > 4 * _MAX_EXPONENT:
        raise InputError(field, repr(found), f"a binary exponent within +-{4 * _MAX_EXPONENT}")
    value = Fraction(int(mantissa)) * (Fraction(2) ** int(exponent))
    return -value if sign else value


def _from_float(value: float, field: str, found: object) -> Fraction:
    if not math.isfinite(value):
        raise InputError(field, repr(found), _EXPECTED)
    return Fraction(value)


def _from_library(value: Any, field: str) -> Exact | None:
    """mpmath and flint numbers, recognised by their own attributes so that neither is imported here."""
    if hasattr(value, "_mpf_"):
        sign, mantissa, exponent, bits = value._mpf_
        if not mantissa and exponent:
            raise InputError(field, repr(value), _EXPECTED)  # infinities and nan
        return Exact(_from_binary(sign, mantissa, exponent, field, value))
    if hasattr(value, "_mpc_"):
        parts = []
        for sign, mantissa, exponent, _bits in value._mpc_:
            if not mantissa and exponent:
                raise InputError(field, repr(value), _EXPECTED)
            parts.append(_from_binary(sign, mantissa, exponent, field, value))
        return Exact(parts[0], parts[1])
    if type(value).__module__.split(".")[0] == "flint":
        kind = type(value).__name__
        if kind == "fmpz":
            return Exact(Fraction(int(value)))
        if kind == "fmpq":
            return Exact(Fraction(int(value.p), int(value.q)))
        if kind in ("arb", "acb"):
            if not value.is_exact() or not value.is_finite():
                raise InputError(field, repr(value), "an exact finite ball (radius zero)")
            parts = []
            for part in (value.real, value.imag) if kind == "acb" else (value,):
                mantissa, exponent = part.man_exp()
                parts.append(_from_binary(0, int(mantissa), int(exponent), field, value))
            return Exact(*parts)
    return None


def read(value: Number, field: str) -> tuple[Exact, bool]:
    """Read a number exactly.

    Parameters
    ----------
    value
        int, Fraction, Decimal, text such as ``"3/10"``, ``"0.37"``, ``"1e-6"`` or ``"0.3+0.2j"``, float, complex,
        numpy scalars, mpmath or flint numbers.  Floats count at their binary value.  bool is refused.
    field
        The name of the input for the error message.

    Returns
    -------
    (number, rounded)
        ``rounded`` is True when the value came as a float or multiple-precision number, which may carry the
        rounding error of the caller's own computation.

    Raises
    ------
    InputError
        For anything else, for text that is not a number, and for non-finite values.

    Examples
    --------
    >>> read("0.3-1/2j", "s12")
    (Exact('3/10-1/2j'), False)
    >>> read(0.5, "s12")
    (Exact('1/2'), True)
    """
    if isinstance(value, Exact):
        return value, False
    if isinstance(value, bool) or type(value).__name__ in ("bool_", "bool"):
        raise InputError(field, repr(value), _EXPECTED)
    if isinstance(value, str):
        return _from_text(value, field), False
    if isinstance(value, (int, Fraction)):
        return Exact(Fraction(value)), False
    if isinstance(value, Decimal):
        if not value.is_finite() or abs(int(value.as_tuple().exponent)) > _MAX_EXPONENT:
            raise InputError(field, repr(value), _EXPECTED)
        return Exact(Fraction(value)), False
    library = _from_library(value, field)
    if library is not None:
        return library, type(value).__name__ not in ("fmpz", "fmpq")
    if isinstance(value, numbers.Rational):
        return Exact(Fraction(int(value.numerator), int(value.denominator))), False
    if isinstance(value, numbers.Real):
        return Exact(_from_float(float(value), field, value)), True
    if isinstance(value, numbers.Complex):
        z = complex(value)
        return Exact(_from_float(z.real, field, value), _from_float(z.imag, field, value)), True
    raise InputError(field, f"{value!r} ({type(value).__name__})"[:120], _EXPECTED)


def read_integer(value: Any, field: str, expected: str = "an integer") -> int:
    """Read a plain integer (numpy integers included); bool and everything else is an InputError.

    >>> read_integer(3, "n")
    3
    """
    if isinstance(value, bool) or not isinstance(value, numbers.Integral):
        raise InputError(field, f"{value!r} ({type(value).__name__})", expected)
    return int(value)
