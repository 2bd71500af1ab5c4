"""The geometry of the direct sphere integrator, its rules and kernels, and what it refuses."""

from __future__ import annotations

import math

import numpy as np
import pytest

from kn_integrate.errors import InputError, NotAvailableError, PoleError, Status, WorkLimitError
from kn_integrate.exact import Exact
from kn_integrate.exponents import SphereExponents
from kn_integrate.integrals import SphereTerm
from kn_integrate.kernels.sphere_rays import COLUMNS, count_nodes, expand, rays
from kn_integrate.sphere.data import Numbers, SphereData, shape_of
from kn_integrate.sphere.direct import integrate_terms, predict
from kn_integrate.sphere.rules import gauss_tables, orders_of
from kn_integrate.sphere.states import cuts, start, with_bulk, with_disc
from kn_integrate.sphere.sweep import Sweeper
from kn_integrate.sphere.tree import Place, Tree, strata


def term(n, pairs, left=None, right=None):
    found = SphereExponents.from_pairs(n, pairs, left=left or {}, right=right or {})
    return SphereTerm(Exact(1), found.pairs, found.left, found.right)


def test_strata_have_the_numbers_of_boundary_cells():
    # cells by codimension: boundary divisors and their intersections of the moduli space of n points
    for n, expected in ((4, [1, 3]), (5, [1, 10, 15]), (6, [1, 25, 105, 105])):
        edges = [len(tree.edges) for tree in strata(n)]
        assert [edges.count(k) for k in range(n - 2)] == expected


def test_clusters_of_all_strata_are_different():
    trees = strata(6)
    assert len({frozenset(tree.below(s) for s in tree.edges) for tree in trees if len(tree.edges) == 3}) == 105


@pytest.mark.parametrize("seed", range(20))
def test_differences_of_a_tree_are_those_of_its_coordinates(seed):
    rng = np.random.default_rng(seed)
    trees = strata(6)
    tree = trees[rng.integers(len(trees))]
    coordinate = {s: complex(*rng.normal(size=2)) for s in range(len(tree.slots))}
    for chart in range(tree.charts):
        coordinate[tree.slots_of(chart)[0]], coordinate[tree.slots_of(chart)[1]] = 0.0, 1.0
    q = {s: complex(*rng.normal(size=2)) for s in tree.edges}

    def positions(chart, origin, scale):
        found = {}
        for s in tree.slots_of(chart):
            at = origin + scale * coordinate[s]
            if tree.slots[s].child < 0:
                found[tree.slots[s].label] = at
            else:
                found |= positions(tree.slots[s].child, at, scale * q[s])
        return found

    z = positions(tree.root, 0.0, 1.0)
    for i, j in ((1, 2), (1, 5), (2, 4), (3, 5), (3, 4)):
        pair = tree.pair(i, j)
        value = coordinate[pair.left] - coordinate[pair.right]
        for mask, slot, origin, sign in pair.terms:
            factor = math.prod((q[e] for k, e in enumerate(tree.edges) if mask >> k & 1), start=1.0 + 0.0j)
            value += sign * factor * (coordinate[slot] - coordinate[origin])
        common = [s for s in tree.edges if {i, j} <= set(tree.below(s))]
        value *= math.prod((q[s] for s in common), start=1.0 + 0.0j)
        assert value == pytest.approx(z[i] - z[j], rel=1e-12)


