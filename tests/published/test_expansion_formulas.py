"""Expansions against published formulas.

Equation numbers are not given: the formulas were taken from memory of the papers named, and are recognisable there.
"""

from __future__ import annotations

from fractions import Fraction
from itertools import permutations
from math import factorial

import pytest

from kn_integrate import FEntry, Mandelstams, ZetaSum, alpha_expansion, parke_taylor, reconstruct, zeta
from kn_integrate.exact import Exact
from kn_integrate.expansion.disk import exact_engine
from kn_integrate.expansion.reduction import words_of
from kn_integrate.expansion.sphere import single_valued

ONE = ZetaSum([((), Exact(1))])
Z2, Z3, Z5 = zeta(2), zeta(3), zeta(5)


def four_points(s, t) -> Mandelstams:
    return Mandelstams.from_planar(4, {(1, 2): s, (2, 3): t})


def exponential(parts: dict[int, ZetaSum], weight: int) -> list[ZetaSum]:
    """The coefficients of exp(sum_k parts[k] x^k)."""
    total = [ONE] + [ZetaSum()] * weight
    for k, part in parts.items():
        power, powers = ONE, [ONE]
        while (len(powers)) * k <= weight:
            power = power * part
            powers.append(power / factorial(len(powers)))
        total = [
            sum((total[w - k * j] * p for j, p in enumerate(powers) if w >= k * j), ZetaSum())
            for w in range(weight + 1)
        ]
    return total


@pytest.mark.parametrize(("s", "t"), [("2/3", "-5/7"), ("-3", "4"), ("1+j", "1/2-j")])
def test_four_points_are_the_exponential_of_single_zeta_values(s, t):
    # log G(1+s)G(1+t)/G(1+s+t) = sum_k zeta(k) (-1)^k (s^k + t^k - (s+t)^k)/k  (DLMF 5.7.3)
    kin = four_points(s, t)
    x, y = kin.pair(1, 2), kin.pair(2, 3)
    parts = {k: zeta(k) * ((-1) ** k * (x**k + y**k - (x + y) ** k) / k) for k in range(2, 13)}
    want = exponential(parts, 12)
    series = alpha_expansion(kin, FEntry(4), weight=12)
    assert list(series.exact) == want
    disk = alpha_expansion(kin, parke_taylor(1, 2, 3, 4), weight=12)
    assert list(disk.exact) == [value * (1 / x + 1 / y) for value in want]
    assert disk.leading == -1


@pytest.mark.parametrize(("s", "t"), [("2/3", "-5/7"), ("-3", "4")])
def test_four_points_on_the_sphere_are_the_exponential_of_odd_zeta_values(s, t):
    # Virasoro-Shapiro: exp(-2 sum zeta(2k+1)(s^(2k+1) + t^(2k+1) + u^(2k+1))/(2k+1))
    kin = four_points(s, t)
    x, y, z = kin.pair(1, 2), kin.pair(2, 3), kin.pair(1, 3)
    parts = {k: zeta(k) * (-2 * (x**k + y**k + z**k) / k) for k in range(3, 13, 2)}
    f = parke_taylor(1, 2, 3, 4)
    series = alpha_expansion(kin, f, f, weight=12)
    assert list(series.exact) == [value * (1 / x + 1 / y) for value in exponential(parts, 12)]


# --- n = 5: Mafra, Schlotterer, Stieberger 2011, arXiv:1106.2645, 1106.2646; Schlotterer, Stieberger 2012, 1205.1516


def five_points(kin: Mandelstams) -> tuple[Exact, ...]:
    return tuple(kin.pair(i, i % 5 + 1) for i in range(1, 6))


def p2(kin):
    s1, s2, s3, s4, s5 = five_points(kin)
    s13, s24 = kin.pair(1, 3), kin.pair(2, 4)
    return [[-s3 * s4 + s1 * (s3 - s5), s13 * s24], [s1 * s3, (s1 + s2) * (s2 + s3) - s4 * s5]]


def m3(kin):
    s1, s2, s3, s4, s5 = five_points(kin)
    s13, s24 = kin.pair(1, 3), kin.pair(2, 4)
    return [
        [
            s3 * (-s1 * (s1 + 2 * s2 + s3) + s3 * s4 + s4 * s4) + s1 * s5 * (s1 + s5),
            -s13 * s24 * (s1 + s2 + s3 + s4 + s5),
        ],
        [s1 * s3 * (s1 + s2 + s3 - 2 * s4 - 2 * s5), None],
    ]


WORDS = ((2, 3), (3, 2))


