"""Numbers that go with a tree of charts: differences, radii and weights of many states at once; regions of a plane.

Radii.  While m further points are still to come after this one, a disc about a point has lambda_m times the distance D
of its nearest neighbour, and the plane of the root ends at E/lambda_m, E the largest coordinate in it: lambda_0 = 0.35,
lambda_m = 4^-m.  About an edge with radius r (which a chart of extent E hangs on) the cut goes through the geometric
mean of what is inside and outside: f = sqrt(r E / D), the parent leaves out D f, the child ends at E/f.  Every
insertion may move D down or E up by 4, and 4^-m leaves room for that: f stays at or below 1/2, which is what keeps the
discs inside their Voronoi cells and the Taylor series convergent at least as fast as 4^-k.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..kernels.sphere_rays import COLUMNS, count_nodes, expand, rays
from .rules import Orders, gauss_tables
from .tree import Place, Tree

Array = NDArray[Any]
LEAF, STEP = 0.35, 4.0


def share(still: int) -> float:
    """lambda_m."""
    return LEAF if still == 0 else STEP**-still


@dataclass(frozen=True)
class States:
    """M states of one tree.

    Attributes
    ----------
    tree : Tree
    d : (M, S, S) complex
        ``w_s - w_t`` for slots of the same chart (0 elsewhere).
    radius : (M, S)
        Radii of the discs of edges (0 for points).
    weight : (M,)
        Quadrature weights of the bulk coordinates so far.
    part : (M,) int
        Number of the boundary piece of the latest bulk coordinate: sums over parts are compared between orders.
    """

    tree: Tree
    d: Array
    radius: Array
    weight: Array
    part: Array

    @property
    def count(self) -> int:
        """M."""
        return int(self.d.shape[0])

    @property
    def is_real(self) -> bool:
        """All coordinates real, so that the plane of a further point has a mirror symmetry."""
        return not self.d.imag.any()

    def rows(self, low: int, high: int) -> States:
        """A contiguous part."""
        cut = slice(low, high)
        return States(self.tree, self.d[cut], self.radius[cut], self.weight[cut], self.part[cut])

    def parts(self) -> int:
        """The number of boundary pieces."""
        return 1 + int(self.part.max(initial=0))


def start(zero: int, one: int) -> States:
    """Two points, at 0 and 1."""
    d = np.array([[[0.0, -1.0], [1.0, 0.0]]], dtype=complex)
    return States(Tree.start(zero, one), d, np.zeros((1, 2)), np.ones(1), np.zeros(1, dtype=np.int64))


@dataclass(frozen=True)
class Cuts:
    """How the plane of a further point is cut: what every chart leaves out, where it ends, the cut at every edge.

    Attributes
    ----------
    excluded : (M, S)
        Radius left out about every slot.
    outer : (M, charts)
        Radius of the outer circle of every chart.
    radius, inner : (M, S)
        For a disc placed at a slot: its new radius; for a split, the radius of the inner coordinate u.
    infinity : (M,)
        Radius of the disc at infinity.
    """

    excluded: Array
    outer: Array
    inner: Array
    infinity: Array


def cuts(states: States, still: int) -> Cuts:
    """The cuts for one further point, with ``still`` more to come after it."""
    tree, count, size = states.tree, states.count, len(states.tree.slots)
    fraction = share(still)
    nearest = np.empty((count, size))
    extent = np.empty((count, tree.charts))
    for chart in range(tree.charts):
        slots = list(tree.slots_of(chart))
        distance = np.abs(states.d[:, slots][:, :, slots])
        extent[:, chart] = distance[:, :, 0].max(axis=1)
        distance[:, range(len(slots)), range(len(slots))] = math.inf
        nearest[:, slots] = distance.min(axis=2)
    excluded = fraction * nearest
    outer = extent / fraction
    inner = np.zeros((count, size))
    for s in tree.edges:
        child = tree.slots[s].child
        f = np.sqrt(states.radius[:, s] * extent[:, child] / nearest[:, s])
        excluded[:, s] = nearest[:, s] * f
        outer[:, child] = extent[:, child] / f
        inner[:, s] = f / extent[:, child]
    return Cuts(excluded, outer, inner, fraction / extent[:, tree.root])


def with_disc(states: States, label: int, place: Place, cut: Cuts) -> States:
    """The states with a further point in a disc (leaf, split or infinity)."""
    tree = states.tree.insert(label, place)
    count, size = states.count, len(states.tree.slots)
    d = np.zeros((count, size + 2, size + 2), dtype=complex)
    d[:, :size, :size] = states.d
    d[:, size, size + 1], d[:, size + 1, size] = -1.0, 1.0
    radius = np.zeros((count, size + 2))
    radius[:, :size] = states.radius
    if place.kind == "infinity":
        radius[:, size] = cut.infinity
    else:
        radius[:, place.at] = cut.excluded[:, place.at]
        if place.kind == "split":
            radius[:, size] = cut.inner[:, place.at]
    return States(tree, d, radius, states.weight, states.part)


def with_bulk(states: States, row: int, label: int, place: Place, cut: Cuts, orders: Orders, half: bool) -> States:
    """One state with a further point at every node of the bulk of a chart."""
    tree = states.tree.insert(label, place)
    slots = np.array(states.tree.slots_of(place.at))
    nodes, weights = gauss_tables()
    table = np.empty((8192, COLUMNS))
    d = states.d[row]
    rows, _ = rays(
        d, slots, len(slots), cut.excluded[row, slots], cut.outer[row, place.at], half,
        orders.angular, orders.radial, nodes, weights, table,
    )  # fmt: skip
    total = count_nodes(table, rows)
    cell, offset = np.empty(total, dtype=np.int64), np.empty(total, dtype=complex)
    weight, piece = np.empty(total), np.empty(total, dtype=np.int64)
    expand(table, rows, nodes, weights, cell, offset, weight, piece)
    size = d.shape[0]
    grown = np.zeros((total, size + 1, size + 1), dtype=complex)
    grown[:, :size, :size] = d
    own = slots[cell]
    for s in slots:
        grown[:, size, s] = d[own, s] + offset
    grown[:, :size, size] = -grown[:, size, :size]
    radius = np.zeros((total, size + 1))
    radius[:, :size] = states.radius[row]
    mirror = 2.0 if half else 1.0
    return States(tree, grown, radius, mirror * states.weight[row] * weight, piece)
