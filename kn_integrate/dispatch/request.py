"""What a caller asks of a result: tolerance, digits, method, limits. Validated once, here."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from ..errors import InputError
from ..exact import read, read_integer

DEFAULT_RTOL = 1e-10
MAX_DIGITS = 10_000
RULES = ("radau", "overhang", "ellipse", "disc", "small disc", "contour")


@dataclass(frozen=True)
class Request:
    """A validated request.

    Attributes
    ----------
    rtol, atol : float
        The result is ok when its error is at most ``max(atol, rtol |value|)``.
    digits : int | None
        Decimal digits of the value, None for double precision.
    method : str
    max_points : float | None
        Limit on integrand evaluations.
    threads : int
    rule : str | None
        One family of quadrature rules for every chord; None chooses chord by chord.
    """

    rtol: float
    atol: float
    digits: int | None
    method: str
    max_points: float | None
    threads: int
    rule: str | None = None


def make_request(
    *,
    rtol: Any = None,
    atol: Any = 0,
    digits: Any = None,
    method: Any = "auto",
    max_points: Any = None,
    threads: Any = 1,
    rule: Any = None,
    methods: Sequence[str] = ("auto", "quadrature", "kz"),
) -> Request:
    """Validate a request; ``rtol=None`` means 1e-10 in double precision and ``10^-digits`` with digits.

    Raises
    ------
    InputError
        Naming the argument.

    Examples
    --------
    >>> make_request(digits=30).rtol
    1e-30
    >>> make_request(rtol=0)
    Traceback (most recent call last):
    ...
    kn_integrate.errors.InputError: rtol: found 0; expected a positive number below 1
    """
    if digits is not None:
        digits = read_integer(digits, "digits", "a positive integer or None")
        if not 1 <= digits <= MAX_DIGITS:
            raise InputError("digits", digits, f"between 1 and {MAX_DIGITS}")
    if rtol is None:
        rtol = DEFAULT_RTOL if digits is None else 10.0 ** -min(digits, 300)
    else:
        rtol = _real(rtol, "rtol", "a positive number below 1")
        if not 0 < rtol < 1:
            raise InputError("rtol", _shown(rtol), "a positive number below 1")
    atol = _real(atol, "atol", "a number that is zero or positive")
    if atol < 0:
        raise InputError("atol", _shown(atol), "a number that is zero or positive")
    if method not in methods:
        raise InputError("method", method, "one of " + ", ".join(repr(name) for name in methods))
    if max_points is not None:
        max_points = _real(max_points, "max_points", "a positive number or None")
        if not max_points > 0:
            raise InputError("max_points", _shown(max_points), "a positive number or None")
    threads = read_integer(threads, "threads", "a positive integer")
    if threads < 1:
        raise InputError("threads", threads, "a positive integer")
    if rule is not None:
        if rule not in RULES:
            raise InputError("rule", repr(rule), "one of " + ", ".join(repr(name) for name in RULES))
        if method != "quadrature" or digits is not None:
            raise InputError("rule", repr(rule), "it with method='quadrature' in double precision only")
    return Request(rtol, atol, digits, method, max_points, threads, rule)


def _real(value: Any, field: str, expected: str) -> float:
    try:
        exact = read(value, field)[0]
    except InputError:
        raise InputError(field, value, expected) from None
    if not exact.is_real:
        raise InputError(field, value, expected)
    number = float(exact)
    if not math.isfinite(number):
        raise InputError(field, value, expected)
    return number


def _shown(value: float) -> str:
    return f"{value:g}"
