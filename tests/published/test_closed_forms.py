"""Every closed form against a second route: quadrature of its definition, another theorem, or a recurrence."""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor
from fractions import Fraction
from itertools import combinations

import mpmath
import numpy as np
import pytest
from cases import KINDS, REGIMES, fits, random_case
from closed_form_checks import complex_beta_by_discs, five_from_chords, u_equation_defect
from massless import big, j_value
from sector_sum import sector_sum

from kn_integrate.closed_forms import (
    DISK_FORMS,
    LOCI,
    AomotoInsertion,
    BetaProduct,
    ComplexBeta,
    ComplexSelberg,
    Dixon,
    DixonAnderson,
    EulerBeta,
    FivePoint,
    Gauss,
    HypergeometricChain,
    PairExponents,
    PfaffSaalschuetz,
    RogersDougall,
    Selberg,
    Watson,
    Whipple,
    find,
    find_sphere,
)
from kn_integrate.closed_forms.unit_series import unit_series
from kn_integrate.closed_forms.working import context, settled
from kn_integrate.errors import InputError, NotAvailableError, PoleError
from kn_integrate.exact import Exact, read


def number(value) -> Exact:
    return read(value, "value")[0]


def numbers(*values) -> tuple[Exact, ...]:
    return tuple(number(value) for value in values)


def relative(value, reference) -> float:
    with mpmath.workdps(60):
        return float(abs(value - reference) / abs(reference))


# 1. The definition: quadrature where the integral converges


CONVERGENT = [
    *(pytest.param(kind, 12, id=kind) for kind in ("beta", "3F2", "betas5", "betas6", "chain6", "dixon-anderson6")),
    *(pytest.param(kind, 12, id=kind) for kind in ("selberg5", "selberg6")),
    *(pytest.param(kind, 10, id=kind) for kind in ("betas7", "chain7", "dougall7", "selberg7")),
]


@pytest.mark.parametrize(("kind", "nodes"), CONVERGENT)
def test_equals_quadrature_of_the_definition(kind, nodes):
    rng = np.random.default_rng(20)
    for _ in range(3):
        case = random_case(kind, rng, "convergent")
        fine, coarse = (sector_sum(case.pairs, count) for count in (nodes, nodes - 2))
        value = float(case.value(20))
        assert abs(fine - value) < 2e-6 * value
        # not merely close: the quadrature converges to the closed form
        assert abs(fine - value) < 0.5 * abs(coarse - value) + 1e-12 * value


@pytest.mark.parametrize(
    "form",
    [
        DixonAnderson(("0.6", "0.7", "0.7", "0.5"), "0.3", "0.2", "0.4"),
        Selberg(5, "0.6", "0.8", "0.3"),
        BetaProduct(("0.6", "0.9", "0.5", "0.8", "0.7"), ("0.8", "0.6", "0.7", "0.9", "0.5")),
    ],
    ids=["dixon-anderson", "selberg", "betas"],
)
def test_eight_points_equal_quadrature(form):
    value = float(form.value(20))
    errors = [abs(sector_sum(form.pairs(), count) / value - 1) for count in (6, 10)]
    assert errors[1] < 1e-6
    assert errors[1] < errors[0] / 500


@pytest.mark.parametrize(
    "form",
    [
        Dixon.match(PairExponents.from_finite(5, {(1, 2): "-0.7", (2, 3): "-0.55", (3, 4): "-0.75", (2, 4): "-0.3"})),
        Watson.match(PairExponents.from_finite(5, {(1, 2): "-0.6", (2, 3): "-0.6", (3, 4): "-0.45", (2, 4): "-0.3"})),
    ],
)
def test_finding_a_locus_takes_all_of_its_conditions(form):
    assert form is None


