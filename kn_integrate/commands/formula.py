"""``kn-integrate formula``: examine a closed form that somebody claims."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

from .. import inputs
from ..errors import InputError
from ..exact import ONE
from ..jobs import INTEGRAND, ORDERING, Field, Job, N, integrand_of
from ..report.outcome import Outcome
from ._verb import verb


def _text_by_name(value: Any, field: str) -> dict[str, str]:
    """``name=formula`` pairs separated by commas, or a TOML table."""
    expected = "name=formula pairs such as a=s12+s23,b=s34"
    if isinstance(value, str):
        pairs = [piece.partition("=") for piece in value.split(",")]
        if not all(equals and name.strip() and text.strip() for name, equals, text in pairs):
            raise InputError(field, inputs.shown(value), expected)
        items = [(name.strip(), text.strip()) for name, _, text in pairs]
    elif isinstance(value, Mapping):
        items = [(str(name), str(text)) for name, text in value.items()]
        if any(isinstance(text, (Mapping, list, bool)) for text in value.values()):
            raise InputError(field, inputs.shown(value), "a table of names in quotes and formulas in quotes")
    else:
        raise InputError(field, inputs.shown(value), expected)
    found = dict(items)
    if len(found) != len(items):
        raise InputError(field, inputs.shown(value), "every name once")
    return found


FORMULA = Field("formula", "text", inputs.text, "TEXT", "The claimed closed form, e.g. 'beta(s12,s23)'.", "--formula")
WHERE = Field("formula", "where", _text_by_name, "L=R,..", "Linear conditions under which it is claimed.")
PARAMETERS = Field("formula", "parameters", _text_by_name, "A=..,..", "Names for linear combinations of invariants.")
TRIALS = Field("formula", "trials", inputs.count, "N", "Number of points [40].")
SEED = Field("formula", "seed", inputs.count, "N", "Seed of the points [7].")
DIGITS = Field("formula", "digits", inputs.count, "D", "Digits to which both must agree [20].")
RIGHT = Field("integrand", "g", inputs.text, "TEXT", "The right integrand: makes it a sphere integral J(f|g).")


def _explain(job: Job) -> dict[str, Any]:
    """How many integrals an examination takes, and what they cost."""
    left = integrand_of(job)
    assert left is not None
    n, trials, digits = job.get(N) or left.n, job.get(TRIALS) or 40, job.get(DIGITS) or 20
    facts: dict[str, Any] = {"n": n, "points": trials, "digits": digits}
    orderings = math.factorial(n - 3) if job.get(RIGHT) is not None else 1
    if orderings > 1:
        facts["each point"] = f"{orderings} x {orderings} disk integrals and the momentum kernel"
    from ..integrals import DiskTerm
    from ..kinematics import Mandelstams
    from ..kz.integral import MAX_PRECISE_LEGS, predict

    if n <= MAX_PRECISE_LEGS:
        sample = DiskTerm(ONE, Mandelstams.random(n, 1).pairs)
        one = predict(n, [sample] * len(left.terms), rtol=10.0**-digits, digits=digits)
        facts["integral seconds"] = f"{trials * orderings**2 * one:.2g}"
    return facts


@verb(FORMULA, WHERE, PARAMETERS, N, INTEGRAND, ORDERING, RIGHT, TRIALS, SEED, DIGITS, explain=_explain)
def formula(job: Job) -> Outcome:
    """Compare a formula with an integral, and say how it is wrong if it is.

    Exit code 0 when it agrees, 1 when it disagrees or no decision is reached. Agreement is evidence, not proof.

    \b
    Example:
      kn-integrate formula --formula "beta(s12,s23)" --integrand "PT(1,2,3,4)"
    """
    text = job.get(FORMULA)
    if text is None:
        raise InputError(job.name(FORMULA), "nothing", "a formula such as 'beta(s12,s23)'")
    left = integrand_of(job)
    assert left is not None  # this verb has no exponents, and a missing integrand was refused
    from ..checks.examine import EVIDENCE, examine_formula
    from ..integrals import DiskIntegral, SphereIntegral

    n = job.get(N) or left.n
    spec: DiskIntegral | SphereIntegral
    if job.get(RIGHT) is None:
        spec = DiskIntegral(n, left, job.get(ORDERING))
    elif job.get(ORDERING) is not None:
        raise InputError(job.name(ORDERING), "it together with a right integrand", "it for disk integrals only")
    else:
        spec = SphereIntegral(n, left, job.get(RIGHT))
    options = {key: job.get(field) for key, field in (("trials", TRIALS), ("rng", SEED), ("digits", DIGITS))}
    result = examine_formula(
        text,
        spec,
        where=job.get(WHERE),
        parameters=job.get(PARAMETERS),
        **{key: value for key, value in options.items() if value is not None},
    )
    counts = ", ".join(f"{count} {name}" for name, count in result.counts().items() if count)
    rows = [("verdict", result.verdict), ("points", counts)]
    if result.digits:
        rows.append(("digits", f"{result.digits:.0f} or more where they agree"))
    if result.diagnosis:
        rows.append(("diagnosis", result.diagnosis))
    if result.channel is not None:
        rows.append(("channel", ".".join(map(str, result.channel))))
    if result.level is not None:
        rows.append(("level", str(result.level)))
    rows.append(("note", EVIDENCE))
    if result.counterexample:
        rows += [("failing job" if k == 0 else "", line) for k, line in enumerate(result.counterexample.splitlines())]
    return Outcome(tuple(rows), result.to_dict(), result.agrees)


command = formula
