"""A scan as its store tells it: rows, counts, tables for other programs."""

from __future__ import annotations

import csv
import io
import json
import math
from collections import Counter
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cached_property
from html import escape
from pathlib import Path
from typing import Any

from ..errors import InputError, NotAvailableError, Status
from ..integrals import DiskIntegral, SphereIntegral
from ..report.text import number_text
from .points import Place, place_of
from .store import read_store
from .task import canonical, spec_of


@dataclass(frozen=True)
class ScanRow:
    """One finished point.

    Attributes
    ----------
    position : int
        From 1.
    coordinates : Mapping[str, str]
    kinematics : Mapping
        Plain data; :attr:`place` is the object.
    real, imaginary, error_text : str | None
        All digits; no imaginary part means a real number, no real part no number.
    status : str
        A name of :class:`~kn_integrate.Status`, or ``"ON_POLE"``, ``"WORK_LIMIT"``.
    method : str
    evaluations : int
    note : str
    seconds : float
    finished : str
        UTC.
    versions : Mapping[str, str]
    job : str
        Hash of the integral and the options.
    digits : int | None
        That were asked for: the values are multiple-precision numbers then.
    """

    position: int
    coordinates: Mapping[str, str]
    kinematics: Mapping[str, Any]
    real: str | None
    imaginary: str | None
    error_text: str | None
    status: str
    method: str
    evaluations: int
    note: str
    seconds: float
    finished: str
    versions: Mapping[str, str]
    job: str
    digits: int | None = None

    @property
    def ok(self) -> bool:
        """True when the value is as accurate as asked for."""
        return self.status == Status.OK.name

    @property
    def value(self) -> Any:
        """The number: float, complex, or mpmath's; None where there is none."""
        if self.real is None:
            return None
        if self.digits is None:
            return float(self.real) if self.imaginary is None else complex(float(self.real), float(self.imaginary))
        parts = [_read_many(text, self.digits) for text in (self.real, self.imaginary) if text is not None]
        import mpmath

        return mpmath.mp.make_mpf(parts[0]) if self.imaginary is None else mpmath.mp.make_mpc(tuple(parts))

    @property
    def error(self) -> float | None:
        """The bound on the error, infinite where nothing is known; None where there is no number."""
        if self.real is None:
            return None
        return math.inf if self.error_text is None else float(self.error_text)

    @property
    def place(self) -> Place:
        """The kinematic point, or the exponents."""
        return place_of(self.kinematics)

    def to_dict(self) -> dict[str, Any]:
        """Plain data for JSON: numbers as text, ``value`` a text, a pair ``[re, im]``, or None."""
        value = self.real if self.imaginary is None else [self.real, self.imaginary]
        return {
            "position": self.position,
            "coordinates": dict(self.coordinates),
            "value": value,
            "error": self.error_text,
            "status": self.status,
            "method": self.method,
            "evaluations": self.evaluations,
            "note": self.note,
            "seconds": f"{self.seconds:.3g}",
            "kinematics": dict(self.kinematics),
            "finished": self.finished,
            "versions": dict(self.versions),
            "job": self.job,
        }


