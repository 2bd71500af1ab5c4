"""Rules against one-variable integrals in closed form: every family, exponents of every kind, claimed errors."""

from __future__ import annotations

import math

import mpmath
import numpy as np
import pytest

from kn_integrate.disk.chords import ChordData
from kn_integrate.disk.plan import FRACTION, Choice, amplification, ladder
from kn_integrate.disk.rules import PoleDistance, chebyshev_rule, contour_rule, disc_rule, radau_rule
from kn_integrate.disk.rules.base import symmetric_bend
from kn_integrate.exact import Exact

EXPONENTS = [
    "0.4",
    "2.7",
    "-0.4",
    "-0.9",
    "-1.5",
    "-2.7",
    "-4.6",
    "0.3+2j",
    "-0.5+1.5j",
    "-1.3+3j",
    "-3.2-1j",
    "1e-7",
    "-2.00001",
]
A = -0.63


def build(family: str, y: PoleDistance, size: int, nodes: int):
    if family == "radau":
        return radau_rule(y, size, nodes)
    if family == "overhang":
        return chebyshev_rule(y, size, nodes, reach=0.25)
    if family == "ellipse":
        return chebyshev_rule(y, size, nodes, rho=2.0)
    if family in ("disc", "small disc"):
        return disc_rule(y, size, nodes, wide=family == "disc")
    return contour_rule(y, size, nodes, nodes // 2, FRACTION)


def exact_value(y: Exact, size: int, power: float) -> complex:
    """int_0^1 t^(Y-1) (1 + size t)^power dt, continued: a hypergeometric series in closed form."""
    with mpmath.workdps(40):
        s = mpmath.mpmathify(complex(y.value())) if not y.is_real else mpmath.mpf(y.re.numerator) / y.re.denominator
        if not y.is_real:
            s = mpmath.mpc(mpmath.mpf(y.re.numerator) / y.re.denominator, mpmath.mpf(y.im.numerator) / y.im.denominator)
        return mpmath.hyp2f1(-mpmath.mpf(power), s, s + 1, -size) / s


def families(y: PoleDistance):
    served = ["overhang", "ellipse", "disc", "small disc", "contour"] if y.is_real else ["ellipse", "disc", "contour"]
    return (["radau"] if y.real > -1 else []) + served


@pytest.mark.parametrize("text", EXPONENTS)
@pytest.mark.parametrize("size", [1, 2, 4])
def test_every_family_integrates_a_power_of_the_nearest_singularity(text, size):
    y = PoleDistance(Exact(text))
    exact = exact_value(y.exact, size, A)
    for family in families(y):
        if family == "overhang" and y.real < -3:
            continue  # its moments grow too fast there; the planner knows
        # the deeper, the more a rule amplifies round-off: the error must stay within what the planner counts on
        bound = 10.0 ** (amplification(y, family) + 0.8) * 2e-15
        nodes = {"radau": 40, "overhang": 60, "ellipse": 80, "disc": 150, "small disc": 260, "contour": 90}[family]
        rule = build(family, y, size, nodes)
        value = (rule.weights * (1.0 + size * rule.nodes) ** A).sum()
        error = float(abs(mpmath.mpmathify(complex(value)) - exact))
        assert error < bound * max(1.0, float(abs(exact)), rule.amplification * 0.05), (family, error)


@pytest.mark.parametrize("family", ["radau", "overhang", "ellipse", "disc", "contour"])
def test_convergence_is_geometric_at_the_predicted_rate(family):
    y, size = PoleDistance(Exact("-0.4")), 2
    exact = complex(exact_value(y.exact, size, A))
    counts = {"radau": [5, 6, 7, 8], "contour": [10, 14, 18, 22]}.get(family, [6, 8, 10, 12, 14])
    errors = []
    for count in counts:
        rule = build(family, y, size, count)
        errors.append(abs(complex((rule.weights * (1.0 + size * rule.nodes) ** A).sum()) - exact))
    measured = math.log(errors[0] / max(errors[-1], 1e-16)) / (counts[-1] - counts[0])
    rule = build(family, y, size, 10)
    predicted = -math.log(max(group.ratio for group in rule.groups)) * (2.0 if family == "radau" else 1.0)
    if family == "contour":
        predicted *= 0.5  # its two parts share the nodes
    assert measured > 0.6 * predicted


@pytest.mark.parametrize("family", ["radau", "overhang", "ellipse", "disc", "contour"])
def test_null_functionals_vanish_on_smooth_functions(family):
    y = PoleDistance(Exact("-0.4"))
    rule = build(family, y, 1, 30)
    values = (1.0 + rule.nodes) ** A
    assert np.abs(rule.nulls @ values).max() < 1e-9


def test_weights_near_a_pole_carry_the_whole_distance():
    # Y = -1 + 1e-13 as an exact number: the residue part 1/(Y+1) must come out to full accuracy
    y = PoleDistance(Exact("-1") + Exact("1e-13"))
    rule = disc_rule(y, 1, 60)
    value = complex((rule.weights * (1.0 + rule.nodes) ** A).sum())
    exact = exact_value(y.exact, 1, A)
    assert float(abs(mpmath.mpmathify(value) - exact) / abs(exact)) < 1e-14


def test_conjugate_halves_give_the_real_part():
    y = PoleDistance(Exact("-1.5"))
    for rule in (disc_rule(y, 2, 40), chebyshev_rule(y, 2, 40, rho=2.0), contour_rule(y, 2, 40, 20, FRACTION)):
        half = rule.upper_half()
        full = (rule.weights * (1.0 + 2 * rule.nodes) ** A).sum()
        assert half.count < rule.count
        assert abs((half.weights * (1.0 + 2 * half.nodes) ** A).sum().real - full.real) < 1e-13 * rule.amplification


def test_radau_is_exact_to_its_degree():
    # in the bent variable; undo the bend by integrating the matching rational functions
    for text in ("0.7", "-0.6", "0.2+1j"):
        y = PoleDistance(Exact(text))
        rule = radau_rule(y, 1, 6)
        b = symmetric_bend(1)
        x = rule.nodes * (1 + b) / (1 + b * rule.nodes)
        stretch = 1 + b - b * x
        for degree in range(11):
            # F(t) with F dt-measure equal to x^degree x^(Y-1) dx
            f = x**degree * stretch ** (y.plus(1)) / (1 + b)
            assert abs((rule.weights * f).sum() - 1 / (y.value + degree)) < 1e-15 * rule.noise.sum()


def test_overhang_and_ellipse_refuse_to_be_mixed():
    y = PoleDistance(Exact("-1.5"))
    with pytest.raises(ValueError, match="either"):
        chebyshev_rule(y, 1, 10, reach=0.2, rho=2.0)
    with pytest.raises(ValueError, match="even"):
        chebyshev_rule(y, 1, 11, rho=2.0)


def test_ladders_start_cheap_and_end_with_the_contour():
    for text in ("0.5", "-0.5", "-2.5", "-2.5+1j"):
        steps = ladder(PoleDistance(Exact(text)))
        assert steps[-1] == "contour"
    assert ladder(PoleDistance(Exact("0.5")))[0] == "radau"


def test_a_faced_disc_keeps_its_accuracy():
    y = PoleDistance(Exact("-1.5"))
    choice = Choice((0, 0), y, 1, "disc", 40, 0, "test")
    exact = complex(exact_value(y.exact, 1, A))
    errors = []
    for faced in (False, True):
        rule = choice.rule(faced)
        errors.append(abs(complex((rule.weights * (1.0 + rule.nodes) ** A).sum()) - exact))
    assert choice.rule(True).count > choice.rule(False).count
    assert errors[1] < 10 * max(errors[0], 1e-14)


def test_chord_data_reports_poles():
    data = ChordData(4, np.array([-1.0, -0.5, -0.5]), (PoleDistance(Exact(-1)), PoleDistance(Exact("1/2"))))
    assert data.on_pole() == [((0, 0), 1)]