def locus_cases():
    rng = np.random.default_rng(4)

    def draw(low, high, im=0):
        real = Fraction(int(rng.integers(int(low * 1000), int(high * 1000))), 1000) + Fraction(1, 7919)
        return Exact(real, Fraction(int(rng.integers(-im * 1000, im * 1000)), 1000) if im else Fraction(0))

    for low, high, im in ((0.1, 0.6, 0), (-3, 2, 0), (-2, 2, 5)):
        for _ in range(2):
            a, b, c, e = (draw(low, high, im) for _ in range(4))
            m = int(rng.integers(0, 6))
            yield Dixon, FivePoint(a, b, c, 1 + a - b, 1 + a - c)
            yield Dixon, FivePoint(b, a, c, 1 + a - c, 1 + a - b)
            yield Watson, FivePoint(a, b, c, (a + b + 1) / 2, 2 * c)
            yield Watson, FivePoint(c, b, a, 2 * c, (a + b + 1) / 2)
            yield Whipple, FivePoint(a, 1 - a, c, e, 1 + 2 * c - e)
            yield Whipple, FivePoint(c, a, 1 - a, e, 1 + 2 * c - e)
            yield PfaffSaalschuetz, FivePoint(-m, a, b, c, 1 + a + b - m - c)
            yield Gauss, FivePoint(a, b, c, e, b)
            yield Gauss, FivePoint(a, b, c, a, e)


@pytest.mark.parametrize("locus", LOCI)
def test_gamma_products_equal_the_continued_series(locus):
    compared = 0
    for cls, five in locus_cases():
        if cls is locus:
            assert relative(locus(five).value(30), five.value(30)) < 1e-29
            compared += 1
    assert compared >= 6


# 2. Continuation


DEEP = [
    ("-2.5", "-2.5", "-2.5", "-2.5", "-2.5"),
    ("-2.3", "-1.4", "-2.6", "-1.35", "-2.45"),
    ("-5.3", "-4.4", "-6.6", "-4.35", "-5.45"),
    ("-1.4+4j", "0.3-2j", "-0.5+3j", "-2.35-1j", "0.45+2j"),
    ("1e-6", "0.31", "-1e-6", "0.42", "0.27"),
    ("-2.000001", "0.31", "-1.000001", "0.42", "-0.27"),
    ("1e-7", "2e-7", "0.5", "0.35", "0.45"),
    ("40.3", "39.1", "-38.7", "41.2", "37.6"),
    ("0.4+10j", "0.7+30j", "0.3-20j", "0.6+50j", "0.5-15j"),
]


@pytest.mark.parametrize("y", DEEP)
def test_five_rotations_give_one_value(y):
    form = five_from_chords(numbers(*y))
    value = form.value(30)
    assert len({rotated.excess for rotated in form.rotations()}) > 1 or len(set(y)) == 1
    for rotated in form.rotations():
        assert relative(settled(rotated.evaluate_here, 30), value) < 1e-29


@pytest.mark.parametrize("y", DEEP)
@pytest.mark.parametrize("chord", [0, 3])
def test_u_equations_hold_past_the_poles(y, chord):
    lost = 12 if "e-" in "".join(y) or "0001" in "".join(y) else 4  # near a pole the terms are larger than the sum
    assert u_equation_defect(numbers(*y), chord, 40) < 10 ** (lost - 40)


def test_residue_at_a_massive_pole_is_a_derivative():
    # Y_12 -> -1: the residue is minus ... the first Taylor coefficient of the rest at z_2 = 0, two beta integrals
    y23, y34, y45, y51 = numbers("0.4", "0.5", "0.35", "0.45")
    step = Fraction(1, 10**20)
    value = five_from_chords((number(step - 1), y23, y34, y45, y51)).value(50)
    # I = int y^(a2-1) (1-y)^(c2-1) x^(a1-1) (1-x)^(c1-1) (1-xy)^L; d/dx at 0 of the rest: -(c1-1) - L y
    long = y51 - y23 - y34
    with mpmath.workdps(50):
        first = big(1 - y23) * mpmath.beta(big(y45), big(y34))
        second = -big(long) * mpmath.beta(big(y45 + 1), big(y34))
        assert relative(value * big(number(step)), first + second) < 1e-18


