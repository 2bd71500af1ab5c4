r"""How every rule changes with its exponent: the functional ``f.p. int t^(Y-1) log t F(t) dt``.

The logarithm is the derivative in Y, ``d/dY f.p. int t^(Y-1) F = f.p. int t^(Y-1) log t F``, meromorphic with double
poles.  A rule ``sum_j w_j(Y) F(t_j(Y))`` that is meromorphic in Y gives it by its own derivative,

    ``sum_j w_j' F(t_j) + w_j t_j' F'(t_j)``,

and the error of that is the derivative of the error of the rule: an analytic function of Y that is small in a whole
neighbourhood, so its derivative is small too (Cauchy's estimate).  No rule of its own for the logarithm is needed, and
a Gauss rule keeps its order.  Keeping the nodes where they are and taking the interpolating functional of ``x^Y log x``
would halve it: exact to degree N - 1 instead of 2N - 2.

*fixed nodes* (overhang, ellipse, disc, contour): weights are linear in moments such as ``1/(Y+k)``, which are
differentiated one by one: ``-1/(Y+k)^2``; so is the recurrence of the Chebyshev moments.

*subtracted Gauss-Jacobi*: the recurrence coefficients are rational in Y.  Derivatives of the orthonormal polynomials in
x and in Y are carried along in the three-term recurrence; then ``x_j' = -(dp_N/dY)/(dp_N/dx)`` at the node, and the
Christoffel number ``1/sum_k p_k(x_j)^2`` changes as the p_k do.

The bend contributes ``-log(stretch)`` and the motion of its argument.

Source: worked out here; differentiating a Gauss rule along with its weight function is the implicit function theorem.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .base import PoleDistance, Rule, circle_fourier, circle_points, symmetric_bend
from .chebyshev import overhang_bend
from .disc import disc_bend


@dataclass(frozen=True)
class LogRule:
    """A rule with its derivative in Y.

    Attributes
    ----------
    rule : Rule
    slopes : (N,) array
        ``dw_j/dY``.
    moves : (N,) array
        ``(dt_j/dY)/t_j``; 0 for nodes that stay.
    noise : (N,) array
        Bound on the error of each slope, in units of round-off.
    """

    rule: Rule
    slopes: NDArray[Any]
    moves: NDArray[Any]
    noise: NDArray[np.float64]

    @property
    def moving(self) -> bool:
        """True when some node depends on Y."""
        return bool(np.any(self.moves))

    def upper_half(self) -> LogRule:
        """As :meth:`Rule.upper_half`."""
        nodes = self.rule.nodes
        keep = nodes.imag >= 0
        factor = np.where(nodes.imag[keep] > 0, 2.0, 1.0)
        return replace(
            self,
            rule=self.rule.upper_half(),
            slopes=self.slopes[keep] * factor,
            moves=self.moves[keep],
            noise=self.noise[keep] * factor,
        )


def log_rule(rule: Rule, y: PoleDistance, size: int) -> LogRule:
    """The derivative of a rule for ``t^(Y-1)``.

    Parameters
    ----------
    rule
        Of any family but the residues.
    y, size
        What the rule was built from.
    """
    return _FAMILIES[rule.kind](rule, dict(rule.parameters), y, size)


def chebyshev_slopes(y: PoleDistance, a: float, count: int) -> tuple[NDArray[Any], NDArray[Any]]:
    """The moments of :func:`chebyshev.chebyshev_moments` and their derivatives in Y, each (count,)."""
    shifts = y.shifts(count + 1)
    moments, slopes = np.empty(count, dtype=shifts.dtype), np.empty(count, dtype=shifts.dtype)
    slope, offset = 2.0 / (1.0 + a), -(1.0 - a) / (1.0 + a)
    i = 1.0 / shifts[:3]
    for found, (i0, i1, i2) in ((moments, i), (slopes, -i * i)):
        found[0] = i0
        found[1] = slope * i1 + offset * i0
        found[2] = 2 * (slope * slope * i2 + 2 * slope * offset * i1 + offset * offset * i0) - i0
    value = shifts[0]
    for k in range(2, count - 1):
        factor = (k - 1 - value) / (k - 1)
        right = 2.0 * offset * moments[k] - moments[k - 1] * factor + 1.0 / (k + 1) - 1.0 / (k - 1)
        moments[k + 1] = right * (k + 1) / shifts[k + 1]
        change = 2.0 * offset * slopes[k] - slopes[k - 1] * factor + moments[k - 1] / (k - 1)
        slopes[k + 1] = (change * (k + 1) - moments[k + 1]) / shifts[k + 1]
    return moments, slopes


def _bent(rule: Rule, slopes: Any, noise: Any, x: Any, bend: float, y1: Any) -> LogRule:
    """Slopes for ``x^(Y-1) dx`` carried over to ``t^(Y-1) dt``, nodes at rest."""
    stretch = 1.0 + bend - bend * x
    factor = (1.0 + bend) * stretch ** (-y1)
    turn = np.log(stretch)
    found = slopes * factor - rule.weights * turn
    size = noise * np.abs(factor) + rule.noise * np.abs(turn) + 4.0 * (np.abs(slopes * factor) + np.abs(found))
    return LogRule(rule, found, np.zeros_like(rule.nodes), size)


def _overhang(rule: Rule, parameters: dict[str, Any], y: PoleDistance, size: int) -> LogRule:
    count = parameters["nodes"]
    bend, a, _ = overhang_bend(size, parameters["reach"])
    slopes = chebyshev_slopes(y, a, count + 3)[1][:count]
    coefficients = circle_fourier(2 * count)[:count, :count].real * 4.0
    waves = coefficients[1] * (0.5 * count)
    coefficients[0] *= 0.5
    x = 0.5 * (1.0 + a) * (waves + 1.0) - a
    return _bent(rule, slopes @ coefficients, 4.0 * (np.abs(slopes) @ np.abs(coefficients)), x, bend, y.plus(1))


def _ellipse(rule: Rule, parameters: dict[str, Any], y: PoleDistance, size: int) -> LogRule:
    count, rho = parameters["nodes"], parameters["rho"]
    slopes = chebyshev_slopes(y, 0.0, count + 1)[1][:count]
    points, fourier = circle_points(count), circle_fourier(count)
    k = np.arange(count)
    damp = rho ** (-2.0 * k)
    scaled = np.empty_like(fourier)
    scaled[0] = fourier[0]
    scaled[1:] = 2.0 * (fourier[1:] + damp[:0:-1, None] * fourier[:0:-1]) / (1.0 - rho ** (-2.0 * count))
    scaled[count // 2] = 2.0 * fourier[count // 2] / (1.0 - rho ** (-count))
    tamed = slopes * rho ** (-k.astype(float))
    x = 0.5 + 0.25 * (rho * points + points.conj() / rho)
    return _bent(rule, tamed @ scaled, 4.0 * (np.abs(tamed) @ np.abs(scaled)), x, symmetric_bend(size), y.plus(1))


def _disc(rule: Rule, parameters: dict[str, Any], y: PoleDistance, size: int) -> LogRule:
    count = parameters["nodes"]
    moments = -1.0 / y.shifts(count) ** 2
    fourier = circle_fourier(count)
    noise = 4.0 * (np.abs(moments) @ np.abs(fourier))
    bend = disc_bend(size, parameters["wide"])
    return _bent(rule, moments @ fourier, noise, circle_points(count), bend, y.plus(1))


def _contour(rule: Rule, parameters: dict[str, Any], y: PoleDistance, size: int) -> LogRule:
    count, radius = parameters["circle"], parameters["fraction"] / size
    inverse = 1.0 / y.shifts(count)
    fourier = circle_fourier(count)
    value = complex(y.value)
    moments = radius**value * (math.log(radius) - inverse) * inverse
    circle_noise = (6.0 + 2.0 * abs(value * math.log(radius))) * (np.abs(moments) @ np.abs(fourier))
    turn = np.log(rule.nodes[count:])
    slopes = np.concatenate([moments @ fourier, rule.weights[count:] * turn])
    noise = np.concatenate([circle_noise, rule.noise[count:] * np.abs(turn) + 2.0 * np.abs(slopes[count:])])
    return LogRule(rule, slopes, np.zeros_like(rule.nodes), noise)


def _radau(rule: Rule, parameters: dict[str, Any], y: PoleDistance, size: int) -> LogRule:
    from ...kernels.gauss_slopes import gauss_slopes  # loads the compiler

    count = parameters["nodes"]
    y1, bend = y.plus(1), symmetric_bend(size)
    x = rule.nodes * (1.0 + bend) / (1.0 + bend * rule.nodes)
    moves, logs = np.empty_like(x[1:]), np.empty_like(x[1:])
    gauss_slopes(x[1:], np.asarray(y1, dtype=x.dtype)[()], moves, logs)
    drift = np.concatenate([[0.0], moves / x[1:]])
    stretch = 1.0 + bend - bend * x
    turn = y1 * bend * drift * x / stretch - np.log(stretch)
    slopes = rule.weights * turn
    slopes[1:] += rule.weights[1:] * (logs - drift[1:])
    shifts = y.shifts(count)
    if y.real > 0:
        slopes[0] -= rule.weights[0] * (1.0 / shifts[0] + 2.0 * (1.0 / shifts[1:]).sum())
    else:
        # as the weight itself, from the exact integral of a constant
        inner = rule.weights[1:] / ((1.0 + bend) * stretch[1:] ** -y1)
        slopes[0] -= (1.0 + bend) ** -y.value * (1.0 / shifts[0] ** 2 + (inner * (logs - drift[1:])).sum())
    noise = 8.0 * np.abs(slopes)
    relative = rule.noise / np.maximum(np.abs(rule.weights), 1e-300)
    noise += relative * (np.abs(slopes) + np.abs(rule.weights) * (1.0 + np.abs(turn)))
    # dt/t = dx/x (1 + b)/stretch
    return LogRule(rule, slopes, drift * (1.0 + bend) / stretch, noise)


_FAMILIES: dict[str, Callable[[Rule, dict[str, Any], PoleDistance, int], LogRule]] = {
    "radau": _radau,
    "overhang": _overhang,
    "ellipse": _ellipse,
    "disc": _disc,
    "contour": _contour,
}
