from __future__ import annotations

import math
import pickle
import random
from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kn_integrate import DiskIntegral, InputError, Integrand, Mandelstams, SphereIntegral, monomial, parke_taylor
from kn_integrate.channels import pair_order
from kn_integrate.exact import Exact
from kn_integrate.integrals import shifted_exponents, shifted_parke_taylor


def ordered_point(ordering: tuple[int, ...], rng: random.Random) -> dict[int, float]:
    """A random point of the domain z_P1 < z_P2 < ... < z_Pn."""
    places = sorted(rng.uniform(-3, 3) for _ in ordering)
    return dict(zip(ordering, places, strict=True))


def with_factor(kin: Mandelstams, f: Integrand, z: dict[int, float]) -> float:
    """prod |z_ij|^s_ij f(z), by its definition."""
    factor = math.prod(abs(z[i] - z[j]) ** float(s) for (i, j), s in zip(pair_order(kin.n), kin.pairs, strict=True))
    total = 0.0
    for term in f.terms:
        total += float(term.coefficient) * math.prod((z[i] - z[j]) ** power for (i, j), power in term.powers)
    return factor * total


def of_terms(integral: DiskIntegral, kin: Mandelstams, z: dict[int, float]) -> float:
    """The integrand of the absolute-value terms at the same point: positions along the ordering."""
    n = integral.n
    by_position = [z[label] for label in integral.ordering]
    total = 0.0
    for term in integral.terms(kin):
        sizes = (abs(by_position[i - 1] - by_position[j - 1]) for i, j in pair_order(n))
        total += float(term.coefficient) * math.prod(r ** float(a) for r, a in zip(sizes, term.pairs, strict=True))
    return total


def random_monomial(n: int, degree: int, rng: random.Random) -> Integrand:
    """A monomial with all degrees equal to ``degree``: a product of cycles, then random moves that keep degrees."""
    powers = dict.fromkeys(pair_order(n), 0)
    if degree:
        cycle = rng.sample(range(1, n + 1), n)
        for k, label in enumerate(cycle):
            pair = (min(label, cycle[k - 1]), max(label, cycle[k - 1]))
            powers[pair] += degree // 2
    for _ in range(3):
        a, b, c, d = rng.sample(range(1, n + 1), 4)
        for pair, change in (((a, b), 1), ((c, d), 1), ((a, c), -1), ((b, d), -1)):
            powers[min(pair), max(pair)] += change
    return monomial(powers)


@pytest.mark.parametrize("n", [4, 5, 6])
@pytest.mark.parametrize(("rows", "degree"), [(0, -2), (-2, 0), (2, -4)])
def test_signs_and_exponents_against_the_definition_at_points_of_the_domain(n, rows, degree):
    rng = random.Random(10 * n + rows)
    for trial in range(25):
        kin = Mandelstams.random(n, 100 * n + trial, row_sums=rows)
        f = sum((Fraction(rng.randint(-9, 9), 4) * random_monomial(n, degree, rng) for _ in range(3)), Integrand())
        ordering = tuple(rng.sample(range(1, n + 1), n))
        integral = DiskIntegral(n, f, ordering)
        z = ordered_point(ordering, rng)
        size = sum(abs(with_factor(kin, term.coefficient * monomial(dict(term.powers)), z)) for term in f.terms)
        assert of_terms(integral, kin, z) == pytest.approx(with_factor(kin, f, z), rel=0, abs=1e-12 * size)


@pytest.mark.parametrize("n", [4, 5, 6, 7])
def test_parke_taylor_on_its_own_ordering_has_coefficient_one_and_reversal_a_sign(n):
    rng = random.Random(n)
    kin = Mandelstams.random(n, n)
    ordering = tuple(rng.sample(range(1, n + 1), n))
    (own,) = DiskIntegral(n, parke_taylor(*ordering), ordering).terms(kin)
    (other,) = DiskIntegral(n, parke_taylor(*ordering), ordering[::-1]).terms(kin)
    assert own.coefficient == 1
    assert other.coefficient == (-1) ** n


@settings(deadline=None, max_examples=80)
@given(st.integers(4, 7), st.integers(0, 10**6), st.sampled_from([(0, -2), (-2, 0), (4, -6)]))
def test_every_monomial_is_a_shifted_parke_taylor_integral(n, seed, kind):
    rows, degree = kind
    rng = random.Random(seed)
    kin = Mandelstams.random(n, seed, row_sums=rows)
    f = random_monomial(n, degree, rng)
    ordering = tuple(rng.sample(range(1, n + 1), n))
    integral = DiskIntegral(n, f, ordering)
    ((c, shifted),) = shifted_parke_taylor(kin, integral)
    assert shifted.is_massless
    (term,) = integral.terms(kin)
    (moved,) = DiskIntegral(n, parke_taylor(*ordering), ordering).terms(shifted)
    assert moved.pairs == term.pairs
    assert c * moved.coefficient == term.coefficient


