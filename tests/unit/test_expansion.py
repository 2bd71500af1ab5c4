from __future__ import annotations

import json
import pickle
import random
from fractions import Fraction

import mpmath
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kn_integrate import (
    DiskIntegral,
    FEntry,
    InputError,
    Integrand,
    Mandelstams,
    NotAvailableError,
    PoleError,
    SphereIntegral,
    WorkLimitError,
    ZetaSum,
    alpha_expansion,
    disk_integral,
    monomial,
    parke_taylor,
    reconstruct,
    zeta,
)
from kn_integrate.exact import Exact
from kn_integrate.expansion.by_parts import reduce_by_parts
from kn_integrate.expansion.chains import chains
from kn_integrate.expansion.disk import disk_series

KIN5 = Mandelstams.from_planar(5, {(1, 2): 2, (2, 3): 3, (3, 4): 5, (4, 5): 7, (5, 1): 11})


def random_parke_taylor(n: int, rng: random.Random) -> tuple[int, ...]:
    return tuple(rng.sample(range(1, n + 1), n))


# --- partial fractions ------------------------------------------------------------------------------------------------


@settings(deadline=None, max_examples=60)
@given(st.integers(4, 7), st.integers(0, 10**6))
def test_chains_are_the_same_function(n, seed):
    rng = random.Random(seed)
    f = parke_taylor(*random_parke_taylor(n, rng))
    a, b, c, d = rng.sample(range(1, n + 1), 4)
    numerator = f * monomial({(a, b): 1, (c, d): 1, (a, c): -1, (b, d): -1})
    z = {label: Fraction(x, 7) for label, x in enumerate(rng.sample(range(-50, 50), n), start=1)}
    for integrand in (f, numerator):
        try:
            words = chains(n, integrand)
        except NotAvailableError:
            assert integrand is numerator
            continue
        back = sum((c * parke_taylor(1, *w, n) for w, c in words.items()), Integrand())
        assert at(back, z) == at(integrand, z)


def at(f: Integrand, z: dict[int, Fraction]) -> Exact:
    total = Exact(0)
    for term in f.terms:
        value = term.coefficient
        for (i, j), power in term.powers:
            value = value * Exact(z[i] - z[j]) ** power
        total = total + value
    return total


# --- integration by parts ---------------------------------------------------------------------------------------------


def random_monomial(n: int, rng: random.Random) -> Integrand:
    """A Parke-Taylor factor times cross ratios: covariant, with double poles and numerators as they come."""
    f = parke_taylor(*random_parke_taylor(n, rng))
    for _ in range(rng.randint(1, 2)):
        a, b, c, d = rng.sample(range(1, n + 1), 4)
        f = f * monomial({(a, b): 1, (c, d): 1, (a, c): -1, (b, d): -1})
    return f


@pytest.mark.parametrize("n", [4, 5, 6])
@pytest.mark.parametrize("seed", range(5))
def test_any_monomial_is_the_integral_near_the_origin(n, seed):
    rng = random.Random(1000 * n + seed)
    kin = Mandelstams.random(n, seed)
    f = random_monomial(n, rng)
    ordering = random_parke_taylor(n, rng)
    series = alpha_expansion(kin, f, ordering=ordering, weight=7, method="associator")
    x = Fraction(1, 80)
    value = disk_integral(kin.scaled(x), f, ordering=ordering, rtol=1e-9, atol=1e-9, method="quadrature")
    size = max(abs(c.value) * float(x) ** c.order for c in series) + 1
    # the series stops at alpha'^(7 - (n - 3)); its coefficients grow like powers of (n - 2)^2, from nested sums
    assert series.partial_sum(x) == pytest.approx(value.value, rel=0, abs=value.error + 1e-8 * size)


@pytest.mark.parametrize("seed", range(4))
def test_reduction_by_parts_agrees_with_partial_fractions_where_both_apply(seed):
    # the words differ, since Parke-Taylor factors are not independent; the integrals agree exactly
    rng = random.Random(seed)
    n = rng.choice([4, 5, 6])
    kin = Mandelstams.random(n, seed)
    f = parke_taylor(*random_parke_taylor(n, rng))
    orders = reduce_by_parts(n, f, kin.pair, 4)
    assert not any(orders[1:])
    again = sum((c * parke_taylor(1, *w, n) for w, c in orders[0].items()), Integrand())
    ordering = tuple(range(1, n + 1))
    assert disk_series(kin, again, ordering, 4) == disk_series(kin, f, ordering, 4)


