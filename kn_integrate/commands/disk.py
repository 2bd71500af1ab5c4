"""``kn-integrate disk``: one disk integral."""

from __future__ import annotations

from ..jobs import EXPONENTS, INTEGRAND, KINEMATICS, ORDERING, Job, accuracy, integrand_of, point_of
from ..report.outcome import Outcome, outcome_of_estimate
from ._verb import verb


@verb(*KINEMATICS, EXPONENTS, INTEGRAND, ORDERING, *accuracy("auto", "quadrature", "kz"))
def disk(job: Job) -> Outcome:
    """One disk integral, at a kinematic point or from exponents.

    \b
    Example:
      kn-integrate disk --planar 1.2=3/10,2.3=2/5 --integrand "PT(1,2,3,4)"
    """
    point, integrand = point_of(job), integrand_of(job)
    from ..api import disk_integral  # after the input was found good: this loads the compiler

    return outcome_of_estimate(disk_integral(point, integrand, ordering=job.get(ORDERING), **job.table("accuracy")))


command = disk