def test_series_equals_another_summation():
    a, b = numbers("0.3", "0.45", "0.7", "0.2"), numbers("1.1", "0.9", "0.6")
    ctx = context(40)
    with mpmath.workdps(40):
        expected = mpmath.hyper([big(x) for x in a], [big(x) for x in b], 1)
        for x in b:
            expected /= mpmath.gamma(big(x))
    assert relative(unit_series(ctx, a, b), expected) < 1e-33


def test_series_ends_when_a_numerator_is_a_negative_integer():
    # 1 + (-2)(a)/(c) + (-2)(-1) a (a+1) / (2 c (c+1)), with c = -1/2 and both Gamma functions regular
    a, c = Fraction(1, 3), Fraction(-1, 2)
    expected = 1 - 2 * a / c + a * (a + 1) / (c * (c + 1))
    ctx = context(30)
    value = unit_series(ctx, numbers(-2, a), numbers(c)) * ctx.gamma(ctx.mpf(-1) / 2)
    assert relative(value, mpmath.mpf(expected.numerator) / expected.denominator) < 1e-15


def test_denominator_at_a_pole_starts_the_series_later():
    # sum (a)_k (b)_k / (k! Gamma(k - 1)) = a (a+1) b (b+1) / 2 * sum (a+2)_j (b+2)_j / (j! (3)_j)   [DLMF 15.2.3_5]
    a, b = numbers("-2.3", "-0.9")
    ctx = context(30)
    with mpmath.workdps(30):
        x, y = big(a), big(b)
        expected = x * (x + 1) * y * (y + 1) / 2 * mpmath.hyp2f1(x + 2, y + 2, 3, 1)
    assert relative(unit_series(ctx, (a, b), numbers(-1)), expected) < 1e-25


# 3. One form against another


@pytest.mark.parametrize("regime", list(REGIMES))
def test_very_well_poised_sum_equals_its_series(regime):
    rng = np.random.default_rng(5)
    for _ in range(3):
        case = random_case("dougall7", rng, regime)
        series = HypergeometricChain.read_off(case.pairs)
        assert relative(case.value(25), series.value(25)) < 1e-24


@pytest.mark.parametrize("regime", list(REGIMES))
def test_two_point_selberg_equals_the_five_point_series(regime):
    rng = np.random.default_rng(6)
    for _ in range(4):
        case = random_case("selberg5", rng, regime)
        assert relative(case.value(25), FivePoint.read_off(case.pairs).value(25)) < 1e-24


@pytest.mark.parametrize(
    "parameters", [("0.4", "0.3", "0.2"), ("-1.6", "-2.3", "0.35"), ("0.4+3j", "-0.7-1j", "0.3+1j")]
)
@pytest.mark.parametrize("k", [0, 1, 2])
def test_aomoto_insertion_equals_the_sum_of_five_point_series(parameters, k):
    form = AomotoInsertion(2, *parameters, k)
    assert len(form.terms()) == [1, 2, 1][k]
    with mpmath.workdps(50):
        total = sum(FivePoint.read_off(term).value(40) for term in form.terms())
    assert relative(form.value(30), total) < 1e-28


def test_aomoto_insertion_equals_quadrature():
    form = AomotoInsertion(3, "0.6", "0.8", "0.3", 2)
    total = sum(sector_sum(term, 14) for term in form.terms())
    assert abs(total / float(form.value(20)) - 1) < 1e-9


def test_product_of_betas_is_the_chain_without_long_factors():
    form = BetaProduct(("0.3", "-1.4", "0.7+1j"), ("0.2", "0.9", "-0.3"))
    chain = HypergeometricChain(form.a, form.c, ())
    assert chain.pairs() == form.pairs()
    assert relative(form.value(30), chain.value(30)) < 1e-29
    betas = [EulerBeta(a, c).value(40) for a, c in zip(form.a, form.c, strict=True)]
    assert relative(form.value(30), betas[0] * betas[1] * betas[2]) < 1e-15


