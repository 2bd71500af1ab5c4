"""What a scan computes at each of its points: an integral, an accuracy, and the record of one evaluation.

A task is plain text and numbers, so that it can be hashed, stored, sent to another process or machine, and mean the
same there.
"""

from __future__ import annotations

import hashlib
import json
import numbers
import time
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from functools import lru_cache
from typing import Any, TypeAlias

from ..errors import InputError, NotAvailableError, PoleError, WorkLimitError
from ..estimate import Estimate
from ..exponents import SphereExponents
from ..integrals import DiskIntegral, SphereIntegral
from ..integrand import Integrand, parse_integrand
from ..kinematics import Mandelstams
from .points import Place, ScanPoint, place_of

Evaluate: TypeAlias = Callable[..., Estimate]
OPTIONS = ("rtol", "atol", "digits", "method", "max_points")

ON_POLE = "ON_POLE"
WORK_LIMIT = "WORK_LIMIT"


@dataclass(frozen=True)
class Task:
    """An integral and how accurately it is wanted.

    Attributes
    ----------
    integral : Mapping
        ``{"kind": "disk", "n", "f", "ordering"}``, ``{"kind": "sphere", "n", "f", "g"}`` or ``{"kind": "exponents"}``.
    options : Mapping
        Those of ``rtol, atol, digits, method, max_points`` that were given.
    """

    integral: Mapping[str, Any]
    options: Mapping[str, Any] = field(default_factory=dict)

    def to_dict(self) -> dict[str, Any]:
        """Plain data; numbers as text."""
        return {"integral": dict(self.integral), "options": {k: _option(k, v) for k, v in self.options.items()}}

    @property
    def text(self) -> str:
        """One canonical JSON text."""
        return canonical(self.to_dict())

    @property
    def hash(self) -> str:
        """SHA-256 of :attr:`text`."""
        return digest(self.to_dict())


def _option(name: str, value: Any) -> int | str:
    """An option as text, the same for the same number of whatever type; digits stay an integer."""
    if isinstance(value, str):
        return value
    if name == "digits":
        return int(value)
    return repr(float(value)) if isinstance(value, numbers.Real) else str(value)


def canonical(data: Any) -> str:
    """JSON with sorted keys and no spaces."""
    return json.dumps(data, sort_keys=True, separators=(",", ":"), ensure_ascii=True, allow_nan=False)


def digest(data: Any) -> str:
    """SHA-256 of the canonical JSON of plain data."""
    return hashlib.sha256(canonical(data).encode("ascii")).hexdigest()


def make_task(points: tuple[ScanPoint, ...], spec: Any, options: Mapping[str, Any]) -> Task:
    """The task of a scan, checked against every point before anything is computed.

    Parameters
    ----------
    points
        Where.
    spec
        :class:`DiskIntegral`, :class:`SphereIntegral`, an Integrand or its text (on the disk, ordering 1..n), or None
        for points that are exponents.
    options
        Of :data:`OPTIONS`; None means not given.

    Raises
    ------
    InputError
        For a specification that cannot be written down, and for a point at which the integral is not covariant.
    """
    given = {key: value for key, value in options.items() if value is not None}
    first = points[0].place
    for k, point in enumerate(points, start=1):
        if type(point.place) is not type(first) or point.place.n != first.n:
            raise InputError(f"points, entry {k}", repr(point.place), f"{type(first).__name__} with n = {first.n}")
    if not isinstance(first, Mandelstams):
        if spec is not None:
            raise InputError("spec", "an integrand together with exponents", "None: the exponents are the integral")
        return Task({"kind": "exponents", "n": first.n}, given)
    if isinstance(spec, str):
        spec = parse_integrand(spec)
    if isinstance(spec, Integrand):
        spec = DiskIntegral(first.n, spec)
    if not isinstance(spec, (DiskIntegral, SphereIntegral)):
        raise InputError("spec", type(spec).__name__, "DiskIntegral, SphereIntegral, Integrand or its text")
    for point in points:
        try:
            spec.terms(point.place)  # type: ignore[arg-type]
        except InputError as error:
            where = ", ".join(f"{name} = {value}" for name, value in point.coordinates.items())
            raise InputError(f"{error.field} at {where}", error.found, error.expected) from None
    kind = "disk" if isinstance(spec, DiskIntegral) else "sphere"
    return Task({"kind": kind, **spec.to_dict()}, given)


