"""The KZ engine: values, digits, resonances, poles, matrices."""

from __future__ import annotations

import math
from fractions import Fraction
from itertools import permutations

import mpmath
import numpy as np
import pytest

import kn_integrate as kn
from kn_integrate.channels import pair_order
from kn_integrate.exact import ONE, Exact
from kn_integrate.integrals import DiskTerm
from kn_integrate.kz.currents import amputated, amputated_lanes, separable
from kn_integrate.kz.integral import integrate_terms, is_resonant, massless_point
from kn_integrate.kz.pattern import step_pattern
from kn_integrate.kz.point import Point, subset_sums
from kn_integrate.kz.series import LEFT, LOG_TWICE, MEETING, RIGHT, _values, terms_needed
from kn_integrate.kz.vector import combination


def pt(n):
    return kn.parke_taylor(*range(1, n + 1))


def test_large_schroeder_numbers():
    assert [len(separable(k).words) for k in range(1, 8)] == [1, 2, 6, 22, 90, 394, 1806]


def test_the_vectorised_current_is_the_plain_one():
    kin = kn.Mandelstams.random(6, 5, low="1/5", high=1)
    letters = (1, 2, 3, 4, 5)
    exact = amputated(letters, lambda labels: kin.channel(labels), Exact(0), ONE)
    lanes = amputated_lanes(letters, lambda labels: np.full(3, kin.channel(labels).value()))
    words = separable(5).words
    assert len(words) == len(exact) == len(lanes)
    for word, row in zip(words, lanes, strict=True):
        assert row == pytest.approx([float(exact[tuple(letters[k] for k in word)])] * 3, rel=1e-12)


def test_terms_are_counted_beyond_the_maximum():
    for growth in (0.0, 5.0, 40.0):
        for decay in (0.5, MEETING):
            k = terms_needed(decay, growth, 1e-18)
            assert decay**k * float(mpmath.binomial(growth + k, k)) < 1e-17
            assert k > growth * decay / (1 - decay)
            assert terms_needed(decay, growth, 1e-18, start=30.0) > 30 + 18 * math.log(10) / -math.log(decay)


def test_the_two_halves_meet_at_one_place():
    with mpmath.workdps(40):
        z, w = (4 * mpmath.mpf(y) / (1 + mpmath.mpf(y)) ** 2 for y in (LEFT, RIGHT))
        assert abs(z + w - 1) < 1e-20
        assert abs(mpmath.log(2 * z) - LOG_TWICE) < 1e-20


@pytest.mark.parametrize("n", [5, 6, 7])
def test_exponents_at_infinity(n):
    """The eigenvalues of A + B are the sums that `growth_of` takes for the behaviour at infinity."""
    point = Point(n, kn.Mandelstams.random(n, 3).pairs)
    legs, table = n - 1, point.table()
    m, one = legs - 3, legs
    pattern = step_pattern(m)
    matrix = np.zeros((len(pattern.splits),) * 2)
    sides = ((pattern.a, 1, subset_sums(point, 1, legs - 1, m)), (pattern.b, one, subset_sums(point, one, legs - 1, m)))
    for half, root, sums in sides:
        values = _values(half, table, root, np.arange(2, legs - 1))
        for row in range(len(matrix)):
            matrix[row, row] += float(sums[half.members[row]].value())
            for e in range(half.start[row], half.start[row + 1]):
                matrix[row, half.column[e]] += values[e]
    full = point.inside(sum(1 << i for i in range(1, legs + 1)))
    expected = {round(float((full - x).value()), 6) for x in subset_sums(point, 1, one, m).values()}
    found = np.linalg.eigvals(matrix)
    assert all(min(abs(x - e) for e in expected) < 1e-4 for x in found)
    assert all(min(abs(x - e) for x in found) < 1e-4 for e in expected)


def test_reference_values():
    # s_ij = ((3i + 5j + ij) mod 7 + 1)/(11 + i + j), s_{1,n-1} by masslessness; computed independently to 40 digits by
    # two expansions about different points and to 12 digits by quadrature
    values = {
        5: ("25.53697491661279698041429572348490", "0.7051363188445620189547066346197412"),
        6: ("205.0417488908200764570811933339176", "0.5833082899792214095598290679654208"),
    }
    for n, (z_text, f_text) in values.items():
        pairs = {
            (i, j): Fraction((3 * i + 5 * j + i * j) % 7 + 1, 11 + i + j)
            for i, j in pair_order(n)
            if j < n and (i, j) != (1, n - 1)
        }
        kin = kn.Mandelstams.from_pairs(n, pairs)
        result = kn.disk_integral(kin, pt(n), digits=30, method="kz")
        assert result.ok
        f = kn.f_matrix(kin, rows=[range(2, n - 1)], digits=30)
        with mpmath.workdps(40):
            assert abs(result.value - mpmath.mpf(z_text)) <= result.error + mpmath.mpf(10) ** -31
            assert abs(f.values[0][0] - mpmath.mpf(f_text)) <= f.errors[0][0] + mpmath.mpf(10) ** -33


