r"""Massless tree amplitudes of the superstring (bosonic external states).

    ``A(1, r, n-1, n) = 2 (g/sqrt(2 alpha'))^(n-2) sum_w F_{r,w} A_YM(1, w, n-1, n)``

(Mafra, Schlotterer, Stieberger 2011, arXiv:1106.2645), other orderings by relabelling; F -> 1 + zeta(2) ... as
alpha' -> 0, so that the Yang-Mills amplitude of coupling ``g/sqrt(2 alpha')`` is the limit.  It is also the limit of
the bosonic string with the same g, which fixes the normalisation.  Closed strings by the bilinear of Kawai, Lewellen
and Tye:

    ``A = 4 (pi g)^(n-2) (4/alpha')^(n-3) (-1)/pi^(n-3) sum B_L(1,r,n,n-1) S[r|t] B_R(1,t,n-1,n)``,   B = F A_YM,

at ``s_ij = (alpha'/2) k_i.k_j``; the limit is the tree of gravitons, dilatons and B fields, the same as of the bosonic
string with the same g.
"""

from __future__ import annotations

from collections.abc import Sequence
from itertools import permutations
from math import pi
from typing import Any

from ..channels import Channel, dotted, pair_order
from ..dispatch.request import make_request
from ..errors import InputError, NotAvailableError, PoleError
from ..estimate import Estimate
from ..exact import ONE, ZERO, Exact, read
from ..kz.point import Point
from .basis import UNIT, Value, context, contracted, functions
from .calls import judged, orderings, plain, scaled, summed
from .klt import joined
from .states import State, check_shells, kinematics_of, read_alpha_prime, read_states
from .yang_mills import Currents


class _Half:
    """One chiral half: F times Yang-Mills amplitudes."""

    def __init__(self, states: Sequence[State], alpha: Exact, side: str) -> None:
        self.n = len(states)
        self.massless = kinematics_of(states, alpha)
        self.currents = Currents(states, side)
        self._known: dict[tuple[Channel, int | None], Value] = {}

    def value(self, ordering: Channel, digits: int | None) -> Value:
        """The superstring amplitude of an ordering, in the normalisation of ``yang_mills_amplitude``."""
        key = (ordering, digits)
        if key not in self._known:
            n, pair = self.n, self.massless.pair
            point = Point(n, tuple(pair(ordering[i - 1], ordering[j - 1]) for i, j in pair_order(n)))
            for (i, j), x in point.planar().items():
                channel = tuple(sorted(ordering[i - 1 : j]))
                if x.is_integer and x <= 0:
                    raise PoleError(channel, -int(x), x)
            found = functions(point, digits)
            try:
                vector = [
                    self.currents.amplitude((ordering[0], *(ordering[k - 1] for k in word), ordering[-2], ordering[-1]))
                    for word in permutations(range(2, n - 1))
                ]
            except PoleError as error:  # a channel that is not planar in this ordering: F vanishes there
                raise NotAvailableError(
                    f"channel {dotted(error.channel)} vanishes: a pole of single terms that cancels; move the point"
                ) from None
            self._known[key] = contracted(vector, found.values, found.errors, digits)
        return self._known[key]


def open_superstring_amplitude(
    states: Sequence[State],
    ordering: Sequence[int] | None = None,
    alpha_prime: Any = 1,
    *,
    coupling: Any = 1,
    rtol: float | None = None,
    atol: float = 0,
    digits: int | None = None,
) -> Estimate:
    """The tree amplitude of gauge bosons of the open superstring.

    Parameters
    ----------
    states
        ``gauge_boson(k, e)``, at least three.
    ordering, alpha_prime, coupling, rtol, atol, digits
        As for :func:`kn_integrate.open_amplitude`.

    Raises
    ------
    InputError
        For other states than gauge bosons, and as there.
    PoleError
        On a pole.
    """
    found = _massless(states, "open")
    request = make_request(rtol=rtol, atol=atol, digits=digits)
    alpha = read_alpha_prime(alpha_prime)
    g = read(coupling, "coupling")[0]
    n = len(found)
    orders, weight = orderings(n, ordering, n)
    a = 2 * alpha
    factor = 2 * g ** (n - 2) / a ** ((n - 1) // 2)
    root = a if n % 2 else ONE
    check_shells(found, alpha)
    if n == 3:
        currents = Currents(found, "left")
        total = sum((currents.amplitude(order) for order in orders), ZERO)
        return judged(request, "exact", {}, lambda d: scaled(plain(total, d), weight * factor, root, d), (digits,))
    half = _Half(found, alpha, "left")
    return judged(
        request,
        "kz",
        {"choice": "F functions and Yang-Mills amplitudes", "techniques": ("superstring", "berends-giele")},
        lambda d: scaled(summed([half.value(order, d) for order in orders], d), weight * factor, root, d),
    )


def closed_superstring_amplitude(
    states: Sequence[State],
    alpha_prime: Any = 1,
    *,
    coupling: Any = 1,
    rtol: float | None = None,
    atol: float = 0,
    digits: int | None = None,
) -> Estimate:
    """The tree amplitude of massless tensors (NS-NS states) of the closed superstring.

    Parameters
    ----------
    states
        ``massless_tensor(k, left, right)``, at least three.
    alpha_prime, coupling, rtol, atol, digits
        As for :func:`kn_integrate.closed_amplitude`.

    Raises
    ------
    InputError, PoleError
    """
    found = _massless(states, "closed")
    request = make_request(rtol=rtol, atol=atol, digits=digits)
    alpha = read_alpha_prime(alpha_prime)
    g = read(coupling, "coupling")[0]
    n = len(found)
    check_shells(found, alpha)
    factor = 4 * g ** (n - 2) * (4 / alpha) ** (n - 3)

    def with_pi(value: Value, d: int | None) -> Value:
        number = pi ** (n - 2) if d is None else context(d).pi ** (n - 2)
        error = value.error * float(number) + n * (UNIT if d is None else 10.0**-d) * float(abs(value.value * number))
        return scaled(Value(value.value * number, error), factor, ONE, d)

    if n == 3:
        product = Currents(found, "left").amplitude((1, 2, 3)) * Currents(found, "right").amplitude((1, 2, 3))
        return judged(request, "exact", {}, lambda d: with_pi(plain(product, d), d), (digits,))
    halves = _Half(found, alpha, "left"), _Half(found, alpha, "right")
    return judged(
        request,
        "klt+kz",
        {
            "choice": "two chiral halves, each F functions and Yang-Mills amplitudes",
            "techniques": ("superstring", "berends-giele"),
        },
        lambda d: with_pi(joined(halves[0].massless, halves[0].value, halves[1].value, d), d),
    )


def _massless(states: Sequence[State], string: str) -> tuple[State, ...]:
    found = read_states(states, string)
    for place, state in enumerate(found, start=1):
        if state.is_tachyon:
            raise InputError(f"states, entry {place}", state.kind, "a massless state (the superstring has no tachyon)")
    return found
