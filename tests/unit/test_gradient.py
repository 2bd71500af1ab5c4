"""Gradients of disk integrals: formulas, known derivatives, differences, errors of input."""

from __future__ import annotations

import json
import math
import pickle
from fractions import Fraction

import mpmath
import numpy as np
import pytest

import kn_integrate as kn
from kn_integrate.channels import planar_channels
from kn_integrate.disk.plan import ellipse_rho
from kn_integrate.disk.rules import PoleDistance, chebyshev_rule, contour_rule, disc_rule, radau_rule
from kn_integrate.disk.rules.logs import log_rule
from kn_integrate.disk.sectors import runs_of
from kn_integrate.disk.slopes import incidence
from kn_integrate.dispatch import integral as dispatch
from kn_integrate.dispatch.family import disk_family, moved
from kn_integrate.dispatch.shifts import chords_of, pair_shift
from kn_integrate.exact import ONE, Exact

EPSILON = 2.0**-52


def big(number: Exact):
    re, im = (mpmath.mpf(part.numerator) / part.denominator for part in (number.re, number.im))
    return mpmath.mpc(re, im) if number.im else re


# --- the functional with log t --------------------------------------------------------------------------------------

POWER, SIZE = -0.63, 2


def log_insertion(y: Exact):
    """f.p. int_0^1 t^(Y-1) log t (1 + SIZE t)^POWER dt, the derivative of 2F1(-POWER, Y; Y+1; -SIZE)/Y."""
    with mpmath.workdps(50):
        e = mpmath.mpf(POWER)
        h = mpmath.mpf(10) ** -15

        def value(z):
            return mpmath.hyp2f1(-e, z, z + 1, -SIZE) / z

        return (value(big(y) + h) - value(big(y) - h)) / (2 * h)


RULES = {
    "radau": lambda y: radau_rule(y, SIZE, 12),
    "overhang": lambda y: chebyshev_rule(y, SIZE, 26, reach=0.25),
    "ellipse": lambda y: chebyshev_rule(y, SIZE, 56, rho=ellipse_rho(SIZE)),
    "disc": lambda y: disc_rule(y, SIZE, 72),
    "small disc": lambda y: disc_rule(y, SIZE, 130, wide=False),
    "contour": lambda y: contour_rule(y, SIZE, 50, 26, 0.4),
}
EXPONENTS = ("0.3", "1.7", "-0.4", "-0.8", "1/1000", "-1.5", "-2.7", "0.3+2j", "-0.4+0.7j", "-2.3+0.4j", "6.3")


SERVED = [
    (family, text)
    for family in RULES
    for text in EXPONENTS
    if not (family == "radau" and not Exact(text).re > -1) and not (family == "overhang" and not Exact(text).is_real)
]


@pytest.mark.parametrize(("family", "text"), SERVED)
def test_rules_differentiate_to_the_insertion_of_a_logarithm(family, text):
    y = PoleDistance(Exact(text))
    found = log_rule(RULES[family](y), y, SIZE)
    nodes, weights = found.rule.nodes, found.rule.weights
    values = (1 + SIZE * nodes) ** POWER
    derivatives = SIZE * POWER * (1 + SIZE * nodes) ** (POWER - 1)
    total = (found.slopes * values).sum() + (weights * found.moves * nodes * derivatives).sum()
    truth = complex(log_insertion(y.exact))
    roundoff = EPSILON * ((8 + found.noise / np.abs(found.slopes)) * np.abs(found.slopes * values)).sum()
    assert abs(total - truth) <= roundoff + 2e-12 * abs(truth)
    assert roundoff < 1e-7 * abs(truth)  # or the line above would say nothing


@pytest.mark.parametrize("family", ["ellipse", "disc", "contour"])
def test_upper_half_has_the_real_part(family):
    y = PoleDistance(Exact("-1.3"))
    found = log_rule(RULES[family](y), y, SIZE)
    half = found.upper_half()
    full = (found.slopes * (1 + found.rule.nodes) ** 0.3).sum()
    assert len(half.slopes) < len(found.slopes)
    assert abs((half.slopes * (1 + half.rule.nodes) ** 0.3).sum().real - full) < 1e-12 * abs(full)