def test_a_double_pole_at_four_points_in_closed_form():
    # Z(z12^-2 z34^-2) = G(s-1)G(t+1)/G(s+t) = (s+t)/(s(s-1)) F: a pole of the tachyon beside the zeta values
    kin = Mandelstams.from_planar(4, {(1, 2): "2/3", (2, 3): "-7/5"})
    s, t = kin.pair(1, 2), kin.pair(2, 3)
    entry = alpha_expansion(kin, FEntry(4), weight=8).exact
    want = [sum((entry[k] * (-(s + t) / s * s ** (w - 1 - k)) for k in range(w)), ZetaSum()) for w in range(9)]
    series = alpha_expansion(kin, "PT(1,2)*PT(3,4)", weight=8)
    assert list(series.exact) == want
    assert series[4].exact.weights == (0, 2, 3)
    assert alpha_expansion(kin, "PT(1,2)*PT(3,4)", weight=4, method="recursion").exact == series.exact[:5]


@pytest.mark.parametrize("ordering", [(1, 2, 3, 4, 5), (3, 1, 4, 2, 5)])
def test_total_derivatives_integrate_to_zero(ordering):
    # d/dz_2 of (Koba-Nielsen factor) g, g = z_25/z_21 h: the factor gives alpha' sum_j s_2j z_j5/(z_2j z_25) g, and
    # 1/z_21 gives the same as s_21 = -1 would
    kin = Mandelstams.random(5, 4)
    g = monomial({(2, 5): 1, (2, 1): -1, (1, 5): -1, (3, 4): -1, (3, 5): -1, (4, 5): -1})
    factor = Integrand()
    for j in (1, 3, 4):
        factor = factor + kin.pair(2, j) * monomial({(j, 5): 1, (2, j): -1, (2, 5): -1}) * g
    plain = -monomial({(1, 5): 1, (2, 1): -1, (2, 5): -1}) * g
    first, second = (alpha_expansion(kin, f, ordering=ordering, weight=7).exact for f in (factor, plain))
    assert not second[0]
    assert any(second)
    assert all(first[w - 1] + second[w] == ZetaSum() for w in range(1, 8))


def test_sphere_with_double_poles_is_symmetric_and_has_no_even_zeta_values():
    kin = Mandelstams.random(5, 6)
    f, g = "PT(1,2)*PT(3,4,5)", "PT(1,4)*PT(2,3,5)"
    one, other = (alpha_expansion(kin, a, b, weight=5).exact for a, b in ((f, g), (g, f)))
    assert one == other
    assert not any((2,) in product for value in one for product, _ in value.terms)
    assert any((3,) in product for value in one for product, _ in value.terms)


# --- values -----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("n", [4, 5, 6])
@pytest.mark.parametrize("seed", range(4))
def test_partial_sums_are_the_integral_near_the_origin_in_every_ordering(n, seed):
    rng = random.Random(100 * n + seed)
    kin = Mandelstams.random(n, seed)
    f = parke_taylor(*random_parke_taylor(n, rng)) - Fraction(2, 3) * parke_taylor(*random_parke_taylor(n, rng))
    ordering = random_parke_taylor(n, rng)
    series = alpha_expansion(kin, f, ordering=ordering, weight=8, method="associator")
    x = Fraction(1, 60)
    value = disk_integral(kin.scaled(x), f, ordering=ordering, rtol=1e-12)
    assert value.ok
    size = max(abs(c.value) * float(x) ** c.order for c in series)
    assert series.partial_sum(x) == pytest.approx(value.value, rel=0, abs=1e-10 * size)


@pytest.mark.parametrize("seed", range(6))
def test_expansions_are_linear_cyclic_and_reverse_with_a_sign(seed):
    rng = random.Random(seed)
    n = rng.choice([4, 5, 6])
    kin = Mandelstams.random(n, seed)
    p, q, r = (random_parke_taylor(n, rng) for _ in range(3))

    def exact(f, ordering=p):
        return disk_series(kin, f, ordering, 4)

    assert exact(parke_taylor(*q), p[1:] + p[:1]) == exact(parke_taylor(*q))
    assert exact(parke_taylor(*q), p[::-1]) == [value * (-1) ** n for value in exact(parke_taylor(*q))]
    total = exact(2 * parke_taylor(*q) - "1/3" * parke_taylor(*r))
    parts = zip(exact(parke_taylor(*q)), exact(parke_taylor(*r)), strict=True)
    assert total == [2 * a - b / 3 for a, b in parts]


