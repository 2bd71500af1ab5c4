"""``kn-integrate amplitude``: a tree amplitude of string states."""

from __future__ import annotations

import math
from typing import Any

from .. import inputs
from ..errors import InputError
from ..jobs import Field, Job, accuracy
from ..report.outcome import Outcome, outcome_of_estimate
from ._explain import recursion_size
from ._verb import verb

_VECTORS = {
    "tachyon": ("k",),
    "gauge_boson": ("k", "e"),
    "closed_tachyon": ("k",),
    "massless_tensor": ("k", "left", "right"),
}
_EXPECTED = "states such as 'tachyon 1,0,0; gauge_boson 1,1,0 | 0,0,1' or an array of tables {kind=, k=, e=}"


def _states(value: Any, field: str) -> tuple[dict[str, Any], ...]:
    """The states as plain values: kind and vectors of exact numbers."""
    items = [piece.strip() for piece in value.split(";")] if isinstance(value, str) else value
    if not isinstance(items, list) or not items:
        raise InputError(field, inputs.shown(value), _EXPECTED)
    return tuple(_state(item, f"{field}, entry {place}") for place, item in enumerate(items, start=1))


def _state(item: Any, field: str) -> dict[str, Any]:
    if isinstance(item, str):
        kind, _, rest = item.partition(" ")
        vectors = [piece.strip().split(",") for piece in rest.split("|")]
        names = _VECTORS.get(kind, ())
        if len(vectors) != len(names):
            expected = f"{kind} {' | '.join(names)}" if names else "one of " + ", ".join(_VECTORS)
            raise InputError(field, inputs.shown(item), expected)
        item = {"kind": kind, **dict(zip(names, vectors, strict=True))}
    if not isinstance(item, dict):
        raise InputError(field, inputs.shown(item), _EXPECTED)
    kind = str(item.get("kind"))
    if kind not in _VECTORS:
        raise InputError(f"{field}: kind", inputs.shown(item.get("kind")), "one of " + ", ".join(_VECTORS))
    if set(item) != {"kind", *_VECTORS[kind]}:
        raise InputError(f"{field}: {kind}", "keys " + ", ".join(map(str, item)), ", ".join(("kind", *_VECTORS[kind])))
    found: dict[str, Any] = {"kind": kind}
    for name in _VECTORS[kind]:
        vector = item[name]
        if not isinstance(vector, list):
            raise InputError(f"{field}: {name}", inputs.shown(vector), "an array of numbers, energy first")
        found[name] = tuple(inputs.number(x, f"{field}: {name}, component {place}") for place, x in enumerate(vector))
    return found


STATES = Field(
    "amplitude",
    "states",
    _states,
    "'KIND K [| E]; ..'",
    "States: tachyon k; gauge_boson k | e; closed_tachyon k; massless_tensor k | left | right.",
)
THEORY = Field("amplitude", "theory", inputs.choice("bosonic", "superstring"), "bosonic|superstring", "[bosonic].")
ORDERING = Field("amplitude", "ordering", inputs.labels, "1,2,..", "Colour order of open states [sum over all].")
ALPHA_PRIME = Field("amplitude", "alpha_prime", inputs.number, "X", "The inverse string tension alpha' [1].")
COUPLING = Field("amplitude", "coupling", inputs.number, "G", "The string coupling g [1].")
ACCURACY = tuple(field for field in accuracy("auto") if field.key not in ("method", "max_points", "threads"))


def _explain(job: Job) -> dict[str, Any]:
    """How many integrals an amplitude takes."""
    given = job.get(STATES)
    if given is None:
        return {}
    n, is_open = len(given), given[0]["kind"] in ("tachyon", "gauge_boson")
    facts: dict[str, Any] = {"legs": n, "theory": job.get(THEORY) or "bosonic"}
    if n < 4:
        return {**facts, "integrals": "none: fixed by symmetry"}
    if is_open:
        facts["orderings"] = 1 if job.get(ORDERING) is not None else math.factorial(n - 1)
    facts["integrals"] = "by parts to the basis of each ordering" if is_open else "bilinear of disk integrals"
    return {**facts, **recursion_size(n)}


@verb(STATES, THEORY, ORDERING, ALPHA_PRIME, COUPLING, *ACCURACY, explain=_explain)
def amplitude(job: Job) -> Outcome:
    """A tree amplitude of open or closed string states, from momenta and polarisations.

    Metric mostly plus, energy first, all legs incoming, k^2 = -m^2; s_ij = 2 alpha' k_i.k_j for open strings and
    (alpha'/2) k_i.k_j for closed ones. Exchanged particles appear as A A/(k^2 + m^2); n legs carry g^(n-2).

    \b
    Example (four open tachyons in colour order, alpha' = 1, k^2 = 1):
      kn-integrate amplitude --states "tachyon 0,1,0; tachyon 0,0,1; tachyon 0,-1,0; tachyon 0,0,-1" --ordering 1,2,3,4
    """
    given = job.get(STATES)
    if given is None:
        raise InputError(job.name(STATES), "nothing", _EXPECTED)
    from .. import amplitudes

    states = []
    for place, item in enumerate(given, start=1):
        vectors = {name: value for name, value in item.items() if name != "kind"}
        try:
            states.append(getattr(amplitudes, item["kind"])(**vectors))
        except InputError as error:
            name = f"{job.name(STATES)}, entry {place}: {error.field}"
            raise InputError(name, error.found, error.expected) from None
    options = {field.key: job.get(field) for field in (ALPHA_PRIME, COUPLING) if job.get(field) is not None}
    options |= job.table("accuracy")
    theory = "superstring_amplitude" if job.get(THEORY) == "superstring" else "amplitude"
    if states[0].is_open:
        compute = getattr(amplitudes, f"open_{theory}")
        options["ordering"] = job.get(ORDERING)
    else:
        if job.get(ORDERING) is not None:
            raise InputError(job.name(ORDERING), "an ordering of closed states", "no ordering: they have none")
        compute = getattr(amplitudes, f"closed_{theory}")
    return outcome_of_estimate(compute(states, **options))


command = amplitude
