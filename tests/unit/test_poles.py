"""Residues, Laurent coefficients and cancelling poles of disk integrals, against lower-point integrals and Gammas."""

from __future__ import annotations

import math
from fractions import Fraction
from itertools import combinations

import numpy as np
import pytest

import kn_integrate as kn
from kn_integrate.dispatch.shifts import chords_of
from kn_integrate.exact import ZERO, Exact
from kn_integrate.poles import _cross


def within(found, exact, slack=0.0):
    assert abs(found.value - exact) <= found.error + slack, (found, exact)


def pt(n):
    return kn.parke_taylor(*range(1, n + 1))


def beta_residue(level: int, b: Fraction) -> Fraction:
    """((-1)^N / N!) prod_(k=1..N) (b - k): the residue of B(a, b) at a = -N (from B = sum_k (1-b)_k / (k! (a+k)))."""
    value = Fraction((-1) ** level, math.factorial(level))
    for k in range(1, level + 1):
        value *= b - k
    return value


@pytest.mark.parametrize("level", range(9))
def test_four_point_residues_of_every_level(level):
    kin = kn.Mandelstams.from_planar(4, {(1, 2): "1/3", (2, 3): "3/7"})
    found = kn.residue(kin, pt(4), channel=(1, 2), level=level, rtol=1e-11)
    assert found.ok
    within(found, float(beta_residue(level, Fraction(3, 7))))


@pytest.mark.parametrize("level", range(9))
def test_the_four_point_residue_is_a_polynomial_of_degree_n(level):
    # fitted, not assumed: one more difference than the degree vanishes, the last one does not
    values, errors = [], []
    for k in range(level + 2):
        kin = kn.Mandelstams.from_planar(4, {(1, 2): "1/3", (2, 3): Fraction(1, 3) + k})
        found = kn.residue(kin, pt(4), channel=(1, 2), level=level, rtol=1e-12)
        values.append(found.value)
        errors.append(found.error)
    noise = 2.0 ** len(values) * max(errors)
    assert abs(np.diff(values, level + 1)[0]) <= noise
    assert abs(np.diff(values, level)[0]) > noise


def lower_points(kin, inside, n):
    """The kinematics of the two factors when a planar channel of labels ``inside`` is on shell (massless)."""
    outside = [*range(inside[-1] + 1, n + 1), *range(1, inside[0])]
    sides = []
    for legs in (list(inside), outside):
        m = len(legs) + 1
        if m < 4:
            sides.append(None)
            continue
        pairs = {(a, b): kin.pair(legs[a - 1], legs[b - 1]) for a, b in combinations(range(1, m), 2)}
        sides.append(kn.Mandelstams.from_pairs(m, pairs))
    return sides


def moved_onto(kin, channel, n):
    from kn_integrate.dispatch.family import disk_family, moved

    family = disk_family(kin, pt(n))
    chord = family.chord(channel)
    return moved(kin, family.ordering, {chord: -kin.channel(channel)})


@pytest.mark.parametrize("n", [5, 6, 7])
def test_massless_residues_factorise_in_every_channel(n):
    kin = kn.Mandelstams.random(n, n, low=0, high=1)
    rtol = 1e-10 if n < 7 else 1e-8
    for i, j in chords_of(n):
        inside = tuple(range(i, j + 1))
        found = kn.residue(kin, pt(n), channel=inside, rtol=rtol)
        product, error = 1.0, 0.0
        for side in lower_points(moved_onto(kin, inside, n), inside, n):
            if side is not None:
                factor = kn.disk_integral(side, pt(side.n), rtol=rtol)
                error = error * abs(factor.value) + factor.error * abs(product)
                product *= factor.value
        assert found.ok
        within(found, product, error)