def test_shift_of_a_known_case():
    # int |z12|^(s12) ... z12^-2 z34^-2 on 1,2,3,4: both factors are squares, so the sign is +
    sign, shifts = shifted_exponents((1, 2, 3, 4), {(1, 2): -2, (3, 4): -2})
    assert sign == 1
    assert shifts == {(1, 2): -1, (1, 3): 0, (1, 4): 1, (2, 3): 1, (2, 4): 0, (3, 4): -1}
    assert shifted_exponents((2, 1, 3, 4), {(1, 2): -1})[0] == 1
    assert shifted_exponents((1, 2, 3, 4), {(1, 2): -1})[0] == -1
    assert shifted_exponents((1, 2, 3, 4), {(2, 1): -1})[0] == 1
    with pytest.raises(InputError, match="label 5"):
        shifted_exponents((1, 2, 3, 4), {(1, 5): -1})


def test_covariance_is_checked_for_every_puncture_and_monomial():
    kin = Mandelstams.random(4, 1)
    with pytest.raises(InputError, match=r"puncture 3 with R_3 \+ sum_j n_3j = 0 \+ -1 = -1 .*-2"):
        DiskIntegral(4, monomial({(1, 2): -2, (3, 4): -1})).terms(kin)
    with pytest.raises(InputError, match=r"puncture 1 .* = 0 in a monomial"):
        DiskIntegral(4, parke_taylor(1, 2, 3, 4) + 1).terms(kin)
    with pytest.raises(InputError, match=r"puncture 1 .* = -4"):
        DiskIntegral(4, parke_taylor(1, 2, 3, 4)).terms(Mandelstams.random(4, 1, row_sums=-2))
    with pytest.raises(InputError, match="puncture 2"):
        DiskIntegral(4, parke_taylor(1, 2, 3, 4)).terms(Mandelstams.random(4, 1, row_sums=[0, 1, 0, 1]))
    closed = Mandelstams.random(4, 1, string="closed")
    with pytest.raises(InputError, match=r"^g: .*puncture 1"):
        SphereIntegral(4, parke_taylor(1, 2, 3, 4), monomial({(1, 2): -1, (3, 4): -2})).terms(closed)


def test_kinematics_of_the_other_string_are_refused_with_the_way_out():
    opened, closed = (Mandelstams.random(4, 1, string=kind) for kind in ("open", "closed"))
    f = parke_taylor(1, 2, 3, 4)
    assert DiskIntegral(4, f).terms(opened)
    assert SphereIntegral(4, f).terms(closed)
    assert SphereIntegral(4, f).terms(opened.as_closed())
    with pytest.raises(InputError, match=r"\.as_closed\(\)"):
        DiskIntegral(4, f).terms(closed)
    with pytest.raises(InputError, match=r"\.as_closed\(\)"):
        SphereIntegral(4, f).terms(opened)


def test_terms_that_cancel_leave_nothing():
    kin = Mandelstams.random(4, 1)
    assert DiskIntegral(4, Integrand()).terms(kin) == ()
    assert DiskIntegral(4, parke_taylor(1, 2, 3, 4) - parke_taylor(4, 3, 2, 1)).terms(kin) == ()
    assert len(DiskIntegral(4, parke_taylor(1, 2, 3, 4) + 2 * parke_taylor(4, 3, 2, 1)).terms(kin)) == 1


