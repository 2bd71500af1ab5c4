"""``kn-integrate check``: one integral by every independent route."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Any

import click

from .. import inputs
from ..errors import InputError
from ..jobs import EXPONENTS, INTEGRAND, KINEMATICS, ORDERING, Field, Job, integrand_of, point_of
from ..report.outcome import Outcome
from ._explain import disk_costs, sphere_costs
from ._verb import verb

RIGHT = Field("integrand", "g", inputs.text, "TEXT", "The right integrand: the sphere integral J(f|g).", flag="--right")
BUDGET = Field("check", "budget", inputs.real, "S", "Seconds to spend [10].")
HTML = Field("check", "html", inputs.text, "FILE", "Write a self-contained report.")
RTOL = Field("accuracy", "rtol", inputs.real, "X", "What each engine is asked for [1e-12].")
THREADS = Field("accuracy", "threads", inputs.count, "N", "Number of threads [1].")


def _explain(job: Job) -> dict[str, Any]:
    """The time a check may take, and what one evaluation of the integral costs."""
    point, spec = point_of(job), integrand_of(job)
    facts: dict[str, Any] = {"n": point.n, "seconds at most, about": job.get(BUDGET) or 10.0}
    accuracy = {"rtol": job.get(RTOL) or 1e-12}
    if job.get(RIGHT) is not None:
        facts["routes"] = "direct, klt from either engine, frames, closed forms, relations"
        return {**facts, **sphere_costs(point.n, accuracy)}
    facts["routes"] = "quadrature and its rules, series, closed forms, relations"
    costs = disk_costs(point, spec, job.get(ORDERING), accuracy)
    return {**facts, **{name: value for name, value in costs.items() if not name.startswith("plan")}}


@verb(*KINEMATICS, EXPONENTS, INTEGRAND, RIGHT, ORDERING, BUDGET, HTML, RTOL, THREADS, explain=_explain)
def check(job: Job) -> Outcome:
    """Every independent reason to believe a value; agreement is evidence, not proof.

    Exit code 0 when the routes agree, 1 when they do not or are too few.

    \b
    Example:
      kn-integrate check --planar 1.2=3/10,2.3=2/5 --integrand "PT(1,2,3,4)" --html report.html
    """
    point, left, right = point_of(job), integrand_of(job), job.get(RIGHT)
    if right is not None and job.get(ORDERING) is not None:
        raise InputError(job.name(ORDERING), "it together with a right integrand", "it for disk integrals only")
    from ..checks.cross_check import cross_check

    found = cross_check(
        point,
        left,
        right,
        ordering=job.get(ORDERING),
        budget=job.get(BUDGET) or 10.0,
        rtol=job.get(RTOL) or 1e-12,
        threads=job.get(THREADS) or 1,
        report=_announce,
    )
    document = found.to_dict()
    path = job.get(HTML)
    if path is not None:
        try:
            Path(path).write_text(found.html(), encoding="utf-8")
        except OSError as error:
            raise InputError(job.name(HTML), f"{path}: {error.strerror}", "a file that can be written") from None
        document["html"] = path
    rows = tuple(("" if k else "check", line) for k, line in enumerate(str(found).splitlines()))
    return Outcome(rows, document, ok=found.verdict == "consistent")


def _announce(name: str) -> None:
    if sys.stderr.isatty():
        click.echo(f"running: {name}", err=True)


command = check
