r"""Closed strings from two chiral halves: the bilinear of Kawai, Lewellen and Tye.

    ``J = -pi^-(n-3) sum over r, t of Z_(1,r,n,n-1)(left) S[r|t] Z_(1,t,n-1,n)(right)``,
    ``S[A,j | B,j,C] = sin pi(s_1j + sum_(b in B) s_jb) S[A | B,C]``,  S[|] = 1

(KLT 1986; the kernel in this form: Bjerrum-Bohr, Damgaard, Feng, Sondergaard and Vanhove 2010, arXiv:1010.3933).
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import permutations
from typing import Any, TypeAlias

from ..exact import Exact
from ..kinematics import Mandelstams
from .basis import UNIT, Chiral, Value, context, to_context

Half: TypeAlias = Callable[[tuple[int, ...], int | None], Value]


def kernel(kin: Mandelstams, r: Sequence[int], t: Sequence[int], ctx: Any) -> Any:
    """``S[r|t]/pi^(n-3)`` in an mpmath context."""
    r, t = tuple(r), tuple(t)
    value = ctx.mpf(1)
    while r:
        j = r[-1]
        place = t.index(j)
        x = sum((kin.pair(j, b) for b in t[:place]), kin.pair(1, j))
        value = value * sine(x, ctx) / ctx.pi
        r, t = r[:-1], t[:place] + t[place + 1 :]
    return value


def sine(x: Exact, ctx: Any) -> Any:
    """``sin(pi x)``, with the period taken off exactly."""
    whole = round(x.re)
    value = ctx.sinpi(to_context(ctx, x - whole))
    return -value if whole % 2 else value


def bilinear(left: Chiral, right: Chiral, digits: int | None) -> Value:
    """``J(left|right)``: both integrands at the same kinematic point, the right one at ``conj(z)`` as it stands.

    Raises
    ------
    PoleError, NotAvailableError, ZeroDivisionError
        Where a single disk integral has no value.
    """
    return joined(left.massless, left.value, right.value, digits)


def joined(kin: Mandelstams, left: Half, right: Half, digits: int | None) -> Value:
    """The bilinear of any two functions of orderings with the monodromies of disk integrals."""
    n = kin.n
    words = list(permutations(range(2, n - 1)))
    a = {r: left((1, *r, n, n - 1), digits) for r in words}
    b = {t: right((1, *t, n - 1, n), digits) for t in words}
    ctx = context(15 if digits is None else digits)
    unit = UNIT if digits is None else 10.0 ** (-digits - 8)
    total: Any = 0.0 if digits is None else ctx.mpf(0)
    error = 0.0
    for r in words:
        for t in words:
            s = kernel(kin, r, t, ctx)
            if digits is None:
                s = float(s) if isinstance(s, ctx.mpf) else complex(s)
            size = float(abs(s))
            x, y = a[r], b[t]
            total = total - x.value * s * y.value
            xs, ys = float(abs(x.value)), float(abs(y.value))
            error += size * (x.error * ys + xs * y.error + x.error * y.error + 8 * unit * xs * ys)
    return Value(total, error)