@pytest.mark.parametrize("spin", [(0, 0), (1, 0), (0, 1), (2, -1), (-3, 2), (1, 1), (-1, -2)])
def test_complex_beta_equals_its_expansion_in_two_discs(spin):
    a, b = numbers("0.37", "2.43")
    ab, bb = a - spin[0], b - spin[1]
    if (b + bb).re <= 0:  # the expansion needs Re(b + bb) > 0
        b, bb = b + 3, bb + 3
    with mpmath.workdps(17):
        expected = complex_beta_by_discs(a, ab, b, bb)
    assert relative(ComplexBeta(a, ab, b, bb).value(25), expected) < 1e-13


@pytest.mark.parametrize(("x", "xb"), [(0, 2), (-1, 2), (0, 1), (-3, 1)])
def test_complex_beta_where_two_gamma_functions_are_infinite_together(x, xb):
    # Gamma(x)/Gamma(1-xb) is finite; the limit along (x + t, xb + t) agrees, and so does its mirror image
    exact = ComplexBeta(x, xb, "0.4", "0.4").value(30)
    step = Fraction(1, 10**18)
    near = ComplexBeta(x + step, xb + step, "0.4", "0.4").value(30)
    assert relative(near, exact) < 1e-16
    assert relative(ComplexBeta(xb, x, "0.4", "0.4").value(30), exact) < 1e-29


@pytest.mark.parametrize(
    "parameters", [("0.3", "0.25", "0.05"), ("-1.3", "-2.43", "0.35"), ("0.3+1j", "0.2", "0.1-2j")]
)
def test_complex_selberg_equals_products_of_disk_integrals(parameters):
    form = ComplexSelberg(2, *parameters)
    cycle = (1, 2, 3, 4, 5)
    s = {(i, j): form.left.at(i, j) for i, j in combinations(range(1, 6), 2)}
    for i, j in ((1, 2), (2, 3), (3, 4), (4, 5), (1, 5)):
        s[i, j] = s[i, j] + 1
    with mpmath.workdps(45):
        assert relative(form.value(30), j_value(s, cycle, cycle, 45)) < 1e-28


# 4. Matching


def test_find_sees_through_rotations_and_reflections():
    rng = np.random.default_rng(7)
    for kind in KINDS:
        case = random_case(kind, rng, "mild")
        images = list(case.pairs.dihedral())
        for k in rng.integers(1, len(images), size=1):
            turned = images[int(k)][1]
            matches = find(turned.flat)
            assert type(case.form) in {type(match.form) for match in matches}
            for match in matches:
                assert match.form.pairs() == turned.image(match.order)
                assert relative(match.form.value(20), case.value(20)) < 1e-19


def test_generic_exponents_match_nothing_beyond_five_points():
    rng = np.random.default_rng(8)
    for n in (6, 7, 8):
        pairs = PairExponents.from_finite(
            n,
            {
                (i, j): Fraction(int(rng.integers(-900, 900)), 1000)
                for i, j in combinations(range(1, n), 2)
                if (i, j) != (1, n - 1)
            },
        )
        assert find(pairs) == ()


def test_every_form_names_its_source_and_domain():
    for form in DISK_FORMS:
        assert all((form.name, form.source, form.domain))
    assert len({form.name for form in DISK_FORMS}) == len(DISK_FORMS)


def test_sphere_forms_are_found_under_any_labelling():
    closed = ComplexSelberg(3, "0.28", "0.23", "0.03")
    image = closed.left.image((6, 3, 1, 5, 2, 4))
    (found,) = find_sphere(image.flat, image.flat)
    assert relative(found.value(20), closed.value(20)) < 1e-19
    assert (
        find_sphere(FivePoint("0.31", "0.2", "0.3", "0.7", "0.8").pairs(), five_from_chords(numbers(*DEEP[1])).pairs())
        == ()
    )


# 5. Poles, zeros, refusals


