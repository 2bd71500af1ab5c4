"""Exact complex rational numbers: what every kinematic input becomes.

Ints, fractions, decimal strings, floats and multiple-precision numbers are all rational (a float is its binary
value), so nothing a caller can write down needs rounding before an engine asks for a working precision.
"""

from __future__ import annotations

import math
import numbers
import operator
import sys
from collections.abc import Callable
from decimal import Decimal
from fractions import Fraction
from typing import Any, TypeAlias

from .errors import InputError
from .ratios import (
    EXPECTED,
    MAX_EXPONENT,
    MAX_TEXT,
    Ratio,
    ball_ratio,
    flint_name,
    float_ratio,
    mpf_ratio,
    ratio_text,
    shown,
    text_ratios,
)

Number: TypeAlias = Any  # whatever `read` accepts; see its docstring


class Exact:
    """A complex number with rational real and imaginary parts.

    Immutable and hashable.  Arithmetic with ints, Fractions, Decimals and flint rationals is exact; with a float or
    a complex it gives a float or a complex, with an mpmath number an mpmath number of the current precision.
    Real numbers can be ordered.  ``str`` and the constructor are inverse to each other.

    Parameters
    ----------
    re, im
        Rational numbers; or one text such as ``"3/10-1/2j"``.

    Examples
    --------
    >>> Exact(Fraction(1, 2)) + Exact(Fraction(1, 3), Fraction(1))
    Exact('5/6+1j')
    >>> Exact("3/10") - 0.25, Exact("3/10") < 1
    (0.04999999999999999, True)
    """

    # The value is (p + i q) / d in lowest terms, d > 0.  One common denominator makes sums, the hot path of every
    # engine's set-up, several times faster than a pair of Fractions.
    __slots__ = ("_d", "_p", "_q")
    _p: int
    _q: int
    _d: int

    def __new__(cls, re: Fraction | int | str = 0, im: Fraction | int = 0) -> Exact:
        """Build from rational parts, or from one text."""
        if isinstance(re, str):
            if im != 0:
                raise InputError("number", shown(im), "no second part beside a text")
            return _lowest_of(*text_ratios(re, "number"))
        for part in (re, im):
            if not isinstance(part, (int, Fraction)) or isinstance(part, bool):
                raise InputError("number", shown(part), "int or Fraction parts, or a text such as '3/10-1/2j'")
        return _lowest(
            int(re.numerator) * int(im.denominator),
            int(im.numerator) * int(re.denominator),
            int(re.denominator) * int(im.denominator),
        )

    @classmethod
    def from_ratio(cls, p: int, q: int, d: int) -> Exact:
        """(p + i q) / d, with d > 0; the terms need not be lowest.

        >>> Exact.from_ratio(6, 3, 12)
        Exact('1/2+1/4j')
        """
        return _lowest(p, q, d)

    def as_ratio(self) -> tuple[int, int, int]:
        """The integers (p, q, d) of (p + i q) / d, in lowest terms with d > 0."""
        return self._p, self._q, self._d

    @property
    def re(self) -> Fraction:
        """The real part."""
        return Fraction(self._p, self._d)

    @property
    def im(self) -> Fraction:
        """The imaginary part."""
        return Fraction(self._q, self._d) if self._q else Fraction(0)

    # --- arithmetic -------------------------------------------------------------------------------------------------

    def __add__(self, other: Any) -> Any:
        if other.__class__ is Exact:
            d, e = self._d, other._d
            if d == e:
                if d == 1:
                    return _make(self._p + other._p, self._q + other._q, 1)
                return _lowest(self._p + other._p, self._q + other._q, d)
            return _lowest(self._p * e + other._p * d, self._q * e + other._q * d, d * e)
        if other.__class__ is int:
            return _make(self._p + other * self._d, self._q, self._d)
        return self._mixed(other, operator.add)

    __radd__ = __add__

    def __neg__(self) -> Exact:
        return _make(-self._p, -self._q, self._d)

    def __pos__(self) -> Exact:
        return self

    def __sub__(self, other: Any) -> Any:
        if other.__class__ is Exact:
            d, e = self._d, other._d
            if d == e:
                if d == 1:
                    return _make(self._p - other._p, self._q - other._q, 1)
                return _lowest(self._p - other._p, self._q - other._q, d)
            return _lowest(self._p * e - other._p * d, self._q * e - other._q * d, d * e)
        if other.__class__ is int:
            return _make(self._p - other * self._d, self._q, self._d)
        return self._mixed(other, operator.sub)

    def __rsub__(self, other: Any) -> Any:
        if other.__class__ is int:
            return _make(other * self._d - self._p, -self._q, self._d)
        return self._mixed(other, _reflected(operator.sub))

    def __mul__(self, other: Any) -> Any:
        if other.__class__ is Exact:
            p, q, r, s = self._p, self._q, other._p, other._q
            if not q and not s:
                return _lowest(p * r, 0, self._d * other._d)
            return _lowest(p * r - q * s, p * s + q * r, self._d * other._d)
        if other.__class__ is int:
            return _lowest(self._p * other, self._q * other, self._d)
        return self._mixed(other, operator.mul)

    __rmul__ = __mul__

    def __truediv__(self, other: Any) -> Any:
        if other.__class__ is Exact:
            p, q, r, s = self._p, self._q, other._p, other._q
            norm = r * r + s * s
            if not norm:
                raise ZeroDivisionError("division of an exact number by zero")
            return _lowest((p * r + q * s) * other._d, (q * r - p * s) * other._d, self._d * norm)
        return self._mixed(other, operator.truediv)

    def __rtruediv__(self, other: Any) -> Any:
        return self._mixed(other, _reflected(operator.truediv))

    def __pow__(self, exponent: int) -> Exact:
        """An integer power."""
        if exponent.__class__ is not int:
            return NotImplemented
        if exponent < 0:
            result: Exact = ONE / self
            return result**-exponent
        result, square = ONE, self
        while exponent:
            if exponent & 1:
                result = result * square
            square, exponent = square * square, exponent >> 1
        return result

    def _mixed(self, other: Any, operation: Callable[[Any, Any], Any]) -> Any:
        """An operation with a number of another type: exact where the other number is, rounded where it is not."""
        exact = _as_exact(other)
        if exact is not None:
            return operation(self, exact)
        if _is_machine_number(other):
            return operation(self.value(), other)
        return NotImplemented

    # --- comparison -------------------------------------------------------------------------------------------------

    def __eq__(self, other: object) -> bool:
        if other.__class__ is Exact:
            same: bool = self._p == other._p and self._q == other._q and self._d == other._d
            return same
        if other.__class__ is int:
            return self._d == 1 and not self._q and self._p == other
        exact = _as_exact(other)
        if exact is None and _is_machine_number(other):
            z: Any = other
            try:
                # exactly, as Python compares a float with a Fraction: the value of the float counts, not its digits
                exact = _lowest_of(z.real.as_integer_ratio(), z.imag.as_integer_ratio())
            except (ValueError, OverflowError):
                return False
        return NotImplemented if exact is None else self == exact

    def __hash__(self) -> int:
        # Equal numbers have equal hashes across Python's number types; the mix is the one of Python's complex.
        if not self._q:
            return hash(self._p) if self._d == 1 else hash(self.re)
        width = 1 << sys.hash_info.width
        mixed = (hash(self.re) + sys.hash_info.imag * hash(self.im)) % width
        mixed = mixed - width if mixed >= width >> 1 else mixed
        return -2 if mixed == -1 else mixed

    def _compare(self, other: Any, operation: Callable[[Any, Any], bool]) -> bool:
        exact = _as_exact(other)
        if exact is None and _is_machine_number(other) and isinstance(other, numbers.Real):
            number: Any = other
            try:
                exact = _lowest_of(number.as_integer_ratio(), (0, 1))
            except (ValueError, OverflowError):
                # an infinity or nan: it stands in the same order to every finite number
                exact = None
                if not self._q:
                    return operation(0.0, float(number))
        if exact is None and not _is_machine_number(other):
            unknown: Any = NotImplemented
            return unknown  # type: ignore[no-any-return]
        if exact is None or self._q or exact._q:
            raise TypeError("complex numbers have no order")
        return operation(self._p * exact._d, exact._p * self._d)

    def __lt__(self, other: Any) -> bool:
        return self._compare(other, operator.lt)

    def __le__(self, other: Any) -> bool:
        return self._compare(other, operator.le)

    def __gt__(self, other: Any) -> bool:
        return self._compare(other, operator.gt)

    def __ge__(self, other: Any) -> bool:
        return self._compare(other, operator.ge)

    def __bool__(self) -> bool:
        return bool(self._p or self._q)

    # --- conversion -------------------------------------------------------------------------------------------------

    def __abs__(self) -> float:
        return abs(self.value())

    def __complex__(self) -> complex:
        return complex(self._p / self._d, self._q / self._d)

    def __float__(self) -> float:
        if self._q:
            raise TypeError("a complex number has no float value")
        return self._p / self._d

    def __int__(self) -> int:
        if self._q or self._d != 1:
            raise ValueError(f"{self} is not an integer")  # truncating here would hide a wrong exponent
        return self._p

    def _mpmath_(self, precision: int, rounding: str) -> Any:
        """The conversion that mpmath asks for, rounded once per part."""
        from mpmath import libmp, mp

        parts = tuple(libmp.from_rational(part, self._d, precision, rounding) for part in (self._p, self._q))
        return mp.make_mpc(parts) if self._q else mp.make_mpf(parts[0])

    def conjugate(self) -> Exact:
        """The complex conjugate."""
        return _make(self._p, -self._q, self._d)

    @property
    def is_real(self) -> bool:
        """True when the imaginary part is exactly zero."""
        return not self._q

    @property
    def is_integer(self) -> bool:
        """True for an exact real integer."""
        return self._d == 1 and not self._q

    def value(self) -> float | complex:
        """The nearest double, real where the number is real."""
        if self._q:
            return complex(self._p / self._d, self._q / self._d)
        return self._p / self._d

    def __str__(self) -> str:
        if not self._q:
            return ratio_text(self._p, self._d)
        imag = ratio_text(self._q, self._d) + "j"
        if not self._p:
            return imag
        return f"{ratio_text(self._p, self._d)}{'' if self._q < 0 else '+'}{imag}"

    def __repr__(self) -> str:
        return f"Exact({str(self)!r})"

    def __format__(self, spec: str) -> str:
        return format(self.value(), spec) if spec else str(self)

    def __reduce__(self) -> tuple[Any, ...]:
        return (_make, (self._p, self._q, self._d))


