"""A sum of disk integrals to one tolerance: every term is made as accurate as the sum needs, not more."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Protocol

from ..errors import Status, WorkLimitError
from ..estimate import Estimate, judge
from ..exact import Exact
from .chords import ChordData, chord_data
from .evaluate import DEFAULT_MAX_POINTS, Integral, integrate
from .plan import Choice, initial_choices, layout_of
from .run import EPSILON

MAX_ROUNDS = 4
SECONDS_PER_POINT = {"real": 4.5e-9, "complex": 1.1e-8}  # for predictions only
PLANS_SHOWN = 20


class Term(Protocol):
    """One absolute-value integral of a sum: a coefficient and the exponents of all pairs."""

    @property
    def coefficient(self) -> Exact:
        """Exact factor, signs included."""

    @property
    def pairs(self) -> tuple[Exact, ...]:
        """Exponents in the order (1,2), (1,3), ..., (n-1,n)."""


@dataclass(frozen=True)
class _Part:
    factor: float | complex
    data: ChordData
    result: Integral | None = None


def _sum_of(parts: Sequence[_Part]) -> tuple[Any, float, float, float]:
    """Value, truncation, round-off and the sum of moduli."""
    value: Any = 0.0
    truncation = roundoff = moduli = 0.0
    for part in parts:
        assert part.result is not None
        size = abs(part.factor)
        value += part.factor * part.result.value
        truncation += size * part.result.truncation
        roundoff += size * part.result.roundoff
        moduli += size * abs(part.result.value)
    return value, truncation, roundoff + (len(parts) + 3) * EPSILON * moduli, moduli


def integrate_terms(
    n: int,
    terms: Sequence[Term],
    *,
    rtol: float,
    atol: float = 0.0,
    max_points: float | None = None,
    threads: int = 1,
    family: str | None = None,
    residues: frozenset[int] = frozenset(),
) -> Estimate:
    """Quadrature of ``sum_k c_k I(A_k)``; no chord of any term may be on a pole but those in ``residues``.

    Parameters
    ----------
    n
        Number of punctures.
    terms
        Coefficients and pair exponents, canonical ordering.
    rtol, atol
        The request for the sum; terms that cancel are computed more accurately than that.
    max_points
        Integrand evaluations over all terms and passes.
    threads
        Python threads; the bits of the result do not depend on it.
    family
        Use this family of rules for every chord instead of choosing per chord.
    residues
        Chords (by index) on a pole in every term: the sum of the iterated residues there.

    Raises
    ------
    WorkLimitError
        Before any work, when a first plan alone needs more than ``max_points``.
    """
    limit = DEFAULT_MAX_POINTS if max_points is None else max_points
    parts = [_Part(term.coefficient.value(), chord_data(n, term.pairs)) for term in terms]
    single = len(parts) == 1
    options: dict[str, Any] = {"threads": threads, "family": family, "residues": residues}
    if not single:
        first = sum(layout_of(n, _plan(part.data, rtol, family, residues)).points for part in parts)
        if first > limit:
            raise WorkLimitError(first, limit, "points", "raise max_points=, relax rtol=, or use method='kz'")
    spent = 0
    done: list[_Part] = []
    for part in parts:
        share = atol / abs(part.factor) if single else 0.0
        result = integrate(part.data, rtol, share, max_points=limit - spent, **options)
        spent += result.points
        done.append(_Part(part.factor, part.data, result))
    value, truncation, roundoff, moduli = _sum_of(done)
    rounds = 1
    while not single and done and rounds < MAX_ROUNDS:
        target = max(atol, rtol * abs(value))
        if truncation + roundoff <= target:
            break
        goal = max(target, 2.0 * roundoff)
        better = []
        for part in done:
            assert part.result is not None
            size = abs(part.factor)
            share = 0.5 * goal / (len(done) * size)
            if part.result.truncation <= share or part.result.error <= 2.0 * part.result.roundoff:
                better.append(part)
                continue
            finer = max(1e-15, share / max(abs(part.result.value), share))
            try:
                result = integrate(part.data, finer, share, max_points=limit - spent, **options)
            except WorkLimitError:
                better.append(part)
                continue
            spent += result.points
            better.append(_Part(part.factor, part.data, min(part.result, result, key=lambda r: r.error)))
        if all(new.result is old.result for new, old in zip(better, done, strict=True)):
            break
        done = better
        value, truncation, roundoff, moduli = _sum_of(done)
        rounds += 1
    error = truncation + roundoff
    status = judge(value, error, rtol, atol, roundoff) if done else Status.OK
    details: dict[str, Any] = {
        "terms": len(done),
        "truncation": truncation,
        "roundoff": roundoff,
        "cancellation": moduli / abs(value) if value else 1.0,
        "plan": [
            {"coefficient": str(term.coefficient), "chords": part.result.plan(), "passes": part.result.passes}
            for term, part in zip(terms[:PLANS_SHOWN], done, strict=False)
            if part.result is not None
        ],
    }
    return Estimate(value, error, status, "residue" if residues else "quadrature", spent, rtol, atol, None, details)


def _plan(data: ChordData, rtol: float, family: str | None, residues: frozenset[int] = frozenset()) -> list[Choice]:
    return initial_choices(data, digits_of(rtol), family, residues)


def predict(n: int, terms: Sequence[Term], rtol: float, family: str | None = None) -> tuple[float, float]:
    """Integrand evaluations and seconds (one core, very roughly) of the first pass over all terms."""
    points = seconds = 0.0
    for term in terms:
        data = chord_data(n, term.pairs)
        layout = layout_of(n, _plan(data, rtol, family))
        points += layout.points
        kind = "real" if data.is_real and all(rule.is_real for rule in layout.rules) else "complex"
        seconds += layout.points * SECONDS_PER_POINT[kind]
    return points, seconds


def digits_of(rtol: float) -> float:
    """Decimal digits that a relative tolerance asks for, at most what double precision has."""
    return min(-math.log10(max(rtol, 1e-15)), 15.0)
