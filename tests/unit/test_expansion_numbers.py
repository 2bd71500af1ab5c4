from __future__ import annotations

import random
from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kn_integrate import InputError, Mandelstams, ZetaSum, recognise, zeta
from kn_integrate.exact import Exact
from kn_integrate.expansion.balls import Ball
from kn_integrate.expansion.disk import exact_engine
from kn_integrate.expansion.numeric import ball_of, value_of
from kn_integrate.expansion.recursion import ball_engine
from kn_integrate.expansion.relations import MARGIN, recognise_ball
from kn_integrate.expansion.zetas import basis

# --- balls ------------------------------------------------------------------------------------------------------------

rationals = st.builds(Fraction, st.integers(-50, 50), st.integers(1, 30))
exacts = st.builds(Exact, rationals, rationals)


def holds(ball: Ball, truth: Exact) -> bool:
    """Whether the ball contains the number, exactly."""
    scale = 2**ball.bits
    return abs(truth.re * scale - ball.re) <= ball.error and abs(truth.im * scale - ball.im) <= ball.error


@settings(deadline=None, max_examples=200)
@given(exacts, exacts, exacts, st.integers(8, 60), st.integers(0, 5))
def test_balls_contain_the_results(a, b, c, bits, spread):
    x, y = Ball.of(a, bits), Ball.of(b, bits)
    # balls that are wider than needed, and off-centre by as much as they allow
    x = Ball(x.re + spread, x.im - spread, x.error + spread, bits)
    assert holds(x, a)
    assert holds(x + y, a + b)
    assert holds(x - y, a - b)
    assert holds(x * y, a * b)
    assert holds(x * c, a * c)
    assert holds(x * 3, a * 3)
    if c:
        assert holds(x / c, a / c)
    assert (x - x).contains_zero()
    assert x.magnitude >= abs(a.re * 2**bits)


def test_errors_of_balls_as_floats_are_rounded_up():
    assert Ball(1, 0, 0, 10).error_number() == 0.0
    assert Ball(0, 0, 3, 10).error_number() >= 3 / 1024 * 2**0.5
    assert Ball(0, 0, 10**40, 10).error_number() > 10**40 / 1024
    assert 0 < Ball(0, 0, 1, 5000).error_number() < 1e-300


# --- the recursion in balls -------------------------------------------------------------------------------------------

CASES = [
    (4, 8, "real", 1),
    (5, 8, "real", 1),
    (5, 6, "complex", 1),
    (5, 6, "real", 50),
    (6, 5, "real", 1),
    (7, 3, "real", 1),
]


@pytest.mark.parametrize(("n", "weight", "kind", "size"), CASES)
@pytest.mark.parametrize("seed", range(4))
def test_errors_of_the_recursion_bound_the_truth_and_are_not_wild(n, weight, kind, size, seed):
    kin = Mandelstams.random(n, seed, low=-size, high=size, denominator=35)
    if kind == "complex":
        other = Mandelstams.random(n, seed + 100, low=-size, high=size, denominator=6)
        kin = kin.moved(other, "1j")
    bits = 160
    numbers = ball_engine(kin, weight, bits)
    for word, series in exact_engine(kin, weight).items():
        for exact, ball in zip(series, numbers[word], strict=True):
            truth = ball_of(exact, 400)
            shift = 400 - bits
            assert abs((ball.re << shift) - truth.re) <= (ball.error << shift) + truth.error
            assert abs((ball.im << shift) - truth.im) <= (ball.error << shift) + truth.error
    # not wild: at least half of the bits are left
    assert max(ball.error for series in numbers.values() for ball in series) < 2 ** (bits // 2)


def test_recursion_is_deterministic_and_more_bits_refine_it():
    kin = Mandelstams.random(5, 9)
    first, again, finer = (ball_engine(kin, 5, bits) for bits in (100, 100, 200))
    assert first == again
    for word, series in first.items():
        for a, b in zip(series, finer[word], strict=True):
            assert abs((a.re << 100) - b.re) <= (a.error << 100) + b.error


# --- integer relations ------------------------------------------------------------------------------------------------


def test_random_reals_are_not_recognised():
    rng = random.Random(12)
    false = 0
    for _ in range(1000):
        weight, digits = rng.randint(0, 8), rng.choice([8, 12, 20, 40, 60])
        value = Exact(Fraction(rng.getrandbits(260), 2**260)) * rng.choice([1, 100, 10**6])
        false += recognise(value, weight, digits=digits).found
    assert false <= 1


@pytest.mark.parametrize("weight", range(13))
def test_true_combinations_are_recognised_when_the_digits_suffice(weight):
    rng = random.Random(weight)
    truth = ZetaSum((p, Exact(Fraction(rng.randint(-999, 999), rng.choice([1, 2, 5, 7])))) for p in basis(weight))
    size = len(basis(weight)) + 1
    digits = int(5.5 * size + MARGIN + 10)
    found = recognise(value_of(truth, digits + 10), weight, digits=digits)
    assert found.exact == truth
    assert found.margin >= MARGIN
    assert found.height < 6
    if truth:
        few = recognise(value_of(truth, digits + 10), weight, digits=4)
        assert not few.found
        assert "not recognised from" in str(few)


def test_wrong_weight_is_not_recognised():
    value = value_of(zeta(3) * 17, 60)
    assert recognise(value, 3, digits=55).exact == 17 * zeta(3)
    assert not recognise(value, 5, digits=55).found
    assert not recognise(value, 8, digits=55).found


def test_complex_combinations_and_zero():
    truth = zeta(5) * Exact("2/3-5j") + zeta(2) * zeta(3) * Exact("1/7")
    found = recognise_ball(ball_of(truth, 300), (5,))
    assert found.exact == truth
    nothing = recognise(0, 4, digits=40)
    assert nothing.exact == ZetaSum()
    assert nothing.found
    assert "chance of an accident" in str(nothing)


def test_sums_of_several_weights():
    truth = zeta(3) * 7 - zeta(2) / 3 + 5
    value = value_of(truth, 70)
    assert recognise(value, (0, 2, 3), digits=65).exact == truth
    assert not recognise(value, 3, digits=65).found
    assert not recognise(value, (0, 3), digits=65).found


def test_a_value_off_by_its_last_digits_is_not_recognised():
    value = Exact(Fraction(round(Fraction(int(ball_of(zeta(3) * 5, 400).re), 2**400) * 10**50), 10**50))
    assert recognise(value, 3, digits=49).exact == 5 * zeta(3)
    assert not recognise(value + Fraction(1, 10**30), 3, digits=49).found


@pytest.mark.parametrize(
    "bad",
    [
        lambda: recognise(1, 13, digits=20),
        lambda: recognise(1, -1, digits=20),
        lambda: recognise("x", 3, digits=20),
        lambda: recognise(1, 3, digits=0),
        lambda: recognise(1, 3, digits=True),
        lambda: recognise(float("nan"), 3, digits=20),
    ],
)
def test_bad_input_is_an_input_error(bad):
    with pytest.raises(InputError):
        bad()