def _make(p: int, q: int, d: int) -> Exact:
    """(p + i q) / d, known to be in lowest terms."""
    number = object.__new__(Exact)
    number._p = p
    number._q = q
    number._d = d
    return number


def _lowest(p: int, q: int, d: int) -> Exact:
    common = math.gcd(p, q, d)
    number = object.__new__(Exact)
    if common == 1:
        number._p, number._q, number._d = p, q, d
    else:
        number._p, number._q, number._d = p // common, q // common, d // common
    return number


def _lowest_of(real: Ratio, imag: Ratio) -> Exact:
    return _lowest(real[0] * imag[1], imag[0] * real[1], real[1] * imag[1])


ZERO = Exact(0)
ONE = Exact(1)


def _reflected(operation: Callable[[Any, Any], Any]) -> Callable[[Any, Any], Any]:
    return lambda right, left: operation(left, right)


def _as_exact(value: Any) -> Any:
    """The exact number of an exact type (never bool or text); None for everything else."""
    if value.__class__ is Exact:
        return value
    if value.__class__ is not bool and isinstance(value, numbers.Rational):
        return _lowest(int(value.numerator), 0, int(value.denominator))
    if isinstance(value, Decimal) and _is_moderate(value):
        p, d = value.as_integer_ratio()
        return _make(p, 0, d)
    number: Any = value
    name = flint_name(value)
    if name == "fmpz":
        return _make(int(value), 0, 1)
    if name == "fmpq":
        return _make(int(number.p), 0, int(number.q))
    return None