@pytest.mark.parametrize("n", [4, 5, 6])
def test_first_massive_level_against_its_closed_expression(n):
    # in the gauge z_n = inf the derivative of the integrand at z_2 = z_1 gives
    #   Res_{s12 = -1} Z_n = - sum_{j=3}^{n-1} A_2j I_{n-1}[A_1j + A_2j merged, one less at j]
    kin = kn.Mandelstams.random(n, 40 + n, low=0, high=1)
    channel = (1, 2)
    found = kn.residue(kin, pt(n), channel=channel, level=1, rtol=1e-10)
    from kn_integrate.dispatch.family import disk_family, moved

    family = disk_family(kin, pt(n))
    at = moved(kin, family.ordering, {(1, 2): Exact(-1) - kin.pair(1, 2)})
    full = {}
    for i, j in combinations(range(1, n + 1), 2):
        full[i, j] = at.pair(i, j) - (1 if j - i in (1, n - 1) else 0)
    total, error = 0.0, 0.0
    for j in range(3, n):
        # punctures 1 = 2 merged, 3, ..., n become 1, 2, ..., n - 1; exponents at infinity follow from the rows
        m = n - 1
        finite = {}
        for a, b in combinations(range(1, m), 2):
            finite[a, b] = full[1, b + 1] + full[2, b + 1] if a == 1 else full[a + 1, b + 1]
        finite[1, j - 1] = finite[1, j - 1] - 1
        if m == 3:
            value, bound = 1.0, 0.0
        else:
            rest = dict(finite)
            for a in range(1, m):
                rest[a, m] = -2 - sum((v for pair, v in finite.items() if a in pair), ZERO)
            # the pair (1, m-1) does not matter in this gauge; it makes the last row right
            excess = (-2 - sum((rest[a, m] for a in range(1, m)), ZERO)) / 2
            rest[1, m - 1] = rest[1, m - 1] - excess
            rest[1, m] = rest[1, m] + excess
            rest[m - 1, m] = rest[m - 1, m] + excess
            result = kn.disk_integral(kn.DiskExponents.from_pairs(m, rest), rtol=1e-11)
            value, bound = result.value, result.error
        total -= float(full[2, j]) * value
        error += abs(float(full[2, j])) * bound
    assert found.ok
    within(found, total, error)


def triangulations(n):
    chords = chords_of(n)
    for chosen in combinations(chords, n - 3):
        if not any(_cross(a, b) for a, b in combinations(chosen, 2)):
            yield chosen


def test_maximal_residues_at_six_points_are_one():
    kin = kn.Mandelstams.random(6, 1)
    every = list(triangulations(6))
    assert len(every) == 14
    for chosen in every:
        channels = [tuple(range(i, j + 1)) for i, j in chosen]
        found = kn.residue(kin, pt(6), channel=channels)
        assert found.value == 1.0
        assert found.ok


@pytest.mark.parametrize("levels", [(0, 1), (1, 0), (0, 3), (2, 0)])
def test_level_mixed_residues_against_four_points(levels):
    # a massless residue in (1,2) leaves the four-point integral of (12), 3, 4, 5, with channels 123 = 45 and 34
    kin = kn.Mandelstams.random(5, 4, low=0, high=1)
    first, second = levels
    found = kn.residue(kin, pt(5), channel=[(1, 2), (3, 4)], level=[first, second], rtol=1e-10)
    assert found.ok
    if first == 0:
        exact = beta_residue(second, kin.channel((1, 2, 3)).re)
        within(found, float(exact))
    else:  # the other order of taking them
        again = kn.residue(kin, pt(5), channel=[(3, 4), (1, 2)], level=[second, first], rtol=1e-10)
        within(found, again.value, again.error)
        one = kn.residue(kin, pt(5), channel=(4, 3), level=second, rtol=1e-10)
        assert one.ok


@pytest.mark.parametrize("distance", ["1/10", "1/1000", "1/10000000"])
def test_value_less_polar_part_tends_to_the_finite_part(distance):
    kin = kn.Mandelstams.random(5, 8, low=0, high=1)
    series = kn.laurent_series(kin, pt(5), channel=(2, 3), level=0, high=2)
    h = Exact(distance)
    pairs = dict(kin.planar())
    pairs[2, 3] = h
    near = kn.Mandelstams.from_planar(5, pairs)
    value = kn.disk_integral(near, pt(5), rtol=1e-13, method="quadrature")
    polar, polar_error = series.coefficient(-1)
    finite, finite_error = series.coefficient(0)
    slope, slope_error = series.coefficient(1)
    curve, _ = series.coefficient(2)
    x = float(h)
    rest = value.value - polar / x - finite - slope * x - curve * x * x
    bound = value.error + polar_error / x + finite_error + slope_error * x
    assert abs(rest) <= bound + 100 * x**3 + 4e-16 * abs(value.value)
    residue = kn.residue(kin, pt(5), channel=(2, 3))
    assert abs(residue.value - polar) <= residue.error + polar_error


def field_theory_trees(kin, n):
    """The sum over planar cubic trees of prod 1/X: one term for each triangulation of the n-gon."""
    total = Fraction(0)
    for chosen in triangulations(n):
        product = Fraction(1)
        for i, j in chosen:
            product /= kin.channel(tuple(range(i, j + 1))).re
        total += product
    return float(total)