@pytest.mark.parametrize("seed", range(3))
def test_complex_kinematics_and_coefficients(seed):
    kin = Mandelstams.random(5, seed).moved(Mandelstams.random(5, seed + 50), "1/2j")
    f = "1+2j" * parke_taylor(1, 3, 2, 4, 5)
    series = alpha_expansion(kin, f, weight=5)
    assert series.details["confirmed_digits"] >= 30
    assert isinstance(series.numeric[3], complex)
    again = alpha_expansion(kin, f, weight=5, method="recursion")
    assert again.exact == series.exact
    g = parke_taylor(1, 2, 4, 3, 5)
    one, other = (alpha_expansion(kin, a, b, weight=3, method="associator") for a, b in ((f, g), (g, f)))
    assert one.exact == tuple(c * (Exact("1+2j") / Exact("1-2j")) for c in other.exact)


def test_numbers_have_the_digits_and_errors_they_claim():
    with mpmath.workdps(120):
        truth = [c.value(100) for c in alpha_expansion(KIN5, FEntry(5), weight=8).exact]
        for digits in (None, 5, 30, 80):
            for method in ("auto", "recursion"):
                series = alpha_expansion(KIN5, FEntry(5), weight=8, digits=digits, method=method)
                for c, want in zip(series, truth, strict=True):
                    assert abs(c.value - want) <= c.error
                    assert c.error <= abs(want) * mpmath.mpf(10) ** (-15 if digits is None else -digits) or not want


# --- what coefficients rest on ----------------------------------------------------------------------------------------


@pytest.mark.parametrize("size", [Exact(10) ** 40, Exact(1) / Exact(10) ** 11])
def test_large_and_small_invariants(size):
    kin = Mandelstams.from_planar(5, {(1, 2): 2, (2, 3): 3, (3, 4): 5, (4, 5): 7, (5, 1): 11})
    base = alpha_expansion(kin, parke_taylor(1, 2, 3, 4, 5), weight=5)
    for method in ("auto", "recursion"):
        series = alpha_expansion(kin.scaled(size), parke_taylor(1, 2, 3, 4, 5), weight=5, method=method)
        for c, d in zip(series, base, strict=True):
            assert c.exact == d.exact * size**d.order
    with pytest.raises(InputError, match="digits="):
        alpha_expansion(kin.scaled(Exact(10) ** 90), FEntry(5), weight=8)


def test_invariants_of_very_different_size():
    kin = Mandelstams.from_planar(4, {(1, 2): "1e-60", (2, 3): 1})
    c = alpha_expansion(kin, FEntry(4), weight=2, digits=80)[2]
    with mpmath.workdps(80):
        assert abs(c.value + mpmath.mpf("1e-60") * mpmath.zeta(2)) <= c.error
    assert c.error < 1e-78
    assert c.exact is None


def test_many_digits():
    value = alpha_expansion(KIN5, FEntry(5), weight=3, digits=700, method="recursion")
    with mpmath.workdps(720):
        assert abs(value[3].value - 576 * mpmath.zeta(3)) < mpmath.mpf(10) ** -695
        assert abs(value[2].value + 47 * mpmath.zeta(2)) <= mpmath.mpf(10) ** -697
    assert value.is_exact


def test_auto_confirms_and_says_so():
    series = alpha_expansion(KIN5, parke_taylor(1, 2, 3, 4, 5), weight=4)
    assert series.method == "associator+recursion"
    assert series.details["confirmed_digits"] >= 30
    assert all("confirmed by numbers" in c.basis for c in series)
    assert series.is_exact
    plain = alpha_expansion(KIN5, parke_taylor(1, 2, 3, 4, 5), weight=4, method="associator")
    assert plain.exact == series.exact
    assert all(c.basis == "derived" for c in plain)
    big = alpha_expansion(Mandelstams.random(8, 1), parke_taylor(*range(1, 9)), weight=2)
    assert big.details["confirmed_digits"] is None
    assert big.method == "associator"


