"""Sphere integrals through the bilinear: closed forms with spins, published values, identities, low energy."""

from __future__ import annotations

import math
from fractions import Fraction
from itertools import combinations

import mpmath
import numpy as np
import pytest
from load import published

import kn_integrate as kn
from kn_integrate.channels import pair_order
from kn_integrate.closed_forms import ComplexBeta, ComplexSelberg
from kn_integrate.dispatch.family import moved
from kn_integrate.dispatch.request import make_request
from kn_integrate.exact import ONE, Exact
from kn_integrate.integrals import SphereTerm
from kn_integrate.sphere.evaluate import evaluate_terms
from kn_integrate.sphere.klt import in_frame

METHODS = ("auto", "klt", "direct")


def off(value, reference) -> float:
    with mpmath.workdps(40):
        return float(abs(mpmath.mpmathify(value) - reference))


def term_of(left, right, coefficient=ONE) -> SphereTerm:
    spins = tuple(int((a - b).re) for a, b in zip(left.flat, right.flat, strict=True))
    return SphereTerm(coefficient, right.flat, spins, tuple(0 for _ in spins))


def value(n, terms, method="klt", rtol=1e-10, digits=None):
    return evaluate_terms(n, terms, make_request(rtol=rtol, digits=digits, method=method, methods=METHODS))


@pytest.mark.parametrize("entry", published("sphere"), ids=lambda e: e.id)
def test_every_published_sphere_value(entry):
    terms = [term_of(term.left, term.right, term.coefficient) for term in entry.terms]
    result = value(entry.n, terms)
    assert result.ok
    assert off(result.value, entry.value) <= result.error + 10.0 ** (1 - entry.digits) * abs(entry.value)


def random_beta(rng, deep=0, imaginary=0):
    def number():
        re = Fraction(int(rng.integers(20, 980)), 1000) - int(rng.integers(0, deep + 1))
        im = Fraction(int(rng.integers(-999, 1000)) * imaginary, 1000)
        return Exact(re, im)

    a, b = number(), number()
    return a, a + int(rng.integers(-2, 3)), b, b + int(rng.integers(-2, 3))


@pytest.mark.parametrize("deep", [0, 3])
@pytest.mark.parametrize("imaginary", [0, 2])
def test_complex_beta_with_spins(deep, imaginary):
    # (1/pi) int d^2z z^(a-1) zb^(ab-1) (1-z)^(b-1) (1-zb)^(bb-1)
    #   = G(a) G(b) G(1-ab-bb) / (G(a+b) G(1-ab) G(1-bb)); the symmetric-looking form is off by a sign
    rng = np.random.default_rng(deep + 10 * imaginary)
    for _ in range(12):
        form = ComplexBeta(*random_beta(rng, deep, imaginary))
        result = value(4, [term_of(form.left, form.right)], rtol=1e-11)
        exact = form.value(30)
        flips = sum((form.left.at(*p) - form.right.at(*p)).re for p in [(1, 2), (1, 3), (2, 3)])
        assert flips % 2 == 0
        assert off(result.value, exact) <= result.error
        assert result.ok


@pytest.mark.parametrize("n", [5, 6, 7, 8])
def test_complex_selberg(n):
    # Dotsenko and Fateev 1985; Aomoto 1987
    form = ComplexSelberg(n - 3, Exact("0.21"), Exact("0.17"), Exact("0.04"))
    result = value(n, [term_of(form.left, form.right)], rtol=1e-9)
    assert result.ok
    assert off(result.value, form.value(30)) <= result.error


def test_digits():
    form = ComplexBeta(Exact("0.3"), Exact("1.3"), Exact("-1.2"), Exact("-1.2"))
    result = value(4, [term_of(form.left, form.right)], rtol=1e-30, digits=30)
    assert result.ok
    assert off(result.value, form.value(45)) <= 1e-29


def random_term(n, rng, spins=True, low=-400, high=400):
    """Random s with two integrands as powers whose rows are equal."""
    kin = kn.Mandelstams.random(n, rng, low=Fraction(low, 1000), high=Fraction(high, 1000))
    labels = list(range(1, n + 1))
    left = kn.parke_taylor(*labels)
    right = kn.parke_taylor(1, *rng.permutation(labels[1:]).tolist()) if spins else left
    return kin, left, right


