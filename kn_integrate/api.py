"""Disk integrals for callers: from a kinematic point and an integrand to an :class:`Estimate`."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

from .dispatch.family import disk_family
from .dispatch.integral import integrate_family
from .dispatch.request import make_request
from .dispatch.shifts import chord_exponents
from .errors import InputError
from .estimate import Estimate
from .exponents import DiskExponents
from .integrals import DiskIntegral
from .integrand import Integrand
from .kinematics import Mandelstams


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
    rule: str | None = None,
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
    rule
        With ``method="quadrature"``: this family of rules for every chord, for a second opinion: ``"contour"``,
        ``"ellipse"``, ``"disc"``, ``"small disc"``, ``"overhang"``, or ``"radau"`` (Re Y > -1).

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
    request = make_request(
        rtol=rtol, atol=atol, digits=digits, method=method, max_points=max_points, threads=threads, rule=rule
    )
    family = disk_family(kin, f, ordering)
    return integrate_family(
        family.n, family.terms_at, request, invariants=family.invariants, name=family.name, varying=family.varying
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
    family = disk_family(kin, f, ordering)
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


def residue(
    kin: Mandelstams | DiskExponents,
    f: Any = None,
    g: Any = None,
    *,
    channel: Any,
    level: Any = 0,
    ordering: Sequence[int] | None = None,
    hold: Any = None,
    rtol: float | None = None,
    atol: float = 0,
    digits: int | None = None,
    max_points: float | None = None,
    threads: int = 1,
) -> Estimate:
    """The residue of a disk or sphere integral at a pole of a channel (or of several compatible ones).

    With ``Y = X + (integer from the integrand)`` the exponent of the channel's boundary divisor, level N is the pole at
    ``Y = -N``; in a sum of monomials the integer is the least one, so that level 0 is the first pole met.  The
    residue is in the planar invariant X of the channel.

    Parameters
    ----------
    kin
        The point; its X of the channel is ignored (it is moved onto the pole), the other planar invariants of the
        ordering are kept.
    f
        The integrand, as for :func:`disk_integral`.
    g
        The right-moving integrand: given, the residue is that of the sphere integral J(f|g).
    channel
        Labels such as ``(1, 2)``, or a list of compatible channels for the iterated residue.
    level
        N >= 0, or one for each channel.
    ordering
        Of the disk integral.
    hold
        n(n-3)/2 - 1 channels to keep instead of the planar ones (any sets of labels).
    rtol, atol, digits, max_points, threads
        As for :func:`disk_integral`.

    Raises
    ------
    InputError
        For a channel that is not planar in the ordering, channels that cross, levels below 0.
    PoleError
        When a further compatible channel sits on a pole at that point.

    Examples
    --------
    >>> import kn_integrate as kn
    >>> kin = kn.Mandelstams.from_planar(4, {(1, 2): "1/3", (2, 3): "1/2"})
    >>> print(f"{kn.residue(kin, kn.parke_taylor(1, 2, 3, 4), channel=(1, 2), level=1).value:.9f}")  # 1 - s23
    0.500000000
    """
    if g is not None:
        if not isinstance(kin, Mandelstams):
            raise InputError("kin", type(kin).__name__, "Mandelstams for a residue of J(f|g)")
        from .sphere.residues import residue as sphere_residue

        return sphere_residue(
            kin, f, g, channel=channel, level=level, rtol=rtol, atol=atol, digits=digits, max_points=max_points
        )
    from .poles import disk_residue

    request = make_request(rtol=rtol, atol=atol, digits=digits, max_points=max_points, threads=threads)
    return disk_residue(kin, f, channel=channel, level=level, ordering=ordering, hold=hold, request=request)
