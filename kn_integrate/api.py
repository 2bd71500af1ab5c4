"""Disk integrals for callers: from a kinematic point and an integrand to an :class:`Estimate`."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any

from .dispatch.engines import evaluate
from .dispatch.integral import Shift, TermsAt, integrate_family, shifted
from .dispatch.request import Request, make_request
from .dispatch.shifts import Chord, chord_exponents, chords_of, pair_order, pair_shift
from .errors import InputError
from .estimate import Estimate
from .exact import Exact
from .exponents import DiskExponents
from .integrals import DiskIntegral, DiskTerm
from .integrand import Integrand, parse_integrand
from .kinematics import Mandelstams

ONE = Exact(1)


def disk_integral(
    kin: Mandelstams | DiskExponents,
    f: Integrand | DiskIntegral | str | Callable[[Mandelstams], Integrand] | None = None,
    *,
    ordering: Sequence[int] | None = None,
    rtol: float | None = None,
    atol: float = 0,
    digits: int | None = None,
    method: str = "auto",
    max_points: float | None = None,
    threads: int = 1,
) -> Estimate:
    """The ordered disk integral ``Z_P(f)``, continued to any kinematics.

    ``Z_P(f) = int dz_P2..dz_P(n-2) prod_{i<j} |z_ij|^{s_ij} f(z)`` over ``z_P1 < ... < z_Pn`` in the gauge
    ``(z_P1, z_P(n-1), z_Pn) = (0, 1, infinity)``; positive measure, signs of f kept.

    Parameters
    ----------
    kin
        A kinematic point with ``s_ij = 2 alpha' k_i.k_j`` (open string); or :class:`DiskExponents` for the
        absolute-value form ``int prod |z_ij|^{a_ij}``, then without ``f``.
    f
        The integrand: an :class:`Integrand`, its text, a :class:`DiskIntegral` (which brings its own ordering), or a
        function of the kinematic point that returns an Integrand, for coefficients that depend on the kinematics
        (then a factor that vanishes on a pole is seen for what it is).
    ordering
        Labels in their order along the boundary; 1..n when None.
    rtol, atol
        Accuracy: the result is ok when ``error <= max(atol, rtol |value|)``.  None means 1e-10, or ``10^-digits``.
    digits
        Decimal digits in multiple precision; None for double precision.
    method
        ``"quadrature"``, ``"kz"`` (series of the Knizhnik-Zamolodchikov equation), or ``"auto"``.
    max_points
        Integrand evaluations that may be spent.
    threads
        Python threads for quadrature; the bits of the result do not depend on it.

    Returns
    -------
    Estimate
        ``value``, ``error`` (a bound, for the exact or projected input), ``status``, and how it was done.

    Raises
    ------
    InputError
        For input that is not well formed, or an integrand that is not Moebius covariant at these kinematics.
    PoleError
        When the integral has a pole at the point.
    WorkLimitError
        When the predicted work is above ``max_points``.
    NotAvailableError
        When the method named does not serve this integral.

    Examples
    --------
    >>> import kn_integrate as kn
    >>> kin = kn.Mandelstams.from_planar(4, {(1, 2): "1/2", (2, 3): "1/2"})
    >>> print(f"{kn.disk_integral(kin, kn.parke_taylor(1, 2, 3, 4)).value:.10f}")  # B(1/2, 1/2) = pi
    3.1415926536
    """
    request = make_request(rtol=rtol, atol=atol, digits=digits, method=method, max_points=max_points, threads=threads)
    family = _Family.of(kin, f, ordering)
    return integrate_family(
        family.n, family.terms_at, request, invariants=family.invariants(), name=family.name, varying=family.varying
    )


def predict(
    kin: Mandelstams | DiskExponents,
    f: Any = None,
    *,
    ordering: Sequence[int] | None = None,
    rtol: float | None = None,
) -> dict[str, Any]:
    """What :func:`disk_integral` would do: engine, integrand evaluations, seconds on one core, the first plan.

    Nothing is integrated.  Arguments and errors as for :func:`disk_integral`.
    """
    from .disk.chords import chord_data
    from .disk.plan import initial_choices, plan_table
    from .disk.terms import digits_of
    from .disk.terms import predict as predict_quadrature

    request = make_request(rtol=rtol)
    family = _Family.of(kin, f, ordering)
    terms = family.terms_at({})
    facts: dict[str, Any] = {"n": family.n, "terms": len(terms)}
    poles = [
        {"channel": ".".join(map(str, family.name(chord))), "level": -int(y)}
        for term in terms
        for chord, y in chord_exponents(family.n, term.pairs).items()
        if y.is_integer and y <= 0
    ]
    if poles:
        return {**facts, "on poles": poles}
    points, seconds = predict_quadrature(family.n, terms, request.rtol)
    facts |= {"quadrature points": f"{points:.3g}", "quadrature seconds": f"{seconds:.2g}"}
    if terms:
        facts["plan of the first term"] = plan_table(
            initial_choices(chord_data(family.n, terms[0].pairs), digits_of(request.rtol))
        )
    return facts


class _Family:
    """An integral with its neighbourhood in kinematic space."""

    def __init__(
        self,
        n: int,
        ordering: tuple[int, ...],
        terms_at: TermsAt,
        invariants: Mapping[Chord, Exact] | None,
        varying: bool,
    ) -> None:
        self.n = n
        self.ordering = ordering
        self.terms_at = terms_at
        self._invariants = invariants
        self.varying = varying

    def name(self, chord: Chord) -> tuple[int, ...]:
        """The labels of a chord's channel, sorted."""
        return tuple(sorted(self.ordering[chord[0] - 1 : chord[1]]))

    def invariants(self) -> Mapping[Chord, Exact] | None:
        """The planar invariant of every chord; None when there are only exponents."""
        return self._invariants

    @staticmethod
    def of(kin: Any, f: Any, ordering: Sequence[int] | None) -> _Family:
        if isinstance(kin, DiskExponents):
            if f is not None:
                raise InputError("f", repr(f), "no integrand beside DiskExponents, which contain it")
            if ordering is not None:
                raise InputError("ordering", repr(ordering), "none beside DiskExponents: punctures stand in order")
            terms: Sequence[Any] = [DiskTerm(ONE, kin.pairs)]
            n = kin.n
            return _Family(n, tuple(range(1, n + 1)), lambda by: shifted(n, terms, by), None, False)
        if not isinstance(kin, Mandelstams):
            raise InputError("kin", type(kin).__name__, "Mandelstams or DiskExponents")
        n = kin.n
        if f is None:
            raise InputError("f", "None", "an integrand, such as parke_taylor(1, 2, ..., n)")
        if isinstance(f, str):
            f = parse_integrand(f)
        if callable(f) and not isinstance(f, (Integrand, DiskIntegral)):
            first = DiskIntegral(n, _integrand_of(f, kin), ordering)
            order = first.ordering

            def terms_at(by: Shift) -> Sequence[Any]:
                point = moved(kin, order, by)
                return DiskIntegral(n, _integrand_of(f, point), order).terms(point)

            return _Family(n, order, terms_at, _invariants(kin, order), True)
        if isinstance(f, DiskIntegral):
            if ordering is not None and tuple(ordering) != f.ordering:
                raise InputError("ordering", repr(tuple(ordering)), f"the ordering of the integral, {f.ordering}")
            spec = f
        elif isinstance(f, Integrand):
            spec = DiskIntegral(n, f, ordering)
        else:
            raise InputError(
                "f", type(f).__name__, "an Integrand, its text, a DiskIntegral or a function of kinematics"
            )
        fixed = spec.terms(kin)
        return _Family(n, spec.ordering, lambda by: shifted(n, fixed, by), _invariants(kin, spec.ordering), False)


def _integrand_of(f: Callable[[Mandelstams], Integrand], kin: Mandelstams) -> Integrand:
    found = f(kin)
    if not isinstance(found, Integrand):
        raise InputError(
            "f", f"a function that returned {type(found).__name__}", "a function that returns an Integrand"
        )
    return found


def _invariants(kin: Mandelstams, ordering: Sequence[int]) -> dict[Chord, Exact]:
    return {(i, j): kin.channel(tuple(ordering[i - 1 : j])) for i, j in chords_of(kin.n)}


def moved(kin: Mandelstams, ordering: Sequence[int], by: Shift) -> Mandelstams:
    """The point with planar invariants of an ordering moved, all other planar invariants and the row sums held."""
    if not by:
        return kin
    n = kin.n
    pairs = {}
    for (i, j), h in zip(pair_order(n), pair_shift(n, by), strict=True):
        a, b = ordering[i - 1], ordering[j - 1]
        pairs[a, b] = kin.pair(a, b) + h
    return kin.with_pairs(pairs)


__all__ = ["Request", "disk_integral", "evaluate", "moved", "predict"]