def _is_machine_number(value: Any) -> bool:
    """True for the floating-point numbers of Python and numpy, real or complex."""
    if isinstance(value, (float, complex)):
        return True
    if isinstance(value, bool) or hasattr(value, "_mpf_") or hasattr(value, "_mpc_"):
        return False
    return isinstance(value, numbers.Complex)


def _is_moderate(value: Decimal) -> bool:
    # looked at before any conversion: 10 to a huge exponent would fill the memory
    return value.is_finite() and abs(value.adjusted()) <= MAX_EXPONENT and len(value.as_tuple().digits) <= MAX_TEXT


def read(value: Number, field: str) -> tuple[Exact, bool]:
    """Read a number exactly.

    Parameters
    ----------
    value
        int, Fraction, Decimal, text such as ``"3/10"``, ``"0.37"``, ``"1e-6"`` or ``"0.3+0.2j"``, float, complex,
        numpy scalars, mpmath or flint numbers.  Floats count at their binary value, those wider than a double with
        all their digits; balls are read when their radius is zero.  bool is refused.
    field
        The name of the input for the error message.

    Returns
    -------
    (number, rounded)
        ``rounded`` is True when the value came as a floating-point number of any precision, which may carry the
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
    kind = value.__class__
    if kind is Exact:
        return value, False
    if kind is int:
        return _make(value, 0, 1), False
    if isinstance(value, str):
        return _lowest_of(*text_ratios(value, field)), False
    if isinstance(value, float):
        p, d = float_ratio(value, field, value)
        return _make(p, 0, d), True
    if isinstance(value, Decimal) and not _is_moderate(value):
        raise InputError(field, shown(value), f"a finite number with an exponent within +-{MAX_EXPONENT}")
    exact = _as_exact(value)
    if exact is not None:
        return exact, False
    name = flint_name(value)
    if name == "arb":  # before mpmath: balls offer their midpoint under mpmath's attribute
        return _lowest_of(ball_ratio(value, field, value), (0, 1)), True
    if name == "acb":
        return _lowest_of(ball_ratio(value.real, field, value), ball_ratio(value.imag, field, value)), True
    if hasattr(value, "_mpf_"):
        return _lowest_of(mpf_ratio(value._mpf_, field, value), (0, 1)), True
    if hasattr(value, "_mpc_"):
        real, imag = value._mpc_
        return _lowest_of(mpf_ratio(real, field, value), mpf_ratio(imag, field, value)), True
    if isinstance(value, numbers.Complex) and kind is not bool:
        return _lowest_of(float_ratio(value.real, field, value), float_ratio(value.imag, field, value)), True
    raise InputError(field, shown(value), EXPECTED)


def read_integer(value: Any, field: str, expected: str = "an integer") -> int:
    """Read a plain integer (numpy integers included); bool and everything else is an InputError.

    >>> read_integer(3, "n")
    3
    """
    if isinstance(value, bool) or not isinstance(value, numbers.Integral):
        raise InputError(field, shown(value), expected)
    return int(value)
