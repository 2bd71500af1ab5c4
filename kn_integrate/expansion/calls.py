"""The public call: from an integral and a kinematic point to its expansion in alpha'."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from itertools import combinations
from math import factorial, gcd, lcm
from typing import Any

from ..errors import InputError, KNError, NotAvailableError, WorkLimitError
from ..exact import Exact, read_integer
from ..integrals import DiskIntegral, SphereIntegral
from ..integrand import Integrand
from ..kinematics import Mandelstams
from ..ratios import shown
from .balls import Ball
from .chains import Word
from .lines import Series
from .numeric import GUARD, ball_of, ball_with, bits_of, fixed_zeta
from .recursion import ball_engine
from .relations import recognise_ball
from .result import AlphaSeries, Coefficient
from .specs import FEntry, Spec, check, is_uniform, kind_of, leading_order, read_spec, series_of
from .zetas import MAX_WEIGHT, ZetaSum

METHODS = ("auto", "associator", "recursion")
MAX_DIGITS = 2000
MAX_WORK = 1e8  # about a microsecond each
MAX_ENTRIES = 1e6  # of a few hundred bytes each
EXACT_DENOMINATOR = 10**12  # beyond this a rational point is a rounded one, and its exact coefficients are of no use
_CONFIRM_DISK, _CONFIRM_SPHERE = 7, 6  # the largest n for which "auto" runs the second engine too
_CONFIRM_DIGITS = 30


def alpha_expansion(
    kin: Mandelstams,
    f: Integrand | DiskIntegral | SphereIntegral | FEntry | str,
    g: Integrand | str | None = None,
    *,
    ordering: Sequence[int] | None = None,
    weight: int = 8,
    digits: int | None = None,
    method: str = "auto",
) -> AlphaSeries:
    """The low-energy expansion of a disk or sphere integral at a kinematic point.

    All invariants are multiplied by alpha'; weight w of the multiple zeta values stands at ``alpha'^(w - (n - 3))``, so
    the field-theory limit is weight 0.  (With double poles in the integrand weights mix: coefficient w then still
    stands at that power, and has zeta values of weights up to w.)  On the disk the integral is ``Z_P(f)``; with ``g``,
    or a :class:`SphereIntegral`, it is ``J(f|g)`` on the sphere.  An :class:`FEntry` has weight w at ``alpha'^w``.

    Parameters
    ----------
    kin
        Massless kinematics.
    f
        An integrand, its text, an integral, or an FEntry.
    g
        The second integrand, for the sphere.
    ordering
        The ordering P on the disk; 1..n when None.
    weight
        The highest weight, 0 to 12.
    digits
        Digits of the numbers; None for doubles.
    method
        ``"associator"``: exact rational combinations of multiple zeta values, derived.  ``"recursion"``: numbers from
        power series, recognised by integer relations where the digits suffice (with ``digits`` given, no more than
        these are used).  ``"auto"``: the associator, confirmed by numbers from the recursion where these come in
        seconds (up to seven points on the disk, five or six on the sphere); numbers alone, unrecognised, for a point
        that is not exact (with a denominator above 10^12, as floating-point input has).

    Returns
    -------
    AlphaSeries
        ``.exact`` and ``.numeric`` by weight; each coefficient says what it rests on.

    Raises
    ------
    InputError
        For kinematics that are not massless, an integrand that is not Moebius covariant, a bad weight or ordering.
    PoleError
        When the integral has a pole for every alpha' because a channel vanishes.
    WorkLimitError
        For too many legs at too high a weight.
    NotAvailableError
        For method="associator" at a point that is not exact.

    Notes
    -----
    The exact coefficients are theorems up to programming errors; the agreement with the second engine is evidence
    against those.  A recognised number is evidence only, with its odds stated.

    Examples
    --------
    >>> import kn_integrate as kn
    >>> kin = kn.Mandelstams.from_planar(4, {(1, 2): 1, (2, 3): 2})
    >>> series = kn.alpha_expansion(kin, kn.parke_taylor(1, 2, 3, 4), weight=3)
    >>> [str(c) for c in series.exact]
    ['3/2', '0', '-3*zeta(2)', '9*zeta(3)']
    """
    if not isinstance(kin, Mandelstams):
        raise InputError("kin", type(kin).__name__, "Mandelstams")
    spec = read_spec(kin.n, f, g, ordering)
    top = read_integer(weight, "weight")
    if not 0 <= top <= MAX_WEIGHT:
        raise InputError("weight", shown(weight), f"a weight from 0 to {MAX_WEIGHT}")
    if digits is not None and not 1 <= read_integer(digits, "digits") <= MAX_DIGITS:
        raise InputError("digits", shown(digits), f"a number of digits from 1 to {MAX_DIGITS}")
    if method not in METHODS:
        raise InputError("method", shown(method), "one of " + ", ".join(METHODS))
    check(spec, kin)
    _limit_work(spec, top)
    problem = _not_exact(kin)
    if method == "associator" and problem:
        raise NotAvailableError(f"method='associator' needs an exact point: {problem}")
    if method == "recursion" or problem:
        return _from_numbers(spec, kin, top, digits, problem)
    return _from_words(spec, kin, top, digits, method == "auto")


def _limit_work(spec: Spec, weight: int) -> None:
    """Refuse what would take hours: products of a matrix entry and a number, over all words of all steps."""
    m = spec.n - 4
    entries = factorial(m) * ((3 ** (m + 1) - 1) // 4 + 1)
    runs = 2 * factorial(spec.n - 3) if isinstance(spec, SphereIntegral) else 1
    work = runs * entries * 2**weight
    if entries > MAX_ENTRIES:
        raise WorkLimitError(entries, MAX_ENTRIES, "matrix entries", "fewer legs")
    if work > MAX_WORK:
        raise WorkLimitError(work, MAX_WORK, "exact products", "lower weight=")


def _not_exact(kin: Mandelstams) -> str:
    """Why the point is not treated as exact; empty when it is."""
    if kin.shift:
        return "its invariants were floating-point numbers that had to be moved to conserve momentum"
    size = lcm(*(value.as_ratio()[2] for value in kin.pairs))
    if size > EXACT_DENOMINATOR:
        return f"the common denominator of the invariants has {len(str(size))} digits, as of rounded numbers"
    return ""


# --- exact ----------------------------------------------------------------------------------------------------------


def _from_words(spec: Spec, kin: Mandelstams, weight: int, digits: int | None, confirm: bool) -> AlphaSeries:
    exact = series_of(spec, kin, weight)
    small = _is_quick(spec, kin)
    details: dict[str, Any] = {}
    basis = "derived"
    if confirm and small:
        agreed = _confirm(spec, kin, weight, exact)
        details["confirmed_digits"] = agreed
        basis = f"derived, confirmed by numbers to {agreed} digits"
    elif confirm:
        details["confirmed_digits"] = None
    coefficients = []
    for w, value in enumerate(exact):
        number, error = _number(value, digits)
        coefficients.append(Coefficient(w, w + leading_order(spec), number, error, value, digits, basis))
    method = "associator+klt" if isinstance(spec, SphereIntegral) else "associator"
    if confirm and small:
        method += "+recursion"
    return AlphaSeries(kin.n, leading_order(spec), _described(spec, kin), tuple(coefficients), method, details)


def _is_quick(spec: Spec, kin: Mandelstams) -> bool:
    """Whether numbers from the second engine come in seconds."""
    if not isinstance(spec, SphereIntegral):
        return kin.n <= _CONFIRM_DISK
    # with a vanishing channel the sphere needs many points on a line: a minute at six points
    channels = (c for size in range(2, kin.n - 1) for c in combinations(range(1, kin.n), size))
    return kin.n < _CONFIRM_SPHERE or (kin.n == _CONFIRM_SPHERE and all(kin.channel(c) for c in channels))


def _number(value: ZetaSum, digits: int | None) -> tuple[Any, float]:
    if not value:
        return (0.0 if digits is None else value.value(digits)), 0.0
    wanted = 20 if digits is None else digits
    return _rounded(ball_with(wanted, lambda bits: ball_of(value, bits)), digits)


def _rounded(ball: Ball, digits: int | None) -> tuple[Any, float]:
    """The number a caller gets, and a bound on its error, the rounding included."""
    if ball.contains_zero():  # no digit is known; what the midpoint is says nothing
        around = Ball(0, 0, max(abs(ball.re), abs(ball.im)) + ball.error, ball.bits)
        if digits is None and not around.error_number() < 1e308:
            raise InputError("digits", "None", "digits=, for a coefficient beyond the range of doubles")
        return (0.0 if digits is None else around.number(digits)), around.error_number()
    number = ball.number(20 if digits is None else digits)
    size = float(abs(number))
    if digits is None:
        if not size < 1e308:
            raise InputError("digits", "None", "digits=, for a coefficient beyond the range of doubles")
        plain: Any = complex(number) if ball.im else float(number)
        return plain, ball.error_number() + size * 2.0**-52
    return number, ball.error_number() + size * 2.0 ** -min(bits_of(digits), 1000)


def _confirm(spec: Spec, kin: Mandelstams, weight: int, exact: Series) -> int:
    """Compare with the second engine; the number of digits in which all coefficients agree."""
    point, scale = _near_one(kin)
    bits = bits_of(_CONFIRM_DIGITS) + GUARD + _growth(kin, weight)
    wanted = bits_of(_CONFIRM_DIGITS)
    for _ in range(4):
        least = 10 * wanted
        for w, (value, ball) in enumerate(zip(exact, _ball_series(spec, point, weight, bits), strict=True)):
            derived = ball_of(value * Exact(Fraction(2) ** (-scale * (w + leading_order(spec)))), bits)
            difference = derived - ball
            if not difference.contains_zero():
                raise KNError(f"two derivations of the coefficient of weight {w} disagree; please report this point")
            if value:
                least = min(least, max(abs(derived.re), abs(derived.im)).bit_length() - difference.error.bit_length())
        if least >= wanted:
            break
        bits += wanted - least + 4
    return max(int(least * 0.30103), 0)


# --- numbers --------------------------------------------------------------------------------------------------------


def _near_one(kin: Mandelstams) -> tuple[Mandelstams, int]:
    """The point scaled so that the largest invariant is about 1, and the binary exponent of what it was.

    Coefficients are homogeneous, so this loses nothing, and numbers with a fixed number of bits like it.
    """
    ratios = [value.as_ratio() for value in kin.pairs if value]
    scale = max((max(abs(p), abs(q)).bit_length() - d.bit_length() for p, q, d in ratios), default=0)
    return (kin.scaled(Exact(Fraction(2) ** -scale)) if scale else kin), scale


def _content(kin: Mandelstams) -> Exact:
    """The largest rational number of which all invariants are integer multiples."""
    ratios = [value.as_ratio() for value in kin.pairs]
    bottom = lcm(*(d for _, _, d in ratios))
    top = gcd(*(part * (bottom // d) for p, q, d in ratios for part in (p, q)))
    return Exact(Fraction(top or 1, bottom))


def _growth(kin: Mandelstams, weight: int) -> int:
    """Bits that numbers of the recursion lose at invariants of about 1, roughly; too few only cost a second run."""
    return (weight + kin.n) * kin.n.bit_length() + 8


def _ball_series(spec: Spec, kin: Mandelstams, weight: int, bits: int) -> Series:
    known: dict[Mandelstams, dict[Word, list[Ball]]] = {}

    def engine(point: Mandelstams, top: int) -> dict[Word, list[Ball]]:
        if point not in known:
            known[point] = ball_engine(point, top, bits)
        return known[point]

    zeta2 = Ball(fixed_zeta((2,), bits), 0, 1 << 24, bits)
    return series_of(spec, kin, weight, engine, Ball(0, 0, 0, bits), zeta2)


def _from_numbers(spec: Spec, kin: Mandelstams, weight: int, digits: int | None, problem: str) -> AlphaSeries:
    wanted = 20 if digits is None else digits
    point, scale = _near_one(kin)
    series = _with_digits(spec, point, weight, wanted)
    balls = list(series)
    exact: list[ZetaSum | None] = [None] * (weight + 1)
    basis = [f"a number only: {problem}"] * (weight + 1)
    if not problem:
        uniform = is_uniform(spec)
        content = _content(kin)
        # relations are looked for at coprime integer invariants, where they have the smallest integers
        to_integers = Exact(Fraction(2) ** scale) / content
        used = wanted
        missing = list(range(weight + 1))
        while missing:
            for w in missing:
                order = w + leading_order(spec)
                ball = _limited(balls[w], digits) * to_integers**order
                found = recognise_ball(ball, (w,) if uniform else range(w + 1))
                exact[w] = None if found.exact is None else found.exact * content**order
                basis[w] = _basis_text(found, digits is not None)
            missing = [w for w in missing if exact[w] is None]
            # with digits= given these are all there are; otherwise take more while that is cheap
            if digits is not None or used >= 500 or not missing:
                break
            used = 60 if used < 60 else 2 * used
            balls = _with_digits(spec, point, weight, used)
    coefficients = []
    for w, ball in enumerate(series):
        order = w + leading_order(spec)
        number, error = _rounded(ball.times_power_of_two(scale * order), digits)
        coefficients.append(Coefficient(w, order, number, error, exact[w], digits, basis[w]))
    method = "recursion" + ("+klt" if isinstance(spec, SphereIntegral) else "") + ("" if problem else "+relations")
    return AlphaSeries(kin.n, leading_order(spec), _described(spec, kin), tuple(coefficients), method)


def _limited(ball: Ball, digits: int | None) -> Ball:
    """A ball as uncertain as the digits that were asked for: guard digits are not evidence."""
    if digits is None:
        return ball
    size = max(abs(ball.re), abs(ball.im), 1 << ball.bits)
    return Ball(ball.re, ball.im, max(ball.error, size // 10**digits), ball.bits)


def _basis_text(found: Any, limited: bool) -> str:
    if found.exact is not None:
        return (
            f"recognised from {found.digits:.0f} digits, integers of up to {found.height:.0f} digits, "
            f"expected number of accidents 1e-{found.margin:.0f}"
        )
    advice = "; give more digits=, or none" if limited else ""
    return f"a number only: {found.digits:.0f} digits do not single out a relation{advice}"


def _with_digits(spec: Spec, kin: Mandelstams, weight: int, digits: int) -> Series:
    """Balls with so many digits of the natural size of each coefficient."""
    bits = bits_of(digits) + GUARD + _growth(kin, weight)
    for _ in range(3):
        series = _ball_series(spec, kin, weight, bits)
        lacking = 0
        for ball in series:
            size = max(abs(ball.re), abs(ball.im), 1 << bits)  # a coefficient may vanish: then absolute digits
            lacking = max(lacking, (ball.error * 10 ** (digits + 1)).bit_length() - size.bit_length())
        if lacking <= 0:
            break
        bits += lacking + 8
    return series


def _described(spec: Spec, kin: Mandelstams) -> dict[str, Any]:
    return {"kind": kind_of(spec), **spec.to_dict(), "kinematics": kin.to_dict()}
