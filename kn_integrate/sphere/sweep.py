"""One pass over all strata at given orders: sums by part, with their moduli.

The points 2, 3, ..., n-2 are inserted one after another; all but the last make states, the last is integrated by the
kernels.  Work is cut into tasks after the first insertion, the tasks do not depend on the number of threads, and their
sums are added in order: the result has the same bits however many threads there are.
"""

from __future__ import annotations

from collections.abc import Iterator
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..kernels.sphere_bulk import plane_sums
from ..kernels.sphere_discs import ABS, IM, RE, SQUARE, TAIL, disc_sums
from .data import Numbers, shape_of
from .rules import Orders, gauss_tables
from .states import States, cuts, start, with_bulk, with_disc
from .tree import Place

Array = NDArray[Any]
Key = tuple[int, ...]
COLUMNS = 5
MAX_PIECES = 128  # of a plane with two punctures
ROWS = 16  # states in one task

_NONE = np.zeros(0, dtype=np.int64)
_NO_PLANE = (np.zeros((1, 0)), np.zeros(1))


@dataclass(frozen=True)
class Sweep:
    """Sums of one pass.

    Attributes
    ----------
    parts : dict
        By part: (real, imaginary, sum of moduli, sum of squares, left out by Taylor series).  A part is a boundary
        piece of the first bulk coordinate with the places of the points before it; what comes after is summed, for
        only the sum over all places is a smooth function of the coordinates before.
    points : int
        Evaluations.
    """

    parts: dict[Key, Array]
    points: int

    def total(self) -> Array:
        """The sum over parts."""
        return np.asarray(np.sum(list(self.parts.values()), axis=0))


