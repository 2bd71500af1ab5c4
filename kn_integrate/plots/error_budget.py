"""What the error of a result is made of, beside what was asked for."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from ..errors import InputError
from ..estimate import Estimate
from ._style import BLACK, BLUE, GREEN, ORANGE, PURPLE, axes, check_target, png, save

PIECES = {"truncation": "truncation", "roundoff": "round-off", "error": "claimed error", "input": "one ulp of input"}
_STYLES = {
    "truncation": {"color": BLUE, "hatch": ""},
    "roundoff": {"color": ORANGE, "hatch": "///"},
    "error": {"color": GREEN, "hatch": "..."},
    "input": {"color": PURPLE, "hatch": "xxx"},
}


@dataclass(frozen=True)
class ErrorBudget:
    """What the figure shows, relative to the modulus of each value.

    Attributes
    ----------
    rows : Mapping[str, Mapping[str, float]]
        By result: those of ``"truncation"``, ``"roundoff"``, ``"error"``, ``"input"`` that are known, and
        ``"tolerance"``.  ``"input"`` is no part of the error: it is what the last bit of the input is worth.
    """

    rows: Mapping[str, Mapping[str, float]]

    def to_dict(self) -> dict[str, Any]:
        """Plain data."""
        return {name: dict(row) for name, row in self.rows.items()}

    def draw(self, path: str | Path | None = None) -> Any:
        """The matplotlib figure, written to a .png, .pdf or .svg file where a path is given."""
        if path is not None:
            check_target(path)
        known = [piece for piece in PIECES if any(row.get(piece, 0) > 0 for row in self.rows.values())]
        width = 0.8 / max(len(known), 1)
        with axes(5.4, 1.2 + 0.6 * len(self.rows)) as (figure, area):
            drawn = [value for row in self.rows.values() for value in row.values() if value > 0]
            left = 10.0 ** math.floor(math.log10(min(drawn, default=1e-16)) - 0.5)
            for k, piece in enumerate(known):
                places = [
                    place + (k + 0.5) * width - 0.4 for place, row in enumerate(self.rows.values()) if row.get(piece)
                ]
                sizes = [row[piece] - left for row in self.rows.values() if row.get(piece)]
                style = {**_STYLES[piece], "edgecolor": "white", "linewidth": 0}
                area.barh(places, sizes, height=0.9 * width, left=left, label=PIECES[piece], **style)
            for place, row in enumerate(self.rows.values()):
                label = "asked for" if place == 0 else None
                area.plot([row["tolerance"]] * 2, [place - 0.45, place + 0.45], color=BLACK, label=label)
            area.set_xscale("log")
            area.set_yticks(range(len(self.rows)), list(self.rows))
            area.invert_yaxis()
            area.set_xlabel("relative to the value")
            area.legend(loc="center left", bbox_to_anchor=(1.0, 0.5))
        if path is not None:
            save(figure, path)
        return figure

    def _repr_png_(self) -> bytes:
        return png(self.draw())


def error_budget(results: Estimate | Mapping[str, Estimate], sensitivity: bool = True) -> ErrorBudget:
    """The pieces of the error of one or several results.

    Parameters
    ----------
    results
        An :class:`~kn_integrate.Estimate`, or several by name.
    sensitivity
        Ask for the sensitivity to the input too, which takes further integrals.

    Raises
    ------
    InputError
        For a value of zero or a result that is not finite: nothing can be relative to it.
    """
    named = {"result": results} if isinstance(results, Estimate) else dict(results)
    if not named:
        raise InputError("results", "none", "at least one Estimate")
    rows = {}
    for name, result in named.items():
        if not isinstance(result, Estimate):
            raise InputError(f"results, {name}", type(result).__name__, "an Estimate")
        size = float(abs(result.value))
        if not (math.isfinite(size) and size > 0 and math.isfinite(float(result.error))):
            raise InputError(f"results, {name}", str(result), "a finite value other than zero")
        row = {
            piece: float(result.details[piece]) / size for piece in ("truncation", "roundoff") if _has(result, piece)
        }
        row["error"] = float(result.error) / size
        row["tolerance"] = max(result.rtol, float(result.atol) / size)
        if sensitivity and math.isfinite(result.input_sensitivity):
            row["input"] = result.input_sensitivity / size
        rows[name] = row
    return ErrorBudget(rows)


def _has(result: Estimate, piece: str) -> bool:
    value = result.details.get(piece)
    return isinstance(value, (int, float)) and math.isfinite(value)
