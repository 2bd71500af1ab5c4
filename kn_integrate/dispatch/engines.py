"""One set of terms, no chord on a pole: which engine does it, and who takes over when it is not accurate enough."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

from ..disk.rows import quick_sum
from ..disk.terms import Term, integrate_terms, predict
from ..errors import NotAvailableError, Status, WorkLimitError
from ..estimate import Estimate
from .request import Request

MAX_PRECISE_QUADRATURE = 6
MAX_KZ = 11
AT_ONCE = 0.004  # seconds: below this nothing is worth comparing
TOO_LONG = 60.0  # seconds: a second engine that takes longer is not started unasked


def evaluate(n: int, terms: Sequence[Term], request: Request) -> Estimate:
    """Value of ``sum_k c_k I(A_k)`` by the engine that ``request.method`` names.

    ``"auto"`` starts with the engine of the smaller predicted cost and lets the other take over when the result is
    not accurate enough; what was done and why is in ``details["choice"]``.

    Raises
    ------
    NotAvailableError, WorkLimitError
    """
    if not terms:
        zero: Any = 0.0
        if request.digits is not None:
            import mpmath

            zero = mpmath.mpf(0)
        return Estimate(
            zero,
            0.0,
            Status.OK,
            "exact",
            0,
            request.rtol,
            request.atol,
            request.digits,
            {"choice": "no terms are left"},
        )
    if request.method == "kz":
        return _kz(n, terms, request, escalate=False)
    if request.method == "quadrature":
        return _quadrature(n, terms, request)
    return _auto(n, terms, request)


def _kz(n: int, terms: Sequence[Term], request: Request, escalate: bool) -> Estimate:
    if n > MAX_KZ:
        raise NotAvailableError(f"method 'kz' goes up to n = {MAX_KZ}; use method='quadrature'")
    from ..kz.integral import integrate_terms as by_series  # loads the compiler

    return by_series(n, terms, rtol=request.rtol, atol=request.atol, digits=request.digits, escalate=escalate)


def _quadrature(n: int, terms: Sequence[Term], request: Request) -> Estimate:
    if request.digits is not None:
        if n > MAX_PRECISE_QUADRATURE:
            raise NotAvailableError(
                f"quadrature in multiple precision goes up to n = {MAX_PRECISE_QUADRATURE}; use method='kz'"
            )
        from ..disk.multiprecision import integrate_terms as precise_terms

        return precise_terms(
            n, terms, rtol=request.rtol, atol=request.atol, digits=request.digits, max_points=request.max_points
        )
    return integrate_terms(
        n,
        terms,
        rtol=request.rtol,
        atol=request.atol,
        max_points=request.max_points,
        threads=request.threads,
        family=request.rule,
    )


def _auto(n: int, terms: Sequence[Term], request: Request) -> Estimate:
    if request.digits is not None:
        reason = f"{request.digits} digits asked for: series in multiple precision"
        return _noted(_kz(n, terms, request, escalate=True), reason)
    if n > MAX_KZ:
        return _noted(_quadrature(n, terms, request), f"n = {n} is beyond the series engine")
    quick = quick_sum(n, terms, request.rtol, request.atol) if request.max_points is None else None
    if quick is not None:
        return _noted(quick, "a small integral without deep chords: quadrature in one compiled call")
    seconds = predict(n, terms, request.rtol)[1]
    what = f"predicted {seconds:.2g} s by quadrature"
    quadrature_first = seconds <= AT_ONCE
    if not quadrature_first:
        from ..kz.integral import predict as predict_series

        series = predict_series(n, terms, rtol=request.rtol, digits=None)
        quadrature_first = seconds <= series
        what += f", {series:.2g} s by series"
    first, second = (_quadrature, _kz_auto) if quadrature_first else (_kz_auto, _quadrature)
    try:
        result = first(n, terms, request)
    except (WorkLimitError, NotAvailableError) as refused:
        if not quadrature_first:
            raise
        why = "above the limit of work" if isinstance(refused, WorkLimitError) else "not available at such exponents"
        return _noted(_kz_auto(n, terms, request), f"{what}; quadrature is {why}")
    if result.ok or (not quadrature_first and seconds > TOO_LONG):
        return _noted(result, what)
    name = result.method
    try:
        other = second(n, terms, request)
    except (WorkLimitError, NotAvailableError):
        return _noted(result, what)
    best = other if _better(other, result) else result
    best = replace(best, evaluations=result.evaluations + other.evaluations)
    return _noted(best, what + f"; {name} was not accurate enough, so {other.method} was asked too")


def _kz_auto(n: int, terms: Sequence[Term], request: Request) -> Estimate:
    return _kz(n, terms, request, escalate=True)


def _better(one: Estimate, other: Estimate) -> bool:
    if (one.status is Status.NOT_FINITE) != (other.status is Status.NOT_FINITE):
        return other.status is Status.NOT_FINITE
    return one.error < other.error


def _noted(result: Estimate, why: str) -> Estimate:
    return replace(result, details={**result.details, "choice": why})
