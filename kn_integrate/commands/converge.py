"""``kn-integrate converge``: error against points and seconds, rule by rule, beside general-purpose integrators."""

from __future__ import annotations

import sys

import click

from .. import inputs
from ..jobs import EXPONENTS, INTEGRAND, KINEMATICS, ORDERING, Field, Job, integrand_of, point_of
from ..report.outcome import Outcome
from ._verb import verb

SECONDS = Field("converge", "seconds", inputs.real, "S", "Time limit for each rule and each peer [5].")
PEERS = Field("converge", "peers", inputs.choice("yes", "no"), "yes|no", "Run general-purpose integrators too [yes].")
PLOT = Field("converge", "plot", inputs.text, "FILE", "Draw the errors into this file (PNG, SVG or PDF).")


@verb(*KINEMATICS, EXPONENTS, INTEGRAND, ORDERING, SECONDS, PEERS, PLOT)
def converge(job: Job) -> Outcome:
    """Convergence and cost of one disk integral.

    \b
    Example:
      kn-integrate converge --planar 1.2=3/10,2.3=2/5 --integrand "PT(1,2,3,4)" --seconds 1
    """
    point, integrand = point_of(job), integrand_of(job)
    from ..convergence import converge as study

    found = study(
        point,
        integrand,
        ordering=job.get(ORDERING),
        seconds=job.get(SECONDS) or 5.0,
        peers=(job.get(PEERS) or "yes") == "yes",
        report=_announce,
    )
    document = found.to_dict()
    path = job.get(PLOT)
    if path is not None:
        from ..plots.convergence import draw_convergence

        draw_convergence(found.series(), path)
        document["plot"] = path
    rows = tuple(("" if k else "convergence", line) for k, line in enumerate(str(found).splitlines()))
    return Outcome(rows, document, ok=True)


def _announce(name: str) -> None:
    """Say on a terminal what is being run; a study takes the time limit for each of several methods."""
    if sys.stderr.isatty():
        click.echo(f"running: {name}", err=True)


command = converge
