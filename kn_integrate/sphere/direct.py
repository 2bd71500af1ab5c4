"""Sphere integrals by integration over complex planes, to a tolerance.

The geometry is in ``tree`` and ``states``, one pass at given orders in ``sweep``; here passes of rising order are run
until the error is small enough.  Nothing is shared with the route through disk integrals, so the two check each other.

Errors
------
*Truncation.*  The rules converge geometrically in the order.  With ``D_k`` the sum over parts of the modulus of the
change from pass k-1 to pass k, what pass k still misses is about ``D_k q/(1-q)`` with ``q = D_k/D_{k-1}``; the larger
of two estimates of q is taken, kept within [0.1, 0.8], and the result multiplied by a safety factor that a calibration
campaign supports (``tests/calibration/sphere_direct_campaign.py``).  Sums of moduli over parts cannot cancel by
luck the way the change of the total can.  This is evidence from comparing orders, not a proof.

*Round-off.*  eps times the sum of moduli of everything that was added, discs with their coefficients and
denominators, times the number of roundings a term goes through.  Past poles the pieces are much larger than the
value, and this is what limits double precision.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from itertools import combinations
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError, NotAvailableError, WorkLimitError
from ..estimate import Estimate, judge
from ..integrals import SphereTerm
from ..kernels.sphere_discs import ABS, IM, RE, TAIL
from .data import Numbers, SphereData
from .rules import MAX_ORDER, orders_of
from .sweep import Key, Sweeper

EPSILON = 2.0**-52
SAFETY = 8.0
SLOWEST, FASTEST = 0.8, 0.1
LUCK = 2e-3
MAX_N = 6
# Angular orders: first one, step.  Three passes are needed before the rate of convergence is known.
_LADDER = {4: (4, 2), 5: (4, 2), 6: (2, 1)}
# Angular nodes to begin with for each unit of the largest exponent.
_RESOLVE = {4: 0.4, 5: 0.3, 6: 0.0}
DEFAULT_MAX_POINTS = {4: 10**7, 5: 4 * 10**8, 6: 4 * 10**9}
# Evaluations of one pass at angular order p, measured: factor and power of a fit, a little above all samples.
_COST = {4: (11.0, 2.0), 5: (800.0, 4.0), 6: (2.6e5, 6.1)}
# Errors of the passes on convergent integrals with unremarkable exponents, measured: log10 of the relative error.
_DIGITS = {4: (1.2, 0.85), 5: (2.0, 1.0), 6: (0.4, 1.1)}


@dataclass(frozen=True)
class Prediction:
    """What a direct integration is likely to take.

    Attributes
    ----------
    points : float
        Integrand evaluations over all passes.
    seconds : float
        On one core at the measured rate of an unremarkable machine.
    orders : tuple of int
        Angular orders of the passes.
    """

    points: float
    seconds: float
    orders: tuple[int, ...]


def _cost(n: int, angular: int) -> float:
    factor, power = _COST[n]
    return factor * math.pow(angular, power)


def _first(n: int, rtol: float) -> int:
    """Where to begin: three passes from here should do for an unremarkable integral."""
    low, step = _LADDER[n]
    start, slope = _DIGITS[n]
    digits = -math.log10(min(max(rtol, 1e-15), 0.1))
    needed = (digits - start) / slope
    steps = max(0, round((needed - low) / step) - 1)
    return low + step * steps


def _refuse_n(n: int) -> None:
    if n not in _LADDER:
        raise NotAvailableError(
            f"direct integration over complex planes serves n = 4, 5, 6, not n = {n}; use method='klt' or 'auto'"
        )


def predict(n: int, rtol: float = 1e-10, terms: int = 1) -> Prediction:
    """The cost of :func:`integrate_terms` on integrals without near or crossed poles; computes nothing.

    Parameters
    ----------
    n : int
        4, 5 or 6.
    rtol : float
    terms : int
        Number of terms.

    Examples
    --------
    >>> predict(5, 1e-8).points < predict(5, 1e-12).points < predict(6, 1e-5).points
    True
    """
    _refuse_n(n)
    low, step = _first(n, rtol), _LADDER[n][1]
    orders = tuple(range(low, low + 3 * step, step))
    points = terms * sum(_cost(n, p) for p in orders)
    return Prediction(points, 1.5e-8 * points + 3e-4, orders)


@dataclass
class _Trail:
    """Passes so far: parts of the latest, changes between passes."""

    parts: dict[tuple[int, Key], NDArray[Any]] = field(default_factory=dict)
    changes: list[float] = field(default_factory=list)

    def add(self, parts: dict[tuple[int, Key], NDArray[Any]]) -> None:
        if self.parts:
            # in the order of the latest pass: the sum must not depend on how a set is ordered
            keys = list(parts) + [key for key in self.parts if key not in parts]
            zero = np.zeros(5)
            moved = [parts.get(key, zero) - self.parts.get(key, zero) for key in keys]
            self.changes.append(float(sum(math.hypot(m[RE], m[IM]) for m in moved)))
        self.parts = parts

    def truncation(self) -> float:
        """Bound on what the latest pass misses."""
        if not self.changes:
            return math.inf
        last = self.changes[-1]
        if last == 0.0:
            return 0.0
        rate = SLOWEST
        if len(self.changes) > 1:
            rate = last / self.changes[-2] if self.changes[-2] > 0 else SLOWEST
            if len(self.changes) > 2 and self.changes[-3] > 0:
                rate = max(rate, math.sqrt(last / self.changes[-3]))
        rate = min(max(rate, FASTEST), SLOWEST)
        bound = SAFETY * last * rate / (1.0 - rate)
        # two passes can agree by luck: the change before bounds what two further steps can have gained
        return max(bound, LUCK * self.changes[-2]) if len(self.changes) > 1 else bound


@dataclass(frozen=True)
class _Outcome:
    """The latest pass of all terms together."""

    value: complex
    truncation: float
    roundoff: float

    @property
    def error(self) -> float:
        return self.truncation + self.roundoff


def _spread(numbers: Numbers) -> float:
    """How many roundings of the exponential's argument a term can carry."""
    n = numbers.data.n
    finite = [numbers.index[i, j] for i in range(1, n) for j in range(i + 1, n)]
    return float(np.abs(numbers.total[finite]).sum())