@pytest.mark.parametrize("row", [0, 1])
@pytest.mark.parametrize("column", [0, 1])
def test_p2_and_m3_as_polynomials(row, column):
    # two polynomials of degree d in five variables that agree at enough random points agree; reconstruct gives them
    # exactly, and the published ones are evaluated at points of a grid that determines polynomials of degree 3
    entry = FEntry(5, WORDS[row], WORDS[column])
    for value, published in ((Z2, p2), (Z3, m3)):
        found = reconstruct(entry, zeta=value)
        assert found.denominator == ()
        assert all(sum(e) == (2 if value == Z2 else 3) for e in found.numerator)
        for k in range(40):
            planar = {(i, i % 5 + 1): (k * i * i + 7 * k + i) % 11 - 5 for i in range(1, 6)}
            kin = Mandelstams.from_planar(5, planar)
            want = published(kin)[row][column]
            if want is not None:
                assert found(kin) == want


def f_matrix(kin: Mandelstams, weight: int) -> list[list[ZetaSum]]:
    """The coefficients of one weight."""
    return [
        [alpha_expansion(kin, FEntry(5, r, c), weight=weight, method="associator").exact[weight] for c in WORDS]
        for r in WORDS
    ]


def times(a, b):
    return [[a[i][0] * b[0][j] + a[i][1] * b[1][j] for j in range(2)] for i in range(2)]


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_weights_through_eight_have_the_published_matrix_structure(seed):
    # F = P :exp(sum zeta(2k+1) M_(2k+1)): with a commutator at depth two: weight 5: zeta2 zeta3 P2 M3; weight 6:
    # zeta3^2 M3 M3/2; weight 7: zeta2 zeta5 P2 M5, zeta2^2 zeta3 P4 M3; weight 8: zeta3 zeta5 M5 M3,
    # zeta2 zeta3^2 P2 M3 M3/2, and zeta(3,5) [M5, M3]/5, the first value of depth two
    kin = Mandelstams.random(5, seed, low=-3, high=3, denominator=4)
    f = {w: f_matrix(kin, w) for w in range(2, 9)}

    def part(weight, *generators):
        return [[entry.coefficient(*generators) for entry in line] for line in f[weight]]

    def scaled(matrix, c):
        return [[c * x for x in line] for line in matrix]

    a2, a3, a4, a5 = part(2, 2), part(3, 3), part(4, 2, 2), part(5, 5)
    assert a2 == p2(kin)
    assert a3[0] == m3(kin)[0]
    assert a3[1][0] == m3(kin)[1][0]
    assert part(5, 2, 3) == times(a2, a3)
    assert part(6, 3, 3) == scaled(times(a3, a3), Fraction(1, 2))
    assert part(7, 2, 5) == times(a2, a5)
    assert part(7, 2, 2, 3) == times(a4, a3)
    assert part(8, 3, 5) == times(a5, a3)
    assert part(8, 2, 3, 3) == scaled(times(a2, times(a3, a3)), Fraction(1, 2))
    commutator = [[x - y for x, y in zip(p, q, strict=True)] for p, q in zip(times(a5, a3), times(a3, a5), strict=True)]
    assert part(8, (3, 5)) == scaled(commutator, Fraction(1, 5))
    assert any(any(line) for line in commutator)


def test_p4_and_m5_are_polynomials_and_come_out_of_numbers_alone():
    # the same polynomials from the second engine: numbers, recognised by integer relations
    for value, weight in ((Z2 * Z2, 4), (Z5, 5)):
        found = reconstruct(FEntry(5), zeta=value)
        assert found.denominator == ()
        generators = value.terms[0][0]
        for seed in range(3):
            kin = Mandelstams.random(5, seed, low=-9, high=9, denominator=1)
            series = alpha_expansion(kin, FEntry(5), weight=weight, method="recursion")
            recognised = series.exact[weight]
            assert recognised is not None
            assert recognised.coefficient(*generators) == found(kin)


def test_example_with_integer_invariants():
    # found once from 50-digit numbers by integer relations, before there was an exact engine
    kin = Mandelstams.from_planar(5, {(1, 2): 2, (2, 3): 3, (3, 4): 5, (4, 5): 7, (5, 1): 11})
    series = alpha_expansion(kin, FEntry(5), weight=8)
    assert series.exact[2] == -47 * Z2
    assert series.exact[3] == 576 * Z3
    assert series.exact[4] == Fraction(-15629, 10) * (Z2 * Z2)
    assert series.exact[5] == 81492 * Z5 - 28632 * (Z2 * Z3)