class Sweeper:
    """Runs passes for one integral."""

    def __init__(self, numbers: Numbers) -> None:
        self.numbers = numbers
        self.labels = tuple(range(2, numbers.data.n - 1))
        self.symmetric = numbers.data.is_real or numbers.data.is_spinless

    def run(self, orders: Orders, threads: int = 1) -> Sweep:
        """One pass."""
        tasks = list(self._tasks(orders))

        def work(task: tuple[States, Key, int]) -> tuple[dict[Key, Array], int]:
            states, key, done = task
            return self._work(states, key, done, orders)

        if threads > 1 and len(tasks) > 1:
            with ThreadPoolExecutor(threads) as pool:
                results = list(pool.map(work, tasks))
        else:
            results = [work(task) for task in tasks]
        parts: dict[Key, Array] = {}
        points = 0
        for found, count in results:
            points += count
            for key, sums in found.items():
                parts[key] = parts[key] + sums if key in parts else sums
        return Sweep(parts, points)

    def _tasks(self, orders: Orders) -> Iterator[tuple[States, Key, int]]:
        """States after the first insertion, cut into tasks (states, key, number of points inserted)."""
        n = self.numbers.data.n
        first = start(1, n - 1)
        if n == 4:
            yield first, (), 0
            return
        rows = ROWS if n == 5 else 1
        for key, states in self._inserted(first, 0, orders):
            for low in range(0, states.count, rows):
                yield states.rows(low, low + rows), key, 1

    def _inserted(self, states: States, done: int, orders: Orders) -> Iterator[tuple[Key, States]]:
        """All states with one point more."""
        still = len(self.labels) - done - 1
        cut = cuts(states, still)
        half = self.symmetric and states.is_real
        for p, place in enumerate(states.tree.places()):
            if place.kind == "bulk":
                for row in range(states.count):
                    yield (p,), with_bulk(states, row, self.labels[done], place, cut, orders, half)
            else:
                yield (p,), with_disc(states, self.labels[done], place, cut)

    def _work(self, states: States, key: Key, done: int, orders: Orders) -> tuple[dict[Key, Array], int]:
        """All further insertions."""
        if done == len(self.labels) - 1:
            return self._last(states, key, orders)
        found: dict[Key, Array] = {}
        points = 0
        for row in range(states.count):
            one = states.rows(row, row + 1)
            flat = _has_bulk(one)
            for (p,), grown in self._inserted(one, done, orders):
                kept = replace(grown, part=np.full(grown.count, one.part[0])) if flat else grown
                sums, count = self._work(kept, key if flat else (*key, p), done + 1, orders)
                points += count
                for name, value in sums.items():
                    found[name] = found[name] + value if name in found else value
        return found, points

    def _outer(self, states: States) -> Array:
        """Weights times the constant parts of all differences but those of the last point."""
        shape = shape_of(states.tree)
        known = self.numbers.of_pairs(shape.between)
        d = states.d[:, shape.pairs[:, 0], shape.pairs[:, 1]]
        modulus = np.abs(d)
        factor = np.exp(np.log(modulus) @ self.numbers.total[known])
        spins = self.numbers.spin[known]
        for k in np.flatnonzero(spins):
            unit = d[:, k] / modulus[:, k]
            factor = factor * (unit if spins[k] > 0 else unit.conj()) ** abs(int(spins[k]))
        return np.asarray(states.weight * factor)

    def _last(self, states: States, key: Key, orders: Orders) -> tuple[dict[Key, Array], int]:
        """The last point: all its places."""
        cut = cuts(states, 0)
        outer = self._outer(states)
        half = self.symmetric and states.is_real
        parts, flat = states.part, _has_bulk(states)
        found: dict[Key, Array] = {}
        points = 0
        for p, place in enumerate(states.tree.places()):
            sums, count = self._place(states, place, cut, half, orders)
            points += count
            if len(sums) > states.count:
                # the constant part (z_1 - z_3 = -1 to a spin) multiplies the sums of all pieces
                sums[:, :2] *= outer[0].real * (2.0 if half else 1.0)
                sums[:, ABS] *= 2.0 if half else 1.0
                found.update({(p, piece): row for piece, row in enumerate(sums) if row[ABS]})
                continue
            scale = 2.0 if half and place.kind == "bulk" else 1.0
            value = scale * outer * (sums[:, RE] + 1j * sums[:, IM])
            size = scale * np.abs(outer)
            columns = np.empty_like(sums)
            columns[:, RE], columns[:, IM] = value.real, value.imag
            columns[:, ABS], columns[:, TAIL] = size * sums[:, ABS], size * sums[:, TAIL]
            columns[:, SQUARE] = size * size * sums[:, SQUARE]
            # one pass per part: the order of additions is that of the states
            for part in np.unique(parts):
                name = (*key, int(part)) if flat else (*key, p, 0)
                here = columns[parts == part].sum(axis=0)
                found[name] = found[name] + here if name in found else here
        return found, points

    def _place(self, states: States, place: Place, cut: Any, half: bool, orders: Orders) -> tuple[Array, int]:
        numbers, label = self.numbers, self.labels[-1]
        nodes, weights = gauss_tables()
        sums = np.zeros((states.count, COLUMNS))
        if place.kind == "bulk":
            tree = states.tree.insert(label, place)
            slots = np.array(states.tree.slots_of(place.at))
            excluded, outer = np.ascontiguousarray(cut.excluded[:, slots]), np.ascontiguousarray(cut.outer[:, place.at])
            if not tree.edges:
                # with one plane only the boundary pieces are the parts to compare
                fine = numbers.data.n == 4
                if fine:
                    sums = np.zeros((MAX_PIECES, COLUMNS))
                others = [states.tree.slots[s].label for s in slots]
                known = numbers.of_pairs([(label, other) for other in others])
                # the kernel has y - w, which is z_j - z_i towards smaller labels
                turned = sum(int(numbers.spin[k]) for other, k in zip(others, known, strict=True) if other < label)
                total = numbers.total[known]
                count = plane_sums(
                    states.d, slots, excluded, outer, half, orders.angular, orders.radial, nodes, weights,
                    total.real.copy(), total.imag.copy(), numbers.spin[known], fine, sums,
                )  # fmt: skip
                if turned % 2:
                    sums[:, :2] *= -1.0
                return sums, _checked(count)
            size = states.d.shape[1]
            d = np.zeros((states.count, size + 1, size + 1), dtype=complex)
            d[:, :size, :size] = states.d
            radius = np.zeros((states.count, size + 1))
            radius[:, :size] = states.radius
        else:
            grown = with_disc(states, label, place, cut)
            tree, d, radius = grown.tree, grown.d, grown.radius
            slots, (excluded, outer) = _NONE, _NO_PLANE
        shape = shape_of(tree)
        mine = [k for k, pair in enumerate(shape.between) if label in pair]
        known = numbers.of_pairs([shape.between[k] for k in mine])
        ends = [numbers.end(cluster) for cluster in shape.clusters]
        powers = np.array([end[0] for end in ends])
        moving = numbers.of_pairs([shape.between[k] for k in shape.factors])
        count = disc_sums(
            d, radius, slots, excluded, outer, half, orders.angular, orders.radial, nodes, weights,
            shape.pairs[mine], numbers.total[known].real.copy(), numbers.total[known].imag.copy(), numbers.spin[known],
            shape.edge_slots, powers.real.copy(), powers.imag.copy(), np.array([end[1] for end in ends]),
            np.array([end[2] for end in ends]), np.array([end[3] for end in ends]),
            shape.pairs[list(shape.factors)], shape.starts, shape.terms, numbers.left[moving], numbers.right[moving],
            numbers.mirror, orders.torus, orders.taylor, sums,
        )  # fmt: skip
        return sums, _checked(count)


def _has_bulk(states: States) -> bool:
    """Whether a point sits in the bulk of a chart, so that the states are nodes of a rule."""
    tree = states.tree
    return any(len(tree.slots_of(chart)) > 2 for chart in range(tree.charts))


def _checked(count: int) -> int:
    if count < 0:
        raise RuntimeError("the table of rays is too small")  # cannot happen: its size covers the largest order
    return count