@pytest.mark.parametrize("points", [[0, 1], [0, 1, 0.3 + 0.4j], [0, 1, 2.5, -0.2 - 0.1j], [0, 1, 1.01, 0.99 + 0.02j]])
def test_the_plane_is_covered_once(points):
    """The area of the cells is that of the circle minus the discs; so is the integral of a second moment."""
    z = np.array(points, dtype=complex)
    d = z[:, None] - z[None, :]
    distance = np.abs(d) + np.where(np.eye(len(z)) > 0, np.inf, 0)
    excluded = 0.35 * distance.min(axis=1)
    outer = np.abs(z).max() / 0.35
    nodes, weights = gauss_tables()
    table = np.empty((8192, COLUMNS))
    slots = np.arange(len(z))
    rows, _ = rays(d, slots, len(z), excluded, outer, False, 20, 20, nodes, weights, table)
    count = count_nodes(table, rows)
    cell, offset = np.empty(count, dtype=np.int64), np.empty(count, dtype=complex)
    weight, piece = np.empty(count), np.empty(count, dtype=np.int64)
    assert expand(table, rows, nodes, weights, cell, offset, weight, piece) == count
    w = z[cell] + offset
    assert weight.sum() == pytest.approx(outer**2 - (excluded**2).sum(), rel=1e-12)
    moment = outer**4 / 2 - sum(e**2 * abs(p) ** 2 + e**4 / 2 for e, p in zip(excluded, z, strict=True))
    assert (weight * np.abs(w) ** 2).sum() == pytest.approx(moment, rel=1e-11)
    if not z.imag.any():
        rows, _ = rays(d, slots, len(z), excluded, outer, True, 20, 20, nodes, weights, table)
        half = count_nodes(table, rows)
        expand(table, rows, nodes, weights, cell, offset, weight, piece)
        assert 2 * weight[:half].sum() == pytest.approx(outer**2 - (excluded**2).sum(), rel=1e-12)


def test_discs_stay_inside_their_cells():
    states = start(1, 5)
    pending = [(states, 0)]
    for _ in range(2):
        following = []
        for state, done in pending:
            cut = cuts(state, 2 - done)
            for place in state.tree.places():
                if place.kind == "bulk":
                    grown = with_bulk(state, 0, 2 + done, place, cut, orders_of(4), False)
                    following += [(grown.rows(k, k + 1), done + 1) for k in range(0, grown.count, 97)]
                else:
                    following.append((with_disc(state, 2 + done, place, cut), done + 1))
        pending = following
    assert len(pending) > 100
    for state, done in pending:
        cut = cuts(state, 2 - done)
        for chart in range(state.tree.charts):
            slots = list(state.tree.slots_of(chart))
            distance = np.abs(state.d[0][np.ix_(slots, slots)])
            np.fill_diagonal(distance, np.inf)
            assert (cut.excluded[0, slots] <= 0.5 * distance.min(axis=1) * (1 + 1e-12)).all()


def test_same_bits_for_any_number_of_threads_and_in_repeated_runs():
    pairs = {(1, 2): "-0.52", (1, 3): "-0.61", (2, 3): "-0.53", (2, 4): "-0.57", (3, 4): "-0.39"}
    one = term(5, pairs, right={(1, 2): 1, (2, 4): -1, (1, 5): -1, (4, 5): 1})
    results = [integrate_terms(5, [one], rtol=1e-5, threads=threads) for threads in (1, 2, 4, 1)]
    assert len({(e.value, e.error, e.evaluations) for e in results}) == 1


def test_relabelling_keeps_the_value():
    pairs = {(1, 2): "-0.52+0.3j", (1, 3): "-0.61", (2, 3): "-0.53-0.2j", (2, 4): "-0.57", (3, 4): "-0.39"}
    one = term(5, pairs, right={(1, 2): 1, (2, 4): -1, (3, 4): 1, (1, 3): -1})
    found = [integrate_terms(5, [one], rtol=1e-6, frame=f) for f in ((1, 2, 3, 4, 5), (5, 3, 1, 2, 4), (2, 1, 4, 5, 3))]
    for other in found[1:]:
        assert abs(other.value - found[0].value) <= other.error + found[0].error
    assert all(e.ok for e in found)


def test_left_and_right_exchanged_for_complex_exponents():
    pairs = {(1, 2): "-0.6+1.2j", (2, 3): "-0.7-0.4j"}
    spins = {(1, 2): 2, (2, 3): -1, (1, 3): -1, (1, 4): -1, (2, 4): -1, (3, 4): 2}
    left, right = term(4, pairs, left=spins, right=None), term(4, pairs, left=None, right=spins)
    a, b = (integrate_terms(4, [t], rtol=1e-10) for t in (left, right))
    assert a.ok
    assert b.ok
    assert abs(a.value - b.value) <= a.error + b.error


