"""Where a scan computes: grids, lines, random samples and tables of kinematic points, all exact.

Points are made once, in a fixed order, and every point is a full kinematic point with its coordinates as text.  A
random sample gives point k its own generator, seeded with (seed, k): a longer sample begins with the shorter one.
"""

from __future__ import annotations

import csv
import itertools
import json
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction
from pathlib import Path
from typing import Any, TypeAlias

from ..channels import dotted, pair_order
from ..errors import InputError
from ..exact import Exact, read, read_integer
from ..exponents import DiskExponents, SphereExponents
from ..kinematics import Mandelstams

Place: TypeAlias = Mandelstams | DiskExponents | SphereExponents
KINDS = ("planar", "pairs", "chords")
_LONGEST = 10_000_000  # points; beyond this somebody mistyped a count


@dataclass(frozen=True)
class ScanPoint:
    """One place of a scan.

    Attributes
    ----------
    coordinates : Mapping[str, str]
        What tells this point from the others, as text: ``{"t": "1/10"}``, ``{"1.2": "3/10", "2.3": "2/5"}``...
    place : Mandelstams | DiskExponents | SphereExponents
        The kinematic point, or the exponents.
    """

    coordinates: Mapping[str, str]
    place: Place

    @property
    def kinematics(self) -> dict[str, Any]:
        """The place as plain data (exact numbers as text)."""
        found = self.place.to_dict()
        found.pop("shift", None)  # how the input was rounded is no part of the point
        return found


def place_of(data: Mapping[str, Any]) -> Place:
    """The inverse of :attr:`ScanPoint.kinematics`."""
    named = "pairs" if "pairs" in data else "exponents"
    values = {_pair(key): value for key, value in data[named].items()}
    if "left" in data:
        left, right = ({_pair(key): power for key, power in data[side].items()} for side in ("left", "right"))
        return SphereExponents.from_pairs(data["n"], values, left=left, right=right)
    if named == "exponents":
        return DiskExponents.from_pairs(data["n"], values)
    pairs = tuple(read(values[pair], named)[0] for pair in pair_order(data["n"]))
    rows = tuple(read(row, "row_sums")[0] for row in data["row_sums"])
    return Mandelstams(data["n"], pairs, rows, data["string"])


def _pair(key: str) -> tuple[int, int]:
    first, second = key.split(".")
    return int(first), int(second)


