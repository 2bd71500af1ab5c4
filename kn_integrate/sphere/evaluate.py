"""Sphere integrals for callers: from a kinematic point and two integrands to an :class:`Estimate`."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

from ..dispatch.request import Request, make_request
from ..errors import InputError, NotAvailableError, Status
from ..estimate import Estimate
from ..exact import ONE
from ..exponents import SphereExponents
from ..integrals import SphereIntegral, SphereTerm
from ..integrand import Integrand, parse_integrand
from ..kinematics import Mandelstams
from . import klt

METHODS = ("auto", "klt", "direct")
MAX_DIRECT = 6


def sphere_terms(kin: Any, f: Any = None, g: Any = None) -> tuple[int, Sequence[SphereTerm]]:
    """The number of punctures and the terms of a sphere integral, from any of the forms callers may use.

    Raises
    ------
    InputError
    """
    if isinstance(kin, SphereExponents):
        if f is not None or g is not None:
            raise InputError("f, g", "integrands", "none beside SphereExponents, which contain them")
        return kin.n, [SphereTerm(ONE, kin.pairs, kin.left, kin.right)]
    if not isinstance(kin, Mandelstams):
        raise InputError("kin", type(kin).__name__, "Mandelstams or SphereExponents")
    if isinstance(f, SphereIntegral):
        if g is not None:
            raise InputError("g", repr(g), "none beside a SphereIntegral, which brings both integrands")
        return f.n, f.terms(kin)
    if f is None:
        raise InputError("f", "None", "an integrand, such as parke_taylor(1, 2, ..., n)")
    left = _integrand(f, "f")
    right = left if g is None else _integrand(g, "g")
    spec = SphereIntegral(kin.n, left, right)
    return kin.n, spec.terms(kin)


def _integrand(f: Any, field: str) -> Integrand:
    if isinstance(f, str):
        return parse_integrand(f)
    if not isinstance(f, Integrand):
        raise InputError(field, type(f).__name__, "an Integrand, or its text")
    return f


def sphere_integral(
    kin: Mandelstams | SphereExponents,
    f: Integrand | SphereIntegral | str | None = None,
    g: Integrand | str | None = None,
    *,
    rtol: float | None = None,
    atol: float = 0,
    digits: int | None = None,
    method: str = "auto",
    max_points: float | None = None,
    threads: int = 1,
) -> Estimate:
    """The sphere integral ``J(f|g)``, continued to any kinematics.

    ``J(f|g) = int d^2z.../(pi^(n-3) vol SL(2,C)) prod_{i<j} |z_ij|^{2 s_ij} f(z) conj(g(z))``, ``d^2z = dx dy``.

    Parameters
    ----------
    kin
        A kinematic point with ``s_ij = (alpha'/2) k_i.k_j`` (closed string); or :class:`SphereExponents`.
    f, g
        Left and right integrand; g is f when None.  Or one :class:`SphereIntegral`.
    rtol, atol, digits, max_points, threads
        As for :func:`kn_integrate.disk_integral`; digits through ``"klt"`` only.
    method
        ``"klt"``: the bilinear of disk integrals (n <= 8); ``"direct"``: integration over complex planes (n <= 6),
        which shares nothing with it; ``"auto"``: the bilinear, then the direct integral where that is not accurate.

    Raises
    ------
    InputError
        For input that is not well formed, open-string kinematics, or integrands that are not Moebius covariant.
    PoleError
        When the integral has a pole: the cluster is named.
    NotAvailableError, WorkLimitError

    Examples
    --------
    >>> import kn_integrate as kn
    >>> exponents = kn.SphereExponents.from_pairs(4, {(1, 2): "-2/3", (2, 3): "-2/3", (1, 3): "-2/3"})
    >>> J = kn.sphere_integral(exponents)
    >>> import math
    >>> exact = (math.gamma(1 / 3) / math.gamma(2 / 3)) ** 3
    >>> abs(J.value - exact) <= J.error
    True
    """
    request = make_request(
        rtol=rtol, atol=atol, digits=digits, method=method, max_points=max_points, threads=threads, methods=METHODS
    )
    n, terms = sphere_terms(kin, f, g)
    if not terms:
        details = {"choice": "no terms are left"}
        return Estimate(0.0, 0.0, Status.OK, "exact", 0, request.rtol, request.atol, request.digits, details)
    return evaluate_terms(n, terms, request)


def evaluate_terms(n: int, terms: Sequence[SphereTerm], request: Request) -> Estimate:
    """The value of terms by the method of the request."""
    for term in terms:
        klt.refuse_poles(n, term)
    if request.method == "klt":
        return klt.integrate_terms(n, terms, request)
    if request.method == "direct":
        return _direct(n, terms, request)
    if n > klt.MAX_LEGS:
        raise NotAvailableError(f"sphere integrals go up to n = {klt.MAX_LEGS}")
    result = klt.integrate_terms(n, terms, request)
    if result.ok or request.digits is not None or n > 5:
        return replace(result, details={**result.details, "choice": "bilinear of disk integrals"})
    other = _direct(n, terms, request)
    best = other if other.error < result.error else result
    why = "the bilinear was not accurate enough, so the direct integral was asked too"
    return replace(best, details={**best.details, "choice": why})


def _direct(n: int, terms: Sequence[SphereTerm], request: Request) -> Estimate:
    if request.digits is not None:
        raise NotAvailableError("method 'direct' works in double precision; use method='klt' with digits=")
    if n > MAX_DIRECT:
        raise NotAvailableError(f"method 'direct' goes up to n = {MAX_DIRECT}; use method='klt'")
    from .direct import integrate_terms

    return integrate_terms(
        n, terms, rtol=request.rtol, atol=request.atol, max_points=request.max_points, threads=request.threads
    )
