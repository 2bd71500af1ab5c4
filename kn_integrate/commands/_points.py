"""The ``[scan]`` table: which points, and where the results go."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from .. import inputs
from ..errors import InputError
from ..exact import Exact
from ..jobs import (
    CHORDS,
    INTEGRAND,
    ORDERING,
    PAIRS,
    PLANAR,
    PLANAR_ORDERING,
    ROW_SUMS,
    Field,
    Job,
    N,
    integrand_of,
    only_one,
)
from ..scans import ScanPoints, spaced

_AXES = "axes such as 1.2=1/10:9/10:9 (first:last:count)"


def _axes(value: Any, field: str) -> dict[inputs.Labels, tuple[Exact, ...]]:
    """``1.2=1/10:9/10:9,2.3=0:1:5``, or a TOML table of such texts or of arrays of values."""
    if isinstance(value, str):
        pieces = [piece.partition("=") for piece in value.split(",")]
        if not all(equals and raw.strip() for _key, equals, raw in pieces):
            raise InputError(field, inputs.shown(value), _AXES)
        value = {key.strip(): raw for key, _equals, raw in pieces}
    if not isinstance(value, Mapping) or not value:
        raise InputError(field, inputs.shown(value), _AXES)
    found = {}
    for key, raw in value.items():
        name = f"{field} {key}"
        if isinstance(raw, Mapping):
            raise InputError(name, "a table", 'channels in quotes: "1.2" = "1/10:9/10:9"')
        if isinstance(raw, list) and raw:
            found[inputs.channel(key, field)] = tuple(inputs.number(item, name) for item in raw)
            continue
        parts = raw.split(":") if isinstance(raw, str) else []
        if len(parts) != 3:
            raise InputError(name, inputs.shown(raw), "first:last:count, such as 1/10:9/10:9, or an array of values")
        first, last = (inputs.number(part.strip(), name) for part in parts[:2])
        found[inputs.channel(key, field)] = spaced(first, last, inputs.count(parts[2].strip(), name))
    return found


def _seed(value: Any, field: str) -> int:
    number = inputs.number(value, field)
    if not number.is_integer or number < 0:
        raise InputError(field, inputs.shown(value), "an integer, at least 0")
    return int(number)


TO = Field("scan", "to", inputs.assignments, "1.2=X,..", "A line: from the kinematics to where these have changed.")
COUNT = Field("scan", "count", inputs.count, "N", "Points on the line, or in the random sample.")
GRID = Field("scan", "grid", _axes, "1.2=A:B:N,..", "A grid: first, last and number of values for each axis.")
SEED = Field("scan", "seed", _seed, "N", "A random sample of planar invariants with this seed.")
LOW = Field("scan", "low", inputs.number, "X", "Lower end of the random sample [-1].")
HIGH = Field("scan", "high", inputs.number, "X", "Upper end of the random sample [1].")
TABLE = Field("scan", "table", inputs.text, "FILE", "Points from a CSV or JSON file with columns such as 1.2.")
EPSILON = Field(
    "scan", "epsilon", inputs.number, "E", "Move every point by -i E in the channels of physical particles."
)
ON = Field("scan", "on", inputs.choice("disk", "sphere"), "disk|sphere", "Which integral [disk].")
RIGHT = Field(
    "integrand", "g", inputs.text, "TEXT", "The right-moving integrand on the sphere [the same].", flag="--right"
)
POINTS = (TO, COUNT, GRID, SEED, LOW, HIGH, TABLE, EPSILON)


def points_of(job: Job) -> ScanPoints:
    """The points that a job asks for.

    Raises
    ------
    InputError
        For none or several of a line, a grid, a sample and a table, and for what does not go with the one.
    """
    source = only_one(job, (TO, GRID, SEED, TABLE))
    if source is None:
        names = ", ".join(field.option for field in (TO, GRID, SEED, TABLE))
        raise InputError("points", "nothing", f"one of {names}")
    for field, users in ((COUNT, (TO, SEED)), (LOW, (SEED,)), (HIGH, (SEED,))):
        if job.get(field) is not None and source not in users:
            allowed = " or ".join(user.option for user in users)
            raise InputError(job.name(field), f"it together with {job.name(source)}", f"it with {allowed} only")
    way = only_one(job, (PLANAR, PAIRS, CHORDS))
    if source is SEED and way is not None:
        raise InputError(job.name(way), f"it together with {job.name(SEED)}", "no fixed kinematics for a random sample")
    kind = "planar" if way is None else way.key
    fixed: dict[inputs.Labels, Exact] = {} if way is None else job.get(way)
    options: dict[str, Any] = {"ordering": job.get(PLANAR_ORDERING)}
    if job.get(ROW_SUMS) is not None:
        options["row_sums"] = job.get(ROW_SUMS)
    found = _found(job, source, _legs(job, fixed), kind, fixed, options)
    epsilon = job.get(EPSILON)
    if epsilon is None:
        return found
    from ..poles import plus_i_epsilon

    return found.map(lambda kin: plus_i_epsilon(kin, epsilon))


def _found(
    job: Job, source: Field, n: int, kind: str, fixed: Mapping[inputs.Labels, Exact], options: dict[str, Any]
) -> ScanPoints:
    if source is TO:
        moved = {**fixed, **job.get(TO)}
        start, stop = (p.place for p in ScanPoints.table([_named(fixed), _named(moved)], n, kind=kind, **options))
        count = job.get(COUNT)
        if count is None:
            raise InputError(COUNT.option, "nothing", "the number of points on the line")
        return ScanPoints.line(start, stop, count)  # type: ignore[arg-type]
    if source is GRID:
        axes = job.get(GRID)
        rest = {labels: value for labels, value in fixed.items() if labels not in axes}
        return ScanPoints.grid(n, axes, rest, kind=kind, **options)
    if source is TABLE:
        return ScanPoints.table(job.get(TABLE), n, fixed, kind=kind, **options)
    count = job.get(COUNT)
    if count is None:
        raise InputError(COUNT.option, "nothing", "the number of points in the sample")
    ends = {field.key: job.get(field) for field in (LOW, HIGH) if job.get(field) is not None}
    return ScanPoints.random(n, count, job.get(SEED), **ends, **options)


def spec_of(job: Job, n: int) -> Any:
    """The integral of a job, without kinematics."""
    from ..integrals import DiskIntegral, SphereIntegral

    integrand = integrand_of(job)
    assert integrand is not None  # exponents are no field of these verbs
    if (job.get(ON) or "disk") == "disk":
        if job.get(RIGHT) is not None:
            raise InputError(job.name(RIGHT), "it with an integral on the disk", f"it with {ON.option} sphere")
        return DiskIntegral(n, integrand, job.get(ORDERING))
    if job.get(ORDERING) is not None:
        raise InputError(job.name(ORDERING), "it with an integral on the sphere", f"it with {ON.option} disk")
    return SphereIntegral(n, integrand, job.get(RIGHT))


def _named(values: Mapping[inputs.Labels, Exact]) -> dict[str, Exact]:
    return {".".join(map(str, labels)): value for labels, value in values.items()}


def _legs(job: Job, fixed: Mapping[inputs.Labels, Exact]) -> int:
    declared = job.get(N)
    if declared is not None:
        return int(declared)
    integrand = integrand_of(job) if job.get(INTEGRAND) is not None else None
    seen = [label for labels in (*fixed, *(job.get(GRID) or {}), *(job.get(TO) or {})) for label in labels]
    seen += [*(job.get(ORDERING) or ()), *(job.get(PLANAR_ORDERING) or ()), 0 if integrand is None else integrand.n]
    return int(max(seen))