@pytest.mark.parametrize("n", [5, 6, 7, 8])
def test_deep_exponents_come_out_right_through_escalation(n):
    # chord exponents in (-2.6, 0.3) and (-5, 5), double precision value against 40 digits
    rng = np.random.default_rng(n)
    for low, high in ((-2600, 300), (-5000, 5000)):
        for _ in range({5: 8, 6: 8, 7: 3, 8: 1}[n]):
            chords = {}
            for i, j in ((a, b) for a in range(1, n) for b in range(a + 1, n) if (a, b) != (1, n - 1)):
                value = int(rng.integers(low, high))
                chords[i, j + 1] = Fraction(value if value % 1000 else value + 137, 1000)
            kin = kn.Mandelstams.from_chords(n, chords)
            result = kn.disk_integral(kin, pt(n), rtol=1e-10)
            exact = kn.disk_integral(kin, pt(n), digits=25, method="kz")
            assert result.ok
            assert exact.ok
            assert float(abs(result.value - exact.value)) <= result.error


def resonant_point(n=6):
    """Non-planar sets of labels whose sums are whole negative numbers, no physical pole."""
    kin = kn.Mandelstams.from_planar(
        n,
        {
            (1, 2): "1/3",
            (2, 3): "2/5",
            (3, 4): "3/7",
            (4, 5): "1/2",
            (5, 6): "2/3",
            (1, 6): "3/4",
            (1, 2, 3): "5/7",
            (2, 3, 4): "1/4",
            (3, 4, 5): "5/8",
        },
    )
    # X_245 = -2 is no pole, but the recursion divides by whole numbers plus this sum; moving s_45 moves it
    planar = dict(kin.planar())
    planar[4, 5] = planar[4, 5] - 2 - kin.channel((2, 4, 5))
    return kn.Mandelstams.from_planar(n, planar)


def test_matrices_at_an_exact_resonance():
    """Entries are regular where the recursion is not; single integrals and the neighbourhood say what they are."""
    kin = resonant_point()
    columns = [(1, 2, 3, 4, 5, 6), (1, 3, 2, 5, 4, 6)]
    domain = (1, 2, 3, 4, 5, 6)
    z = kn.z_matrix(kin, [domain], columns)
    for column in columns:
        single = kn.disk_integral(kin, kn.parke_taylor(*column), method="quadrature", rtol=1e-9)
        difference = abs(z.value(domain, column) - single.value)
        assert difference <= single.error + z.error(domain, column)
    row = [(2, 3, 4)]  # another ordering of the domain has a pole there
    way = kn.Mandelstams.random(6, 9)
    f = kn.f_matrix(kin, rows=row, digits=20)
    up, down = (kn.f_matrix(kin.moved(way, by), rows=row, digits=20) for by in ("1e-9", "-1e-9"))
    for here, above, below in zip(f.values, up.values, down.values, strict=True):
        for value, a, b in zip(here, above, below, strict=True):
            assert float(abs(value - (a + b) / 2)) < 1e-14 * max(1.0, float(abs(a)))


def test_exact_resonances_are_no_obstacle():
    kin = resonant_point()
    terms = kn.DiskIntegral(6, pt(6)).terms(kin)
    assert is_resonant(massless_point(6, terms[0].pairs))
    series = integrate_terms(6, terms, rtol=1e-9)
    quadrature = kn.disk_integral(kin, pt(6), method="quadrature", rtol=1e-9)
    assert series.ok
    assert abs(series.value - quadrature.value) <= series.error + quadrature.error
    precise = integrate_terms(6, terms, rtol=1e-20, digits=20)
    assert precise.ok
    assert abs(complex(precise.value) - quadrature.value) <= quadrature.error + precise.error


def test_poles_are_refused():
    kin = kn.Mandelstams.from_planar(5, {(1, 2): "1/2", (2, 3): -1, (3, 4): 2, (4, 5): "1/3", (5, 1): "1/7"})
    with pytest.raises(kn.PoleError) as caught:
        kn.disk_integral(kin, pt(5), method="kz")
    assert (caught.value.channel, caught.value.level) == ((2, 3), 1)


