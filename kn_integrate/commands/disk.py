"""``kn-integrate disk``: one disk integral, and its derivatives."""

from __future__ import annotations

from .. import inputs
from ..errors import InputError
from ..jobs import EXPONENTS, INTEGRAND, KINEMATICS, ORDERING, Field, Job, accuracy, integrand_of, point_of
from ..report.outcome import Outcome, outcome_of_estimate, outcome_of_gradient
from ._verb import verb

GRADIENT = Field(
    "disk", "gradient", inputs.switch, "", "The derivatives in all planar channels too [rtol is 1e-8 then]."
)
ACCURACY = accuracy("auto", "quadrature", "kz")


@verb(*KINEMATICS, EXPONENTS, INTEGRAND, ORDERING, *ACCURACY, GRADIENT)
def disk(job: Job) -> Outcome:
    """One disk integral, at a kinematic point or from exponents.

    \b
    Example:
      kn-integrate disk --planar 1.2=3/10,2.3=2/5 --integrand "PT(1,2,3,4)"
    """
    point, integrand = point_of(job), integrand_of(job)
    options = job.table("accuracy")
    if job.get(GRADIENT):
        for field in ACCURACY:
            if field.key in ("digits", "method") and job.get(field) not in (None, "auto", "quadrature"):
                raise InputError(job.name(field), str(job.get(field)), f"quadrature in doubles with {GRADIENT.option}")
            options.pop("method", None)
        from ..gradient import disk_gradient

        return outcome_of_gradient(disk_gradient(point, integrand, job.get(ORDERING), **options))
    from ..api import disk_integral  # after the input was found good: this loads the compiler

    return outcome_of_estimate(disk_integral(point, integrand, ordering=job.get(ORDERING), **options))


command = disk
