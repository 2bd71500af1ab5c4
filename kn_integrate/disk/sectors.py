r"""Exact decomposition of the disk integral into sectors with endpoint powers only.

Geometry
--------
Punctures 1..n in canonical order, ``z_1 = 0``, ``z_{n-1} = 1``, ``z_n = infinity``.  The integral lives on the
``m = n - 2`` gaps ``g_0..g_{m-1}`` between neighbouring finite punctures; ``z_b - z_a`` is the sum of a *run* of
consecutive gaps, and because the exponents of all runs add up to ``-m`` the integrand is projective: any one gap
may be put to 1 instead of their sum.

Cut the space of gaps by the question which gap is the largest; then ask the same to the left and to the right of
it, and so on.  The answer is a binary tree on the gaps whose in-order sequence is ``0..m-1`` (a Cartesian tree), so
there are Catalan(n-2) sectors, one for each vertex of the associahedron.  In a sector put the root gap to 1 and

    ``g_v = t_v g_parent(v)``,   ``0 <= t_v <= 1``.

Then the integrand becomes ``prod_v t_v^(Y_v - 1)`` times ``prod_runs P_run^A_run`` with

    ``P_run = (sum of the run) / (largest gap of the run) = 1 + a polynomial with coefficients 0 or 1``,

multilinear in the ``t_v``, at least 1 on the cube.  ``Y_v`` is the exponent of the boundary divisor of the chord
whose cluster is the subtree of v.  All singularities are endpoint powers; that is the whole point.

Evaluation plan
---------------
Per sector two variables are chosen as the *inner pair* so that as few runs as possible depend on both; every
``P_run`` is ``alpha + beta t_i + gamma t_j + delta t_i t_j`` with coefficients that depend on the other (outer)
variables through a few monomials.  :class:`SectorTable` holds this as integer arrays, which is all that the kernels
see.  Tables depend on n alone and are kept.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

Run = tuple[int, int]

CONST, I_ONLY, J_ONLY, BOTH = 0, 1, 2, 3


def runs_of(m: int) -> tuple[Run, ...]:
    """All runs ``(a, b)`` of consecutive gaps, ``0 <= a <= b < m``, by length and then by position.

    The full run stands last.  A run shorter than the full one is a chord of the n-gon: the one whose cluster is
    the punctures ``a+1 .. b+2``.

    >>> runs_of(3)
    ((0, 0), (1, 1), (2, 2), (0, 1), (1, 2), (0, 2))
    """
    return tuple((a, a + length) for length in range(m) for a in range(m - length))


@dataclass(frozen=True)
class Tree:
    """A Cartesian tree on gaps ``0..m-1``: the parent of each gap (-1 for the root) and the run of its subtree."""

    parent: tuple[int, ...]
    subtree: tuple[Run, ...]

    @property
    def root(self) -> int:
        """The largest gap of the sector."""
        return self.parent.index(-1)

    def lca(self, run: Run) -> int:
        """The largest gap of a run: its member nearest to the root."""
        a, b = run
        return min(range(a, b + 1), key=self.depth)

    def depth(self, v: int) -> int:
        """Number of steps to the root."""
        steps = 0
        while self.parent[v] >= 0:
            v = self.parent[v]
            steps += 1
        return steps

    def path(self, v: int, ancestor: int) -> tuple[int, ...]:
        """The gaps from v up to, not including, an ancestor: ``g_v = g_ancestor * prod t_u`` over them."""
        steps = []
        while v != ancestor:
            steps.append(v)
            v = self.parent[v]
        return tuple(steps)


@cache
def trees(m: int) -> tuple[Tree, ...]:
    """All Cartesian trees on m gaps, in a fixed order; Catalan(m) of them.

    >>> [len(trees(m)) for m in (2, 3, 4, 5, 6, 7)]
    [2, 5, 14, 42, 132, 429]
    """

    @cache
    def build(a: int, b: int) -> tuple[tuple[tuple[int, int], ...], ...]:
        # every tree on gaps a..b, as pairs (gap, parent or -1)
        if a > b:
            return ((),)
        found = []
        for root in range(a, b + 1):
            for left in build(a, root - 1):
                for right in build(root + 1, b):
                    nodes = [(root, -1)]
                    nodes += [(v, root if p < 0 else p) for v, p in (*left, *right)]
                    found.append(tuple(nodes))
        return tuple(found)

    result = []
    for nodes in build(0, m - 1):
        parent = [0] * m
        for v, p in nodes:
            parent[v] = p
        low, high = list(range(m)), list(range(m))
        for v in range(m):
            u = v
            while parent[u] >= 0:
                u = parent[u]
                low[u], high[u] = min(low[u], v), max(high[u], v)
        result.append(Tree(tuple(parent), tuple(zip(low, high, strict=True))))
    return tuple(result)


@dataclass(frozen=True)
class SectorTable:
    """Every sector of one n as padded integer arrays, S sectors.

    Attributes
    ----------
    n, m, runs
        Number of punctures, of gaps, and the runs in the order of :func:`runs_of`.
    variables : (S, n-3) int32
        The chord (run index) of each variable; outer ones first, then the inner pair i, j.
    masks_prev, masks_var : (S, K) int32
        Monomials of the outer variables: entry k is entry ``masks_prev[k]`` times outer variable ``masks_var[k]``;
        entry 0 is 1.
    mask_count : (S,) int32
    run_index : (S, R) int32
        The runs of at least two gaps, sorted by how they depend on the inner pair.
    run_bounds : (S, 5) int32
        Where the four kinds (constant, i only, j only, both) start and the last ends in ``run_index``.
    run_split : (S, 4) int32
        Within each kind, where the runs start that depend on the last outer variable; the others stand first.
    term_start : (S, R + 1) int32
    term_mask, term_class : (S, T) int32
        The terms of each run: which monomial, times 1, t_i, t_j or t_i t_j (class 0..3).
    sibling : (S, n-3) int32
        For each variable the position, in the same row, of the variable on the other side of its parent; -1 if none.
    """

    n: int
    m: int
    runs: tuple[Run, ...]
    trees: tuple[Tree, ...]
    variables: NDArray[np.int32]
    masks_prev: NDArray[np.int32]
    masks_var: NDArray[np.int32]
    mask_count: NDArray[np.int32]
    run_index: NDArray[np.int32]
    run_bounds: NDArray[np.int32]
    run_split: NDArray[np.int32]
    term_start: NDArray[np.int32]
    term_mask: NDArray[np.int32]
    term_class: NDArray[np.int32]
    sibling: NDArray[np.int32]

    @property
    def count(self) -> int:
        """Number of sectors."""
        return len(self.trees)

    @property
    def chord_count(self) -> int:
        """n(n-3)/2: the runs shorter than the full one."""
        return len(self.runs) - 1

    def sizes(self) -> NDArray[np.int64]:
        """The number of gaps in the cluster of each chord."""
        return np.array([b - a + 1 for a, b in self.runs[:-1]], dtype=np.int64)


def _run_terms(tree: Tree, run: Run) -> list[tuple[int, ...]]:
    top = tree.lca(run)
    return [tree.path(v, top) for v in range(run[0], run[1] + 1)]


def _order_variables(m: int, tree: Tree, terms: dict[Run, list[tuple[int, ...]]]) -> tuple[list[int], tuple[int, ...]]:
    """The outer variables, the fastest one last, and the inner pair (one variable when there is only one).

    Chosen for the fewest logarithms per point: a run that depends on both inner variables costs one at every point, on
    one of them and the fastest outer variable one in a row of about 8 points, on one of them alone one in 64.
    """
    variables = [v for v in range(m) if tree.parent[v] >= 0]
    if len(variables) == 1:
        return [], (variables[0],)
    on = np.array([[any(v in path for path in paths) for v in variables] for paths in terms.values()], dtype=np.int64)
    two = on.T @ on
    three = np.einsum("ri,rj,rk->ijk", on, on, on)
    best: tuple[float, tuple[int, int], int] | None = None
    for i, j in combinations(range(len(variables)), 2):
        single = two[i, i] + two[j, j] - 2 * two[i, j]
        for k in range(len(variables)):
            if k in (i, j) and len(variables) > 2:
                continue
            often = two[i, k] + two[j, k] - 2 * three[i, j, k] if len(variables) > 2 else 0
            cost = float(two[i, j] + often / 8 + (single - often) / 64)
            if best is None or cost < best[0]:
                best = cost, (i, j), k
    assert best is not None
    _, (i, j), k = best
    outer = [v for c, v in enumerate(variables) if c not in (i, j)]
    if outer:
        outer = [v for v in outer if v != variables[k]] + [variables[k]]
    return outer, (variables[i], variables[j])


class _Masks:
    """The monomials of the outer variables a sector needs, each one built from an earlier one by one factor."""

    def __init__(self, slot: dict[int, int]) -> None:
        self.slot = slot
        self.prev, self.var = [0], [0]
        self.known: dict[frozenset[int], int] = {frozenset(): 0}

    def index(self, path: tuple[int, ...]) -> int:
        """The number of the product of ``t_v`` over the outer members of a path."""
        members = frozenset(self.slot[v] for v in path if v in self.slot)
        if members not in self.known:
            # the path without its lowest gap belongs to the parent; build it first
            head = next(v for v in path if v in self.slot)
            base = self.index(tuple(v for v in path if v != head))
            self.known[members] = len(self.prev)
            self.prev.append(base)
            self.var.append(self.slot[head])
        return self.known[members]


def _sector_row(m: int, tree: Tree, index: dict[Run, int]) -> dict[str, list[int]]:
    """One sector as lists of integers, by the names of :class:`SectorTable`."""
    terms = {run: _run_terms(tree, run) for run in index if run[1] > run[0]}
    outer, pair = _order_variables(m, tree, terms)
    i, j = pair if len(pair) == 2 else (pair[0], -1)
    fastest = outer[-1] if outer else -1
    masks = _Masks({v: k for k, v in enumerate(outer)})
    by_kind: list[list[tuple[bool, int, list[tuple[int, int]]]]] = [[], [], [], []]
    for run, paths in terms.items():
        encoded = [(masks.index(path), (1 if i in path else 0) + (2 if j in path else 0)) for path in paths]
        classes = {c for _, c in encoded}
        on_i, on_j = bool(classes & {1, 3}), bool(classes & {2, 3})
        kind = (BOTH if on_i else J_ONLY) if on_j else (I_ONLY if on_i else CONST)
        by_kind[kind].append((any(fastest in path for path in paths), index[run], encoded))
    row: dict[str, list[int]] = {
        "masks_prev": masks.prev,
        "masks_var": masks.var,
        "run_index": [],
        "run_bounds": [0],
        "run_split": [],
        "term_start": [0],
        "term_mask": [],
        "term_class": [],
    }
    for members in by_kind:
        members.sort(key=lambda member: member[0])
        row["run_split"].append(len(row["run_index"]) + sum(not fast for fast, _, _ in members))
        for _, position, encoded in members:
            row["run_index"].append(position)
            row["term_mask"] += [mask for mask, _ in encoded]
            row["term_class"] += [c for _, c in encoded]
            row["term_start"].append(len(row["term_mask"]))
        row["run_bounds"].append(len(row["run_index"]))
    order = [*outer, *pair]
    row["variables"] = [index[tree.subtree[v]] for v in order]
    row["sibling"] = [
        next((k for k, u in enumerate(order) if u != v and tree.parent[u] == tree.parent[v]), -1) for v in order
    ]
    return row


@cache
def sector_table(n: int) -> SectorTable:
    """The table of all sectors for n punctures (n >= 4), built once per n.

    >>> table = sector_table(6)
    >>> table.count, table.chord_count
    (14, 9)
    """
    m = n - 2
    runs = runs_of(m)
    index = {run: k for k, run in enumerate(runs)}
    rows = [_sector_row(m, tree, index) for tree in trees(m)]

    def packed(name: str) -> NDArray[np.int32]:
        width = max(1, max(len(row[name]) for row in rows))
        array = np.zeros((len(rows), width), dtype=np.int32)
        for s, row in enumerate(rows):
            array[s, : len(row[name])] = row[name]
        array.setflags(write=False)
        return array

    counts = np.array([len(row["masks_prev"]) for row in rows], dtype=np.int32)
    counts.setflags(write=False)
    names = (
        "variables",
        "masks_prev",
        "masks_var",
        "run_index",
        "run_bounds",
        "run_split",
        "term_start",
        "term_mask",
        "term_class",
    )
    return SectorTable(
        n=n,
        m=m,
        runs=runs,
        trees=trees(m),
        mask_count=counts,
        sibling=packed("sibling"),
        **{name: packed(name) for name in names},
    )


@cache
def mirror(n: int) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Reversing the order of the gaps maps sectors to sectors: the image of each, and of each of its variables.

    Returns
    -------
    partner : (S,) array
    place : (S, n-3) array
        Variable v of sector s becomes variable ``place[s, v]`` of sector ``partner[s]``.

    >>> mirror(5)[0].tolist()
    [4, 3, 2, 1, 0]
    """
    table = sector_table(n)
    m = table.m
    chord = {run: k for k, run in enumerate(table.runs)}
    image = np.array([chord[m - 1 - b, m - 1 - a] for a, b in table.runs])
    known = {frozenset(row): s for s, row in enumerate(table.variables.tolist())}
    mirrored = image[table.variables]
    partner = np.array([known[frozenset(row)] for row in mirrored.tolist()])
    place = (mirrored[:, :, None] == table.variables[partner][:, None, :]).argmax(axis=2)
    return partner, place