def test_floating_point_input_stays_numeric():
    kin = Mandelstams.from_planar(4, {(1, 2): 0.3, (2, 3): 0.7})
    series = alpha_expansion(kin, parke_taylor(1, 2, 3, 4), weight=6)
    assert not series.is_exact
    assert series.exact == (None,) * 7
    assert all("a number only" in c.basis and "denominator" in c.basis for c in series)
    exact = alpha_expansion(
        Mandelstams.from_planar(4, {(1, 2): "3/10", (2, 3): "7/10"}), parke_taylor(1, 2, 3, 4), weight=6
    )
    assert series.numeric == pytest.approx(exact.numeric, rel=1e-14, abs=1e-14)
    moved = Mandelstams.from_pairs(4, {(1, 2): 0.1, (1, 3): 0.2, (1, 4): -0.3, (2, 3): -0.3, (2, 4): 0.2, (3, 4): 0.1})
    assert not alpha_expansion(moved, parke_taylor(1, 2, 3, 4), weight=3).is_exact
    with pytest.raises(NotAvailableError, match="exact point"):
        alpha_expansion(kin, parke_taylor(1, 2, 3, 4), method="associator")


def test_too_few_digits_stay_numeric_and_enough_are_recognised():
    few = alpha_expansion(KIN5, FEntry(5), weight=8, method="recursion", digits=12)
    assert few.exact[8] is None
    assert "more digits" in few[8].basis
    enough = alpha_expansion(KIN5, FEntry(5), weight=8, method="recursion")
    assert enough.exact == alpha_expansion(KIN5, FEntry(5), weight=8).exact
    assert "expected number of accidents 1e-" in enough[8].basis


# --- points where single terms have poles -----------------------------------------------------------------------------


def test_poles_of_the_integral_are_named():
    kin = Mandelstams.from_planar(5, {(1, 2): 2, (2, 3): 0, (3, 4): 5, (4, 5): 7, (5, 1): 11})
    with pytest.raises(PoleError) as caught:
        alpha_expansion(kin, parke_taylor(1, 2, 3, 4, 5))
    assert (caught.value.channel, caught.value.level, caught.value.at) == ((2, 3), 0, 0)
    f = parke_taylor(1, 2, 3, 4, 5)
    with pytest.raises(PoleError) as caught:
        alpha_expansion(kin, f, f, weight=3)
    assert caught.value.channel == (2, 3)


@pytest.mark.parametrize(
    ("zeros", "f", "ordering"),
    [
        ({(1, 2): 0}, parke_taylor(1, 2, 3, 4, 5) + parke_taylor(2, 1, 3, 4, 5), (1, 2, 3, 4, 5)),
        ({(1, 3): 0}, parke_taylor(1, 3, 2, 4, 5), (1, 2, 3, 4, 5)),
        ({(2, 4): 0, (1, 3): 0}, parke_taylor(1, 3, 4, 2, 5), (1, 2, 3, 4, 5)),
        ({(2, 4): 0}, parke_taylor(1, 5, 2, 4, 3), (2, 5, 4, 3, 1)),
    ],
)
def test_cancelling_poles_of_single_terms_leave_the_limit(zeros, f, ordering):
    base = {(1, 2): 2, (1, 3): "3/2", (1, 4): -5, (2, 3): "1/3", (2, 4): 7, (3, 4): "-29/6"} | zeros
    total = sum((Exact(str(x)) for x in base.values()), Exact(0))
    base[3, 4] = Exact(str(base[3, 4])) - total
    kin = Mandelstams.from_pairs(5, base)
    value = disk_series(kin, f, ordering, 4)
    assert list(alpha_expansion(kin, f, ordering=ordering, weight=4).exact) == value
    # the limit along a line, from points on both sides: the error is quadratic in the distance
    line = Mandelstams.random(5, 3)
    distance = Exact("1/1000000")
    sides = [disk_series(kin.moved(line, h), f, ordering, 4) for h in (distance, -distance)]
    for w in range(5):
        mean = (sides[0][w] + sides[1][w]) / 2
        assert complex(mean.value(20)) == pytest.approx(complex(value[w].value(20)), rel=1e-7, abs=1e-7)


def test_sphere_at_a_point_with_cancelling_poles():
    kin = Mandelstams.from_planar(5, {(1, 2): 0, (2, 3): 3, (3, 4): 5, (4, 5): 7, (5, 1): 11})
    f, g = parke_taylor(1, 3, 2, 4, 5), parke_taylor(1, 2, 3, 4, 5)
    series = alpha_expansion(kin, f, g, weight=5)
    near = alpha_expansion(kin.moved(Mandelstams.random(5, 2), "1/100000000"), f, g, weight=5, method="associator")
    assert series.numeric == pytest.approx(near.numeric, rel=1e-6, abs=1e-6)
    assert not series.exact[2]


