"""Readers for what people write on the command line and in job files.

Every reader takes the raw value (text from a flag, or a TOML value) and the name of the input, and returns a checked
value or raises :class:`InputError` under that name.  Text and TOML values mean the same: ``0.37`` is exactly 37/100
whether it stands in quotes or not.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from decimal import Decimal
from typing import Any, TypeAlias

from .errors import InputError
from .exact import Exact, read

Reader: TypeAlias = Callable[[Any, str], Any]
Labels: TypeAlias = tuple[int, ...]

_KEY = "labels joined by dots, such as 1.2"
_ASSIGNMENTS = "label=value pairs such as 1.2=3/10,2.3=2/5"


def shown(value: object) -> str:
    """A raw value for an error message, with its type where the type is what is wrong."""
    text = repr(value) if isinstance(value, (str, int, float)) else f"{value} ({_toml_type(value)})"
    return text if len(text) <= 100 else text[:97] + "..."


def _toml_type(value: object) -> str:
    names = {dict: "a table", list: "an array", Decimal: "a number", bool: "a boolean"}
    return names.get(type(value), type(value).__name__)


def text(value: Any, field: str) -> str:
    """Text that is not empty."""
    if not isinstance(value, str) or not value.strip():
        raise InputError(field, shown(value), "text")
    return value.strip()


def number(value: Any, field: str) -> Exact:
    """An exact complex number."""
    if not isinstance(value, (str, int, Decimal, float)) or isinstance(value, bool):
        raise InputError(field, shown(value), "a number such as 3/10, 0.37 or 0.3+0.2j")
    return read(value, field)[0]


def real(value: Any, field: str) -> float:
    """A real number as a double."""
    exact = number(value, field)
    if not exact.is_real:
        raise InputError(field, shown(value), "a real number")
    try:
        found = float(exact)
    except OverflowError:
        found = 0.0
    if exact and not found:
        raise InputError(field, shown(value), "zero, or a size between 1e-307 and 1e308")
    return found


def count(value: Any, field: str) -> int:
    """A positive integer; ``1e6`` counts as one."""
    expected = "a positive integer"
    if not isinstance(value, (str, int, Decimal)) or isinstance(value, bool):
        raise InputError(field, shown(value), expected)
    try:
        exact = read(value, field)[0]
    except InputError:
        raise InputError(field, shown(value), expected) from None
    if not exact.is_integer or exact.re < 1:
        raise InputError(field, shown(value), expected)
    return int(exact.re)


def choice(*allowed: str) -> Reader:
    """A reader for one of several words."""

    def read_choice(value: Any, field: str) -> str:
        if value not in allowed:
            raise InputError(field, shown(value), "one of " + ", ".join(allowed))
        return str(value)

    return read_choice


def switch(value: Any, field: str) -> bool:
    """True or false."""
    if not isinstance(value, bool):
        raise InputError(field, shown(value), "true or false")
    return value


def labels(value: Any, field: str) -> Labels:
    """Labels in order: ``1,3,2,4`` or a TOML array of integers.

    >>> labels("1,3,2,4", "--ordering")
    (1, 3, 2, 4)
    """
    expected = "labels such as 1,3,2,4"
    if isinstance(value, str):
        return tuple(_label(part, field, expected, value) for part in value.split(","))
    if isinstance(value, list) and value and all(type(item) is int and item >= 1 for item in value):
        return tuple(value)
    raise InputError(field, shown(value), expected)


def channel(value: str, field: str) -> Labels:
    """The labels of one channel: ``1.2.3``."""
    return tuple(_label(part, field, _KEY, value) for part in value.split("."))


def _label(part: str, field: str, expected: str, whole: str) -> int:
    stripped = part.strip()
    if not (stripped.isascii() and stripped.isdigit() and len(stripped) <= 4 and int(stripped) >= 1):
        raise InputError(field, shown(whole), expected)
    return int(stripped)


def values(value: Any, field: str) -> Exact | tuple[Exact, ...]:
    """One number for all labels, or one for each: ``-2``, ``0,0,-2,-2`` or a TOML array."""
    if isinstance(value, str) and "," in value:
        value = value.split(",")
    if isinstance(value, list):
        return tuple(number(item, f"{field}, entry {place}") for place, item in enumerate(value, start=1))
    return number(value, field)


def assignments(value: Any, field: str) -> dict[Labels, Exact]:
    """Numbers by label set: ``1.2=3/10,2.3=2/5`` or a TOML table with keys such as ``"1.2"``.

    >>> assignments("1.2=3/10, 2.3=0.4", "--planar")
    {(1, 2): Exact('3/10'), (2, 3): Exact('2/5')}
    """
    found: dict[Labels, Exact] = {}
    for key, raw in _pairs(value, field):
        name = channel(key, field)
        item = number(raw, f"{field} {key.strip()}")
        if found.setdefault(name, item) != item:
            raise InputError(f"{field} {key.strip()}", f"{found[name]} and {item}", "one value, or the same one again")
    return found


def _pairs(value: Any, field: str) -> Sequence[tuple[str, Any]]:
    if isinstance(value, str):
        pieces = [piece.partition("=") for piece in value.split(",")]
        for key, equals, raw in pieces:
            if not equals or not key.strip() or not raw.strip():
                raise InputError(field, shown(key + equals + raw), _ASSIGNMENTS)
        return [(key, raw) for key, _equals, raw in pieces]
    if isinstance(value, Mapping) and value:
        # An unquoted key 1.2 = 3 is read by TOML as a table in a table; say so instead of calling it a wrong type.
        for key, raw in value.items():
            if isinstance(raw, Mapping):
                raise InputError(field, f"the unquoted key {_dotted(key, raw)}", 'channels in quotes: "1.2" = "3/10"')
        return list(value.items())
    raise InputError(field, shown(value), _ASSIGNMENTS)


def _dotted(key: str, value: Any) -> str:
    while isinstance(value, Mapping) and value:
        step, value = next(iter(value.items()))
        key = f"{key}.{step}"
    return key
