"""``kn-integrate plot``: figures of scans, poles and errors, and the data in them."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

from .. import inputs
from ..errors import InputError
from ..jobs import INTEGRAND, KINEMATICS, ORDERING, Field, Job, accuracy, integrand_of, point_of
from ..report.outcome import Outcome, json_text
from ._points import GRID, ON, RIGHT, spec_of
from ._verb import verb

KINDS = ("energy-line", "pole-map", "error-budget", "complex-plane")
KIND = Field("plot", "kind", inputs.choice(*KINDS), "|".join(KINDS), "Which figure.")
STORE = Field("plot", "store", inputs.text, "FILE", "energy-line: the results of a scan.")
AXIS = Field("plot", "axis", inputs.text, "T|1.2", "energy-line: coordinate or channel on the axis [the first].")
PART = Field(
    "plot", "part", inputs.choice("abs", "real", "imag", "phase"), "abs|real|imag|phase", "energy-line: of A [abs]."
)
OUT = Field("plot", "out", inputs.text, "FILE", "The figure: .png, .pdf or .svg.")
DATA = Field("plot", "data", inputs.text, "FILE", "Write what the figure shows as JSON.")
WINDOW = Field(
    "plot", "window", GRID.read, "1.2=A:B:2,..", "pole-map: two channels, each with its first and last value."
)
HELD = Field("plot", "held", inputs.text, "Z[,Z]", "complex-plane: places of z3, z4, ... such as 0.3+0.8j.")
_ACCURACY = tuple(field for field in accuracy("auto", "quadrature", "kz") if field.key != "threads")
_FOR_POINTS = (*KINEMATICS, INTEGRAND, RIGHT, ORDERING, ON, *_ACCURACY)


def _explain(job: Job) -> dict[str, Any]:
    """A figure needs no more than seconds; what it shows is what counts."""
    return {"kind": job.get(KIND), "figure": job.get(OUT), "data": job.get(DATA)}


@verb(KIND, STORE, AXIS, PART, WINDOW, HELD, OUT, DATA, *_FOR_POINTS, explain=_explain)
def plot(job: Job) -> Outcome:
    """A figure, and its data.

    \b
    Examples:
      kn-integrate plot --kind energy-line --store a.sqlite --out a.pdf
      kn-integrate plot --kind pole-map --planar 1.2=1,2.3=1 --window 1.2=-2:1:2,2.3=-2:1:2 \\
        --integrand "PT(1,2,3,4)" --out poles.png
      kn-integrate plot --kind complex-plane --planar 1.2=1/3,2.3=1/5 --integrand "PT(1,2,3,4)" --out plane.png
      kn-integrate plot --kind error-budget --planar 1.2=1/3,2.3=1/5 --integrand "PT(1,2,3,4)" --out errors.svg
    """
    kind = job.get(KIND)
    if kind is None:
        raise InputError(KIND.option, "nothing", "one of " + ", ".join(KINDS))
    out, data = job.get(OUT), job.get(DATA)
    if out is None and data is None:
        raise InputError(OUT.option, "nothing", f"a file for the figure, or {DATA.option} for its data")
    if out is not None:
        from ..plots._style import check_target

        check_target(out)
    _only_with(job, kind)
    figure = {
        "energy-line": _energy_line,
        "pole-map": _pole_map,
        "error-budget": _error_budget,
        "complex-plane": _plane,
    }[kind](job)
    document: Mapping[str, Any] = figure.to_dict()
    files = {"figure": out, "data": data}
    if out is not None:
        figure.draw(out)
    if data is not None:
        try:
            Path(data).write_text(json_text(document) + "\n", encoding="utf-8")
        except OSError as error:
            raise InputError(DATA.option, f"{data}: {error.strerror}", "a file that can be written") from None
    written = {name: path for name, path in files.items() if path is not None}
    return Outcome((("kind", kind), *written.items()), {"kind": kind, **written, "shows": document})


def _only_with(job: Job, kind: str) -> None:
    """Refuse what another kind of figure needs: it would be ignored."""
    wanted = {
        "energy-line": (STORE, AXIS, PART),
        "pole-map": (WINDOW, *KINEMATICS, INTEGRAND, RIGHT, ORDERING, ON),
        "error-budget": (*KINEMATICS, INTEGRAND, ORDERING, *_ACCURACY),
        "complex-plane": (*KINEMATICS, INTEGRAND, RIGHT, HELD),
    }[kind]
    for field in (STORE, AXIS, PART, WINDOW, HELD, *_FOR_POINTS):
        if job.get(field) is not None and field not in wanted:
            raise InputError(job.name(field), f"it with --kind {kind}", "only what that figure uses")


def _energy_line(job: Job) -> Any:
    from ..plots.energy_line import energy_line
    from ..scans import open_scan

    if job.get(STORE) is None:
        raise InputError(STORE.option, "nothing", "the results of a scan, such as scan.sqlite")
    scan = open_scan(job.get(STORE))
    axis = job.get(AXIS)
    if axis is not None and axis not in scan.names:
        axis = inputs.channel(axis, job.name(AXIS))
    return energy_line(scan, axis, job.get(PART) or "abs")


def _pole_map(job: Job) -> Any:
    from ..plots.pole_map import pole_map

    window = job.get(WINDOW)
    if window is None or len(window) != 2:
        raise InputError(job.name(WINDOW), "nothing" if window is None else f"{len(window)} channels", "two channels")
    point: Any = point_of(job)
    x, y = ((channel, values[0], values[-1]) for channel, values in window.items())
    return pole_map(point, spec_of(job, point.n), x, y)


def _error_budget(job: Job) -> Any:
    from ..api import disk_integral
    from ..plots.error_budget import error_budget

    point, integrand = point_of(job), integrand_of(job)
    result = disk_integral(point, integrand, ordering=job.get(ORDERING), **job.table("accuracy"))
    return error_budget({result.method: result})


def _plane(job: Job) -> Any:
    from ..plots.complex_plane import complex_plane

    held = [] if job.get(HELD) is None else [part.strip() for part in job.get(HELD).split(",")]
    return complex_plane(point_of(job), integrand_of(job), job.get(RIGHT), held=held)


command = plot