@pytest.mark.parametrize("n", [4, 5, 6])
def test_every_ordering_and_integrand_from_one_run(n):
    kin = kn.Mandelstams.random(n, 21, low=-1, high=1)
    every = [(1, *p) for p in permutations(range(2, n + 1))]
    rows = [every[0], every[-1], tuple(range(n, 0, -1))]
    columns = every if n < 6 else every[::13]
    matrix = kn.z_matrix(kin, rows, columns)
    for row in rows:
        for column in columns:
            one = kn.disk_integral(kin, kn.parke_taylor(*column), ordering=row, method="quadrature", rtol=1e-8)
            assert abs(one.value - matrix.value(row, column)) <= one.error + matrix.error(row, column)


def test_kleiss_kuijf_words():
    assert combination(5, (1, 2, 5, 3, 4)) == ((1, (1, 2, 4, 3)), (1, (1, 4, 2, 3)), (1, (1, 4, 3, 2)))
    assert combination(5, (3, 4, 1, 2, 5)) == combination(5, (1, 2, 5, 3, 4))


def test_matrix_of_integrands_that_are_not_parke_taylor():
    kin = kn.Mandelstams.from_pairs(4, {(1, 2): "-3/5", (2, 3): "-7/10"}, row_sums=-2)
    matrix = kn.z_matrix(kin, [(1, 2, 3, 4)], [kn.monomial({})])
    assert matrix.values[0][0] == pytest.approx(float(mpmath.beta(0.4, 0.3)), rel=1e-12)
    assert matrix.to_dict()["rows"] == ["1.2.3.4"]


def test_quadrature_in_multiple_precision_is_independent():
    for n, digits in ((4, 50), (5, 30), (6, 14)):
        kin = kn.Mandelstams.random(n, 31, low="1/5", high=1)
        one = kn.disk_integral(kin, pt(n), method="quadrature", digits=digits)
        other = kn.disk_integral(kin, pt(n), method="kz", digits=digits)
        assert one.ok
        assert other.ok
        with mpmath.workdps(digits + 20):
            assert abs(one.value - other.value) <= one.error + other.error
    deep = kn.Mandelstams.from_planar(
        5, {(1, 2): "-13/10", (2, 3): "-2.4+0.3j", (3, 4): "-1/2", (4, 5): "-31/10", (5, 1): "9/20"}
    )
    one = kn.disk_integral(deep, pt(5), method="quadrature", digits=25)
    other = kn.disk_integral(deep, pt(5), method="kz", digits=25)
    assert one.ok
    with mpmath.workdps(50):
        assert abs(one.value - other.value) <= one.error + other.error
    with pytest.raises(kn.NotAvailableError):
        kn.disk_integral(kn.Mandelstams.random(7, 1), pt(7), method="quadrature", digits=20)
    with pytest.raises(kn.WorkLimitError):
        kn.disk_integral(kn.Mandelstams.random(6, 1), pt(6), method="quadrature", digits=60, max_points=1000)


def test_all_digits_are_there():
    kin = kn.Mandelstams.random(5, 1, low="1/5", high=1)
    result = kn.disk_integral(kin, pt(5), digits=60)
    assert len(result.text.replace(".", "").replace("-", "")) >= 60
    again = kn.disk_integral(kin, pt(5), digits=80)
    assert result.text[:58] == again.text[:58]


def test_close_to_a_cancelling_pole_no_digit_is_lost():
    # PT(1,2,3,4) + PT(2,1,3,4) near s_12 = 0: two terms of 1e12 whose sum is 3
    kin = kn.Mandelstams.from_planar(4, {(1, 2): "1e-12", (2, 3): "1/3"})
    result = kn.disk_integral(kin, kn.parke_taylor(1, 2, 3, 4) + kn.parke_taylor(2, 1, 3, 4))
    assert result.ok
    with mpmath.workdps(40):
        # Z_1234(2134) = -B(s12, s23) + ... : by its own closed form, B at the exponents of |z_12| and |z_23|
        s, t = mpmath.mpf("1e-12"), mpmath.mpf(1) / 3
        exact = mpmath.beta(s, t) - mpmath.beta(s, t + 1)
    assert abs(result.value - exact) <= result.error


def test_uncertain_double_values_escalate_and_explicit_ones_say_so():
    kin = kn.Mandelstams.from_planar(
        5, {(1, 2): "-53/10", (2, 3): "-87/20", (3, 4): "-22/5", (4, 5): "-109/20", (5, 1): "-33/5"}
    )
    explicit = kn.disk_integral(kin, pt(5), method="kz", rtol=1e-12)
    assert not explicit.ok
    assert explicit.status is kn.Status.ROUND_OFF
    automatic = kn.disk_integral(kin, pt(5), rtol=1e-12)
    assert automatic.ok
    assert abs(explicit.value - automatic.value) <= explicit.error + automatic.error
    assert "choice" in automatic.details