@dataclass(frozen=True)
class Scan:
    """A scan, finished or not: what is in its store.

    Attributes
    ----------
    path : str
    task : Mapping
        ``{"integral": ..., "options": ...}``.
    total : int
        Points asked for.
    rows : tuple of ScanRow
        The finished ones, by position.
    """

    path: str
    task: Mapping[str, Any]
    total: int
    rows: tuple[ScanRow, ...]

    def __len__(self) -> int:
        return len(self.rows)

    def __iter__(self) -> Iterator[ScanRow]:
        return iter(self.rows)

    @property
    def complete(self) -> bool:
        """True when every point asked for has a row."""
        return len(self.rows) == self.total

    @property
    def ok(self) -> bool:
        """True when it is complete and every value is as accurate as asked for (points on a pole have no value)."""
        return self.complete and all(row.status in (Status.OK.name, "ON_POLE") for row in self.rows)

    @property
    def counts(self) -> dict[str, int]:
        """How many rows have which status."""
        return dict(sorted(Counter(row.status for row in self.rows).items()))

    @property
    def names(self) -> tuple[str, ...]:
        """The names of all coordinates, in order of first use."""
        return tuple(dict.fromkeys(name for row in self.rows for name in row.coordinates))

    @cached_property
    def integral(self) -> DiskIntegral | SphereIntegral | None:
        """What was integrated; None where the points are exponents."""
        data = self.task["integral"]
        return None if data["kind"] == "exponents" else spec_of(canonical(data))

    def to_csv(self, path: str | Path | None = None) -> str:
        """One line a row: coordinates, real, imaginary, error, status, method, evaluations, seconds, note, job.

        Returns the text, and writes it where a path is given.
        """
        target = io.StringIO()
        writer = csv.writer(target, lineterminator="\n")
        writer.writerow(["position", *self.names, *_COLUMNS])
        for row in self.rows:
            fields = (row.real, row.imaginary, row.error_text, row.status, row.method, row.evaluations)
            rest = (f"{row.seconds:.3g}", row.note, row.job)
            cells = ["" if cell is None else cell for cell in (*fields, *rest)]
            writer.writerow([row.position, *(row.coordinates.get(name, "") for name in self.names), *cells])
        return _written(target.getvalue(), path)

    def to_json(self, path: str | Path | None = None) -> str:
        """The task and all rows with their kinematics; returns the text, and writes it where a path is given."""
        document = {
            "task": dict(self.task),
            "total": self.total,
            "rows": [row.to_dict() for row in self.rows],
        }
        return _written(json.dumps(document, indent=1, allow_nan=False) + "\n", path)

    def to_pandas(self) -> Any:
        """A pandas DataFrame: one column a coordinate (as text, exact), value, error, status...

        Raises
        ------
        NotAvailableError
            When pandas is not installed.
        """
        try:
            import pandas
        except ImportError:
            raise NotAvailableError("to_pandas needs pandas, which is not installed: pip install pandas") from None
        columns: dict[str, list[Any]] = {"position": [row.position for row in self.rows]}
        for name in self.names:
            columns[name] = [row.coordinates.get(name) for row in self.rows]
        for name in ("value", "error", "status", "method", "evaluations", "seconds", "note"):
            columns[name] = [getattr(row, name) for row in self.rows]
        return pandas.DataFrame(columns)

    def _repr_html_(self) -> str:
        from ..report.faces import html_table
        from ..report.text import value_with_error

        rows = []
        for row in self.rows[:_SHOWN]:
            value = "" if row.value is None else value_with_error(row.value, row.error, row.digits)
            cells = [*(row.coordinates.get(name, "") for name in self.names), value.replace("+-", "±"), row.status]
            rows.append([escape(cell) for cell in cells])
        more = f"<p>and {len(self.rows) - _SHOWN} more</p>" if len(self.rows) > _SHOWN else ""
        table = html_table([*(escape(name) for name in self.names), "value", "status"], rows)
        return f"<p>{escape(str(self))}</p>{table}{more}"

    def __str__(self) -> str:
        counts = ", ".join(f"{count} {status}" for status, count in self.counts.items())
        return f"{self.path}: {len(self.rows)} of {self.total} points" + (f" ({counts})" if counts else "")

    def __repr__(self) -> str:
        return f"<Scan {self}>"


_SHOWN = 20  # rows in a notebook
_COLUMNS = ("real", "imaginary", "error", "status", "method", "evaluations", "seconds", "note", "job")


def open_scan(path: str | Path) -> Scan:
    """Read the store of a scan, finished or not; also while it is being written.

    Raises
    ------
    InputError
        When there is no such file, or it is no store.
    """
    about, total, found = read_store(path)
    task = json.loads(about["task"])
    digits = task["options"].get("digits")
    rows = []
    for position, _key, coordinates, kinematics, *values, versions, job in found:
        real, imaginary, error, status, method, evaluations, note, seconds, finished = values
        rows.append(
            ScanRow(
                position,
                json.loads(coordinates),
                json.loads(kinematics),
                real,
                imaginary,
                error,
                status,
                method,
                evaluations,
                note,
                seconds,
                finished,
                json.loads(versions),
                job,
                digits,
            )
        )
    return Scan(str(path), task, total, tuple(rows))


def _read_many(text: str, digits: int) -> Any:
    """The multiple-precision number whose text this is, bit for bit.

    The text has two digits more than its mantissa needs, so rounding it to that many bits gives the mantissa back;
    where zeros at its end were dropped the precision is not known, and the first one that gives the text again is it.
    """
    import mpmath

    context = mpmath.MPContext()
    figures = len(text.lower().partition("e")[0].replace("-", "").replace(".", "").strip("0"))
    least = max(int((figures - 2) / _DIGITS_PER_BIT), 8)
    for precision in range(least, least + 64):
        context.prec = precision
        found = context.mpf(text)._mpf_
        if number_text(mpmath.mp.make_mpf(found), digits) == text:
            return found
    context.prec = least + 64  # a text of other origin: nothing of it is lost
    return context.mpf(text)._mpf_


_DIGITS_PER_BIT = 0.30102999566398120


def _written(text: str, path: str | Path | None) -> str:
    if path is not None:
        try:
            Path(path).write_text(text, encoding="utf-8")
        except OSError as error:
            raise InputError(str(path), error.strerror or "an error", "a file that can be written") from None
    return text
