"""Where an integral has poles in a plane of kinematics, and where it converges."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import Any, TypeAlias

from ..channels import canonical, dotted, read_ordering
from ..errors import InputError
from ..exact import read
from ..integrals import DiskIntegral, SphereIntegral
from ..integrand import Integrand, parse_integrand
from ..kinematics import Mandelstams
from ._style import GREEN, axes, check_target, line_style, png, save
from .divisors import divisors, levels_between

Point: TypeAlias = tuple[Fraction, Fraction]


@dataclass(frozen=True)
class PoleLine:
    """A piece of a line on which the integral may have a pole.

    Attributes
    ----------
    channel : tuple of int
    level : int
    start, stop : pairs of Fraction
        Where it enters and leaves the window, exactly.
    """

    channel: tuple[int, ...]
    level: int
    start: Point
    stop: Point


@dataclass(frozen=True)
class PoleMap:
    """What the figure shows.

    Attributes
    ----------
    axes : pair of channels
    window : ((x low, x high), (y low, y high))
    lines : tuple of PoleLine
    region : tuple of points
        Corners of the part of the window in which the integral converges absolutely; empty where there is none.
    everywhere : tuple of (channel, level)
        Channels that are on a pole in the whole plane.
    """

    axes: tuple[tuple[int, ...], tuple[int, ...]]
    window: tuple[tuple[Fraction, Fraction], tuple[Fraction, Fraction]]
    lines: tuple[PoleLine, ...]
    region: tuple[Point, ...]
    everywhere: tuple[tuple[tuple[int, ...], int], ...]

    def to_dict(self) -> dict[str, Any]:
        """Plain data; exact numbers as text."""
        return {
            "axes": [dotted(channel) for channel in self.axes],
            "window": [[str(end) for end in side] for side in self.window],
            "lines": [
                {
                    "channel": dotted(line.channel),
                    "level": line.level,
                    "start": [str(c) for c in line.start],
                    "stop": [str(c) for c in line.stop],
                }
                for line in self.lines
            ],
            "region": [[str(c) for c in corner] for corner in self.region],
            "everywhere": [{"channel": dotted(channel), "level": level} for channel, level in self.everywhere],
        }

    def draw(self, path: str | Path | None = None) -> Any:
        """The matplotlib figure, written to a .png, .pdf or .svg file where a path is given."""
        if path is not None:
            check_target(path)
        channels = list(dict.fromkeys(line.channel for line in self.lines))
        with axes(4.6, 3.6) as (figure, area):
            if self.region:
                xs, ys = ([float(corner[k]) for corner in self.region] for k in (0, 1))
                area.fill(xs, ys, facecolor=GREEN, alpha=0.15, hatch="//", edgecolor=GREEN, linewidth=0)
                middle = sum(xs) / len(xs), sum(ys) / len(ys)
                area.annotate("converges", middle, ha="center", va="center", fontsize=7)
            for k, channel in enumerate(channels):
                mine = [line for line in self.lines if line.channel == channel]
                for j, line in enumerate(mine):
                    ends = [[float(line.start[c]), float(line.stop[c])] for c in (0, 1)]
                    label = f"channel {dotted(channel)}" if j == 0 else None
                    area.plot(*ends, label=label, linewidth=1.6 if line.level == 0 else 0.8, **line_style(k))
            area.set_xlim(*(float(end) for end in self.window[0]))
            area.set_ylim(*(float(end) for end in self.window[1]))
            area.set_xlabel(f"$X_{{{dotted(self.axes[0])}}}$")
            area.set_ylabel(f"$X_{{{dotted(self.axes[1])}}}$")
            if channels:
                area.legend(loc="center left", bbox_to_anchor=(1.0, 0.5), title="poles (thick: level 0)")
        if path is not None:
            save(figure, path)
        return figure

    def _repr_png_(self) -> bytes:
        return png(self.draw())


def pole_map(
    kin: Mandelstams,
    spec: DiskIntegral | SphereIntegral | Integrand | str,
    x: tuple[Sequence[int], Any, Any],
    y: tuple[Sequence[int], Any, Any],
    ordering: Sequence[int] | None = None,
) -> PoleMap:
    """Poles in the plane in which two planar invariants move and the others stay.

    Parameters
    ----------
    kin
        Real kinematics: the others, and the row sums.
    spec
        The integral; an Integrand or its text means the disk with this ordering.
    x, y
        ``(channel, low, high)``.
    ordering
        In which the channels are planar; that of a disk integral when None.

    Returns
    -------
    PoleMap
        The data, exact; ``.draw(path)`` makes the figure.

    Examples
    --------
    >>> kin = Mandelstams.from_planar(4, {(1, 2): 1, (2, 3): 1})
    >>> found = pole_map(kin, "PT(1,2,3,4)", ((1, 2), "-3/2", 1), ((2, 3), "-1/2", 1))
    >>> [(line.channel, line.level) for line in found.lines]
    [((1, 2), 0), ((1, 2), 1), ((2, 3), 0)]
    """
    if not isinstance(kin, Mandelstams) or not kin.is_real:
        raise InputError(
            "kin", "complex kinematics" if isinstance(kin, Mandelstams) else type(kin).__name__, "real ones"
        )
    if isinstance(spec, str):
        spec = parse_integrand(spec)
    if isinstance(spec, Integrand):
        spec = DiskIntegral(kin.n, spec, ordering)
    order = spec.ordering if ordering is None and isinstance(spec, DiskIntegral) else read_ordering(ordering, kin.n)
    planar = kin.planar(order)
    sides = []
    for name, (labels, low, high) in (("x", x), ("y", y)):
        channel = canonical(tuple(labels), order)
        if channel not in planar:
            raise InputError(name, dotted(tuple(labels)), "a channel of " + ", ".join(map(dotted, planar)))
        ends = [read(end, name)[0] for end in (low, high)]
        if not all(end.is_real for end in ends) or not ends[0] < ends[1]:
            raise InputError(name, f"{low} to {high}", "two real numbers, low < high")
        sides.append((channel, ends[0].re, ends[1].re))
    if sides[0][0] == sides[1][0]:
        raise InputError("y", dotted(sides[1][0]), "another channel than x")
    (first, x0, x1), (second, y0, y1) = sides

    def at(u: Fraction, v: Fraction) -> dict[tuple[int, ...], tuple[Fraction, Fraction]]:
        channels = {**planar, first: u, second: v}
        place = Mandelstams.from_planar(kin.n, channels, order, kin.row_sums, kin.string)
        return {d.channel: (d.pole.re, d.convergence.re) for d in divisors(spec, place)}

    corners = [(x0, y0), (x1, y0), (x1, y1), (x0, y1)]
    values = [at(u, v) for u, v in corners]
    region: list[Point] = corners
    lines, everywhere = [], []
    for channel in values[0]:
        at_corners = [value[channel][0] for value in values]
        levels = levels_between(float(min(at_corners)), float(max(at_corners)))
        for level in levels:
            if len(set(at_corners)) == 1:
                everywhere.append((channel, level))
                continue
            crossing = _crossings(corners, [value + level for value in at_corners])
            if len(crossing) == 2:
                lines.append(PoleLine(channel, level, *crossing))
        height = _affine(corners, [value[channel][1] for value in values])
        region = _where_positive(region, height)
    lines.sort(key=lambda line: (line.channel, line.level))
    return PoleMap((first, second), ((x0, x1), (y0, y1)), tuple(lines), tuple(region), tuple(everywhere))


def _crossings(corners: Sequence[Point], values: Sequence[Fraction]) -> list[Point]:
    """Where a function that is linear on the window vanishes on its border: no point, one corner, or two points."""
    found: list[Point] = []
    for k in range(4):
        (p, a), (q, b) = ((corners[m % 4], values[m % 4]) for m in (k, k + 1))
        if a == 0:
            found.append(p)
        elif a * b < 0:
            t = a / (a - b)
            found.append((p[0] + t * (q[0] - p[0]), p[1] + t * (q[1] - p[1])))
    return list(dict.fromkeys(found))


def _affine(corners: Sequence[Point], values: Sequence[Fraction]) -> Any:
    (x0, y0), (x1, _), (_, y1), _ = corners
    slope_x, slope_y = (values[1] - values[0]) / (x1 - x0), (values[3] - values[0]) / (y1 - y0)
    return lambda p: values[0] + slope_x * (p[0] - x0) + slope_y * (p[1] - y0)


def _where_positive(polygon: Sequence[Point], height: Any) -> list[Point]:
    """The part of a convex polygon on one side of a line (Sutherland and Hodgman, Commun. ACM 17 (1974) 32)."""
    found: list[Point] = []
    for k, p in enumerate(polygon):
        before = polygon[k - 1]
        a, b = height(before), height(p)
        if a * b < 0:
            t = a / (a - b)
            found.append((before[0] + t * (p[0] - before[0]), before[1] + t * (p[1] - before[1])))
        if b > 0 or (b == 0 and a > 0) or (b == 0 and height(polygon[(k + 1) % len(polygon)]) > 0):
            found.append(p)
    return found
