"""What a rule is, the Moebius variable all families share, and shifts of Y that keep their digits near a pole."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ...exact import Exact


@dataclass(frozen=True)
class PoleDistance:
    """The exponent Y of a chord, such that Y + k is available to full relative accuracy for every integer k.

    ``Y = -2 + 1e-12`` rounded to a double has lost the distance to the pole; the exact number has not.
    """

    exact: Exact

    def plus(self, k: int) -> float | complex:
        """``Y + k`` correctly rounded, real where Y is."""
        shifted: Exact = self.exact + k
        return shifted.value()

    @property
    def value(self) -> float | complex:
        """Y itself."""
        return self.exact.value()

    @property
    def real(self) -> float:
        """The real part of Y."""
        return float(self.exact.re)

    @property
    def is_real(self) -> bool:
        """True when Y is exactly real."""
        return self.exact.is_real

    def shifts(self, count: int) -> NDArray[Any]:
        """The array ``Y + k`` for ``k = 0..count-1``, each correctly rounded where it matters.

        Only the shifts next to a pole can cancel; the others lose nothing when formed in double.
        """
        array = self.value + np.arange(count)
        nearest = round(-self.real)
        for k in (nearest - 1, nearest, nearest + 1):
            if 0 <= k < count:
                array[k] = self.plus(k)
        return array


@dataclass(frozen=True)
class NullGroup:
    """Where to find the decay of a rule's expansion coefficients, and how far to extrapolate it.

    Attributes
    ----------
    start : int
        First of four consecutive rows in ``Rule.nulls``: functionals that give the last four expansion coefficients,
        the highest first, each times the factor that makes its modulus an error of the integral.
    ratio : float
        Theoretical modulus of the ratio of successive coefficients.
    steps : float
        How many coefficients lie between the last computed one and the first that the rule gets wrong.
    degree : int
        Degree of the last computed coefficient; 0 where ``steps`` is so small that powers of the degree do not matter.
    """

    start: int
    ratio: float
    steps: float
    degree: int = 0


@dataclass(frozen=True)
class Rule:
    """A linear functional on functions of t, ``sum_j weights[j] F(nodes[j])``.

    Attributes
    ----------
    kind : str
        The family.
    nodes, weights : (N,) arrays
        Real or complex.
    nulls : (4 * groups, N) array
        Functionals that vanish as the rule converges; see :class:`NullGroup`.
    groups : tuple of NullGroup
    amplification : float
        ``sum |weights|``, relative to a function of size one: what round-off is multiplied with.
    noise : (N,) array
        Bound on the error of each weight, in units of round-off: absolute, because a small weight that came out of
        the cancellation of large terms carries their error.
    conjugate_pairs : bool
        True when nodes and weights come in conjugate pairs, so that an integrand real on the real axis needs only
        the nodes of the upper half plane.
    parameters : tuple
        What the family was asked for, in plain values.
    """

    kind: str
    nodes: NDArray[Any]
    weights: NDArray[Any]
    nulls: NDArray[Any]
    groups: tuple[NullGroup, ...]
    amplification: float
    noise: NDArray[np.float64]
    conjugate_pairs: bool = False
    parameters: tuple[tuple[str, Any], ...] = ()

    @property
    def count(self) -> int:
        """Number of nodes."""
        return len(self.nodes)

    @property
    def is_real(self) -> bool:
        """True when nodes and weights are real."""
        return not (np.iscomplexobj(self.nodes) or np.iscomplexobj(self.weights))

    def upper_half(self) -> Rule:
        """The rule without the nodes below the real axis, the others doubled: for the real part of the sum."""
        if not self.conjugate_pairs:
            raise ValueError("nodes are not in conjugate pairs")
        keep = self.nodes.imag >= 0
        factor = np.where(self.nodes.imag[keep] > 0, 2.0, 1.0)
        return replace(
            self,
            nodes=self.nodes[keep],
            weights=self.weights[keep] * factor,
            nulls=self.nulls[:, keep] * factor,
            noise=self.noise[keep] * factor,
            conjugate_pairs=False,
        )


def circle_points(count: int) -> NDArray[np.complex128]:
    """``exp(i theta_j)``, ``theta_j = pi (2j+1)/count``."""
    return _roots(2 * count)[2 * np.arange(count) + 1]


def circle_fourier(count: int) -> NDArray[np.complex128]:
    """``exp(-i k theta_j)/count`` for k (rows) and j below count.

    Phases are looked up by whole numbers: formed as a product of doubles, ``k theta_j`` has a rounding error that grows
    with k and is the same for all nodes, the worst kind.
    """
    k, j = np.arange(count), np.arange(count)
    index = np.outer(k, 2 * j + 1) % (2 * count)
    table: NDArray[np.complex128] = _roots(2 * count)[index].conj() / count
    return table


@lru_cache(maxsize=256)
def _roots(order: int) -> NDArray[np.complex128]:
    """``exp(2 pi i m/order)`` for m below order, each correctly rounded up to one unit; order a multiple of 2."""
    m = np.arange(order)
    # fold into the first octant, where sine and cosine of a small angle are accurate
    quarter, rest = np.divmod(4 * m, order)
    angle = rest * (0.5 * math.pi / order)
    table = np.empty(order, dtype=complex)
    cos, sin = np.cos(angle), np.sin(angle)
    table.real = np.choose(quarter, [cos, -sin, -cos, sin])
    table.imag = np.choose(quarter, [sin, cos, -sin, -cos])
    table.setflags(write=False)
    return table


def ellipse_parameter(distance: float) -> float:
    """The Bernstein parameter rho of a real singularity at this distance from an interval of length 1.

    ``rho + 1/rho = 2 (1 + 2 distance)``: coefficients in Chebyshev (or any orthogonal) polynomials on the interval
    then fall like ``rho^-k``.

    >>> round(ellipse_parameter(1 / (math.sqrt(2) - 1)), 2)
    11.57
    """
    u = 1.0 + 2.0 * distance
    return u + math.sqrt(u * u - 1.0)


def symmetric_bend(size: int) -> float:
    """The bend b of ``t = x / (1 + b - b x)`` that puts the singularities of [0, 1] at equal distances.

    The map fixes 0 and 1.  With the other variables anywhere in [0, 1] the nearest singularity of the integrand is at
    ``t = -1/size``; the other end of its cut is at infinity.  ``b = sqrt(1 + size) - 1`` sends the two to distance
    ``1/b`` on either side of [0, 1].
    """
    return math.sqrt(1.0 + size) - 1.0


def bent(x: NDArray[Any], weights: NDArray[Any], y_plus_one: float | complex, bend: float) -> Any:
    """Carry nodes and functionals for ``x^(Y-1) dx`` over to ``t^(Y-1) dt``.

    ``t^(Y-1) dt = x^(Y-1) (1+b) (1+b-bx)^-(Y+1) dx``; the smooth factor goes into the weights.
    """
    stretch = 1.0 + bend - bend * x
    return x / stretch, weights * ((1.0 + bend) * stretch ** (-y_plus_one))
