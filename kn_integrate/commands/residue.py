"""``kn-integrate residue``: the residue of a disk or sphere integral at a pole."""

from __future__ import annotations

from typing import Any

from .. import inputs
from ..errors import InputError
from ..jobs import INTEGRAND, KINEMATICS, ORDERING, Field, Job, accuracy, integrand_of, point_of
from ..report.outcome import Outcome, outcome_of_estimate
from ._verb import verb


def _channels(value: Any, field: str) -> tuple[tuple[int, ...], ...]:
    """``1.2`` or ``1.2,3.4``."""
    items = value.split(",") if isinstance(value, str) else value
    if not isinstance(items, list) or not items:
        raise InputError(field, inputs.shown(value), "channels such as 1.2 or 1.2,3.4")
    return tuple(inputs.channel(inputs.text(item, field), field) for item in items)


def _levels(value: Any, field: str) -> tuple[int, ...]:
    """``0`` or ``0,1``."""
    items = value.split(",") if isinstance(value, str) else value if isinstance(value, list) else [value]
    found = []
    for item in items:
        number = inputs.number(item, field)
        if not number.is_integer or number < 0:
            raise InputError(field, inputs.shown(value), "integers, at least 0")
        found.append(int(number))
    return tuple(found)


CHANNEL = Field(
    "residue", "channel", _channels, "1.2[,3.4]", "The channel with the pole; several for iterated residues."
)
LEVEL = Field("residue", "level", _levels, "N[,N]", "Level of the pole, from 0 [0].")


ACCURACY = tuple(field for field in accuracy("quadrature") if field.key != "method")


@verb(*KINEMATICS, INTEGRAND, ORDERING, CHANNEL, LEVEL, *ACCURACY)
def residue(job: Job) -> Outcome:
    """The residue at a pole of a planar channel.

    \b
    Example:
      kn-integrate residue --planar 1.2=0,2.3=2/5,3.4=1/2,4.5=7/20,1.5=9/20 --integrand "PT(1,2,3,4,5)" --channel 1.2
    """
    point, integrand = point_of(job), integrand_of(job)
    channels = job.get(CHANNEL)
    if channels is None:
        raise InputError("--channel", "nothing", "the channel of the pole, such as 1.2")
    levels = job.get(LEVEL) or (0,)
    if len(levels) == 1:
        levels = levels * len(channels)
    from ..api import residue as compute

    found = compute(
        point,
        integrand,
        channel=list(channels),
        level=list(levels),
        ordering=job.get(ORDERING),
        **job.table("accuracy"),
    )
    return outcome_of_estimate(found)


command = residue
