"""Errors against points and against seconds, rule by rule."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from ._style import axes, check_target, marker_styles, save

Series = tuple[Sequence[int], Sequence[float], Sequence[float]]


def convergence_data(series: Mapping[str, Series]) -> list[dict[str, Any]]:
    """What the figure shows as rows: ``{"name", "evaluations", "seconds", "error"}``."""
    return [
        {"name": name, "evaluations": int(n), "seconds": float(s), "error": float(e)}
        for name, columns in series.items()
        for n, s, e in zip(*columns, strict=True)
    ]


def draw_convergence(series: Mapping[str, Series], path: str | Path | None = None, against: str = "evaluations") -> Any:
    """Draw relative errors on logarithmic axes.

    Parameters
    ----------
    series
        ``{name: (evaluations, seconds, errors)}``.
    path
        A .png, .pdf or .svg file, or None.
    against
        ``"evaluations"`` or ``"seconds"``.

    Returns
    -------
    matplotlib.figure.Figure
    """
    if path is not None:
        check_target(path)
    column = {"evaluations": 0, "seconds": 1}[against]
    with axes(6.0, 3.6) as (figure, area):
        floor = min((e for _, _, errors in series.values() for e in errors if e > 0), default=1e-16)
        for (name, columns), style in zip(series.items(), marker_styles(len(series)), strict=True):
            points = sorted(zip(columns[column], columns[2], strict=True))
            # an error of exactly zero has no place on a logarithmic axis; it stands at the bottom
            area.plot([x for x, _ in points], [max(e, floor) for _, e in points], label=name, **style)
        area.set_xscale("log")
        area.set_yscale("log")
        area.set_xlabel("integrand evaluations" if column == 0 else "seconds")
        area.set_ylabel("relative error")
        if series:
            area.legend(loc="center left", bbox_to_anchor=(1.0, 0.5))
    if path is not None:
        save(figure, path)
    return figure
