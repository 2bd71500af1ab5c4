"""An amplitude along a line of energies, with the resonances it passes marked."""

from __future__ import annotations

import cmath
import math
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from ..channels import dotted
from ..errors import InputError
from ..kinematics import Mandelstams
from ..scans import Scan
from ._style import BLUE, ORANGE, RED, axes, check_target, png, save
from .divisors import divisors, levels_between

PARTS: dict[str, Callable[[Any], float]] = {
    "abs": lambda value: float(abs(value)),
    "real": lambda value: complex(value).real,
    "imag": lambda value: complex(value).imag,
    "phase": lambda value: cmath.phase(complex(value)),
}
_NAMES = {"abs": "|A|", "real": "Re A", "imag": "Im A", "phase": "arg A"}


@dataclass(frozen=True)
class Resonance:
    """A pole that the line passes, or passes beside.

    Attributes
    ----------
    x : float
        Where on the axis.
    channel : tuple of int
    level : int
    distance : float
        Imaginary part of the exponent there: 0 on the pole, the size of i epsilon beside it.
    """

    x: float
    channel: tuple[int, ...]
    level: int
    distance: float


@dataclass(frozen=True)
class EnergyLine:
    """What the figure shows.

    Attributes
    ----------
    axis : str
        The coordinate or channel on the x axis.
    part : str
        ``"abs"``, ``"real"``, ``"imag"`` or ``"phase"``.
    x, y, error : tuple of float
        One entry a point with a value; error bounds the modulus of the amplitude's error.
    not_ok : tuple of float
        x of the points whose value is not as accurate as asked for.
    resonances : tuple of Resonance
    """

    axis: str
    part: str
    x: tuple[float, ...]
    y: tuple[float, ...]
    error: tuple[float, ...]
    not_ok: tuple[float, ...]
    resonances: tuple[Resonance, ...]

    def to_dict(self) -> dict[str, Any]:
        """Plain data."""
        return {
            "axis": self.axis,
            "part": self.part,
            "x": list(self.x),
            "y": list(self.y),
            "error": [error if math.isfinite(error) else None for error in self.error],
            "not_ok": list(self.not_ok),
            "resonances": [
                {"x": r.x, "channel": dotted(r.channel), "level": r.level, "distance": r.distance}
                for r in self.resonances
            ],
        }

    def draw(self, path: str | Path | None = None, log: bool | None = None) -> Any:
        """The matplotlib figure, written to a .png, .pdf or .svg file where a path is given.

        Parameters
        ----------
        path
            File, or None.
        log
            Logarithmic y axis; None: for the modulus, where it spans more than a factor of 30.
        """
        if path is not None:
            check_target(path)
        if log is None:
            sizes = [y for y in self.y if y > 0]
            log = self.part == "abs" and len(sizes) == len(self.y) and max(sizes) > 30 * min(sizes)
        with axes() as (figure, area):
            xs, ys = self._with_gaps()
            area.plot(xs, ys, color=BLUE, marker="." if len(self.x) <= 100 else None, zorder=3)
            for x in self.not_ok:
                area.plot([x], [self.y[self.x.index(x)]], color=RED, marker="x", markersize=7, zorder=4)
            if log:
                area.set_yscale("log")
            self._mark(area)
            area.set_xlabel(f"$X_{{{self.axis}}}$" if self.axis[:1].isdigit() else self.axis)
            area.set_ylabel(_NAMES[self.part])
        if path is not None:
            save(figure, path)
        return figure

    def _with_gaps(self) -> tuple[list[float], list[float]]:
        """The points with gaps: no line is drawn through infinity, nor from one end of the phase to the other."""
        xs, ys = list(self.x[:1]), list(self.y[:1])
        poles = [r.x for r in self.resonances if r.distance == 0]
        for k in range(1, len(self.x)):
            low, high = sorted(self.x[k - 1 : k + 1])
            turned = self.part == "phase" and abs(self.y[k] - self.y[k - 1]) > math.pi
            if turned or any(low <= pole <= high for pole in poles):
                xs.append(math.nan)
                ys.append(math.nan)
            xs.append(self.x[k])
            ys.append(self.y[k])
        return xs, ys

    def _mark(self, area: Any) -> None:
        channels = list(dict.fromkeys(r.channel for r in self.resonances))
        heights = {channel: 1.0 + 0.055 * k for k, channel in enumerate(channels)}
        for r in self.resonances:
            area.axvline(r.x, color=ORANGE, linewidth=0.8, linestyle="--", zorder=1)
            area.annotate(
                f"{dotted(r.channel)}:{r.level}",
                (r.x, heights[r.channel]),
                xycoords=("data", "axes fraction"),
                ha="center",
                va="bottom",
                fontsize=6,
            )

    def _repr_png_(self) -> bytes:
        return png(self.draw())