@pytest.mark.parametrize("n", [4, 5, 6, 7])
def test_the_leading_coefficient_is_the_sum_over_planar_cubic_trees(n):
    kin = kn.Mandelstams.random(n, 3, low="1/4", high=1)
    series = kn.laurent_series(kin, pt(n), direction="scale", high=-(n - 3), rtol=1e-9 if n < 7 else 1e-6)
    value, error = series.coefficient(-(n - 3))
    exact = field_theory_trees(kin, n)
    assert abs(value - exact) <= error
    assert error <= 1e-6 * abs(exact)


def test_the_leading_coefficient_for_every_integrand_at_five_points():
    from itertools import permutations

    kin = kn.Mandelstams.random(5, 3, low="1/4", high=1)
    for order in permutations((2, 3, 4, 5)):
        cycle = (1, *order)
        series = kn.laurent_series(kin, kn.parke_taylor(*cycle), direction="scale", high=-2)
        value, error = series.coefficient(-2)
        exact = common_trees(kin, cycle)
        assert abs(value - exact) <= error


def common_trees(kin, cycle):
    """Sum over cubic trees planar in 12345 and in ``cycle``, with (-1)^(vertices that turn over), n = 5."""
    n = 5
    total = 0.0
    for chosen in triangulations(n):
        clusters = [set(range(i, j + 1)) for i, j in chosen]
        place = {label: k for k, label in enumerate(cycle)}
        ok = True
        for cluster in clusters:
            inside = [label in cluster for label in cycle]
            ok &= sum(inside[k] != inside[k - 1] for k in range(n)) == 2
        if not ok:
            continue
        flips = 0
        for legs in vertices(clusters, n):
            # the three branches of a vertex, each by one of its labels, in the cyclic order of both orderings
            a, b, c = (min(leg) for leg in legs)
            flips += cyclic_sign(a, b, c) != cyclic_sign(place[a], place[b], place[c])
        product = 1.0
        for cluster in clusters:
            product /= float(kin.channel(tuple(cluster)))
        total += (-1) ** flips * product
    return total


def cyclic_sign(a, b, c):
    return 1 if (a < b < c) or (b < c < a) or (c < a < b) else -1


def vertices(clusters, n):
    """The vertices of a cubic tree as triples of leaf sets: all splits of the leaves, matched three by three."""
    everything = frozenset(range(1, n + 1))
    splits = [frozenset(c) for c in clusters] + [frozenset({k}) for k in everything]
    splits += [everything - s for s in splits]
    found = set()
    for a, b, c in combinations(set(splits), 3):
        if a | b | c == everything and len(a) + len(b) + len(c) == n:
            found.add(frozenset((a, b, c)))
    return [tuple(v) for v in found]


def test_soft_limit():
    # Z_n -> (1/s_{n-1,n} + 1/s_{n,1}) Z_{n-1}: the leading Laurent coefficient when s_{n j} -> x s_{n j}
    # four-point kinematics of the hard legs, and a direction that adds the soft leg: what it takes from a hard row is
    # given back by pairs of hard legs
    hard = kn.Mandelstams.from_planar(4, {(1, 2): "1/3", (2, 3): "2/5"})
    base = {(i, j): hard.pair(i, j) if j < 5 else ZERO for i, j in combinations(range(1, 6), 2)}
    s15, s25, s35 = Exact("1/3"), Exact("-1/4"), Exact("1/7")
    s45 = -(s15 + s25 + s35)
    r1, r2, r3, r4 = -s15, -s25, -s35, -s45
    t12 = (r1 + r2 - r3 + r4) / 2
    total = {
        **dict.fromkeys(combinations(range(1, 6), 2), ZERO),
        (1, 5): s15,
        (2, 5): s25,
        (3, 5): s35,
        (4, 5): s45,
        (1, 2): t12,
        (1, 3): r1 - t12,
        (2, 3): r2 - t12,
        (3, 4): r4,
    }
    moved = kn.Mandelstams.from_pairs(5, total)
    start = kn.Mandelstams.from_pairs(5, base)
    series = kn.laurent_series(start, pt(5), direction=moved, low=-2, high=-1)
    value, error = series.coefficient(-1)
    four = kn.disk_integral(hard, pt(4))
    exact = (1 / float(s45) + 1 / float(s15)) * four.value
    assert abs(value - exact) <= error + four.error * abs(exact / four.value)


def test_poles_that_cancel_in_a_sum():
    f = kn.parke_taylor(1, 2, 3, 4) + kn.parke_taylor(2, 1, 3, 4)
    at = kn.Mandelstams.from_planar(4, {(1, 2): 0, (2, 3): "1/3"})
    value = kn.disk_integral(at, f)
    assert value.ok
    within(value, 3.0)  # 1/s + 1/t - 1/s: the U(1) relation gives -Z(1,3,2,4)-like 1/t at s = 0
    close = kn.Mandelstams.from_planar(4, {(1, 2): "1/100000", (2, 3): "1/3"})
    near = kn.disk_integral(close, f, method="quadrature", rtol=1e-8)
    assert abs(near.value - 3.0) < 1e-4


