"""Orders of the rules, and Gauss-Legendre tables."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

MAX_ORDER = 40


@dataclass(frozen=True)
class Orders:
    """One level of accuracy.

    Attributes
    ----------
    angular, radial : int
        Gauss-Legendre nodes on the longest angular and radial pieces.
    torus, taylor : int
        Nodes on every circle of a product of discs, and Taylor coefficients kept.
    """

    angular: int
    radial: int
    torus: int
    taylor: int


def orders_of(level: int) -> Orders:
    """Level 1, 2, 3, ...: steps that each gain about the same factor.

    The figures are measured: at these proportions no direction of the rule limits the others.
    """
    angular = 2 + 2 * level
    torus = 12 + 6 * level
    return Orders(angular, 2 + (13 * level) // 8, torus, (11 * torus) // 20)


MAX_LEVEL = (MAX_ORDER - 2) // 2 - 1


@lru_cache(maxsize=1)
def gauss_tables() -> tuple[NDArray[Any], NDArray[Any]]:
    """Nodes and weights on (0, 1): row p holds the rule with p nodes."""
    nodes = np.zeros((MAX_ORDER + 1, MAX_ORDER))
    weights = np.zeros((MAX_ORDER + 1, MAX_ORDER))
    for p in range(1, MAX_ORDER + 1):
        x, w = np.polynomial.legendre.leggauss(p)
        nodes[p, :p] = 0.5 * (x + 1.0)
        weights[p, :p] = 0.5 * w
    return nodes, weights