def energy_line(
    scan: Scan, axis: str | Sequence[int] | None = None, part: str = "abs", channels: Iterable[Any] | None = None
) -> EnergyLine:
    """The amplitude along the points of a scan, in their order.

    Parameters
    ----------
    scan
        Of a line, or of one axis.
    axis
        A coordinate of the scan, or the labels of a channel, whose real X is then the x axis; None: the first
        coordinate.
    part
        ``"abs"``, ``"real"``, ``"imag"``, ``"phase"``.
    channels
        Whose resonances are marked; None: all.

    Returns
    -------
    EnergyLine
        The data; ``.draw(path)`` makes the figure.

    Notes
    -----
    Resonances are found from the exponents of the boundary divisors, linear between neighbouring points.  They are
    where the integral may have a pole; the residue can vanish.

    Examples
    --------
    >>> import tempfile, kn_integrate as kn
    >>> a = kn.Mandelstams.from_planar(4, {(1, 2): "-3/2", (2, 3): "1/3"})
    >>> b = kn.Mandelstams.from_planar(4, {(1, 2): "1/2", (2, 3): "1/3"})
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     found = kn.scan(kn.ScanPoints.line(a, b, 10), "PT(1,2,3,4)", store=folder + "/a.sqlite", progress=False)
    >>> [(round(r.x, 10), r.channel, r.level) for r in kn.energy_line(found, (1, 2)).resonances]
    [(-1.0, (1, 2), 1), (0.0, (1, 2), 0)]
    """
    if part not in PARTS:
        raise InputError("part", repr(part), "one of " + ", ".join(PARTS))
    rows = list(scan.rows)
    if len(rows) < 2:
        raise InputError("scan", f"{len(rows)} rows", "at least 2 points")
    places = [row.place for row in rows]
    name, xs = _axis(scan, places, axis)
    wanted = None if channels is None else {tuple(sorted(channel)) for channel in channels}
    resonances = []
    spec = scan.integral
    levels = [{d.channel: d.pole for d in divisors(spec, place)} for place in places]
    for k in range(1, len(rows)):
        for channel, first in levels[k - 1].items():
            last = levels[k].get(channel, first)
            if wanted is not None and channel not in wanted:
                continue
            a, b = float(first.re), float(last.re)
            for level in levels_between(a, b) if a != b else []:
                t = (-level - a) / (b - a)
                if t == 0 and k > 1:
                    continue  # the end of the interval before
                distance = float(first.im) + t * float(last.im - first.im)
                resonances.append(Resonance(xs[k - 1] + t * (xs[k] - xs[k - 1]), channel, level, distance))
    found = [(x, row) for x, row in zip(xs, rows, strict=True) if row.value is not None]
    return EnergyLine(
        name,
        part,
        tuple(x for x, _ in found),
        tuple(PARTS[part](row.value) for _, row in found),
        tuple(math.inf if row.error is None else row.error for _, row in found),
        tuple(x for x, row in found if not row.ok),
        tuple(sorted(resonances, key=lambda r: (r.x, r.channel))),
    )


def _axis(scan: Scan, places: Sequence[Any], axis: Any) -> tuple[str, list[float]]:
    if axis is None:
        axis = scan.names[0]
    if isinstance(axis, str):
        if axis in scan.names:
            return axis, [float(_fraction(row.coordinates[axis], axis)) for row in scan.rows]
        raise InputError("axis", repr(axis), f"one of {', '.join(scan.names)}, or a channel such as (1, 2)")
    if not all(isinstance(place, Mandelstams) for place in places):
        raise InputError("axis", repr(axis), f"one of {', '.join(scan.names)}: exponents have no channels")
    labels = tuple(axis)
    return dotted(labels), [float(place.channel(labels).re) for place in places]


def _fraction(text: str, axis: str) -> Any:
    from ..exact import read

    value = read(text, f"coordinate {axis}")[0]
    return value.re