@pytest.mark.parametrize("n", [5, 6])
def test_small_alpha_prime(n):
    # F = 1 + zeta2 P2 + zeta3 M3 + ... (Mafra, Schlotterer, Stieberger 2011, arXiv:1106.2645)
    if n == 5:
        kin = kn.Mandelstams.from_planar(5, {(1, 2): 2, (2, 3): 3, (3, 4): 5, (4, 5): 7, (1, 5): 11})
        s1, s2, s3, s4, s5 = 2, 3, 5, 7, 11
        s13, s24 = (float(kin.pair(1, 3)), float(kin.pair(2, 4)))
        p2 = [[-s3 * s4 + s1 * (s3 - s5), s13 * s24], [s1 * s3, (s1 + s2) * (s2 + s3) - s4 * s5]]
        m3 = [
            [
                s3 * (-s1 * (s1 + 2 * s2 + s3) + s3 * s4 + s4**2) + s1 * s5 * (s1 + s5),
                -s13 * s24 * (s1 + s2 + s3 + s4 + s5),
            ],
            [s1 * s3 * (s1 + s2 + s3 - 2 * s4 - 2 * s5), None],
        ]
        x = Fraction(1, 10**8)
        f = kn.f_matrix(kin.scaled(x), digits=40)
        with mpmath.workdps(40):
            h = mpmath.mpf(x.numerator) / x.denominator
            for i in range(2):
                for j in range(2):
                    rest = (f.values[i][j] - (i == j)) / h**2
                    assert abs(rest - mpmath.zeta(2) * p2[i][j]) < 1e-4
                    if m3[i][j] is not None:
                        third = (rest - mpmath.zeta(2) * p2[i][j]) / h
                        assert abs(third - mpmath.zeta(3) * m3[i][j]) < 1e-3
        return
    kin = kn.Mandelstams.random(6, 9, low=1, high=5)
    x = lambda *labels: kin.channel(labels)  # noqa: E731
    s = kin.pair
    row = {
        (2, 3, 4): -(
            s(4, 5) * s(5, 6)
            + s(1, 2) * s(6, 1)
            - s(4, 5) * x(1, 2, 3)
            - s(1, 2) * x(3, 4, 5)
            + x(1, 2, 3) * x(3, 4, 5)
        ),
        (3, 2, 4): -s(1, 3) * (s(2, 3) - s(6, 1) + x(3, 4, 5)),
        (2, 4, 3): -s(3, 5) * (s(3, 4) - s(5, 6) + x(1, 2, 3)),
        (3, 4, 2): s(1, 3) * s(2, 5),
        (4, 2, 3): s(1, 4) * s(3, 5),
        (4, 3, 2): -s(1, 4) * s(2, 5),
    }
    h = Fraction(1, 10**7)
    f = kn.f_matrix(kin.scaled(h), rows=[(2, 3, 4)], digits=30)
    with mpmath.workdps(30):
        for word, expected in row.items():
            value = (f.value((2, 3, 4), word) - (word == (2, 3, 4))) / (mpmath.mpf(h.numerator) / h.denominator) ** 2
            assert abs(value - mpmath.zeta(2) * float(expected)) < 1e-4


def test_cli_prints_all_digits():
    import subprocess
    import sys

    command = "disk --planar 1.2=3/10,2.3=2/5 --integrand PT(1,2,3,4) --digits 50 --method kz"
    run = subprocess.run(
        [sys.executable, "-m", "kn_integrate.cli", *command.split()], capture_output=True, text=True, check=True
    )
    value = run.stdout.split()[1]
    with mpmath.workdps(60):
        exact = mpmath.beta(mpmath.mpf(3) / 10, mpmath.mpf(2) / 5)
        assert abs(mpmath.mpf(value) - exact) < mpmath.mpf(10) ** -48


def test_work_is_predicted():
    from kn_integrate.kz.integral import memory, predict

    term = DiskTerm(ONE, kn.DiskIntegral(5, pt(5)).terms(kn.Mandelstams.random(5, 1))[0].pairs)
    assert 0 < predict(5, [term], rtol=1e-10) < 1
    assert predict(5, [term], rtol=1e-10, digits=100) > predict(5, [term], rtol=1e-10, digits=50)
    assert predict(12, [term], rtol=1e-10) == float("inf")
    assert memory(11) > 1e8