def test_exponents_of_runs_change_as_the_pairs_do():
    for n in (4, 5, 6, 7):
        runs = runs_of(n - 2)
        place = {pair: k for k, pair in enumerate(kn.channels.pair_order(n))}
        for c, chord in enumerate(chords_of(n)):
            shift = pair_shift(n, {chord: ONE})
            assert [int(shift[place[a + 1, b + 2]]) for a, b in runs] == incidence(n)[:, c].tolist()


# --- known derivatives ----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("a", "b"), [("1/2", "1/3"), ("-0.3", "2.2"), ("-2.6", "-1.3"), ("0.2+3j", "-1.1-0.5j"), ("1e-6", "0.4")]
)
@pytest.mark.parametrize("rtol", [1e-4, 1e-11])
def test_beta_function_differentiates_to_digammas(a, b, rtol):
    kin = kn.Mandelstams.from_planar(4, {(1, 2): a, (2, 3): b})
    found = kn.disk_gradient(kin, "PT(1,2,3,4)", rtol=rtol)
    with mpmath.workdps(40):
        x, y = big(Exact(a)), big(Exact(b))
        value = mpmath.beta(x, y)
        truth = {(1, 2): value * (mpmath.digamma(x) - mpmath.digamma(x + y))}
        truth[2, 3] = value * (mpmath.digamma(y) - mpmath.digamma(x + y))
        assert found.ok
        assert found.channels == ((1, 2), (2, 3))
        for channel, derivative, error in found:
            assert abs(mpmath.mpmathify(derivative) - truth[channel]) <= error
        assert max(found.errors) <= rtol * max(map(abs, found.derivatives))
        assert abs(mpmath.mpmathify(found.value.value) - value) <= found.value.error


def along(found: kn.Gradient, direction: dict[tuple[int, ...], int]):
    """The derivative along a direction, and its error."""
    parts = [(speed, *found.derivative(*channel)) for channel, speed in direction.items()]
    return sum(s * v for s, v, _ in parts), sum(abs(s) * e for s, _, e in parts)


@pytest.mark.parametrize("n", [5, 6])
@pytest.mark.parametrize("gamma", ["0.23", "-0.11", "0.2+0.3j"])
def test_derivative_along_the_parameters_of_the_selberg_integral(n, gamma):
    from kn_integrate.closed_forms import Selberg

    count, alpha, beta = n - 3, Exact("0.7"), Exact("-0.37")
    form = Selberg(count, alpha, beta, Exact(gamma))
    names = {(i, j): str(form.pairs().at(i, j)) for i, j in kn.channels.pair_order(n)}
    found = kn.disk_gradient(kn.DiskExponents.from_pairs(n, names), rtol=1e-10)
    assert found.ok
    # alpha: every cluster at 0, {1..k+1}, has k points; gamma: k points that meet have k(k-1)/2 pairs of 2 gamma
    to_alpha = {tuple(range(1, k + 2)): k for k in range(1, count + 1)}
    to_gamma = {tuple(range(i, i + k)): k * (k - 1) for k in range(2, n - 1) for i in range(1, n - k + 1)}
    to_gamma = {c: (len(c) - (1 in c) - (n - 1 in c)) * (len(c) - (1 in c) - (n - 1 in c) - 1) for c in to_gamma}
    with mpmath.workdps(50):
        h = mpmath.mpf(10) ** -13
        step = Fraction(1, 10**13)
        for direction, changed in (
            (to_alpha, lambda s: Selberg(count, alpha + s, beta, Exact(gamma))),
            (to_gamma, lambda s: Selberg(count, alpha, beta, Exact(gamma) + s)),
        ):
            truth = (changed(step).value(45) - changed(-step).value(45)) / (2 * h)
            value, error = along(found, direction)
            assert abs(mpmath.mpmathify(value) - truth) <= error
            assert error <= 1e-8 * max(map(abs, found.derivatives))


