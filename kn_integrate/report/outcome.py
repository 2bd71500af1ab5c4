"""What a command has to show: rows for people, a document for programs, and whether all is well."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from ..errors import PoleError, WorkLimitError
from .plain import plain
from .text import error_text, number_text

if TYPE_CHECKING:
    from ..estimate import Estimate
    from ..gradient import Gradient

_POLE_ADVICE = "the value does not exist on a pole; ask for the residue, or move the point"
_LIMIT_ADVICE = "nothing was computed; raise max_points=, relax rtol=, or use another method="


@dataclass(frozen=True)
class Outcome:
    """The result of a command.

    Attributes
    ----------
    rows : tuple of (name, text)
        For the table.
    document : Mapping
        JSON-ready, without version and timing.
    ok : bool
        Decides the exit code: 0 or 1.
    """

    rows: tuple[tuple[str, str], ...]
    document: Mapping[str, Any] = field(default_factory=dict)
    ok: bool = True


def outcome_of_estimate(estimate: Estimate) -> Outcome:
    """A number: its status and advice are shown where it is not ok."""
    status = [] if estimate.ok else [("status", estimate.status.name), ("advice", estimate.status.advice)]
    rows = (
        ("value", number_text(estimate.value, estimate.digits)),
        ("error", error_text(estimate.error)),
        *status,
        ("method", estimate.method),
        ("evaluations", str(estimate.evaluations)),
    )
    return Outcome(rows, {**estimate.to_dict(), "sources": list(estimate.sources())}, estimate.ok)


def outcome_of_gradient(gradient: Gradient) -> Outcome:
    """A number and its derivatives: fine only when both are."""
    value = outcome_of_estimate(gradient.value)
    status = [] if gradient.ok else [("gradient", gradient.status.name), ("advice", gradient.status.advice)]
    slopes = [
        (f"d/dX_{'.'.join(map(str, channel))}", f"{number_text(number)} +- {error_text(error)}")
        for channel, number, error in gradient
    ]
    document = gradient.to_dict()
    del document["value"]
    ok = value.ok and gradient.ok
    return Outcome((*value.rows, *slopes, *status), {**value.document, "ok": ok, "gradient": document}, ok)


def outcome_of_pole(error: PoleError) -> Outcome:
    """A point at which there is no value."""
    document = {
        "value": None,
        "error": None,
        "ok": False,
        "status": "ON_POLE",
        "advice": _POLE_ADVICE,
        "message": str(error),
        "channel": list(error.channel),
        "level": error.level,
        "at": plain(error.at),
    }
    rows = (
        ("status", "ON_POLE"),
        ("channel", ".".join(str(label) for label in error.channel)),
        ("level", str(error.level)),
        ("at", _cell(plain(error.at))),
        ("advice", _POLE_ADVICE),
    )
    return Outcome(rows, document, ok=False)


def outcome_of_work_limit(error: WorkLimitError) -> Outcome:
    """Work that was refused before it began."""
    advice = error.hint or _LIMIT_ADVICE
    document = {
        "value": None,
        "error": None,
        "ok": False,
        "status": "WORK_LIMIT",
        "advice": advice,
        "message": str(error),
        "predicted": plain(error.predicted),
        "limit": plain(error.limit),
        "unit": error.unit,
    }
    rows = (
        ("status", "WORK_LIMIT"),
        ("predicted", f"{error.predicted:.3g} {error.unit}"),
        ("limit", f"{error.limit:.3g} {error.unit}"),
        ("advice", advice),
    )
    return Outcome(rows, document, ok=False)


def outcome_of_facts(facts: Mapping[str, Any]) -> Outcome:
    """Named facts; a nested mapping becomes rows with dotted names, a list one row for each entry."""
    document = plain(facts)
    return Outcome(tuple(_rows("", document)), document)


def _rows(prefix: str, value: Any) -> list[tuple[str, str]]:
    if isinstance(value, Mapping):
        return [row for key, item in value.items() for row in _rows(f"{prefix}.{key}" if prefix else str(key), item)]
    if isinstance(value, list) and any(isinstance(item, (list, Mapping)) for item in value):
        return [row for place, item in enumerate(value, start=1) for row in _rows(f"{prefix}.{place}", item)]
    return [(prefix, _cell(value))]


def _cell(value: Any) -> str:
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, list):
        return ",".join(_cell(item) for item in value) or "-"
    return "-" if value is None else str(value)


def table(rows: tuple[tuple[str, str], ...]) -> str:
    """Rows as two aligned columns.

    >>> print(table((("value", "0.5"), ("evaluations", "12"))))
    value        0.5
    evaluations  12
    """
    width = max((len(name) for name, _text in rows), default=0)
    return "\n".join(f"{name:<{width}}  {text}".rstrip() for name, text in rows)


def json_text(document: Mapping[str, Any]) -> str:
    """The document as JSON; a NaN in it would be a slip of ours and raises ValueError."""
    return json.dumps(document, indent=2, allow_nan=False)
