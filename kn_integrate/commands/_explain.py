"""What a job would cost, told before it runs."""

from __future__ import annotations

import math
from typing import Any

from ..jobs import CHORDS, EXPONENTS, INTEGRAND, ORDERING, PAIRS, PLANAR, Job, integrand_of, point_of

_ONE_DISK_INTEGRAL = ("disk", "residue", "converge")
BASE_MEMORY = 170.0  # MB of a process that has loaded the libraries and kernels (measured: 150 to 190)


def explain_point(job: Job) -> dict[str, Any]:
    """The facts for a verb with one kinematic point, as far as it has one and a disk integral there."""
    if all(job.get(way) is None for way in (PLANAR, PAIRS, CHORDS, EXPONENTS)):
        return {}
    point = point_of(job)
    if job.verb == "sphere" and job.get(INTEGRAND) is not None:
        return sphere_costs(point.n, job.table("accuracy"))
    if job.verb not in _ONE_DISK_INTEGRAL or (job.get(INTEGRAND) is None and job.get(EXPONENTS) is None):
        return {"n": point.n}
    return disk_costs(point, integrand_of(job), job.get(ORDERING), job.table("accuracy"))


def disk_costs(point: Any, spec: Any, ordering: Any, accuracy: dict[str, Any]) -> dict[str, Any]:
    """Engines, integrand evaluations, seconds on one core and memory for one disk integral."""
    from .. import api

    facts: dict[str, Any] = dict(api.predict(point, spec, ordering=ordering, rtol=accuracy.get("rtol")))
    if "on poles" in facts or "terms" not in facts:
        return facts
    from ..dispatch.engines import MAX_KZ
    from ..kz.integral import memory, predict

    digits, method, n = accuracy.get("digits"), accuracy.get("method") or "auto", point.n
    terms = _terms(point, spec, ordering)
    seconds = predict(n, terms, rtol=accuracy.get("rtol") or 1e-10, digits=digits) if n <= MAX_KZ else math.inf
    if math.isfinite(seconds):
        facts["series seconds"] = f"{seconds:.2g}"
        facts["series memory"] = f"{BASE_MEMORY + memory(n) / 1e6:.0f} MB"
    if digits is not None:
        for name in ("quadrature points", "quadrature seconds"):
            facts.pop(name, None)  # predicted for double precision
    facts["method"] = method if method != "auto" else _first_choice(facts, seconds, digits)
    return facts


def recursion_size(n: int) -> dict[str, Any]:
    """How large the recursion in the number of legs is."""
    from ..kz.integral import memory
    from ..kz.pattern import entry_count

    return {
        "basis integrals": math.factorial(n - 3),
        "entries of the matrices": sum(entry_count(m) for m in range(n - 3)),
        "memory": f"{BASE_MEMORY + memory(n) / 1e6:.0f} MB",
    }


def sphere_costs(n: int, accuracy: dict[str, Any]) -> dict[str, Any]:
    """The same for one sphere integral with one term."""
    from ..sphere.direct import predict

    method = accuracy.get("method") or "auto"
    facts: dict[str, Any] = {"n": n, "method": "auto: klt first" if method == "auto" else method}
    if n <= 6 and accuracy.get("digits") is None:
        found = predict(n, accuracy.get("rtol") or 1e-10)
        facts |= {"direct points": f"{found.points:.3g}", "direct seconds": f"{found.seconds:.2g}"}
    orderings = math.factorial(n - 3)
    facts["klt"] = f"{orderings} x {orderings} disk integrals and the momentum kernel"
    return facts


def _first_choice(facts: dict[str, Any], seconds: float, digits: int | None) -> str:
    """What "auto" begins with; the other engine follows where the first is not accurate enough."""
    if digits is not None or float(facts.get("quadrature seconds", 0.0)) > seconds:
        return "auto: kz first"
    return "auto: quadrature first"


def _terms(point: Any, spec: Any, ordering: Any) -> Any:
    from ..dispatch.family import disk_family

    return disk_family(point, spec, ordering).terms_at({})