def test_products_of_betas_factorise():
    # z_24 has exponent 0: Z = B(X_12, X_23) B(X_123, X_34), four independent channels of five
    kin = kn.Mandelstams.from_planar(5, {(1, 2): "0.4", (2, 3): "0.3", (3, 4): "0.8", (4, 5): "0.6", (1, 5): "1.1"})
    assert kin.pair(2, 4) == 0
    found = kn.disk_gradient(kin, "PT(1,2,3,4,5)", rtol=1e-11)
    b1, b2 = mpmath.beta(0.4, 0.3), mpmath.beta(0.6, 0.8)
    for channel, x, y, other in (((1, 2), 0.4, 0.3, b2), ((4, 5), 0.6, 0.8, b1)):
        truth = other * mpmath.beta(x, y) * (mpmath.digamma(x) - mpmath.digamma(x + y))
        value, error = found.derivative(*channel)
        assert abs(value - float(truth)) <= error + 1e-13 * abs(value)


# --- the other engine, other orderings, sums ------------------------------------------------------------------------


def differences(kin, f, ordering, digits=30):
    """Derivatives in the planar channels by central differences in multiple precision."""
    order = tuple(ordering) if ordering else tuple(range(1, kin.n + 1))
    family = disk_family(kin, f, ordering)
    step = Fraction(1, 10**9)
    found = {}
    for channel in planar_channels(order):
        chord = family.chord(channel)
        ends = [
            kn.disk_integral(
                moved(kin, order, {chord: Exact(h)}), f, ordering=ordering, digits=digits, method="kz"
            ).value
            for h in (step, -step)
        ]
        with mpmath.workdps(digits + 5):
            found[channel] = (ends[0] - ends[1]) / 2 * step.denominator
    return found


SIX = ["0.3", "-0.4", "0.9", "0.7", "1.2", "-1.3", "0.5", "0.8", "0.35"]
CASES = {
    "convergent": (5, dict.fromkeys(range(5), "0.6"), "PT(1,2,3,4,5)", None, {}),
    "ordering": (5, dict(enumerate(["0.3", "-0.4", "0.9", "0.7", "0.2"])), "PT(1,3,2,4,5)", (2, 4, 1, 5, 3), {}),
    "other integrand": (5, dict(enumerate(["0.3", "1.4", "0.9", "0.7", "1.2"])), "PT(1,4,2,3,5)", None, {}),
    "deep": (5, dict(enumerate(["-2.3", "0.4", "-1.6", "-0.7", "0.2"])), "PT(1,2,3,4,5)", None, {}),
    "complex": (5, dict(enumerate(["0.3+1j", "-1.4+0.2j", "0.9", "0.7j", "0.2"])), "PT(1,2,3,4,5)", None, {}),
    "tachyons": (4, {0: "-0.4", 1: "0.3"}, "1", None, {"row_sums": -2}),
    "sum": (5, dict(enumerate(["0.3", "0.4", "0.9", "0.7", "0.2"])), "PT(1,2,3,4,5) - 2*PT(1,3,2,4,5)", None, {}),
    "six": (
        6,
        dict(enumerate(["0.3", "-0.4", "0.9", "0.7", "1.2", "-1.3", "0.5", "0.8", "0.35"])),
        "PT(1,2,3,4,5,6)",
        None,
        {},
    ),
}


@pytest.mark.parametrize("name", CASES)
def test_gradient_is_the_difference_quotient_of_the_other_engine(name):
    n, numbers, f, ordering, options = CASES[name]
    order = ordering or tuple(range(1, n + 1))
    planar = {channel: numbers[k] for k, channel in enumerate(planar_channels(order))}
    kin = kn.Mandelstams.from_planar(n, planar, ordering=ordering, **options)
    found = kn.disk_gradient(kin, f, ordering, rtol=1e-9)
    assert found.ok, str(found)
    truth = differences(kin, f, ordering)
    largest = max(map(abs, found.derivatives))
    for channel, expected in truth.items():
        derivative, error = found.derivative(*channel)
        assert abs(complex(derivative) - complex(expected)) <= error + 1e-15 * largest
        assert error <= 1e-9 * largest
    assert {isinstance(d, complex) for d in found.derivatives} == {name == "complex"}