def test_sums_of_terms_and_zero_coefficients():
    one = term(4, {(1, 2): "-0.6", (2, 3): "-0.7"})
    twice = SphereTerm(Exact(2), one.pairs, one.left, one.right)
    nothing = SphereTerm(Exact(0), one.pairs, one.left, one.right)
    single, double = integrate_terms(4, [one], rtol=1e-10), integrate_terms(4, [one, twice, nothing], rtol=1e-10)
    assert double.value == pytest.approx(3 * single.value, rel=1e-9)
    assert integrate_terms(4, [nothing], rtol=1e-10).value == 0.0
    minus = SphereTerm(Exact(-1), one.pairs, one.left, one.right)
    cancelled = integrate_terms(4, [one, minus], rtol=1e-10)
    assert cancelled.status is Status.ZERO
    assert abs(cancelled.value) <= cancelled.error


def test_a_pole_names_its_cluster():
    with pytest.raises(PoleError) as caught:
        integrate_terms(4, [term(4, {(1, 2): -2, (2, 3): "-0.3"})], rtol=1e-8)
    assert caught.value.channel == (1, 2)
    assert caught.value.level == 1
    with pytest.raises(PoleError) as caught:
        integrate_terms(
            5, [term(5, {(1, 2): -1, (1, 3): "-0.5", (2, 3): "-0.5", (2, 4): "0.1", (3, 4): "0.2"})], rtol=1e-4
        )
    assert caught.value.channel in {(1, 2), (1, 2, 3)}


def test_no_pole_where_only_one_side_is_an_integer_at_or_below_zero():
    # divisor exponents -1 and 2: the angular integral of the singular term vanishes
    spins = {(1, 2): 3, (1, 4): -3, (2, 3): -3, (3, 4): 3}
    found = integrate_terms(4, [term(4, {(1, 2): -2, (2, 3): "0.3"}, right=spins)], rtol=1e-8)
    near = integrate_terms(4, [term(4, {(1, 2): "-2.000001", (2, 3): "0.3"}, right=spins)], rtol=1e-8)
    assert found.ok
    assert found.value == pytest.approx(near.value, rel=1e-4)


def test_refusals():
    one = term(4, {(1, 2): "-0.6", (2, 3): "-0.7"})
    with pytest.raises(NotAvailableError, match="n = 7"):
        integrate_terms(7, [], rtol=1e-3)
    with pytest.raises(InputError, match="frame"):
        integrate_terms(4, [one], rtol=1e-3, frame=(1, 2, 3, 3))
    bad = SphereTerm(Exact(1), (Exact(0),) * 6, (0,) * 6, (0,) * 6)
    with pytest.raises(InputError, match="row sum -2"):
        integrate_terms(4, [bad], rtol=1e-3)
    with pytest.raises(InputError, match="rtol"):
        integrate_terms(4, [one], rtol=0.0)
    with pytest.raises(WorkLimitError):
        integrate_terms(4, [one], rtol=1e-3, max_points=10)


def test_a_tolerance_below_the_arithmetic_is_not_ok():
    found = integrate_terms(4, [term(4, {(1, 2): "-5.3", (2, 3): "-4.6"})], rtol=1e-15)
    assert not found.ok
    assert found.status is Status.ROUND_OFF


def test_prediction_is_near_the_work_done():
    pairs = {(1, 2): "-0.52", (1, 3): "-0.61", (2, 3): "-0.53", (2, 4): "-0.57", (3, 4): "-0.39"}
    found = integrate_terms(5, [term(5, pairs)], rtol=1e-6)
    assert predict(5, 1e-6).points == pytest.approx(found.evaluations, rel=1.0)


def test_next_to_a_pole_the_denominator_keeps_its_digits():
    found = integrate_terms(4, [term(4, {(1, 2): "-0.999999999999", (2, 3): "-0.3"})], rtol=1e-9)
    # the residue of the four-point integral at the leading pole is 1
    assert found.ok
    assert found.value * 1e-12 == pytest.approx(1.0, rel=1e-9)


def test_shapes_of_a_split_edge():
    tree = Tree.start(1, 4).insert(2, Place("leaf", 0)).insert(3, Place("split", 0))
    shape = shape_of(tree)
    assert sorted(map(len, shape.clusters)) == [2, 3]
    assert Sweeper(Numbers(SphereData.of(4, *_four()))).symmetric


def _four():
    one = term(4, {(1, 2): "-0.6", (2, 3): "-0.7"})
    return one.pairs, one.left, one.right