@pytest.mark.parametrize("n", [4, 5, 6])
def test_exchange_of_left_and_right_and_reality(n):
    rng = np.random.default_rng(n)
    for k in range(3):
        kin, f, g = random_term(n, rng)
        if k == 2:
            kin = kn.Mandelstams.from_planar(
                n, {c: x + Exact(0, Fraction(7 * j + 3, 50)) for j, (c, x) in enumerate(kin.planar().items())}
            )
        one, other = kn.sphere_integral(kin, f, g), kn.sphere_integral(kin, g, f)
        assert abs(one.value - other.value) <= one.error + other.error
        assert isinstance(one.value, float) == kin.is_real


@pytest.mark.parametrize("n", [4, 5, 6])
def test_the_bilinear_does_not_depend_on_the_frame(n):
    rng = np.random.default_rng(n)
    kin, f, g = random_term(n, rng)
    (term,) = kn.SphereIntegral(n, f, g).terms(kin)
    request = make_request(rtol=1e-12)
    plain, _ = in_frame(n, term, tuple(range(1, n + 1)), request)
    for _ in range(4):
        frame = (rng.permutation(n) + 1).tolist()
        other, _ = in_frame(n, term, frame, request)
        assert abs(plain.value - other.value) <= plain.error + other.error


def test_poles_of_single_disk_integrals_are_no_poles_of_the_sphere_integral():
    # s_13 = -1 is a pole of disk integrals in which 1 and 3 are neighbours; spin keeps the sphere integral finite there
    form = ComplexBeta(Exact("-1"), Exact("2"), Exact("0.3"), Exact("0.3"))
    result = value(4, [term_of(form.left, form.right)])
    assert result.ok
    assert off(result.value, form.value(30)) <= result.error


def test_a_pole_names_its_cluster():
    kin = kn.Mandelstams.from_planar(5, {(1, 2): -1, (2, 3): "1/2", (3, 4): "1/3", (4, 5): "1/5", (1, 5): "1/7"})
    f = kn.parke_taylor(1, 2, 3, 4, 5)
    for method in ("klt", "direct", "auto"):
        with pytest.raises(kn.PoleError) as caught:
            kn.sphere_integral(kin, f, method=method)
        assert caught.value.channel == (1, 2)
        assert caught.value.level == 1


@pytest.mark.parametrize("spins", [False, True])
def test_direct_against_bilinear_at_five_points(spins):
    rng = np.random.default_rng(17 + spins)
    for _ in range(2):
        kin, f, g = random_term(5, rng, spins, low=-250, high=450)
        one = kn.sphere_integral(kin, f, g, method="klt")
        other = kn.sphere_integral(kin, f, g, method="direct", rtol=1e-6)
        assert abs(one.value - other.value) <= one.error + other.error


def test_four_point_sphere_is_sine_times_two_disks():
    # J(1234|1234) = (sin pi s / pi) Z_1234(1234) Z_1243(...): Kawai, Lewellen and Tye 1986 at n = 4
    kin = kn.Mandelstams.from_planar(4, {(1, 2): "3/10", (2, 3): "9/20"})
    f = kn.parke_taylor(1, 2, 3, 4)
    sphere = kn.sphere_integral(kin, f)
    one = kn.disk_integral(kin, f, ordering=(1, 2, 4, 3))
    other = kn.disk_integral(kin, f, ordering=(1, 2, 3, 4))
    product = -math.sin(math.pi * 0.3) / math.pi * one.value * other.value
    assert abs(sphere.value - product) <= sphere.error + 1e-9


