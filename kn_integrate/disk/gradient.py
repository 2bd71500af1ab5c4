r"""The gradient of a sum of disk integrals to a tolerance: plan by the value, differentiate, look at the errors.

Rules that give the value to some digits give the derivatives to almost as many (see :mod:`.slopes`): if the value
that rules give is off by ``E``, analytic in the exponents, the derivative is off by ``E'``.  Exponents enter through
weights and integrand, so ``|E'|`` is at most about ``(1 + speed) |E|``, with ``speed`` the sum of the moduli of the
terms of the derivative relative to those of the value.  That, with the calibrated bound on ``|E|``, bounds the
truncation error here; ``tests/calibration/gradient_campaign.py`` compares it with true errors.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..errors import WorkLimitError
from .chords import ChordData, chord_data
from .evaluate import DEFAULT_MAX_POINTS, Integral, _caution, integrate
from .plan import layout_of
from .run import EPSILON
from .slopes import Slopes, slopes
from .terms import Term

MARGIN = 0.3  # on the bound from value and speed, which adds up moduli; the campaign reports what it leaves
LIKELY = 1.0  # the same for round-off
# Further attempts may cost this many times the first pass, or this many points, each: what double precision cannot give
# is not worth a hundredfold price.
DEARER, CHEAP_POINTS = 8.0, 1e6
MAX_ATTEMPTS = 4
FINEST = 1e-15
MAX_ROUNDS = 3


@dataclass(frozen=True)
class Differentiated:
    """The value of ``I(A)`` and its derivatives in the exponents Y of all chords.

    Attributes
    ----------
    integral : Integral
        The value, with its errors and its plan.
    slopes : (chords,) array
    truncation, roundoff : (chords,) arrays
        The two parts of the bounds on the errors of the slopes.
    points : int
        Integrand evaluations of all passes, those of the value included.
    """

    integral: Integral
    slopes: NDArray[Any]
    truncation: NDArray[np.float64]
    roundoff: NDArray[np.float64]
    points: int

    @property
    def errors(self) -> NDArray[np.float64]:
        """Bounds on the errors."""
        return self.truncation + self.roundoff


def differentiate(
    data: ChordData,
    rtol: float,
    atol: float,
    *,
    max_points: float = DEFAULT_MAX_POINTS,
    threads: int = 1,
) -> Differentiated:
    """Value and derivatives; no chord may be on a pole.

    Parameters
    ----------
    data
        Exponents.
    rtol, atol
        Stop when every error is at most ``max(atol, rtol * the largest modulus of a derivative)``.
    max_points
        Integrand evaluations that may be spent.
    threads
        Python threads; the result does not depend on it.

    Raises
    ------
    WorkLimitError, NotAvailableError
        As for the value.
    """
    want, spent, first = rtol, 0, 0.0
    best: Differentiated | None = None
    value: Integral | None = None
    for _ in range(MAX_ATTEMPTS):
        limit = max_points - spent
        if best is not None:
            limit = min(limit, max(DEARER * first, CHEAP_POINTS))
        try:
            integral = integrate(data, want, 0.0, max_points=limit, threads=threads)
        except WorkLimitError:
            if best is None:
                raise
            break
        spent += integral.points
        value = integral if value is None or integral.error < value.error else value
        layout = layout_of(data.n, integral.choices)
        if best is not None and spent + layout.points > max_points:
            break
        found = slopes(data, layout, threads)
        spent += found.points
        first = first or layout.points
        current = _judged(data, integral, found)
        scale = float(np.abs(current.slopes).max()) if found.finite else 0.0
        target = max(atol, rtol * scale)
        error = float(current.errors.max())
        gain = 0.0 if best is None else float(best.errors.max()) / max(error, 1e-300)
        if best is None or gain > 1.0:
            best = current
        if error <= target or want <= FINEST or (gain and gain < 1.5):
            break
        share = 0.3 * target / error if np.isfinite(error) and error > 0 else 1e-3
        want = max(FINEST, want * min(max(share, 1e-5), 0.3))
    assert best is not None  # the first attempt ends in one or in an exception
    assert value is not None
    return Differentiated(value, best.slopes, best.truncation, best.roundoff, spent)


def _judged(data: ChordData, integral: Integral, found: Slopes) -> Differentiated:
    truncation = MARGIN * integral.truncation * (1.0 + found.speed)
    # the value has a statistical bound where the worst case would be too much; derivatives inherit it likewise
    roundoff = np.minimum(_caution(data) * found.roundoff, LIKELY * integral.roundoff * (1.0 + found.speed))
    if not found.finite:
        truncation = roundoff = np.full_like(truncation, np.inf)
    return Differentiated(integral, found.slopes, truncation, roundoff, found.points)


@dataclass(frozen=True)
class GradientSum:
    """Value and derivatives of ``sum_k c_k I(A_k)`` with their errors, see :class:`Differentiated`; and its terms."""

    value: Any
    value_truncation: float
    value_roundoff: float
    slopes: NDArray[Any]
    truncation: NDArray[np.float64]
    roundoff: NDArray[np.float64]
    points: int
    terms: tuple[Differentiated, ...]

    @property
    def errors(self) -> NDArray[np.float64]:
        """Bounds on the errors of the derivatives."""
        return self.truncation + self.roundoff


def differentiate_terms(
    n: int,
    terms: Sequence[Term],
    *,
    rtol: float,
    atol: float = 0.0,
    max_points: float | None = None,
    threads: int = 1,
) -> GradientSum:
    """Derivatives of a sum in the exponents of the chords, all exponents of a chord moving together.

    Parameters
    ----------
    n
        Number of punctures.
    terms
        Coefficients and pair exponents, canonical ordering; no chord on a pole.
    rtol, atol
        The request for the sum, relative to its largest derivative; terms that cancel are done more accurately.
    max_points
        Integrand evaluations over all terms and passes.
    threads
        Python threads.

    Raises
    ------
    WorkLimitError, NotAvailableError
    """
    limit = DEFAULT_MAX_POINTS if max_points is None else max_points
    factors = [term.coefficient.value() for term in terms]
    data = [chord_data(n, term.pairs) for term in terms]
    single = len(terms) == 1
    spent = 0
    done: list[Differentiated] = []
    for factor, item in zip(factors, data, strict=True):
        share = atol / abs(factor) if single else 0.0
        done.append(differentiate(item, rtol, share, max_points=limit - spent, threads=threads))
        spent += done[-1].points
    found = _sum_of(n, factors, done, spent)
    for _ in range(MAX_ROUNDS if len(terms) > 1 else 0):
        target = max(atol, rtol * float(np.abs(found.slopes).max()))
        if not found.errors.max() > target:
            break
        goal = max(target, 2.0 * float(found.roundoff.max()))
        better = []
        for factor, item, old in zip(factors, data, done, strict=True):
            share = 0.4 * goal / (len(terms) * abs(factor))
            if old.errors.max() <= share or old.errors.max() <= 2.0 * old.roundoff.max():
                better.append(old)
                continue
            scale = float(np.abs(old.slopes).max())
            try:
                new = differentiate(item, max(FINEST, share / scale), share, max_points=limit - spent, threads=threads)
            except (WorkLimitError, ZeroDivisionError):
                better.append(old)
                continue
            spent += new.points
            better.append(min(old, new, key=lambda part: float(part.errors.max())))
        if all(new is old for new, old in zip(better, done, strict=True)):
            break
        done = better
        found = _sum_of(n, factors, done, spent)
    return found


def _sum_of(n: int, factors: Sequence[Any], parts: Sequence[Differentiated], points: int) -> GradientSum:
    chords = n * (n - 3) // 2
    value: Any = 0.0
    slopes: NDArray[Any] = np.zeros(chords)
    truncation, roundoff, moduli = np.zeros(chords), np.zeros(chords), np.zeros(chords)
    value_truncation = value_roundoff = value_moduli = 0.0
    for factor, part in zip(factors, parts, strict=True):
        size = abs(factor)
        value = value + factor * part.integral.value
        value_truncation += size * part.integral.truncation
        value_roundoff += size * part.integral.roundoff
        value_moduli += size * abs(part.integral.value)
        slopes = slopes + factor * part.slopes
        truncation += size * part.truncation
        roundoff += size * part.roundoff
        moduli += size * np.abs(part.slopes)
    units = (len(parts) + 3) * EPSILON
    return GradientSum(
        value,
        value_truncation,
        value_roundoff + units * value_moduli,
        slopes,
        truncation,
        roundoff + units * moduli,
        points,
        tuple(parts),
    )