# --- reconstruction ---------------------------------------------------------------------------------------------------


def test_rational_coefficients_with_their_poles():
    f = parke_taylor(1, 2, 3, 4)
    field = reconstruct(f, n=4, zeta=1)
    assert str(field) == "(s12 + s14)/(s12*s14)"
    assert field.latex() == r"\frac{s_{12} + s_{14}}{s_{12} s_{14}}"
    assert str(reconstruct(f, n=4, zeta=zeta(2))) == "-s12 - s14"
    assert str(reconstruct(f, f, n=4, zeta=zeta(3))) == "2*s12^2 + 4*s12*s14 + 2*s14^2"
    mixed = reconstruct(parke_taylor(1, 3, 2, 4, 5), n=5, zeta=zeta(2))
    assert mixed.denominator == ((2, 3), (4, 5), (1, 5))
    assert mixed.checks == 4
    kin = Mandelstams.random(5, 77)
    want = alpha_expansion(kin, parke_taylor(1, 3, 2, 4, 5), weight=2).exact[2].coefficient(2)
    assert mixed(kin) == want
    assert json.loads(json.dumps(mixed.to_dict()))["zeta"] == "zeta(2)"


def test_reconstruction_of_other_orderings_and_of_zero():
    spec = DiskIntegral(5, parke_taylor(1, 2, 3, 4, 5), (2, 4, 1, 3, 5))
    found = reconstruct(spec, zeta=zeta(3))
    kin = Mandelstams.random(5, 5)
    assert found(kin) == alpha_expansion(kin, spec, weight=3).exact[3].coefficient(3)
    assert str(reconstruct(FEntry(5, (2, 3), (3, 2)), zeta=1)) == "0"
    # a product that cannot occur at four points on the sphere
    f = parke_taylor(1, 2, 3, 4)
    assert not reconstruct(f, f, n=4, zeta=zeta(2) * zeta(3)).numerator


@pytest.mark.parametrize(
    ("bad", "match"),
    [
        (lambda: reconstruct(FEntry(5), zeta=zeta(3) + zeta(2)), "zeta"),
        (lambda: reconstruct(FEntry(5), zeta=2 * zeta(3)), "zeta"),
        (lambda: reconstruct(FEntry(5), zeta="zeta(3)"), "zeta"),  # type: ignore[arg-type]
        (lambda: reconstruct(parke_taylor(1, 2, 3, 4), zeta=zeta(3)), "^n"),
        (lambda: reconstruct("1j*PT(1,2,3,4)", n=4, zeta=zeta(3)), "complex"),
        (lambda: reconstruct(FEntry(5), zeta=zeta(3), checks=0), "checks"),
    ],
)
def test_reconstruction_refuses_bad_input(bad, match):
    with pytest.raises(InputError, match=match):
        bad()


def test_work_without_end_is_refused_before_it_starts():
    with pytest.raises(WorkLimitError, match="matrix entries"):
        alpha_expansion(Mandelstams.random(11, 1), FEntry(11), weight=2)
    with pytest.raises(WorkLimitError, match="exact products"):
        alpha_expansion(Mandelstams.random(10, 1), FEntry(10), weight=12)
    f = parke_taylor(*range(1, 10))
    with pytest.raises(WorkLimitError, match="exact products"):
        alpha_expansion(Mandelstams.random(9, 1), f, f, weight=8)
    with pytest.raises(NotAvailableError, match="partial fractions"):
        reconstruct("PT(1,2)*PT(3,4)", n=4, zeta=zeta(3))
    with pytest.raises(WorkLimitError, match="monomials"):
        reconstruct(parke_taylor(1, 2, 3, 4, 5, 6), n=6, zeta=zeta(3))


# --- the objects ------------------------------------------------------------------------------------------------------


