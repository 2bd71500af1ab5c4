"""``kn-integrate scan``: an integral at many points, into a file from which it can go on."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import click

from .. import inputs
from ..errors import InputError
from ..jobs import INTEGRAND, KINEMATICS, ORDERING, Field, Job, accuracy
from ..progress import FACES
from ..report.outcome import Outcome
from ._explain import BASE_MEMORY, disk_costs
from ._points import ON, POINTS, RIGHT, points_of, spec_of
from ._verb import verb

STORE = Field("scan", "store", inputs.text, "FILE", "The SQLite file with the results; gone on with if it is there.")
WORKERS = Field("scan", "workers", inputs.count, "N", "Number of processes; the results do not depend on it [1].")
CSV = Field("scan", "csv", inputs.text, "FILE", "Write all rows as CSV.")
JSON = Field("scan", "json", inputs.text, "FILE", "Write all rows as JSON, with kinematics and versions.")
PROGRESS = Field("scan", "progress", inputs.choice(*FACES), "|".join(FACES), "How progress is shown [auto].")

_ACCURACY = tuple(field for field in accuracy("auto", "quadrature", "kz", "direct", "klt") if field.key != "threads")

_OVERHEAD = 0.005  # seconds a point: planning, and writing to the disk (measured: 3 to 10 ms)


def _explain(job: Job) -> dict[str, Any]:
    """Points, what is there already, and the cost from three of the points."""
    points = points_of(job)
    spec = spec_of(job, points[0].place.n)
    facts: dict[str, Any] = {
        "points": len(points),
        "coordinates": list(points[0].coordinates),
        "first": dict(points[0].coordinates),
        "last": dict(points[len(points) - 1].coordinates),
    }
    left, path, workers = len(points), job.get(STORE), job.get(WORKERS) or 1
    if path is not None and Path(path).exists():
        from ..scans import open_scan

        facts["finished in the store"] = len(open_scan(path))
        left = max(0, left - len(open_scan(path)))
    samples = sorted({0, len(points) // 2, len(points) - 1})
    if (job.get(ON) or "disk") == "disk":
        found = [disk_costs(points[k].place, spec, None, job.table("accuracy")) for k in samples]
        cheaper = [min(_seconds(f, "quadrature seconds"), _seconds(f, "series seconds")) for f in found]
        seconds = [_OVERHEAD + s for s in cheaper]
        known = [s for s in seconds if math.isfinite(s)]
        facts["on poles, of the first, middle and last"] = sum("on poles" in f for f in found)
        if known:
            facts["seconds for a point"] = f"{sum(known) / len(known):.2g}"
            facts["seconds in all"] = f"{sum(known) / len(known) * left / workers:.2g} with {workers} at work"
    facts["memory"] = f"{BASE_MEMORY * (workers + (workers > 1)):.0f} MB at least"
    facts["size of the store"] = f"{len(points) * 6e-4:.2g} MB"
    return facts


def _seconds(facts: dict[str, Any], name: str) -> float:
    return float(facts.get(name, math.inf))


@verb(
    *KINEMATICS,
    INTEGRAND,
    RIGHT,
    ORDERING,
    ON,
    *POINTS,
    STORE,
    WORKERS,
    CSV,
    JSON,
    PROGRESS,
    *_ACCURACY,
    explain=_explain,
)
def scan(job: Job) -> Outcome:
    """An integral on a line, on a grid, on a random sample, or at the points of a table.

    Interrupted or killed, the same command goes on where it stopped. Points on a pole are rows of their own status.

    \b
    Examples:
      kn-integrate scan --planar 1.2=1/10,2.3=2/5 --to 1.2=9/10 --count 9 --integrand "PT(1,2,3,4)" --store a.sqlite
      kn-integrate scan --planar 2.3=2/5 --grid 1.2=1/10:9/10:9 --integrand "PT(1,2,3,4)" --store b.sqlite
    """
    path = job.get(STORE)
    if path is None:
        raise InputError(STORE.option, "nothing", "the file for the results, such as scan.sqlite")
    points = points_of(job)
    spec = spec_of(job, points[0].place.n)
    from ..scans import scan as run

    try:
        found = run(
            points,
            spec,
            store=path,
            workers=job.get(WORKERS) or 1,
            progress=job.get(PROGRESS) or "auto",
            **job.table("accuracy"),
        )
    except KeyboardInterrupt:
        click.echo(f"\nstopped; what was finished is in {path}, run the same command again to go on", err=True)
        raise
    for field, write in ((CSV, found.to_csv), (JSON, found.to_json)):
        if job.get(field) is not None:
            write(Path(job.get(field)))
    rows = [("store", path), ("points", f"{len(found)} of {found.total}")]
    rows += [(f"status {status}", str(count)) for status, count in found.counts.items()]
    files = {field.key: job.get(field) for field in (CSV, JSON) if job.get(field) is not None}
    rows += list(files.items())
    document = {
        "store": path,
        "points": found.total,
        "finished": len(found),
        "ok": found.ok,
        "counts": found.counts,
        "hash": found.rows[0].job,
        **files,
    }
    return Outcome(tuple(rows), document, found.ok)


command = scan
