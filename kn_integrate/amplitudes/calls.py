r"""Tree amplitudes of the bosonic string, from states to numbers.

Normalisation, stated once.  With S = 1 + i (2 pi)^D delta(sum k) A, metric mostly plus, and an exchanged particle

    ``A -> A_left A_right / (k^2 + m^2)``   as k^2 -> -m^2, summed over its polarisations,

one coupling g for each string fixes everything:

    open,  m gauge bosons among n states:     ``A(P) = (g^(n-2)/alpha') a^(m/2) Z_P(f)``,               a = 2 alpha'
    closed, m massless tensors among n states: ``A = (8 pi g^(n-2)/alpha') (2 pi)^(n-3) a^m J(f_L|f_R)``, a = alpha'/2

with f from :func:`~kn_integrate.amplitudes.wick.vertex_integrand` (each vertex operator carries one g) and the
integrals Z, J of this package.  The prefactor is the functional determinant of the disk (sphere) times g^n.  Derivation
by factorisation on the tachyon: near ``Y = X_12 = 0`` the disk integral is 1/Y times the product of two smaller
integrals, and ``Y = alpha' ((k1+k2)^2 - 1/alpha')``, so a prefactor ``C g^n`` must obey
``C g^n/alpha' = C g^(l+1) C g^(r+1)`` with l + r = n: ``C = 1/(alpha' g^2)``.  On the sphere, in the measure
``d^2z/pi``, ``Y = (alpha'/4)((k1+k2)^2 - 4/alpha')``; with ``C' (2 pi)^(n-3) g^n`` in front,
``(2 pi) C' 4/alpha' = C'^2 g^2``: ``C' = 8 pi/(alpha' g^2)`` (the same as Polchinski, String Theory I, (6.4.14) and
(6.6.8), equation numbers from memory; his d^2z is twice ours).  The factor ``a^(1/2)`` of a massless vertex is fixed in
the same way by a massless pole.  Chan-Paton factors are not included: ``ordering=None`` sums all (n-1)! cyclic
orderings, the amplitude of the theory with one brane.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from itertools import permutations
from typing import Any

from ..channels import Channel, read_ordering
from ..dispatch.request import Request, make_request
from ..errors import NotAvailableError, PoleError, Status
from ..estimate import Estimate, judge
from ..exact import ONE, ZERO, Exact, read
from ..integrand import Integrand
from ..kinematics import Mandelstams
from .basis import UNIT, Chiral, Value, context, to_context
from .klt import bilinear
from .reduction import ResonanceError
from .states import State, check_shells, kinematics_of, read_alpha_prime, read_states
from .wick import chiral_coupling, contraction

METHODS = ("auto", "reduction", "monomials")
_STEPS = (None, 25, 45, 90)


def open_amplitude(
    states: Sequence[State],
    ordering: Sequence[int] | None = None,
    alpha_prime: Any = 1,
    *,
    coupling: Any = 1,
    rtol: float | None = None,
    atol: float = 0,
    digits: int | None = None,
    method: str = "auto",
) -> Estimate:
    """The tree amplitude of open-string tachyons and gauge bosons.

    Parameters
    ----------
    states
        ``tachyon(k)`` and ``gauge_boson(k, e)``, at least three, all incoming.
    ordering
        Labels along the boundary: the colour-ordered amplitude.  None sums all cyclic orderings.
    alpha_prime
        ``s_ij = 2 alpha' k_i.k_j``.
    coupling
        g; see the text of the module for the normalisation.
    rtol, atol, digits
        As for :func:`kn_integrate.disk_integral`.
    method
        ``"reduction"``: integration by parts in exact arithmetic to (n-3)! functions, which share one run of the series
        engine; ``"monomials"``: every monomial of the contraction by :func:`kn_integrate.disk_integral`;
        ``"auto"``: the first, or the second where the first has no value.

    Returns
    -------
    Estimate
        Exactly zero with error 0 where exact input makes the integrand a total derivative.

    Raises
    ------
    InputError
        States off the mass shell, momenta that do not add up to zero, polarisations that are not transverse.
    PoleError
        On a pole.
    NotAvailableError
        ``method="reduction"`` at a resonance of the reduction.

    Examples
    --------
    >>> from kn_integrate.amplitudes import tachyon
    >>> k = [(0, "4/5", "3/5"), (0, "3/5", "4/5"), (0, "-4/5", "-3/5"), (0, "-3/5", "-4/5")]
    >>> A = open_amplitude([tachyon(q) for q in k], ordering=(1, 2, 3, 4))  # Gamma(73/25) Gamma(-23/25)
    >>> print(f"{A.value:.10f}", A.ok)
    -24.2545362968 True
    """
    found = read_states(states, "open")
    request = make_request(rtol=rtol, atol=atol, digits=digits, method=method, methods=METHODS)
    alpha = read_alpha_prime(alpha_prime)
    g = read(coupling, "coupling")[0]
    n = len(found)
    a = chiral_coupling("open", alpha)
    bosons = sum(not state.is_tachyon for state in found)
    factor, root = g ** (n - 2) / alpha * a ** (bosons // 2), (a if bosons % 2 else ONE)
    orders, weight = orderings(n, ordering, bosons)
    f = _integrand(found, alpha, a, "left")
    if n == 3:
        total = sum((_three(f, order) for order in orders), ZERO)
        return judged(request, "exact", {}, lambda d: scaled(plain(total, d), weight * factor, root, d), (digits,))
    kin = kinematics_of(found, alpha)
    details = {"monomials": len(f.terms), "orderings": len(orders) * weight}
    if request.method != "monomials":
        try:
            chiral = Chiral(kin, f)
            return judged(
                request,
                "kz",
                {**details, "choice": "monomials reduced by parts to F functions", "techniques": ("by-parts",)},
                lambda d: scaled(summed([chiral.value(order, d) for order in orders], d), weight * factor, root, d),
            )
        except (ResonanceError, PoleError, NotAvailableError, ZeroDivisionError) as error:
            if request.method == "reduction":
                if isinstance(error, (PoleError, NotAvailableError)):
                    raise
                raise NotAvailableError(f"the reduction has no value at this point ({error})") from None
    return _by_monomials(kin, f, orders, weight * factor, root, request, details)


def closed_amplitude(
    states: Sequence[State],
    alpha_prime: Any = 1,
    *,
    coupling: Any = 1,
    rtol: float | None = None,
    atol: float = 0,
    digits: int | None = None,
    method: str = "auto",
) -> Estimate:
    """The tree amplitude of closed-string tachyons and massless tensors.

    Parameters
    ----------
    states
        ``closed_tachyon(k)`` and ``massless_tensor(k, left, right)``, at least three.
    alpha_prime
        ``s_ij = (alpha'/2) k_i.k_j``.
    coupling
        g; see the text of the module.
    rtol, atol, digits
        As for :func:`kn_integrate.disk_integral`.
    method
        ``"reduction"``: both chiral halves reduced by parts in exact arithmetic; ``"monomials"``: every product of
        monomials by :func:`kn_integrate.sphere_integral`; ``"auto"``: the first, or the second where it has no value.

    Notes
    -----
    Both chiral halves are reduced by parts, and joined by the bilinear relation of Kawai, Lewellen and Tye 1986.

    Raises
    ------
    InputError, PoleError
        As :func:`open_amplitude`.
    NotAvailableError
        ``method="reduction"`` where single disk integrals have poles or the reduction a resonance.
    """
    found = read_states(states, "closed")
    request = make_request(rtol=rtol, atol=atol, digits=digits, method=method, methods=METHODS)
    alpha = read_alpha_prime(alpha_prime)
    g = read(coupling, "coupling")[0]
    n = len(found)
    a = chiral_coupling("closed", alpha)
    tensors = sum(not state.is_tachyon for state in found)
    factor = g ** (n - 2) * 8 / alpha * a**tensors
    left, right = (_integrand(found, alpha, a, side) for side in ("left", "right"))

    def with_pi(value: Value, d: int | None) -> Value:
        # 8 pi (2 pi)^(n-3)
        if d is None:
            from math import pi

            number = pi * (2 * pi) ** (n - 3)
        else:
            ctx = context(d)
            number = ctx.pi * (2 * ctx.pi) ** (n - 3)
        error = value.error * float(number) + 4 * (UNIT if d is None else 10.0**-d) * float(abs(value.value * number))
        return scaled(Value(value.value * number, error), factor, ONE, d)

    if n == 3:
        product = sum((term.coefficient for term in left.terms), ZERO) * sum(
            (term.coefficient for term in right.terms), ZERO
        )
        return judged(request, "exact", {}, lambda d: with_pi(plain(product, d), d), (digits,))
    kin = kinematics_of(found, alpha)
    details: dict[str, Any] = {"monomials": f"{len(left.terms)} x {len(right.terms)}"}
    if request.method != "monomials":
        try:
            halves = Chiral(kin, left), Chiral(kin, right)
            reduced = {**details, "techniques": ("by-parts", "kleiss-kuijf")}
            return judged(request, "klt+kz", reduced, lambda d: with_pi(bilinear(*halves, d), d))
        except (ResonanceError, PoleError, NotAvailableError, ZeroDivisionError) as error:
            if request.method == "reduction":
                raise NotAvailableError(f"the reduction has no value at this point ({error})") from None
    from ..sphere.evaluate import sphere_integral

    found_integral = sphere_integral(
        kin, left, _conjugated(right), rtol=request.rtol, atol=request.atol, digits=request.digits
    )
    value = Value(found_integral.value, found_integral.error)
    result = judged(request, found_integral.method, details, lambda d: with_pi(value, request.digits), (None,))
    return replace(result, evaluations=found_integral.evaluations)


def _conjugated(f: Integrand) -> Integrand:
    return Integrand(replace(term, coefficient=term.coefficient.conjugate()) for term in f.terms)


def _integrand(states: Sequence[State], alpha: Exact, a: Exact, side: str) -> Integrand:
    check_shells(states, alpha)
    return contraction(states, a, side)


def orderings(n: int, ordering: Sequence[int] | None, bosons: int) -> tuple[tuple[Channel, ...], int]:
    """Orderings to compute, and how often each counts: a reversed ordering gives ``(-1)^bosons`` times the same."""
    if ordering is not None:
        return (read_ordering(ordering, n),), 1
    if bosons % 2:
        return (), 0
    words = ((1, *word) for word in permutations(range(2, n + 1)))
    return tuple(word for word in words if word[1] < word[-1]), 2


def _three(f: Integrand, ordering: Channel) -> Exact:
    """Three punctures: nothing is integrated, every monomial times the Koba-Nielsen factor is a sign."""
    place = {label: k for k, label in enumerate(ordering)}
    total = ZERO
    for term in f.terms:
        odd = sum(k for (i, j), k in term.powers if place[i] < place[j]) % 2
        total = total - term.coefficient if odd else total + term.coefficient
    return total


# --- numbers --------------------------------------------------------------------------------------------------------


def plain(value: Exact, digits: int | None) -> Value:
    """An exact number in the arithmetic of a step."""
    if digits is None:
        return Value(value.value(), 2 * UNIT * abs(value))
    return Value(to_context(context(digits), value), 4 * 10.0 ** (-digits - 10) * abs(value))


def summed(values: Sequence[Value], digits: int | None) -> Value:
    """The sum with the sum of the bounds."""
    total = sum(value.value for value in values) if values else 0.0
    slack = len(values) * (UNIT if digits is None else 10.0 ** (-digits - 10))
    return Value(total, sum(value.error + slack * float(abs(value.value)) for value in values))


def scaled(value: Value, factor: Exact, root: Exact, digits: int | None) -> Value:
    """``factor sqrt(root) value``."""
    if digits is None:
        number = factor.value() * float(root) ** 0.5
        unit = UNIT
    else:
        ctx = context(digits)
        number = to_context(ctx, factor) * ctx.sqrt(to_context(ctx, root))
        unit = 10.0 ** (-digits - 9)
    result = value.value * number
    return Value(result, float(abs(number)) * value.error + 4 * unit * float(abs(result)))


def judged(
    request: Request,
    method: str,
    details: dict[str, Any],
    compute: Callable[[int | None], Value],
    steps: tuple[int | None, ...] = _STEPS,
) -> Estimate:
    """The result in double precision, or with more digits until it is accurate enough."""
    if request.digits is not None:
        steps = tuple(request.digits + extra for extra in (0, 15, 40))
    for step in steps:
        value = compute(step)
        number: Any = value.value
        error = value.error
        if request.digits is None:
            if step is not None:
                number = complex(number) if _is_complex(number) else float(number)
                error += UNIT * abs(number)
            status = judge(complex(number), error, request.rtol, request.atol, error)
        else:
            status = judge(complex(number), error, request.rtol, request.atol, error)
        if status is Status.OK or not value.error:
            break
    if request.digits is not None:
        number = _global(number)
    if step is not None and request.digits is None:
        details = {**details, "digits used": step}
    if status is Status.ZERO and not error:
        status = Status.OK
    return Estimate(number, error, status, method, 0, request.rtol, request.atol, request.digits, details)


def _global(number: Any) -> Any:
    """A number of a private context as one of mpmath's own, which can be pickled."""
    from mpmath import mp

    return mp.make_mpc(number._mpc_) if hasattr(number, "_mpc_") else mp.make_mpf(number._mpf_)


def _is_complex(number: Any) -> bool:
    return hasattr(number, "_mpc_") or isinstance(number, complex)


def _by_monomials(
    kin: Mandelstams,
    f: Integrand,
    orders: Sequence[Channel],
    factor: Exact,
    root: Exact,
    request: Request,
    details: dict[str, Any],
) -> Estimate:
    from ..api import disk_integral

    parts = [
        disk_integral(kin, f, ordering=order, rtol=request.rtol, atol=request.atol, digits=request.digits)
        for order in orders
    ]
    total = scaled(
        summed([Value(part.value, part.error) for part in parts], request.digits), factor, root, request.digits
    )
    evaluations = sum(part.evaluations for part in parts)
    method = "+".join(dict.fromkeys(part.method for part in parts)) or "exact"
    result = judged(request, method, details, lambda _: total, (None,))
    return replace(result, evaluations=evaluations)