def test_series_is_a_value_with_texts_of_every_kind():
    series = alpha_expansion(Mandelstams.from_planar(4, {(1, 2): 1, (2, 3): 2}), parke_taylor(1, 2, 3, 4), weight=3)
    assert [str(c) for c in series.exact] == ["3/2", "0", "-3*zeta(2)", "9*zeta(3)"]
    assert [c.order for c in series] == [-1, 0, 1, 2]
    assert len(series) == 4
    assert series[3].exact == 9 * zeta(3)
    assert series.latex() == (
        r"\left(\frac{3}{2}\right) {\alpha'}^{-1} + \left(-3 \zeta_{2}\right) \alpha' + "
        r"\left(9 \zeta_{3}\right) {\alpha'}^{2} + \mathcal{O}\left({\alpha'}^{3}\right)"
    )
    lines = str(series).splitlines()
    assert len(lines) == 5
    assert lines[4].split() == ["3", "alpha'^2", "10.818512128436348", "+-", "3e-15", "9*zeta(3)"]
    document = json.loads(json.dumps(series.to_dict(), allow_nan=False))
    assert document["coefficients"][3]["zeta_values"] == {"zeta(3)": "9"}
    assert document["integral"]["kind"] == "disk"
    again = pickle.loads(pickle.dumps(series))
    assert again == series
    assert series.sources()
    with pytest.raises(InputError):
        series[4]
    with pytest.raises(InputError):
        series[-1]
    with pytest.raises(InputError):
        series.partial_sum(0)


def test_integrals_are_accepted_and_equal_to_their_parts():
    f, g = parke_taylor(1, 2, 3, 4, 5), parke_taylor(1, 3, 2, 5, 4)
    ordering = (1, 3, 2, 4, 5)
    assert alpha_expansion(KIN5, DiskIntegral(5, f, ordering), weight=3) == alpha_expansion(
        KIN5, f, ordering=ordering, weight=3
    )
    assert alpha_expansion(KIN5, SphereIntegral(5, f, g), weight=3) == alpha_expansion(KIN5, str(f), str(g), weight=3)
    assert hash(FEntry(5)) == hash(FEntry(5, (2, 3), (2, 3)))


@pytest.mark.parametrize(
    ("bad", "match"),
    [
        (lambda: alpha_expansion(KIN5, "PT(1,2,3,4,5)", weight=13), "weight"),
        (lambda: alpha_expansion(KIN5, "PT(1,2,3,4,5)", weight=-1), "weight"),
        (lambda: alpha_expansion(KIN5, "PT(1,2,3,4,5)", weight=2.5), "weight"),  # type: ignore[arg-type]
        (lambda: alpha_expansion(KIN5, "PT(1,2,3,4,5)", digits=0), "digits"),
        (lambda: alpha_expansion(KIN5, "PT(1,2,3,4,5)", digits=10**6), "digits"),
        (lambda: alpha_expansion(KIN5, "PT(1,2,3,4,5)", method="magic"), "method"),
        (lambda: alpha_expansion(KIN5, "PT(1,2,3,4)"), "puncture 5"),
        (lambda: alpha_expansion(KIN5, "PT(1,2,3,4,5)", ordering=(1, 2, 3)), "ordering"),
        (lambda: alpha_expansion(None, "PT(1,2,3,4,5)"), "Mandelstams"),  # type: ignore[arg-type]
        (lambda: alpha_expansion(KIN5, "PT(1,2,3,4,5)", "PT(1,2,3,4,5)", ordering=(1, 2, 3, 4, 5)), "sphere"),
        (lambda: alpha_expansion(KIN5, FEntry(5), "PT(1,2,3,4,5)"), "second"),
        (lambda: alpha_expansion(KIN5, FEntry(5), ordering=(1, 2, 3, 4, 5)), "ordering"),
        (lambda: alpha_expansion(KIN5, FEntry(6)), "6 legs"),
        (lambda: alpha_expansion(Mandelstams.random(4, 1, row_sums=-2), monomial({})), "massless|zero"),
        (lambda: alpha_expansion(Mandelstams.random(4, 1, string="closed"), "PT(1,2,3,4)"), "as_closed"),
        (lambda: alpha_expansion(Mandelstams.random(4, 1, string="closed"), FEntry(4)), "closed"),
        (lambda: FEntry(5, (2, 2)), "row"),
        (lambda: FEntry(5, column=(2, 4)), "column"),
        (lambda: FEntry(3), "n"),
    ],
)
def test_bad_input_names_what_is_wrong(bad, match):
    with pytest.raises(InputError, match=match):
        bad()


def test_zero_integrand_expands_to_zero():
    assert alpha_expansion(KIN5, Integrand(), weight=2).exact == (ZetaSum(),) * 3
