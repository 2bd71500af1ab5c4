"""``kn-integrate sphere``: one sphere integral."""

from __future__ import annotations

from .. import inputs
from ..errors import InputError
from ..exponents import DiskExponents
from ..jobs import INTEGRAND, KINEMATICS, Field, Job, accuracy, integrand_of, point_of
from ..report.outcome import Outcome, outcome_of_estimate
from ._verb import verb

RIGHT = Field("integrand", "g", inputs.text, "TEXT", "The right-moving integrand [the same].", flag="--right")


@verb(*KINEMATICS, INTEGRAND, RIGHT, *accuracy("auto", "klt", "direct"))
def sphere(job: Job) -> Outcome:
    """One sphere integral J(f|g) at a kinematic point.

    \b
    Example:
      kn-integrate sphere --planar 1.2=3/10,2.3=2/5 --integrand "PT(1,2,3,4)" --right "PT(1,2,4,3)"
    """
    point, left, right = point_of(job), integrand_of(job), job.get(RIGHT)
    if isinstance(point, DiskExponents):
        raise InputError("--exponents", "exponents of a disk integral", "kinematics: --planar, --pairs or --chords")
    from ..sphere.evaluate import sphere_integral

    return outcome_of_estimate(sphere_integral(point, left, right, **job.table("accuracy")))


command = sphere