def test_poles_name_channel_level_and_invariant():
    kin = Mandelstams.from_planar(5, {(1, 2): -1, (2, 3): "1/3", (3, 4): 0, (4, 5): "1/7", (5, 1): "2/5"})
    own = DiskIntegral(5, parke_taylor(1, 2, 3, 4, 5))
    assert own.poles(kin) == (((1, 2), 1, Exact(-1)), ((3, 4), 0, Exact(0)))
    # a channel across the end of the ordering is named by its other side
    crossing = Mandelstams.from_planar(5, {(1, 2): "1/2", (2, 3): "1/3", (3, 4): "1/4", (4, 5): "1/7", (5, 1): -2})
    assert own.poles(crossing) == (((2, 3, 4), 2, Exact(-2)),)
    assert DiskIntegral(5, parke_taylor(1, 2, 4, 3, 5)).poles(kin)[0] == ((1, 2), 1, Exact(-1))
    # s_34 = 0 is no pole without 1/z34, and a double pole starts at s = 1
    assert not any(c == (3, 4) for c, *_ in DiskIntegral(5, parke_taylor(1, 3, 2, 4, 5)).poles(kin))
    kin4 = Mandelstams.from_planar(4, {(1, 2): 1, (2, 3): "1/3"})
    double = DiskIntegral(4, monomial({(1, 2): -2, (3, 4): -2}))
    assert double.poles(kin4) == (((1, 2), 0, Exact(1)),)


def test_poles_on_the_sphere_need_both_sides():
    kin = Mandelstams.from_planar(4, {(1, 2): 0, (2, 3): "1/3"})
    f, g = parke_taylor(1, 2, 3, 4), parke_taylor(1, 3, 2, 4)
    assert SphereIntegral(4, f).poles(kin) == (((1, 2), 0, Exact(0)),)
    assert SphereIntegral(4, f, g).poles(kin) == ()
    lower = Mandelstams.from_planar(4, {(1, 2): -1, (2, 3): "1/3"})
    assert SphereIntegral(4, f, g).poles(lower) == (((1, 2), 1, Exact(-1)),)


def test_sphere_terms_are_all_products_with_the_second_one_conjugated():
    kin = Mandelstams.random(4, 3)
    f = 2 * parke_taylor(1, 2, 3, 4) + "1/3" * parke_taylor(1, 3, 2, 4)
    g = "1+2j" * parke_taylor(1, 2, 4, 3)
    terms = SphereIntegral(4, f, g).terms(kin)
    assert {str(t.coefficient) for t in terms} <= {"2-4j", "1/3-2/3j", "-2+4j", "-1/3+2/3j"}
    assert {t.left for t in terms} == {(-1, 0, -1, -1, 0, -1), (0, -1, -1, -1, -1, 0)}
    assert {t.right for t in terms} == {(-1, -1, 0, 0, -1, -1)}
    assert all(t.pairs == kin.pairs for t in terms)
    assert SphereIntegral(4, f).g == f


def test_specs_are_values():
    a, b = DiskIntegral(5, "PT(1,2,3,4,5)"), DiskIntegral(5, parke_taylor(2, 3, 4, 5, 1), (1, 2, 3, 4, 5))
    assert a == b
    assert hash(a) == hash(b)
    assert a != DiskIntegral(5, "PT(1,2,3,4,5)", (2, 1, 3, 4, 5))
    kin = Mandelstams.random(5, 2)
    assert pickle.loads(pickle.dumps(a)).terms(kin) == a.terms(kin)
    assert a.to_dict() == {"n": 5, "f": str(a.f), "ordering": [1, 2, 3, 4, 5]}
    assert SphereIntegral(5, a.f).to_dict() == {"n": 5, "f": str(a.f), "g": str(a.f)}
    with pytest.raises(AttributeError):
        a.n = 6  # type: ignore[misc]


@pytest.mark.parametrize(
    ("bad", "match"),
    [
        (lambda: DiskIntegral(4, parke_taylor(1, 2, 3, 5)), "label 5"),
        (lambda: DiskIntegral(4, 3), "Integrand"),  # type: ignore[arg-type]
        (lambda: DiskIntegral(4, "PT(1,2"), "character"),
        (lambda: DiskIntegral(4, "PT(1,2,3,4)", (1, 2, 3)), "permutation"),
        (lambda: DiskIntegral(4, "PT(1,2,3,4)", (1, 2, 3, 3)), "different"),
        (lambda: DiskIntegral(3, "PT(1,2,3)"), "n"),
        (lambda: DiskIntegral(4, "PT(1,2,3,4)").terms(Mandelstams.random(5, 1)), "4 legs"),
        (lambda: DiskIntegral(4, "PT(1,2,3,4)").terms(None), "Mandelstams"),  # type: ignore[arg-type]
        (lambda: SphereIntegral(4, parke_taylor(1, 2, 3, 4), "PT(1,2,3,5)"), "^g"),
        (lambda: SphereIntegral(4, "PT(1,2,3,4)").terms(Mandelstams.random(5, 1)), "4 legs"),
    ],
)
def test_bad_input_names_what_is_wrong(bad, match):
    with pytest.raises(InputError, match=match):
        bad()