@dataclass(frozen=True)
class ScanPoints:
    """The points of a scan, in order.

    Build them with ``line``, ``grid``, ``random``, ``table`` or ``of``.

    Attributes
    ----------
    points : tuple of ScanPoint
    """

    points: tuple[ScanPoint, ...]

    def __len__(self) -> int:
        return len(self.points)

    def __iter__(self) -> Iterator[ScanPoint]:
        return iter(self.points)

    def __getitem__(self, k: int) -> ScanPoint:
        return self.points[k]

    @classmethod
    def of(cls, places: Any) -> ScanPoints:
        """Any sequence of kinematic points (or exponents); their coordinate is their position from 1."""
        if isinstance(places, ScanPoints):
            return places
        if isinstance(places, Place):
            places = [places]
        if isinstance(places, (str, bytes, Mapping)) or not isinstance(places, Iterable):
            raise InputError("points", type(places).__name__, "ScanPoints, or a sequence of kinematic points")
        found = []
        for k, place in enumerate(places, start=1):
            if not isinstance(place, Place):
                raise InputError(f"points, entry {k}", type(place).__name__, "kinematics or exponents")
            found.append(ScanPoint({"point": str(k)}, place))
        return cls(_some(found))

    @classmethod
    def line(cls, start: Mandelstams, stop: Mandelstams, count: int) -> ScanPoints:
        """``count`` equally spaced points from start to stop, both included; the coordinate is ``t`` from 0 to 1.

        Every invariant is linear in t.

        >>> a = Mandelstams.from_planar(4, {(1, 2): 0, (2, 3): "1/2"})
        >>> b = Mandelstams.from_planar(4, {(1, 2): 1, (2, 3): "1/2"})
        >>> [str(point.place.pair(1, 2)) for point in ScanPoints.line(a, b, 3)]
        ['0', '1/2', '1']
        """
        for name, end in (("start", start), ("stop", stop)):
            if not isinstance(end, Mandelstams):
                raise InputError(name, type(end).__name__, "Mandelstams")
        if start.n != stop.n or start.string != stop.string:
            raise InputError(
                "stop", f"n = {stop.n}, string {stop.string}", f"n = {start.n}, string {start.string}, as at the start"
            )
        count = _count(count, 2)
        found = []
        for k in range(count):
            t = Fraction(k, count - 1)
            found.append(ScanPoint({"t": str(t)}, between(start, stop, t)))
        return cls(tuple(found))

    @classmethod
    def grid(
        cls,
        n: int,
        axes: Mapping[Any, Sequence[Any]],
        fixed: Mapping[Any, Any] | None = None,
        *,
        kind: str = "planar",
        ordering: Sequence[int] | None = None,
        row_sums: Any = 0,
        string: str | None = None,
    ) -> ScanPoints:
        """All combinations of values on several axes; the last axis runs fastest.

        Parameters
        ----------
        n
            Number of legs.
        axes
            ``{labels: values}``; :func:`spaced` gives equally spaced exact values.
        fixed
            ``{labels: value}`` for the invariants that stay.
        kind
            Which constructor of :class:`~kn_integrate.Mandelstams` takes them: ``"planar"``, ``"pairs"``, ``"chords"``.
        ordering, row_sums, string
            For that constructor.

        >>> points = ScanPoints.grid(4, {(1, 2): spaced("1/10", "3/10", 3)}, {(2, 3): "1/2"})
        >>> [dict(point.coordinates) for point in points]
        [{'1.2': '1/10'}, {'1.2': '1/5'}, {'1.2': '3/10'}]
        """
        build = _builder(kind, ordering)
        if not isinstance(axes, Mapping) or not axes:
            raise InputError("axes", repr(axes), "{labels: values} with at least one axis")
        columns = []
        for labels, values in axes.items():
            name = f"axis {_name(labels)}"
            if isinstance(values, (str, bytes)) or not isinstance(values, Sequence) or not values:
                raise InputError(name, repr(values), "a sequence of values")
            if labels in (fixed or {}):
                raise InputError(name, "it among the fixed invariants too", "it once")
            columns.append([read(value, name)[0] for value in values])
        total = 1
        for column in columns:
            total *= len(column)
        _count(total, 1)
        found = []
        for values in itertools.product(*columns):
            moving = dict(zip(axes, values, strict=True))
            place = build(n, {**(fixed or {}), **moving}, row_sums=row_sums, string=string)
            found.append(ScanPoint({_name(labels): str(value) for labels, value in moving.items()}, place))
        return cls(tuple(found))

    @classmethod
    def random(
        cls,
        n: int,
        count: int,
        seed: int,
        low: Any = -1,
        high: Any = 1,
        *,
        row_sums: Any = 0,
        ordering: Sequence[int] | None = None,
        string: str | None = None,
    ) -> ScanPoints:
        """``count`` generic points: planar invariants between low and high, exact multiples of 1/1000.

        The coordinate is ``sample``, from 1.  Sample k depends on ``(seed, k)`` only.
        """
        import numpy as np

        seed = read_integer(seed, "seed")
        if seed < 0:
            raise InputError("seed", str(seed), "an integer, at least 0")
        return cls(
            tuple(
                ScanPoint(
                    {"sample": str(k)},
                    Mandelstams.random(
                        n,
                        np.random.default_rng([seed, k]),
                        low,
                        high,
                        row_sums=row_sums,
                        ordering=ordering,
                        string=string,
                    ),
                )
                for k in range(1, _count(count, 1) + 1)
            )
        )

    @classmethod
    def table(
        cls,
        rows: Any,
        n: int,
        fixed: Mapping[Any, Any] | None = None,
        *,
        kind: str = "planar",
        ordering: Sequence[int] | None = None,
        row_sums: Any = 0,
        string: str | None = None,
    ) -> ScanPoints:
        """Points from a table whose columns are labels joined by dots, such as ``1.2``.

        Parameters
        ----------
        rows
            Path of a CSV file with a header line, or of a JSON file with a list of objects; or a list of mappings.  A
            column whose name is not made of digits and dots (``name``, ``comment``) is kept as a coordinate only.
        n, fixed, kind, ordering, row_sums, string
            As for :meth:`grid`.

        Raises
        ------
        InputError
            Names the file and the row.
        """
        build = _builder(kind, ordering)
        source = "table" if not isinstance(rows, (str, Path)) else str(rows)
        found = []
        for k, row in enumerate(_read_table(rows), start=1):
            where = f"{source}, row {k}"
            if not isinstance(row, Mapping):
                raise InputError(where, type(row).__name__, 'an object such as {"1.2": "3/10"}')
            values = {_labels(key): value for key, value in row.items() if _labels(key)}
            try:
                place = build(n, {**(fixed or {}), **values}, row_sums=row_sums, string=string)
            except InputError as error:
                raise InputError(f"{where}: {error.field}", error.found, error.expected) from None
            found.append(ScanPoint({_name(key): str(value) for key, value in row.items()}, place))
        return cls(_some(found))

    def map(self, function: Callable[[Any], Place]) -> ScanPoints:
        """The same coordinates at changed points, such as ``points.map(kn.plus_i_epsilon)``."""
        return ScanPoints(tuple(ScanPoint(p.coordinates, function(p.place)) for p in self.points))

    def __repr__(self) -> str:
        names = ", ".join(self.points[0].coordinates) if self.points else ""
        return f"<ScanPoints: {len(self.points)} points in {names}>"


