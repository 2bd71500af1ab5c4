"""Derivatives of disk integrals with respect to all planar channels at once."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

from .channels import Channel, planar_channels, read_labels
from .disk.terms import PLANS_SHOWN, Term
from .dispatch.family import DiskFamily, disk_family
from .dispatch.integral import integrate_family
from .dispatch.request import Request, make_request
from .dispatch.shifts import chord_exponents, chords_of
from .errors import InputError, NotAvailableError, Status
from .estimate import Estimate, judge
from .exponents import DiskExponents
from .integrals import DiskIntegral
from .integrand import Integrand
from .kinematics import Mandelstams

if TYPE_CHECKING:
    from .disk.gradient import GradientSum

DEFAULT_RTOL = 1e-8


@dataclass(frozen=True)
class Gradient:
    """The derivatives of a disk integral in its planar channels.

    Attributes
    ----------
    value : Estimate
        The integral itself, with its own error and status.
    channels : tuple of tuple of int
        The n(n-3)/2 planar channels of the ordering by their labels, in the order of :class:`PlanarPoints`; a channel
        is named by its smaller side, halves by the one without the last leg.
    derivatives : tuple of float | complex
        ``dZ/dX`` of each channel, all other planar channels and all row sums held.
    errors : tuple of float
        A bound on the error of each derivative, truncation and round-off included.
    status : Status
        Of all derivatives together: OK when every error is at most ``max(atol, rtol * the largest modulus)``.
    evaluations : int
        Integrand evaluations, those of the value included.
    rtol, atol : float
        The request.
    details : Mapping
        How the work was done; plain values only.
    """

    value: Estimate
    channels: tuple[Channel, ...]
    derivatives: tuple[Any, ...]
    errors: tuple[float, ...]
    status: Status
    evaluations: int
    rtol: float = DEFAULT_RTOL
    atol: float = 0.0
    details: Mapping[str, Any] = field(default_factory=dict)

    def __post_init__(self) -> None:
        object.__setattr__(self, "details", MappingProxyType(dict(self.details)))

    def __getstate__(self) -> dict[str, Any]:
        return {**self.__dict__, "details": dict(self.details)}

    def __setstate__(self, state: dict[str, Any]) -> None:
        for name, value in state.items():
            object.__setattr__(self, name, value)
        self.__post_init__()

    @property
    def ok(self) -> bool:
        """True when all derivatives are finite and their errors meet the request."""
        return self.status is Status.OK

    @property
    def n(self) -> int:
        """Number of punctures."""
        return (3 + math.isqrt(9 + 8 * len(self.channels))) // 2

    def derivative(self, *labels: int) -> tuple[Any, float]:
        """The derivative in one channel, given by its labels or by those of its complement, and its error.

        Raises
        ------
        InputError
            When the labels are no planar channel of the ordering.
        """
        n = self.n
        inside = set(read_labels(labels, n, "channel"))
        for channel, value, error in self:
            if set(channel) in (inside, set(range(1, n + 1)) - inside):
                return value, error
        known = ", ".join(".".join(map(str, channel)) for channel in self.channels)
        raise InputError("channel", ".".join(map(str, labels)), f"one of {known}")

    def __iter__(self) -> Iterator[tuple[Channel, Any, float]]:
        """Channel, derivative and error, one channel after the other."""
        return iter(zip(self.channels, self.derivatives, self.errors, strict=True))

    def __len__(self) -> int:
        return len(self.channels)

    def __str__(self) -> str:
        from .report.text import value_with_error

        names = [f"d/dX_{'.'.join(map(str, channel))}" for channel in self.channels]
        width = max(map(len, names))
        lines = [f"{'value':<{width}}  {self.value}"]
        for name, value, error in zip(names, self.derivatives, self.errors, strict=True):
            lines.append(f"{name:<{width}}  {value_with_error(value, error)}")
        if not self.ok:
            lines.append(f"{self.status.name}: {self.status.advice}")
        return "\n".join(lines)

    def _repr_html_(self) -> str:
        from html import escape

        from .report.faces import html_table
        from .report.text import value_with_error

        def cell(value: Any, error: float) -> str:
            return f"<code>{escape(value_with_error(value, error).replace('+-', '±'))}</code>"

        rows = [("value", cell(self.value.value, self.value.error))]
        rows += [(f"d/dX<sub>{'.'.join(map(str, c))}</sub>", cell(v, e)) for c, v, e in self]
        if not self.ok:
            rows += [("status", f"<b>{self.status.name}</b>"), ("advice", escape(self.status.advice))]
        return html_table((), [*rows, ("evaluations", str(self.evaluations))])

    def to_dict(self) -> dict[str, Any]:
        """A JSON-ready dictionary: numbers as text, complex as ``[re, im]``, never NaN.

        Keys: ``value`` (that of :meth:`Estimate.to_dict`), ``derivatives`` (a list of ``channel``, ``value``,
        ``error``), ``ok, status, advice, evaluations, rtol, atol, details``.
        """
        from .report.plain import plain, plain_number

        return {
            "value": self.value.to_dict(),
            "derivatives": [
                {"channel": list(channel), "value": plain_number(value), "error": plain_number(error)}
                for channel, value, error in self
            ],
            "ok": self.ok,
            "status": self.status.name,
            "advice": self.status.advice,
            "evaluations": self.evaluations,
            "rtol": plain_number(self.rtol),
            "atol": plain_number(self.atol),
            "details": plain(self.details),
        }


def disk_gradient(
    kin: Mandelstams | DiskExponents,
    f: Integrand | DiskIntegral | str | None = None,
    ordering: Sequence[int] | None = None,
    *,
    rtol: float | None = None,
    atol: float = 0,
    max_points: float | None = None,
    threads: int = 1,
) -> Gradient:
    """The derivatives of ``Z_P(f)`` in all planar channels of the ordering, from passes that give the value too.

    ``dZ/dX_c`` holds the other planar channels and all row sums: the four s_ij at the corners of the channel move, by
    +1 or -1 times dX.  Together with the chain rule that is the derivative along any direction of kinematic space
    that conserves momentum.  Works wherever the integral is continued to, for real and complex invariants.

    Parameters
    ----------
    kin
        A kinematic point; or :class:`DiskExponents`, then without ``f``: derivatives in the exponents Y of the chords.
    f
        The integrand: an :class:`Integrand`, its text, or a :class:`DiskIntegral`; constant coefficients.
    ordering
        Labels in their order along the boundary; 1..n when None.
    rtol, atol
        Accuracy: ok when every error is at most ``max(atol, rtol * the largest modulus of a derivative)``.
        None means 1e-8.
    max_points
        Integrand evaluations that may be spent.
    threads
        Python threads; the bits of the result do not depend on it.

    Returns
    -------
    Gradient

    Raises
    ------
    InputError
        For input that is not well formed, and for a function of kinematics as ``f``.
    PoleError
        When the integral has a pole at the point.
    NotAvailableError
        Where poles of single monomials cancel, and for exponents beyond double precision.
    WorkLimitError
        When the predicted work is above ``max_points``.

    Notes
    -----
    Logarithms of the integration variables are inserted by differentiating the quadrature rules, those of the factors
    of the integrand by summing them beside the value; see ``DEVELOPERS.md``.

    Examples
    --------
    >>> import kn_integrate as kn
    >>> kin = kn.Mandelstams.from_planar(4, {(1, 2): "1/2", (2, 3): "1/2"})
    >>> gradient = kn.disk_gradient(kin, "PT(1,2,3,4)")
    >>> print(f"{gradient.derivative(1, 2)[0]:.7f}")  # of B(a, b) in a at 1/2, 1/2: -2 pi log 2
    -4.3551722
    """
    request = make_request(
        rtol=DEFAULT_RTOL if rtol is None else rtol, atol=atol, max_points=max_points, threads=threads
    )
    if callable(f):
        raise InputError(
            "f",
            "a function of kinematics",
            "an integrand with constant coefficients: how a function changes is known to its author only; "
            "use differences of disk_integral, or the product rule",
        )
    family = disk_family(kin, f, ordering)
    terms = family.terms_at({})
    if not terms:
        return _of_nothing(family, request)
    singular = [
        chord for term in terms for chord, y in chord_exponents(family.n, term.pairs).items() if y.is_integer and y <= 0
    ]
    if singular:
        # raises PoleError when the sum has the pole
        integrate_family(family.n, family.terms_at, request, invariants=family.invariants, name=family.name)
        where = ", ".join(".".join(map(str, family.name(chord))) for chord in dict.fromkeys(singular))
        raise NotAvailableError(
            f"poles of single monomials cancel in channels {where}, and their derivatives do not exist one by one; "
            "use differences of disk_integral, or move the point"
        )
    from .disk.gradient import differentiate_terms  # loads the compiler

    found = differentiate_terms(
        family.n,
        terms,
        rtol=request.rtol,
        atol=request.atol,
        max_points=request.max_points,
        threads=request.threads,
    )
    return _gradient(family, terms, request, found)


def _channels(family: DiskFamily) -> tuple[tuple[Channel, ...], list[int]]:
    """The planar channels in the order of :class:`PlanarPoints`, and the place of each among the chords."""
    place = {chord: k for k, chord in enumerate(chords_of(family.n))}
    chords = [family.chord(channel) for channel in planar_channels(family.ordering)]
    names = [family.name(chord) for chord in chords]  # the side without the last leg
    rest = [tuple(sorted(set(family.ordering) - set(name))) for name in names]
    channels = tuple(min(sides, key=len) for sides in zip(names, rest, strict=True))
    return channels, [place[chord] for chord in chords]


def _of_nothing(family: DiskFamily, request: Request) -> Gradient:
    value = Estimate(0.0, 0.0, Status.OK, "exact", 0, request.rtol, request.atol, None, {"choice": "no terms are left"})
    channels = _channels(family)[0]
    zeros = (0.0,) * len(channels)
    return Gradient(value, channels, zeros, zeros, Status.OK, 0, request.rtol, request.atol)


def _gradient(family: DiskFamily, terms: Sequence[Term], request: Request, found: GradientSum) -> Gradient:
    error = found.value_truncation + found.value_roundoff
    value = Estimate(
        found.value,
        error,
        judge(found.value, error, request.rtol, request.atol, found.value_roundoff),
        "quadrature",
        found.points,
        request.rtol,
        request.atol,
        None,
        {
            "terms": len(found.terms),
            "truncation": found.value_truncation,
            "roundoff": found.value_roundoff,
            "plan": [
                {"coefficient": str(term.coefficient), "chords": part.integral.plan(), "passes": part.integral.passes}
                for term, part in zip(terms[:PLANS_SHOWN], found.terms, strict=False)
            ],
        },
    )
    channels, order = _channels(family)
    roundoff = found.roundoff[order]
    derivatives, errors = found.slopes[order].tolist(), found.errors[order].tolist()
    largest = max(map(abs, derivatives))
    worst_place = max(range(len(errors)), key=lambda k: errors[k] if math.isfinite(errors[k]) else math.inf)
    finite = all(math.isfinite(abs(x)) for x in (*derivatives, *errors))
    status = Status.NOT_FINITE
    if finite:
        status = judge(largest, errors[worst_place], request.rtol, request.atol, float(roundoff[worst_place]))
    details = {
        "terms": len(found.terms),
        "truncation": found.truncation[order].tolist(),
        "roundoff": roundoff.tolist(),
    }
    return Gradient(
        value,
        channels,
        tuple(derivatives),
        tuple(errors),
        status,
        found.points,
        request.rtol,
        request.atol,
        details,
    )
