"""A state of the integration is a tree of charts.

Two affine frames fix nothing but which points are called 0 and 1, so a configuration of points of the plane that has
clusters, clusters inside clusters and so on is described best by one *chart* for every cluster.  A chart holds two or
more *slots*; the first sits at 0, the second at 1, the others at bulk coordinates.  A slot is a point, or an *edge*: a
small disc with coordinate q in which a whole further chart sits, at w_slot + q w for its coordinate w.

              root        slots:  [point 1] at 0   [edge q] at 1   [point 2] at w
                               \\
                child      slots:  [point 4] at 0   [point 3] at 1        (points 3, 4 at distance |q| in the root)

The point of the root chart that is at infinity is the last puncture.  With |S| points below an edge the measure is
``prod_edges |q|^{2|S|-4} d^2q prod d^2(bulk)``.

A further point y has four kinds of place: the bulk of a chart; a disc about a point (which becomes an edge with a new
chart {point at 0, y at 1}); the outside of the root (a new root {old root as an edge at 0, y at 1}); an annulus about
an edge, between parent and child (a new chart {child as an edge at 0, y at 1} put in between, the old q = u v).
Beginning with the chart {first at 0, last finite one at 1} and inserting the others one by one gives every stratum of
the moduli space once: 1 + 3 for n = 4, 1 + 10 + 15 for n = 5, 1 + 25 + 105 + 105 for n = 6.

How the numbers are kept: not coordinates but differences ``d[s, t] = w_s - w_t`` of slots of the same chart, so nothing
is lost however small a cluster is against the rest.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from itertools import combinations, pairwise


@dataclass(frozen=True)
class Slot:
    """A place in a chart: a point (``label``) or an edge to a ``child`` chart."""

    chart: int
    label: int = 0
    child: int = -1


@dataclass(frozen=True)
class Place:
    """Where a further point goes: ``kind`` bulk (of chart ``at``), leaf or split (at slot ``at``), or infinity."""

    kind: str
    at: int = -1


@dataclass(frozen=True)
class PairMap:
    """How the difference of two points depends on the disc coordinates.

    ``z_i - z_j`` is a product of disc coordinates (kept with the measure and the exponents of the edges) times
    ``d[left, right] + sum_t sign_t (prod of the edges in mask_t) d[slot_t, origin_t]``.

    Attributes
    ----------
    left, right : int
        The slots, in one chart, below which the points sit.
    terms : tuple of (mask, slot, origin, sign)
        Masks are over :attr:`Tree.edges`.
    """

    left: int
    right: int
    terms: tuple[tuple[int, int, int, int], ...]


@dataclass(frozen=True)
class Tree:
    """A tree of charts; see the module."""

    slots: tuple[Slot, ...]
    root: int = 0

    @classmethod
    def start(cls, zero: int, one: int) -> Tree:
        """The chart with two points at 0 and 1."""
        return cls((Slot(0, zero), Slot(0, one)))

    @cached_property
    def charts(self) -> int:
        """The number of charts."""
        return 1 + max(slot.chart for slot in self.slots)

    def slots_of(self, chart: int) -> tuple[int, ...]:
        """Slots of a chart, the one at 0 first."""
        return tuple(s for s, slot in enumerate(self.slots) if slot.chart == chart)

    def parent(self, chart: int) -> int:
        """The edge above a chart; -1 for the root."""
        return next((s for s, slot in enumerate(self.slots) if slot.child == chart), -1)

    @cached_property
    def edges(self) -> tuple[int, ...]:
        """Slots that are edges."""
        return tuple(s for s, slot in enumerate(self.slots) if slot.child >= 0)

    @cached_property
    def labels(self) -> tuple[int, ...]:
        """All points, ascending."""
        return tuple(sorted(slot.label for slot in self.slots if slot.label))

    def below(self, slot: int) -> tuple[int, ...]:
        """The points of a slot: one, or the cluster of an edge; ascending."""
        if self.slots[slot].child < 0:
            return (self.slots[slot].label,)
        found: list[int] = []
        for s in self.slots_of(self.slots[slot].child):
            found.extend(self.below(s))
        return tuple(sorted(found))

    def places(self) -> tuple[Place, ...]:
        """All places of a further point; together they fill the plane."""
        found = [Place("bulk", chart) for chart in range(self.charts)]
        found += [Place("leaf" if slot.child < 0 else "split", s) for s, slot in enumerate(self.slots)]
        return (*found, Place("infinity"))

    def insert(self, label: int, place: Place) -> Tree:
        """The tree with a further point; old slots keep their numbers, new ones are appended."""
        slots, new = list(self.slots), self.charts
        if place.kind == "bulk":
            return Tree((*slots, Slot(place.at, label)), self.root)
        if place.kind == "infinity":
            return Tree((*slots, Slot(new, child=self.root), Slot(new, label)), new)
        inner = slots[place.at]
        slots[place.at] = Slot(inner.chart, child=new)
        return Tree((*slots, Slot(new, inner.label, inner.child), Slot(new, label)), self.root)

    def _path(self, label: int) -> tuple[int, ...]:
        """Slots from the root down to a point."""
        path = [next(s for s, slot in enumerate(self.slots) if slot.label == label)]
        while (above := self.parent(self.slots[path[0]].chart)) >= 0:
            path.insert(0, above)
        return tuple(path)

    def _terms(self, path: tuple[int, ...], sign: int) -> list[tuple[int, int, int, int]]:
        """Position of a point below the first slot of its path, as a polynomial in the disc coordinates."""
        terms, mask = [], 0
        for upper, lower in pairwise(path):
            mask |= 1 << self.edges.index(upper)
            origin = self.slots_of(self.slots[lower].chart)[0]
            if lower != origin:
                terms.append((mask, lower, origin, sign))
        return terms

    def pair(self, i: int, j: int) -> PairMap:
        """The difference of two points."""
        a, b = self._path(i), self._path(j)
        depth = next(k for k, (x, y) in enumerate(zip(a, b, strict=False)) if x != y)
        return PairMap(a[depth], b[depth], tuple(self._terms(a[depth:], 1) + self._terms(b[depth:], -1)))


def strata(n: int) -> list[Tree]:
    """All strata of n-point integration, points inserted in the order 2, 3, ..., n-2.

    >>> [len(strata(n)) for n in (4, 5, 6)]
    [4, 26, 236]
    """
    trees = [Tree.start(1, n - 1)]
    for label in range(2, n - 1):
        trees = [tree.insert(label, place) for tree in trees for place in tree.places()]
    return trees


def all_pairs(labels: tuple[int, ...]) -> tuple[tuple[int, int], ...]:
    """Pairs i < j."""
    return tuple(combinations(labels, 2))