@dataclass(frozen=True)
class Record:
    """What became of one point; all numbers as text.

    Attributes
    ----------
    real, imaginary : str | None
        The value; no imaginary part means a real number, no real part no number.
    error : str | None
    status : str
        The name of a :class:`~kn_integrate.Status`, or ``"ON_POLE"``, ``"WORK_LIMIT"``.
    method : str
    evaluations : int
    note : str
        What a pole or a limit had to say.
    seconds : float
    """

    real: str | None
    imaginary: str | None
    error: str | None
    status: str
    method: str
    evaluations: int
    note: str
    seconds: float


def integrate(integral: Mapping[str, Any], place: Place, options: Mapping[str, Any]) -> Estimate:
    """Compute one point with this package's own integrals; the default of :func:`evaluate_point`."""
    spec = None if integral["kind"] == "exponents" else spec_of(canonical(integral))
    if isinstance(place, SphereExponents) or isinstance(spec, SphereIntegral):
        import kn_integrate

        sphere_integral = getattr(kn_integrate, "sphere_integral", None)
        if sphere_integral is None:
            raise NotAvailableError("sphere integrals are not in this version")
        found: Estimate = sphere_integral(place, spec, **options)
        return found
    from ..api import disk_integral

    return disk_integral(place, spec, **options)


@lru_cache(maxsize=64)
def spec_of(text: str) -> DiskIntegral | SphereIntegral:
    """The integral that a task describes, from its JSON text."""
    data = json.loads(text)
    if data["kind"] == "disk":
        return DiskIntegral(data["n"], data["f"], data["ordering"])
    return SphereIntegral(data["n"], data["f"], data["g"])


def evaluate_point(task: Task, kinematics: Mapping[str, Any], evaluate: Evaluate = integrate) -> Record:
    """One point, in whatever process this runs.

    Poles and work limits are results here; bad input and unavailable methods are the same at every point and raise.
    """
    start = time.perf_counter()
    try:
        found = evaluate(task.integral, place_of(kinematics), dict(task.options))
    except PoleError as error:
        return _no_number(ON_POLE, str(error), time.perf_counter() - start)
    except WorkLimitError as error:
        return _no_number(WORK_LIMIT, str(error), time.perf_counter() - start)
    seconds = time.perf_counter() - start
    from ..report.plain import plain_number

    value = plain_number(found.value, found.digits)
    real, imaginary = value if isinstance(value, list) else (value, None)
    if real is None or (isinstance(value, list) and imaginary is None):
        real = imaginary = None  # half a number is none
    error_text = plain_number(found.error)
    return Record(real, imaginary, error_text, found.status.name, found.method, int(found.evaluations), "", seconds)


def takes_pieces(task: Task, evaluate: Evaluate) -> bool:
    """True when several points of a task can be computed in one call: disk integrals in double precision."""
    fit = evaluate is integrate and task.integral["kind"] in ("disk", "exponents")
    options = task.options
    return fit and "digits" not in options and "max_points" not in options and options.get("method", "auto") != "kz"


def evaluate_piece(task: Task, kinematics: Sequence[Mapping[str, Any]]) -> list[Record | None]:
    """What compiled code can do of several points, the same as :func:`evaluate_point` does; None for the others."""
    from ..batch import at_once
    from ..report.plain import plain_number

    start = time.perf_counter()
    places = [place_of(each) for each in kinematics]
    if any(isinstance(place, SphereExponents) for place in places):
        return [None] * len(places)
    spec = None if task.integral["kind"] == "exponents" else spec_of(canonical(task.integral))
    tolerances = {name: task.options[name] for name in ("rtol", "atol") if name in task.options}
    done, found = at_once(places, spec, **tolerances)  # type: ignore[arg-type]
    each = (time.perf_counter() - start) / max(1, int(done.sum()))
    records: list[Record | None] = []
    for k in range(len(places)):
        if not done[k]:
            records.append(None)
            continue
        row = found.row(k)
        value, error = plain_number(row["value"]), plain_number(row["error"])
        records.append(Record(value, None, error, row["status"], row["method"], row["evaluations"], "", each))
    return records


def _no_number(status: str, note: str, seconds: float) -> Record:
    return Record(None, None, None, status, "", 0, note, seconds)