def _stiffness(numbers: Numbers) -> float:
    """The largest exponent of a disc coordinate, oscillation included: what the rules have to resolve at all."""
    clusters = (c for size in range(2, numbers.data.n - 1) for c in combinations(range(1, numbers.data.n), size))
    ends = [numbers.end(cluster) for cluster in clusters]
    return max(abs(end[0]) + abs(end[1]) for end in ends)


def integrate_terms(
    n: int,
    terms: Sequence[SphereTerm],
    *,
    rtol: float,
    atol: float = 0.0,
    max_points: float | None = None,
    threads: int = 1,
    frame: Sequence[int] | None = None,
) -> Estimate:
    """A sum of sphere integrals with integer spins, integrated over complex planes.

    Parameters
    ----------
    n : int
        Punctures, 4 to 6.
    terms
        With attributes ``coefficient``, ``pairs`` (s in the pair order (1,2), (1,3), ..., (n-1,n)), ``left`` and
        ``right``: ``coefficient * int prod |z_ij|^{2 s_ij} z_ij^{left} conj(z_ij)^{right}``, ``z_ij = z_i - z_j``,
        ``d^2z/pi`` for each integrated puncture, rows of s + left and of s + right equal to -2.
    rtol, atol : float
        Passes of rising order are run until the error is at most ``max(atol, rtol |value|)``.
    max_points
        Integrand evaluations that may be spent; None for a default that depends on n.
    threads
        Python threads; the result has the same bits for any number of them.
    frame
        A permutation: puncture ``frame[0]`` goes to 0, ``frame[n-2]`` to 1, ``frame[n-1]`` to infinity, those between
        are integrated in this order.  The value does not depend on it.

    Returns
    -------
    Estimate
        ``method="direct"``; a float for real exponents and coefficients, complex otherwise.

    Raises
    ------
    PoleError
        Names the cluster when both of its divisor exponents ``sum a + |S| - 1``, ``sum b + |S| - 1`` (a = s + left,
        b = s + right) are non-positive integers.  With only one of them such, there is no pole: the angular integral
        of every term with that denominator vanishes.
    InputError, NotAvailableError
        For exponents that do not fit, and n above 6.
    WorkLimitError
        When the first pass needs more than ``max_points``.
    """
    _refuse_n(n)
    if not rtol >= 0 or not atol >= 0 or not max(rtol, atol) > 0:
        raise InputError("rtol, atol", f"{rtol}, {atol}", "non-negative numbers, not both 0")
    order = tuple(frame) if frame is not None else tuple(range(1, n + 1))
    if sorted(order) != list(range(1, n + 1)):
        raise InputError("frame", repr(order), f"a permutation of 1..{n}")
    sweepers: list[tuple[complex, Sweeper, float]] = []
    for term in terms:
        if not term.coefficient:
            continue
        data = SphereData.of(n, term.pairs, term.left, term.right)
        data.refuse_rows()
        data.refuse_poles()
        numbers = Numbers(data.relabelled(order))
        sweepers.append((complex(term.coefficient) * numbers.data.sign, Sweeper(numbers), _spread(numbers)))
    real = all(term.coefficient.is_real and all(s.is_real for s in term.pairs) for term in terms)
    if not sweepers:
        return Estimate(0.0, 0.0, judge(0.0, 0.0, rtol, atol), "direct", 0, rtol, atol)
    limit = DEFAULT_MAX_POINTS[n] * max(1, len(sweepers)) if max_points is None else max_points
    return _climb(n, sweepers, real, rtol, atol, limit, threads)


