"""Results as plain data that any JSON reader understands without losing a digit.

Real numbers become text (JSON readers cut numbers to doubles), complex ones the pair ``[re, im]``, integers that count
or name something (labels, levels, evaluations) stay integers, a number that is not finite becomes ``None``.
"""

from __future__ import annotations

import enum
import numbers
from collections.abc import Mapping
from fractions import Fraction
from typing import TYPE_CHECKING, Any

from ..exact import Exact
from .text import is_finite, number_text

if TYPE_CHECKING:
    from ..estimate import Estimate


def plain_number(value: Any, digits: int | None = None) -> Any:
    """A real number as text, a complex one as ``[re, im]``, None where it is not finite.

    >>> plain_number(0.1), plain_number(1 + 0j), plain_number(float("nan"))
    ('0.1', ['1.0', '0.0'], None)
    """
    if hasattr(value, "_mpc_") or isinstance(value, complex) or (isinstance(value, Exact) and value.im):
        parts = (value.re, value.im) if isinstance(value, Exact) else (value.real, value.imag)
        return [plain_number(part, digits) for part in parts]
    return number_text(value, digits) if is_finite(value) else None


def plain(value: Any) -> Any:
    """Any of the package's values as nested dicts, lists, text, integers, booleans and None.

    >>> plain({(1, 2): Fraction(3, 10), "status": (True, 1.5, None)})
    {'1.2': '3/10', 'status': [True, '1.5', None]}
    """
    if value is None or isinstance(value, (str, bool)):
        return value
    if isinstance(value, enum.Enum):
        return value.name
    if isinstance(value, numbers.Integral):
        return int(value)
    if isinstance(value, (numbers.Number, Fraction, Exact)) or hasattr(value, "_mpf_") or hasattr(value, "_mpc_"):
        return plain_number(value)
    if isinstance(value, Mapping):
        return {_key(key): plain(item) for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return [plain(item) for item in value]
    if isinstance(value, (set, frozenset)):
        return [plain(item) for item in sorted(value)]
    if hasattr(value, "tolist"):  # numpy arrays and scalars
        return plain(value.tolist())
    return str(value)


def _key(key: Any) -> str:
    if isinstance(key, tuple):
        return ".".join(str(part) for part in key)
    return key.name if isinstance(key, enum.Enum) else str(key)


def estimate_to_dict(estimate: Estimate) -> dict[str, Any]:
    """What :meth:`kn_integrate.Estimate.to_dict` returns."""
    return {
        "value": plain_number(estimate.value, estimate.digits),
        "error": plain_number(estimate.error),
        "ok": estimate.ok,
        "status": estimate.status.name,
        "advice": estimate.status.advice,
        "method": estimate.method,
        "evaluations": int(estimate.evaluations),
        "rtol": plain_number(estimate.rtol),
        "atol": plain_number(estimate.atol),
        "digits": estimate.digits,
        "details": plain(estimate.details),
    }