def test_a_chord_on_a_pole_is_named():
    with pytest.raises(PoleError) as caught:
        five_from_chords(numbers("0.3", "-2", "0.4", "0.7", "0.9")).value()
    assert caught.value.channel == (2, 3)
    assert caught.value.level == 2
    with pytest.raises(PoleError) as caught:
        Selberg(3, "0.4", "0.3", "-1/3").value()
    assert caught.value.channel == (2, 3, 4)
    with pytest.raises(PoleError):
        ComplexBeta(-1, -2, "0.3", "0.3").value()


def test_an_exact_zero_is_exactly_zero():
    assert EulerBeta("1/2", "-1/2").value(30) == 0
    assert BetaProduct(("0.3", "0.5"), ("-1.3", "0.2")).value(30) == 0


def test_a_series_that_cannot_be_told_from_zero_is_refused():
    five = FivePoint("0.3", "0.45", "2.6", "2.6", "-0.55")  # 2F1(0.3, 0.45; -0.55; 1) with c - b = -1
    assert Gauss(five).value(20) == 0
    assert five.value(20) == 0  # the rotation that is chosen ends by itself
    with pytest.raises(NotAvailableError):
        settled(five.evaluate_here, 5)  # this one does not


@pytest.mark.parametrize(
    "make",
    [
        lambda: Dixon(FivePoint("0.3", "0.2", "0.4", "0.7", "0.8")),
        lambda: RogersDougall("0.3", ("0.1", "0.2", "0.3", "0.4"), ("0.5", "0.6", "0.7", "0.8")),
        lambda: DixonAnderson(("0.3", "0.4", "0.5", "0.6"), "0.1", "0.2"),
        lambda: DixonAnderson(("0.3", "0.4", "0.6"), "0.1", "0.2", "0.3"),
        lambda: Selberg(0, "0.4", "0.3", "0.2"),
        lambda: Selberg(True, "0.4", "0.3", "0.2"),
        lambda: AomotoInsertion(2, "0.4", "0.3", "0.2", 3),
        lambda: HypergeometricChain(("0.3", "0.4"), ("0.5", "0.6"), (((2, 3), "0.1"),)),
        lambda: BetaProduct(("0.3", "0.4"), ("0.5",)),
        lambda: ComplexBeta("0.3", "0.4", "0.2", "0.2"),
        lambda: EulerBeta("x", 1),
        lambda: EulerBeta("0.3", "0.4").value(0),
        lambda: EulerBeta("0.3", "0.4").value(True),
        lambda: find(["0.1"] * 6),
        lambda: find(["0.1"] * 7),
        lambda: PairExponents.from_finite(5, {(1, 4): 1}),
    ],
)
def test_parameters_off_the_domain_are_refused(make):
    with pytest.raises(InputError):
        make()


def test_values_do_not_depend_on_the_global_precision_or_on_threads():
    case = five_from_chords(numbers(*DEEP[3]))
    before = mpmath.mp.prec
    alone = case.value(30)
    with mpmath.workdps(7):
        low = case.value(30)
    with ThreadPoolExecutor(4) as pool:
        many = list(pool.map(lambda _: case.value(30), range(8)))
    assert mpmath.mp.prec == before
    assert {value._mpc_ for value in [alone, low, *many]} == {alone._mpc_}


def test_more_digits_agree_with_fewer():
    form = five_from_chords(numbers(*DEEP[1]))
    best = form.value(120)
    for digits in (1, 5, 16, 50, 100):
        assert relative(form.value(digits), best) < 10.0**-digits


# 6. The generators other tests draw from


@pytest.mark.parametrize("regime", list(REGIMES))
@pytest.mark.parametrize("kind", list(KINDS))
def test_random_cases_stay_in_their_regime_and_repeat(kind, regime):
    case = random_case(kind, np.random.default_rng(11), regime)
    again = random_case(kind, np.random.default_rng(11), regime)
    assert case == again
    assert fits(case.pairs, REGIMES[regime])
    assert case.pairs.converges == (regime == "convergent") or regime == "complex"
    assert mpmath.isfinite(case.value(15))
