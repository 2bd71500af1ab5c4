"""A disk integral at one kinematic point, poles of single terms included."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from typing import Any

from ..disk.terms import Term, predict
from ..errors import KNError, PoleError
from ..estimate import Estimate, judge
from ..exact import ZERO, Exact
from .circle import Laurent, choose_circle, laurent, pole_places
from .engines import evaluate
from .request import Request, make_request
from .shifts import Chord, chord_exponents, chords_of, pair_shift

Shift = Mapping[Chord, Exact]
TermsAt = Callable[[Shift], Sequence[Term]]

_SLANT = (Fraction(3, 8), Fraction(-5, 16), Fraction(7, 16), Fraction(-1, 4), Fraction(5, 13), Fraction(-4, 11))


@dataclass(frozen=True)
class ShiftedTerm:
    """A term moved in kinematic space."""

    coefficient: Exact
    pairs: tuple[Exact, ...]


def shifted(n: int, terms: Sequence[Term], by: Shift) -> Sequence[Term]:
    """The same terms with planar invariants moved; coefficients stay."""
    if not by:
        return terms
    shift = pair_shift(n, by)
    return [
        ShiftedTerm(term.coefficient, tuple(p + h for p, h in zip(term.pairs, shift, strict=True))) for term in terms
    ]


def integrate_disk_terms(
    n: int,
    terms: Sequence[Term],
    *,
    rtol: Any = None,
    atol: Any = 0,
    digits: Any = None,
    method: Any = "auto",
    max_points: Any = None,
    threads: Any = 1,
) -> Estimate:
    """Value of ``sum_k c_k I(A_k)`` in canonical ordering, coefficients constant in kinematic space.

    Parameters
    ----------
    n
        Number of punctures.
    terms
        Each with ``coefficient`` (Exact) and ``pairs`` (exponents in the order (1,2), (1,3), ..., (n-1,n); rows -2).
    rtol, atol, digits, method, max_points, threads
        See :func:`kn_integrate.disk_integral`.

    Raises
    ------
    PoleError
        When the sum has a pole at the point.
    """
    request = make_request(rtol=rtol, atol=atol, digits=digits, method=method, max_points=max_points, threads=threads)
    return integrate_family(n, lambda by: shifted(n, terms, by), request)


def integrate_family(
    n: int,
    terms_at: TermsAt,
    request: Request,
    *,
    invariants: Mapping[Chord, Exact] | None = None,
    name: Callable[[Chord], tuple[int, ...]] | None = None,
    varying: bool = False,
) -> Estimate:
    """Value of a sum whose terms are known in a neighbourhood of the point.

    Parameters
    ----------
    n
        Number of punctures.
    terms_at
        The terms at the point moved by a shift of its planar invariants (an empty mapping: the point itself).
    request
        Tolerance, method, limits.
    invariants
        The planar invariant X of every chord at the point; the exponents of the first term when None.
    name
        The labels of the channel of a chord; its positions when None.
    varying
        True when coefficients depend on the kinematics: a term may then vanish at the point and yet count.
    """
    terms = terms_at({})
    probe: Shift = {chord: Exact(Fraction(1, 97 + 2 * k)) for k, chord in enumerate(chords_of(n))} if varying else {}
    exponents = exponents_of(n, terms_at(probe) if varying else terms, probe)
    if invariants is None:
        invariants = {chord: ys[0] for chord, ys in exponents.items() if ys}
    point = _Point(n, terms_at, exponents, invariants, name or (lambda chord: tuple(range(chord[0], chord[1] + 1))))
    on_pole = _poles(exponents)
    if on_pole:
        if len(terms) == 1 and not varying:
            raise point.pole_error(on_pole)
        result = _on_cancelling_poles(point, on_pole, request, _is_real(terms))
    else:
        result = evaluate(n, terms, request)
    return replace(result, _sensitivity=lambda: math.nan if on_pole else sensitivity(point, terms, varying))


@dataclass(frozen=True)
class _Point:
    """The neighbourhood of a kinematic point."""

    n: int
    terms_at: TermsAt
    exponents: Mapping[Chord, Sequence[Exact]]
    invariants: Mapping[Chord, Exact]
    name: Callable[[Chord], tuple[int, ...]]

    def pole_error(self, on_pole: Sequence[tuple[Chord, int]]) -> PoleError:
        chord, level = on_pole[0]
        return PoleError(self.name(chord), level, self.invariants.get(chord))


def exponents_of(n: int, terms: Sequence[Term], probe: Shift) -> dict[Chord, list[Exact]]:
    """The different exponents Y of every chord over the terms, at the unmoved point."""
    found: dict[Chord, set[Exact]] = {chord: set() for chord in chords_of(n)}
    for term in terms:
        for chord, y in chord_exponents(n, term.pairs).items():
            found[chord].add(y - probe.get(chord, ZERO))
    return {chord: sorted(ys, key=lambda y: (y.re, y.im)) for chord, ys in found.items()}


def _poles(exponents: Mapping[Chord, Sequence[Exact]]) -> list[tuple[Chord, int]]:
    """Chords with an exponent exactly on a pole, with the largest level."""
    found = []
    for chord, ys in exponents.items():
        levels = [-int(y) for y in ys if y.is_integer and y <= 0]
        if levels:
            found.append((chord, max(levels)))
    return found


def _is_real(terms: Sequence[Term]) -> bool:
    return all(term.coefficient.is_real and all(p.is_real for p in term.pairs) for term in terms)


def _on_cancelling_poles(point: _Point, on_pole: Sequence[tuple[Chord, int]], request: Request, real: bool) -> Estimate:
    """The value of a sum with terms on poles, or PoleError when the sum itself has one.

    Two directions are tried: a function such as x/y is finite along every line and has no value all the same.
    """
    singular = [chord for chord, _ in on_pole]
    straight: dict[Chord, Exact] = {chord: Exact(Fraction(1, 1 + k)) for k, chord in enumerate(singular)}
    slanted: dict[Chord, Exact] = {chord: Exact(_SLANT[k % len(_SLANT)]) for k, chord in enumerate(chords_of(point.n))}
    slanted.update({chord: Exact(Fraction((-1) ** k, 1 + (k + 1) % 3)) for k, chord in enumerate(singular)})
    found = [along(point.n, point.terms_at, point.exponents, speed, request, real) for speed in (straight, slanted)]
    for series in found:
        for k in range(series.low, 0):
            value, error = series.coefficient(k)
            if not abs(value) <= error:
                raise point.pole_error(on_pole)
    (one, error), (other, other_error) = (series.coefficient(0) for series in found)
    if not abs(one - other) <= error + other_error:
        raise point.pole_error(on_pole)
    evaluations = sum(series.evaluations for series in found)
    channels = ", ".join(".".join(map(str, point.name(chord))) for chord in singular)
    number: Any = one
    if request.digits is None:
        number = float(one) if real else complex(one)
    return Estimate(
        number,
        error,
        judge(complex(number), error, request.rtol, request.atol, error),
        "circle",
        evaluations,
        request.rtol,
        request.atol,
        request.digits,
        {"choice": f"poles of single terms cancel in channels {channels}: mean over a circle in kinematic space"},
    )


def along(
    n: int,
    terms_at: TermsAt,
    exponents: Mapping[Chord, Sequence[Exact]],
    speed: Mapping[Chord, Exact],
    request: Request,
    real: bool,
    low: int | None = None,
    high: int = 0,
) -> Laurent:
    """Laurent coefficients along a line through the point; ``speed`` is the change of each planar invariant."""
    digits = request.digits or 15
    want = digits + 1.0 if request.digits else min(15.5, 1.0 - math.log10(request.rtol))
    low = -(n - 2) if low is None else low
    circle = choose_circle(pole_places(exponents, speed), want, max(abs(low), abs(high)))
    inner = replace(
        request,
        rtol=max(0.1 * request.rtol, 2e-15) if request.digits is None else request.rtol,
        atol=0.1 * request.atol,
        digits=None if request.digits is None else request.digits + 3,
    )
    return laurent(
        lambda h: evaluate(n, terms_at({chord: v * h for chord, v in speed.items()}), inner),
        circle,
        low,
        high,
        real,
        digits,
    )


STEP = Fraction(1, 1024)
GRADIENT_RTOL, GRADIENT_SHARE = 1e-3, 5e-3  # what is asked of a gradient, and how much of the sum may be error
GRADIENT_POINTS = 3e9
GRADIENT_COST, AT_ONCE = 6.0, 0.05  # passes for values that a gradient costs; seconds below which nothing is compared


def sensitivity(point: _Point, terms: Sequence[Term], varying: bool = False) -> float:
    """``eps sum_c |dZ/dX_c| |X_c|`` over the planar channels, to two good digits; no chord of any term on a pole.

    From one gradient with few nodes; by central differences where that does not serve.
    """
    total = None if varying or not terms else _by_gradient(point, terms)
    return (by_differences(point) if total is None else total) * 2.0**-52


def _by_gradient(point: _Point, terms: Sequence[Term]) -> float | None:
    """``sum_c |dZ/dX_c| |X_c|`` from a gradient, None when it is too expensive or not accurate enough."""
    from ..disk.gradient import differentiate_terms

    if _series_are_cheaper(point, terms):
        return None
    sizes = [abs(point.invariants[chord].value()) for chord in chords_of(point.n)]
    for rtol in (GRADIENT_RTOL, 1e-3 * GRADIENT_RTOL):
        try:
            found = differentiate_terms(point.n, terms, rtol=rtol, max_points=GRADIENT_POINTS)
        except (KNError, ArithmeticError):
            return None
        total = float(sum(abs(slope) * x for slope, x in zip(found.slopes.tolist(), sizes, strict=True)))
        error = float(sum(e * x for e, x in zip(found.errors.tolist(), sizes, strict=True)))
        if error <= GRADIENT_SHARE * total:
            return total
    return None


def _series_are_cheaper(point: _Point, terms: Sequence[Term]) -> bool:
    """Whether differences of the series engine are predicted to take less time than a gradient by quadrature."""
    seconds = GRADIENT_COST * predict(point.n, terms, GRADIENT_RTOL)[1]
    if seconds <= AT_ONCE:
        return False
    from ..kz.integral import predict as predict_series

    return seconds > point.n * (point.n - 3) * predict_series(point.n, terms, rtol=GRADIENT_RTOL)


def by_differences(point: _Point) -> float:
    """``sum_c |dZ/dX_c| |X_c|`` by central differences."""
    request = make_request(rtol=1e-9)
    total = 0.0
    try:
        for chord, x in point.invariants.items():
            room = min([1.0, *(p for p in pole_places(point.exponents, {chord: Exact(1)}))])
            step = Exact(STEP * Fraction(room))
            ends = [evaluate(point.n, point.terms_at({chord: h}), request).value for h in (step, -step)]
            total += abs(ends[0] - ends[1]) / (2.0 * float(step)) * abs(x.value())
    except (KNError, ArithmeticError):
        return math.nan
    return total