def test_six_point_row_of_zeta_two():
    # Mafra, Schlotterer, Stieberger 2011: the first row at order zeta(2)
    def published(kin):
        s, x = kin.pair, kin.channel
        s123, s345 = x((1, 2, 3)), x((3, 4, 5))
        return {
            (2, 3, 4): -(s(4, 5) * s(5, 6) + s(1, 2) * s(6, 1) - s(4, 5) * s123 - s(1, 2) * s345 + s123 * s345),
            (3, 2, 4): -s(1, 3) * (s(2, 3) - s(6, 1) + s345),
            (2, 4, 3): -s(3, 5) * (s(3, 4) - s(5, 6) + s123),
            (3, 4, 2): s(1, 3) * s(2, 5),
            (4, 2, 3): s(1, 4) * s(3, 5),
            (4, 3, 2): -s(1, 4) * s(2, 5),
        }

    functions = {word: reconstruct(FEntry(6, column=word), zeta=Z2) for word in permutations((2, 3, 4))}
    for seed in range(12):
        kin = Mandelstams.random(6, seed)
        for word, want in published(kin).items():
            assert functions[word](kin) == want


# --- the sphere: Stieberger 2013, arXiv:1310.3259; Schlotterer, Schnetz 2018, arXiv:1808.00713


@pytest.mark.parametrize(("n", "weight"), [(4, 10), (5, 8), (6, 5)])
@pytest.mark.parametrize("seed", [1, 2])
def test_sphere_is_the_single_valued_image_of_the_disk(n, weight, seed):
    # J(P|Q) = sv Z_P(Q); J comes from sines and products of disk integrals, without any use of sv
    kin = Mandelstams.random(n, seed, denominator=101)
    ordering = tuple(range(1, n + 1))
    for q in (ordering, (1, 3, 2, *ordering[3:]), (ordering[0], *ordering[:0:-1])):
        sphere = alpha_expansion(kin, parke_taylor(*ordering), parke_taylor(*q), weight=weight, method="associator")
        disk = alpha_expansion(kin, parke_taylor(*q), ordering=ordering, weight=weight, method="associator")
        assert list(sphere.exact) == [single_valued(value) for value in disk.exact]


@pytest.mark.parametrize("seed", [3, 4])
def test_five_point_sphere_has_no_zeta_two_and_doubled_odd_values(seed):
    kin = Mandelstams.random(5, seed, denominator=101)
    f = parke_taylor(1, 2, 3, 4, 5)
    sphere = alpha_expansion(kin, f, f, weight=7).exact
    disk = alpha_expansion(kin, f, weight=7).exact
    assert not any((2,) in product for value in sphere for product, _ in value.terms)
    assert sphere[0] == disk[0]
    assert sphere[3].coefficient(3) == 2 * disk[3].coefficient(3)
    assert sphere[5].coefficient(5) == 2 * disk[5].coefficient(5)
    assert sphere[7].coefficient(7) == 2 * disk[7].coefficient(7)
    assert not sphere[2]
    assert not sphere[4]


def test_sv_of_depth_two_values():
    # the combination that appears at weight 8 on the disk, zeta(3,5) + 5 zeta(3) zeta(5), maps to 10 zeta(3) zeta(5)
    assert single_valued(zeta(3, 5) + 5 * zeta(3) * zeta(5)) == 10 * zeta(3) * zeta(5)


# --- field theory: Cachazo, He, Yuan 2013, arXiv:1309.0885


@pytest.mark.parametrize(("n", "trees"), [(4, 2), (5, 5), (6, 14), (7, 42)])
def test_leading_order_counts_planar_cubic_trees(n, trees):
    kin = Mandelstams.from_planar(n, dict.fromkeys(_planar(n), 1))
    f = parke_taylor(*range(1, n + 1))
    assert alpha_expansion(kin, f, weight=0).exact[0] == ONE * trees


def _planar(n):
    from kn_integrate.channels import planar_channels

    return planar_channels(tuple(range(1, n + 1)))


# --- the functions F go to the unit matrix, and the number of words is what the zeta values need


@pytest.mark.parametrize("n", [4, 5, 6, 7])
def test_functions_start_with_the_unit_matrix_and_have_no_weight_one(n):
    found = exact_engine(Mandelstams.random(n, n), 1)
    identity = tuple(range(2, n - 1))
    assert all(series[0] == (ONE if word == identity else ZetaSum()) for word, series in found.items())
    assert not any(series[1] for series in found.values())
    assert len(words_of(6)) == 2**4