def between(start: Mandelstams, stop: Mandelstams, t: Any) -> Mandelstams:
    """The point ``(1 - t) start + t stop``."""
    rest = 1 - t
    pairs = tuple(rest * a + t * b for a, b in zip(start.pairs, stop.pairs, strict=True))
    rows = tuple(rest * a + t * b for a, b in zip(start.row_sums, stop.row_sums, strict=True))
    return Mandelstams(start.n, pairs, rows, start.string)


def spaced(start: Any, stop: Any, count: int) -> tuple[Exact, ...]:
    """``count`` equally spaced exact values from start to stop, both included.

    >>> [str(value) for value in spaced("0.1", "0.3", 3)]
    ['1/10', '1/5', '3/10']
    """
    first, last = read(start, "start")[0], read(stop, "stop")[0]
    count = _count(count, 1)
    if count == 1:
        if first != last:
            raise InputError("count", "1", "at least 2 values where start and stop differ")
        return (first,)
    return tuple(first + Fraction(k, count - 1) * (last - first) for k in range(count))


# --- inside ---------------------------------------------------------------------------------------------------------


def _builder(kind: str, ordering: Sequence[int] | None) -> Callable[..., Mandelstams]:
    if kind not in KINDS:
        raise InputError("kind", repr(kind), "one of " + ", ".join(KINDS))
    if ordering is not None and kind != "planar":
        raise InputError("ordering", f"it with kind {kind!r}", "it with kind 'planar' only")
    if kind == "planar":
        return lambda n, values, **options: Mandelstams.from_planar(n, values, ordering=ordering, **options)
    return Mandelstams.from_pairs if kind == "pairs" else Mandelstams.from_chords


def _count(value: Any, least: int) -> int:
    count = read_integer(value, "count")
    if not least <= count <= _LONGEST:
        raise InputError("count", str(count), f"an integer from {least} to {_LONGEST}")
    return count


def _some(found: list[ScanPoint]) -> tuple[ScanPoint, ...]:
    if not found:
        raise InputError("points", "none", "at least one point")
    return tuple(found)


def _name(labels: Any) -> str:
    return labels if isinstance(labels, str) else dotted(labels)


def _labels(key: Any) -> tuple[int, ...] | None:
    """``"1.2"`` and ``(1, 2)`` as labels; None for the name of something else."""
    if isinstance(key, tuple):
        return key
    parts = str(key).strip().split(".")
    return tuple(int(part) for part in parts) if all(p.isascii() and p.isdigit() for p in parts) else None


def _read_table(rows: Any) -> list[Any]:
    if not isinstance(rows, (str, Path)):
        if not isinstance(rows, Iterable) or isinstance(rows, (bytes, Mapping)):
            raise InputError("table", type(rows).__name__, "a path, or a list of mappings")
        return list(rows)
    path = Path(rows)
    try:
        content = path.read_text(encoding="utf-8-sig")
    except (OSError, UnicodeDecodeError) as error:
        reason = error.strerror if isinstance(error, OSError) and error.strerror else "not UTF-8 text"
        raise InputError(str(rows), reason, "a CSV or JSON file that can be read") from None
    if path.suffix.lower() == ".json":
        try:
            data = json.loads(content, parse_float=Decimal)
        except (ValueError, RecursionError) as error:
            raise InputError(str(rows), f"invalid JSON ({error})", "a list of objects") from None
        if not isinstance(data, list):
            raise InputError(str(rows), type(data).__name__, "a list of objects")
        return data
    reader = csv.DictReader(content.splitlines(), skipinitialspace=True, strict=True)
    found = []
    try:
        for k, row in enumerate(reader, start=1):
            if None in row or None in row.values():
                raise InputError(f"{rows}, row {k}", "another number of values than columns", "one value a column")
            found.append(dict(row))
    except csv.Error as error:
        raise InputError(str(rows), f"invalid CSV ({error})", "a CSV file with a header line") from None
    if reader.fieldnames and len(set(reader.fieldnames)) < len(reader.fieldnames):
        raise InputError(str(rows), "a column given twice", "every column once")
    return found