def test_terms_that_cancel_are_done_more_accurately():
    # the integrand is a total derivative up to a small rest: large terms, small sum
    kin = kn.Mandelstams.from_planar(4, {(1, 2): "0.5", (2, 3): "0.7"})
    f = "1000*PT(1,2,3,4) + 1000*PT(1,3,2,4) + 1000*PT(1,2,4,3) + PT(1,2,3,4)"  # PT(..) add up to zero
    found = kn.disk_gradient(kin, f, rtol=1e-10)
    plain = kn.disk_gradient(kin, "PT(1,2,3,4)", rtol=1e-12)
    assert found.ok
    for (_, one, error), (_, other, other_error) in zip(found, plain, strict=True):
        assert abs(one - other) <= error + other_error


@pytest.mark.parametrize("n", [6, 7])
def test_any_number_of_threads_gives_the_same_bits(n):
    numbers = [Fraction(3 + 5 * k % 11, 7) for k in range(n * (n - 3) // 2)]
    planar = dict(zip(planar_channels(tuple(range(1, n + 1))), numbers, strict=True))
    planar[1, 2] = Fraction(-8, 5)  # complex nodes too
    kin = kn.Mandelstams.from_planar(n, planar)
    f = kn.parke_taylor(*range(1, n + 1))
    one, three = (kn.disk_gradient(kin, f, rtol=1e-6, threads=threads) for threads in (1, 3))
    assert one.derivatives == three.derivatives
    assert one.errors == three.errors
    assert one.evaluations == three.evaluations


def test_reflection_exchanges_channels():
    planar = {(1, 2): "0.3", (2, 3): "-0.4", (3, 4): "0.9", (4, 5): "0.7", (1, 5): "0.2"}
    kin = kn.Mandelstams.from_planar(5, planar)
    found = kn.disk_gradient(kin, "PT(1,2,3,4,5)")
    back = kn.disk_gradient(kin, "PT(5,4,3,2,1)", ordering=(5, 4, 3, 2, 1))
    for channel, derivative, error in found:
        other, other_error = back.derivative(*channel)
        assert abs(derivative - other) <= error + other_error


# --- the request ----------------------------------------------------------------------------------------------------

KIN = kn.Mandelstams.from_planar(5, {(1, 2): "0.3", (2, 3): "0.4", (3, 4): "0.9", (4, 5): "0.7", (1, 5): "0.2"})
PT = kn.parke_taylor(1, 2, 3, 4, 5)


def test_evaluations_grow_with_the_digits_and_two_cost_less_than_differences():
    two, eight, eleven = (kn.disk_gradient(KIN, PT, rtol=rtol) for rtol in (1e-2, 1e-8, 1e-11))
    assert two.evaluations < eight.evaluations < eleven.evaluations
    value = kn.disk_integral(KIN, PT, rtol=1e-8, method="quadrature")
    assert eight.evaluations < 5 * value.evaluations  # ten values by central differences
    assert max(eleven.errors) < 1e-2 * max(eight.errors)


def test_what_double_precision_cannot_give_is_not_ok():
    found = kn.disk_gradient(KIN, PT, rtol=1e-16)
    assert not found.ok
    assert found.status is kn.Status.ROUND_OFF
    assert str(found).endswith(kn.Status.ROUND_OFF.advice)
    exact = kn.disk_gradient(KIN, PT, rtol=1e-11)
    for (_, one, error), (_, other, other_error) in zip(found, exact, strict=True):
        assert abs(one - other) <= error + other_error


def test_atol_is_enough():
    kin = kn.Mandelstams.from_planar(4, {(1, 2): "30", (2, 3): "28"})
    loose = kn.disk_gradient(kin, "PT(1,2,3,4)", rtol=1e-16, atol=1e-20)
    assert loose.ok
    assert max(loose.errors) <= 1e-20


def test_limit_of_work():
    with pytest.raises(kn.WorkLimitError):
        kn.disk_gradient(KIN, PT, max_points=100)
    enough = kn.disk_gradient(KIN, PT)
    limited = kn.disk_gradient(KIN, PT, max_points=enough.evaluations)
    assert limited.evaluations <= enough.evaluations


def test_input_errors_name_the_argument():
    with pytest.raises(kn.InputError, match="function of kinematics") as caught:
        kn.disk_gradient(KIN, lambda kin: PT)
    assert caught.value.field == "f"
    assert "product rule" in caught.value.expected
    for options, field in (
        ({"rtol": 0}, "rtol"),
        ({"rtol": 2}, "rtol"),
        ({"atol": -1}, "atol"),
        ({"threads": 0}, "threads"),
        ({"max_points": 0}, "max_points"),
        ({"ordering": (1, 2, 3, 4)}, "ordering"),
    ):
        with pytest.raises(kn.InputError) as caught:
            kn.disk_gradient(KIN, PT, **options)
        assert caught.value.field == field
    with pytest.raises(kn.InputError):
        kn.disk_gradient(KIN)
    with pytest.raises(kn.InputError):
        kn.disk_gradient(KIN, "PT(1,2,3,4)")


def test_poles():
    kin = kn.Mandelstams.from_planar(4, {(1, 2): -2, (2, 3): "0.3"})
    with pytest.raises(kn.PoleError) as caught:
        kn.disk_gradient(kin, "PT(1,2,3,4)")
    assert caught.value.channel == (1, 2)
    assert caught.value.level == 2
    kin = kn.Mandelstams.from_planar(4, {(1, 2): 0, (2, 3): "0.3"})
    with pytest.raises(kn.NotAvailableError, match=r"channels 1\.2"):
        kn.disk_gradient(kin, "PT(1,2,3,4) + PT(2,1,3,4)")
    with pytest.raises(kn.PoleError):
        kn.disk_gradient(kin, "PT(1,2,3,4) + 2*PT(2,1,3,4)")


def test_next_to_a_pole_double_poles_are_seen():
    tiny = Fraction(1, 10**9)
    kin = kn.Mandelstams.from_planar(5, {(1, 2): tiny, (2, 3): "0.4", (3, 4): "0.9", (4, 5): "0.7", (1, 5): "0.2"})
    found = kn.disk_gradient(kin, PT)
    assert found.ok
    value, error = found.derivative(1, 2)
    residue = kn.residue(kin, PT, channel=(1, 2)).value
    assert abs(value * float(tiny) ** 2 + residue) < 1e-7 * residue
    assert error < 1e-8 * abs(value)


def test_channels_by_complements_and_unknown_ones():
    found = kn.disk_gradient(KIN, PT)
    assert len(found) == 5
    assert found.n == 5
    assert found.derivative(3, 4, 5) == found.derivative(1, 2)
    with pytest.raises(kn.InputError, match=r"1\.3"):
        found.derivative(1, 3)


def test_shown_and_stored():
    kin = kn.Mandelstams.from_planar(4, {(1, 2): "0.3+0.1j", (2, 3): "0.4"})
    found = kn.disk_gradient(kin, "PT(1,2,3,4)")
    data = json.loads(json.dumps(found.to_dict(), allow_nan=False))
    assert [row["channel"] for row in data["derivatives"]] == [[1, 2], [2, 3]]
    assert complex(*map(float, data["derivatives"][0]["value"])) == found.derivatives[0]
    assert data["ok"] is True
    assert "d/dX_1.2  (" in str(found)
    assert found._repr_html_().count("<tr>") == 4
    assert pickle.loads(pickle.dumps(found)) == found
    with pytest.raises(AttributeError):
        found.status = kn.Status.ZERO
    with pytest.raises(TypeError):
        found.details["terms"] = 2


def test_nothing_has_no_slope():
    found = kn.disk_gradient(KIN, PT - PT)
    assert found.ok
    assert set(found.derivatives) == {0.0}


# --- sensitivity to the input ---------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", CASES)
def test_sensitivity_agrees_with_central_differences_to_two_digits(name, monkeypatch):
    n, numbers, f, ordering, options = CASES[name]
    order = ordering or tuple(range(1, n + 1))
    planar = {channel: numbers[k] for k, channel in enumerate(planar_channels(order))}
    kin = kn.Mandelstams.from_planar(n, planar, ordering=ordering, **options)
    evaluated, differentiated = [], []
    evaluate = dispatch.evaluate

    def counted(*arguments):
        result = evaluate(*arguments)
        evaluated.append(result.evaluations)
        return result

    from kn_integrate.disk import gradient

    differentiate = gradient.differentiate_terms

    def counted_gradient(*arguments, **options):
        result = differentiate(*arguments, **options)
        differentiated.append(result.points)
        return result

    monkeypatch.setattr(dispatch, "evaluate", counted)
    monkeypatch.setattr(gradient, "differentiate_terms", counted_gradient)
    result = kn.disk_integral(kin, f, ordering=ordering)
    evaluated.clear()
    by_gradient = result.input_sensitivity
    assert evaluated == []
    assert len(differentiated) == 1
    monkeypatch.setattr(dispatch, "_by_gradient", lambda point, terms: None)
    by_differences = kn.disk_integral(kin, f, ordering=ordering).input_sensitivity
    del evaluated[0]
    assert len(evaluated) == n * (n - 3)
    assert by_gradient == pytest.approx(by_differences, rel=1e-2)
    assert sum(differentiated) < 0.5 * sum(evaluated)


def test_sensitivity_falls_back_on_differences_and_is_unknown_on_poles():
    kin = kn.Mandelstams.from_planar(4, {(1, 2): "0.3", (2, 3): "0.4"})
    constant = kn.disk_integral(kin, "PT(1,2,3,4)").input_sensitivity
    varying = kn.disk_integral(kin, lambda kin: kn.parse_integrand("PT(1,2,3,4)")).input_sensitivity
    assert varying == pytest.approx(constant, rel=1e-2)
    pole = kn.Mandelstams.from_planar(4, {(1, 2): 0, (2, 3): "0.3"})
    assert math.isnan(kn.disk_integral(pole, "PT(1,2,3,4) + PT(2,1,3,4)").input_sensitivity)


# --- the command line -----------------------------------------------------------------------------------------------

DISK = ["disk", "--planar", "1.2=3/10,2.3=2/5", "--integrand", "PT(1,2,3,4)"]


def command(*words):
    from click.testing import CliRunner

    from kn_integrate.cli import main

    result = CliRunner().invoke(main, list(words))
    return result.exit_code, result.stdout, result.stderr


def test_command_prints_channels_and_derivatives():
    code, out, _ = command(*DISK, "--gradient")
    assert code == 0
    rows = dict(line.split(maxsplit=1) for line in out.splitlines())
    kin = kn.Mandelstams.from_planar(4, {(1, 2): "3/10", (2, 3): "2/5"})
    found = kn.disk_gradient(kin, "PT(1,2,3,4)")
    assert rows["d/dX_1.2"].split(" +- ")[0] == repr(found.derivatives[0])
    assert rows["d/dX_2.3"].split(" +- ")[0] == repr(found.derivatives[1])
    assert float(rows["d/dX_2.3"].split(" +- ")[1]) >= found.errors[1]
    assert rows["value"] == repr(found.value.value)


def test_command_writes_json_and_reads_a_job_file(tmp_path):
    job = tmp_path / "job.toml"
    job.write_text(
        'version = 1\nverb = "disk"\n[kinematics]\nplanar = { "1.2" = "3/10", "2.3" = "2/5" }\n'
        '[integrand]\nf = "PT(1,2,3,4)"\n[disk]\ngradient = true\n[accuracy]\nrtol = 1e-11\n'
    )
    code, out, _ = command("disk", str(job), "--format", "json")
    data = json.loads(out)
    assert code == 0
    assert data["ok"] is True
    assert data["gradient"]["rtol"] == "1e-11"
    assert [row["channel"] for row in data["gradient"]["derivatives"]] == [[1, 2], [2, 3]]
    assert "gradient" not in json.loads(command(*DISK, "--format", "json")[1])
    job.write_text(job.read_text().replace("true", '"yes"'))
    code, _, err = command("disk", str(job))
    assert code == 2
    assert "true or false" in err


def test_command_fails_where_the_gradient_does():
    code, out, _ = command(*DISK, "--gradient", "--rtol", "1e-16")
    assert code == 1
    assert "ROUND_OFF" in out
    code, out, _ = command("disk", "--planar", "1.2=0,2.3=2/5", "--integrand", "PT(1,2,3,4)", "--gradient")
    assert code == 1
    assert "ON_POLE" in out
    for words in (["--digits", "20"], ["--method", "kz"]):
        code, _, err = command(*DISK, "--gradient", *words)
        assert code == 2
        assert words[0] in err
        assert "--gradient" in err
    assert command(*DISK, "--gradient", "--method", "quadrature")[0] == 0
