"""Second routes to closed-form values: recurrences, rotations, expansions in a disc."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import mpmath
from massless import big

from kn_integrate.closed_forms import FivePoint
from kn_integrate.exact import ONE, Exact


def five_from_chords(y: Sequence[Any]) -> FivePoint:
    """The five-point integral with the divisor exponents of the channels 12, 23, 34, 45, 51."""
    y12, y23, y34, y45, y51 = (ONE * 0 + x for x in y)
    # a1 = Y_12, a2 = Y_123 = Y_45, c1 = Y_23, c2 = Y_34, and Y_234 = Y_51 = c1 + c2 - a0
    return FivePoint(y23 + y34 - y51, y12, y45, y12 + y23, y45 + y34)


def u_equation_defect(y: Sequence[Exact], chord: int, digits: int) -> Any:
    """|I(Y) - I(Y + e_c) - I(Y + the two chords that cross c)| / |I(Y)|: u_c + prod u_crossing = 1 inside I."""
    raised, crossed = list(y), list(y)
    raised[chord] = raised[chord] + 1
    for other in (chord - 1, (chord + 1) % 5):
        crossed[other] = crossed[other] + 1
    whole, first, second = (five_from_chords(x).value(digits) for x in (y, raised, crossed))
    with mpmath.workdps(digits + 10):
        return abs(whole - first - second) / abs(whole)


def complex_beta_by_discs(a: Exact, ab: Exact, b: Exact, bb: Exact) -> Any:
    """(1/pi) int d^2z z^(a-1) zb^(ab-1) (1-z)^(b-1) (1-zb)^(bb-1), expanded in |z| < 1 and in |z| > 1.

    Angular integration keeps equal powers of z and zb and leaves one 3F2(1) per disc; Re(b + bb) > 0.
    """

    def disc(x: Exact, xb: Exact) -> Any:
        spin = int((x - xb).re)
        if spin < 0:  # the integral with z and zb exchanged
            x, xb, p, left, right = xb, x, -spin, bb, b
        else:
            p, left, right = spin, b, bb
        top = [big(1 - left), big(1 - right + p), big(x)]
        series = mpmath.hyp3f2(*top, p + 1, big(x + 1), 1)
        return mpmath.rf(big(1 - right), p) / mpmath.factorial(p) * series / big(x)

    sign = (-1) ** int((b - bb).re)
    return disc(a, ab) + sign * disc(1 - a - b, 1 - ab - bb)