def test_a_pole_that_does_not_cancel_names_its_channel():
    kin = kn.Mandelstams.from_planar(5, {(1, 2): 1, (2, 3): -1, (3, 4): 2, (4, 5): "1/3", (5, 1): "1/7"})
    with pytest.raises(kn.PoleError) as caught:
        kn.disk_integral(kin, pt(5))
    assert (caught.value.channel, caught.value.level, caught.value.at) == ((2, 3), 1, -1)
    with pytest.raises(kn.PoleError):
        kn.disk_integral(kin, pt(5) + kn.parke_taylor(1, 2, 4, 3, 5))


def test_directional_limits_are_not_values():
    # Gamma(a) Gamma(b)/Gamma(a+b) at a = -1, b = 1: finite along some lines, different along others
    kin = kn.Mandelstams.from_planar(4, {(1, 2): -1, (2, 3): 1})
    with pytest.raises(kn.PoleError):
        kn.disk_integral(kin, pt(4))


def test_other_invariants_may_be_held():
    kin = kn.Mandelstams.random(5, 12, low=0, high=1)
    planar = kn.residue(kin, pt(5), channel=(1, 2), level=1)
    same = kn.residue(kin, pt(5), channel=(1, 2), level=1, hold=[(2, 3), (3, 4), (4, 5), (1, 5)])
    other = kn.residue(kin, pt(5), channel=(1, 2), level=1, hold=[(1, 3), (3, 4), (4, 5), (2, 5)])
    assert planar.value == same.value
    assert planar.value != other.value


@pytest.mark.parametrize(
    ("options", "field"),
    [
        ({"channel": (1, 3)}, "channel"),
        ({"channel": [(1, 2), (2, 3)]}, "channel"),
        ({"channel": [(1, 2), (1, 2)]}, "channel"),
        ({"channel": "12"}, "channel"),
        ({"channel": (1, 2), "level": -1}, "level"),
        ({"channel": (1, 2), "level": [0, 1]}, "level"),
        ({"channel": (1, 2), "hold": [(2, 3)]}, "hold"),
        ({"channel": (1, 2), "hold": [(1, 2), (2, 3), (3, 4), (4, 5)]}, "hold"),
        ({"channel": (1, 9)}, "channel"),
    ],
)
def test_bad_input(options, field):
    kin = kn.Mandelstams.random(5, 12, low=0, high=1)
    with pytest.raises(kn.InputError) as caught:
        kn.residue(kin, pt(5), **options)
    assert caught.value.field == field


def test_a_further_pole_at_the_residue_is_refused():
    kin = kn.Mandelstams.from_planar(5, {(1, 2): 1, (2, 3): "1/2", (3, 4): 0, (4, 5): "1/3", (5, 1): "1/7"})
    with pytest.raises(kn.PoleError):
        kn.residue(kin, pt(5), channel=(1, 2))


def test_i_epsilon_moves_timelike_channels_down():
    for n in (4, 5, 6):
        kin = kn.Mandelstams.random(n, 2)
        moved = kn.plus_i_epsilon(kin, "1/50")
        assert moved.row_sums == kin.row_sums
        final = range(3, n + 1)
        for size in range(2, n - 1):
            for legs in combinations(final, size):
                assert moved.channel(legs).im < 0
        assert moved.pair(1, 2).im < 0
    with pytest.raises(kn.InputError):
        kn.plus_i_epsilon(kin, "-1/2")


def test_principal_value_and_discontinuity_at_a_resonance():
    # across a pole at X = -1: (Z(X + i e) + Z(X - i e))/2 is the finite part, the difference 2 pi i times a delta
    kin = kn.Mandelstams.from_planar(4, {(1, 2): -1, (2, 3): "2/5"})
    series = kn.laurent_series(kin, pt(4), channel=(1, 2), level=1, high=2)
    finite, _ = series.coefficient(0)
    residue, _ = series.coefficient(-1)
    e = 1e-3
    up, down = (
        kn.disk_integral(
            kn.Mandelstams.from_planar(4, {(1, 2): Exact(-1) + Exact(f"{s}1/1000j"), (2, 3): "2/5"}), pt(4)
        )
        for s in ("", "-")
    )
    assert abs(up.value - down.value.conjugate()) <= up.error + down.error
    assert abs((up.value + down.value).real / 2 - finite) < 10 * e**2
    assert abs((up.value - down.value).imag / 2 + residue / e) < 10 * e