def _climb(
    n: int,
    sweepers: list[tuple[complex, Sweeper, float]],
    real: bool,
    rtol: float,
    atol: float,
    limit: float,
    threads: int,
) -> Estimate:
    """Passes of rising order until the error is small enough, or nothing more can be gained."""
    low, step = _LADDER[n]
    stiff = max(_stiffness(sweeper.numbers) for _, sweeper, _ in sweepers)
    angular = max(_first(n, rtol), low + step * round(_RESOLVE[n] * stiff / step))
    while angular > low and sum(_cost(n, angular + k * step) for k in range(3)) * len(sweepers) > limit:
        angular -= step
    if _cost(n, angular) * len(sweepers) > limit:
        hint = "raise max_points=, or use method='klt'"
        raise WorkLimitError(_cost(n, angular) * len(sweepers), limit, "points", hint)
    trail, best, points, done = _Trail(), _Outcome(math.nan, math.inf, math.inf), 0, []
    while True:
        parts: dict[tuple[int, Key], NDArray[Any]] = {}
        spent, roundoff, tail, value = 0, 0.0, 0.0, 0.0 + 0.0j
        for t, (coefficient, sweeper, spread) in enumerate(sweepers):
            sweep = sweeper.run(orders_of(angular), threads)
            spent += sweep.points
            total = sweep.total()
            mine = coefficient * complex(total[RE], 0.0 if sweeper.numbers.data.is_real else total[IM])
            value += mine
            roundoff += abs(coefficient) * EPSILON * (6.0 + spread) * float(total[ABS]) + 2 * EPSILON * abs(mine)
            tail += abs(coefficient) * float(total[TAIL])
            weight = abs(coefficient)
            for key, sums in sweep.parts.items():
                changed = weight * sums
                if sweeper.numbers.data.is_real:
                    changed[IM] = 0.0
                parts[t, key] = changed
        points += spent
        done.append(angular)
        trail.add(parts)
        current = _Outcome(value, trail.truncation() + 2.0 * tail, roundoff)
        finite = math.isfinite(abs(value)) and math.isfinite(roundoff)
        if not finite or current.error <= best.error or not math.isfinite(best.error):
            best = current
        target = max(atol, rtol * abs(best.value))
        enough = best.error <= target or (best.roundoff > target and best.truncation <= best.roundoff)
        following = spent * ((angular + step) / angular) ** _COST[n][1]
        if not finite or enough or angular + step > MAX_ORDER or points + following > limit:
            break
        angular += step
    final: Any = best.value.real if real else best.value
    details = {
        "passes": tuple(done),
        "truncation": best.truncation,
        "roundoff": best.roundoff,
        "changes": tuple(trail.changes),
    }
    status = judge(best.value, best.error, rtol, atol, best.roundoff)
    return Estimate(final, best.error, status, "direct", points, rtol, atol, None, details)
