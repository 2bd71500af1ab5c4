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


def orders_of(angular: int) -> Orders:
    """The orders that go with this many angular nodes.

    The lengths of the pieces are chosen (measured) such that equal orders limit about equally; two nodes more are then
    at least one more on every piece, so that every piece of the rule changes from one pass to the next.
    """
    torus = 6 + 3 * angular
    return Orders(angular, angular, torus, (11 * torus) // 20)


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