@pytest.mark.parametrize("n", [4, 5])
def test_single_valued_image_at_low_energy(n):
    # zeta(2) is absent and zeta(3) doubled (Stieberger 2013, arXiv:1310.3259), from memory
    kin = kn.Mandelstams.random(n, 5, low=1, high=4)
    f = kn.parke_taylor(*range(1, n + 1))
    leading = kn.biadjoint(kin, range(1, n + 1), range(1, n + 1))
    h = Fraction(1, 10**6)
    scaled = kn.sphere_integral(kin.scaled(h), f, digits=45)
    disk = kn.disk_integral(kin.scaled(h), f, digits=45)
    with mpmath.workdps(45):
        x = mpmath.mpf(h.numerator) / h.denominator
        lead = mpmath.mpf(leading.re.numerator) / leading.re.denominator
        closed = (scaled.value * x ** (n - 3) - lead) / x**2
        opened = (disk.value * x ** (n - 3) - lead) / x**2
        assert abs(closed) < 1e-3 * abs(opened)  # no zeta(2)
        # at n = 4: 2 zeta(3) s t u (1/s + 1/t) ... the cubic coefficient relative to the open one's zeta(3) part
        cubic = closed / x
        if n == 4:
            s, t = (mpmath.mpf(kin.pair(*p).re.numerator) / kin.pair(*p).re.denominator for p in ((1, 2), (2, 3)))
            expected = -2 * mpmath.zeta(3) * (s + t) / (s * t) * s * t * (s + t) * -1
            assert abs(abs(cubic) - abs(expected)) < 1e-3 * abs(expected)


def test_massless_residue_of_five_points_is_four_points():
    kin = kn.Mandelstams.random(5, 3, low=0, high=1)
    f = kn.parke_taylor(1, 2, 3, 4, 5)
    found = kn.residue(kin, f, f, channel=(1, 2))
    at = moved(kin, (1, 2, 3, 4, 5), {(1, 2): -kin.pair(1, 2)})
    four = kn.Mandelstams.from_pairs(
        4,
        {
            (1, 2): at.pair(1, 3) + at.pair(2, 3),
            (2, 3): at.pair(3, 4),
            (1, 3): at.pair(1, 4) + at.pair(2, 4),
        },
    )
    expected = kn.sphere_integral(four, kn.parke_taylor(1, 2, 3, 4))
    assert found.ok
    assert abs(found.value - expected.value) <= found.error + expected.error


@pytest.mark.parametrize("level", [0, 1, 2, 3])
def test_four_point_residues_are_squares(level):
    # the open residue is ((-1)^N/N!) prod (b - k); the closed one its square, of degree 2N
    kin = kn.Mandelstams.from_planar(4, {(1, 2): "1/7", (2, 3): "2/5"})
    f = kn.parke_taylor(1, 2, 3, 4)
    found = kn.residue(kin, f, f, channel=(1, 2), level=level)
    exact = 1.0
    for k in range(1, level + 1):
        exact *= (0.4 - k) / k
    assert found.ok
    assert abs(found.value - exact**2) <= found.error


def test_open_kinematics_are_refused_with_the_way_out():
    kin = kn.Mandelstams.from_squares(4, {(1, 2): -1, (2, 3): 2}, string="open")
    with pytest.raises(kn.InputError, match="as_closed"):
        kn.sphere_integral(kin, kn.parke_taylor(1, 2, 3, 4))
    closed = kin.as_closed()
    assert kn.sphere_integral(closed, kn.parke_taylor(1, 2, 3, 4)).status is not None
    with pytest.raises(kn.InputError):
        kn.disk_integral(closed, kn.parke_taylor(1, 2, 3, 4))


def test_methods_that_cannot_serve_say_so():
    kin = kn.Mandelstams.random(7, 3, low=0, high=1)
    f = kn.parke_taylor(*range(1, 8))
    with pytest.raises(kn.NotAvailableError):
        kn.sphere_integral(kin, f, method="direct")
    with pytest.raises(kn.NotAvailableError):
        kn.sphere_integral(kn.Mandelstams.random(4, 3), kn.parke_taylor(1, 2, 3, 4), method="direct", digits=20)
    with pytest.raises(kn.InputError):
        kn.sphere_integral(kin, f, method="quadrature")


def test_pairs_are_in_order():
    assert len(pair_order(5)) == len(list(combinations(range(5), 2)))
