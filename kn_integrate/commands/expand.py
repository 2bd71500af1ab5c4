"""``kn-integrate expand``: the low-energy expansion of an integral."""

from __future__ import annotations

import math
from typing import Any

from ..errors import InputError
from ..inputs import choice, count, labels, text
from ..jobs import INTEGRAND, KINEMATICS, ORDERING, Field, Job, integrand_of, point_of
from ..report.outcome import Outcome
from ._explain import recursion_size
from ._verb import verb

RIGHT = Field("integrand", "g", text, "TEXT", "The right integrand: the sphere integral J(f|g).", flag="--right")
ROW = Field("integrand", "row", labels, "2,3,..", "Row of the matrix F, in place of an integrand.")
COLUMN = Field("integrand", "column", labels, "2,3,..", "Column of the matrix F [2,..,n-2].")


def _weight(value: Any, field: str) -> int:
    """A weight; zero, the field-theory limit, is one."""
    return 0 if value in (0, "0") and value is not False else count(value, field)


WEIGHT = Field("expansion", "weight", _weight, "W", "Highest weight of the zeta values, up to 12 [8].")
DIGITS = Field("expansion", "digits", count, "D", "Digits of the numbers [double precision].")
METHOD = Field(
    "expansion",
    "method",
    choice("auto", "associator", "recursion"),
    "auto|associator|recursion",
    "Exact and confirmed, exact only, or numbers and integer relations [auto].",
)
FORM = Field("expansion", "form", choice("terms", "latex"), "terms|latex", "How coefficients are printed [terms].")


def _explain(job: Job) -> dict[str, Any]:
    """What an expansion is made of."""
    n, weight, method = point_of(job).n, job.get(WEIGHT), job.get(METHOD) or "auto"
    facts: dict[str, Any] = {"n": n, "weight": 8 if weight is None else weight, "method": method}
    if job.get(RIGHT) is not None:
        facts["disk expansions"] = f"{math.factorial(n - 3)} x {math.factorial(n - 3)}, and the momentum kernel"
    return {**facts, **recursion_size(n)}


@verb(*KINEMATICS, INTEGRAND, RIGHT, ORDERING, ROW, COLUMN, WEIGHT, DIGITS, METHOD, FORM, explain=_explain)
def expand(job: Job) -> Outcome:
    """Expansion in alpha': rational numbers times multiple zeta values.

    \b
    Examples:
      kn-integrate expand --planar 1.2=1,2.3=2 --integrand "PT(1,2,3,4)" --weight 6
      kn-integrate expand --planar 1.2=1,2.3=2 --integrand "PT(1,2,3,4)" --right "PT(1,2,4,3)"
    """
    point = point_of(job)
    from ..expansion import alpha_expansion
    from ..kinematics import Mandelstams

    assert isinstance(point, Mandelstams)  # exponents are no field of this verb
    given = {field.key: job.get(field) for field in (WEIGHT, DIGITS, METHOD) if job.get(field) is not None}
    series = alpha_expansion(point, _integral(job, point.n), job.get(RIGHT), ordering=job.get(ORDERING), **given)
    latex = job.get(FORM) == "latex"
    rows = [("latex", series.latex())] if latex else [_row(c) for c in series]
    bases = list(dict.fromkeys(c.basis for c in series))
    rows += [("method", series.method)]
    rows += [("basis", bases[0])] if len(bases) == 1 else [(f"basis {c.weight}", c.basis) for c in series]
    document = {**series.to_dict(), "latex": series.latex(), "sources": list(series.sources())}
    return Outcome(tuple(rows), document)


def _row(c: Any) -> tuple[str, str]:
    from ..report.text import value_with_error

    number = value_with_error(c.value, c.error, c.digits)
    return f"alpha'^{c.order}", f"{number}  = {c.exact}" if c.exact is not None else number


def _integral(job: Job, n: int) -> Any:
    rows = [field for field in (ROW, COLUMN) if job.get(field) is not None]
    if not rows:
        return integrand_of(job)
    for field in (INTEGRAND, RIGHT, ORDERING):
        if job.get(field) is not None:
            raise InputError(job.name(field), f"it together with {job.name(rows[0])}", "only one of them")
    from ..expansion import FEntry

    return FEntry(n, job.get(ROW), job.get(COLUMN))


command = expand
