"""The public disk call: requests, rules by name, zeros, determinism, explanation of a result."""

from __future__ import annotations

import json
from concurrent.futures import ThreadPoolExecutor

import mpmath
import pytest

import kn_integrate as kn

F = kn.parke_taylor(1, 2, 3, 4, 5)


def point(n=5, seed=3):
    return kn.Mandelstams.random(n, seed, low=0, high=1)


DEEP = kn.Mandelstams.from_planar(
    5, {(1, 2): "-13/10", (2, 3): "-12/5", (3, 4): "-1/2", (4, 5): "-31/10", (5, 1): "9/20"}
)


@pytest.mark.parametrize("rule", ["contour", "ellipse", "disc", "small disc"])
def test_rules_by_name_are_second_opinions(rule):
    chosen = kn.disk_integral(DEEP, F, method="quadrature", rtol=1e-8)
    named = kn.disk_integral(DEEP, F, method="quadrature", rule=rule, rtol=1e-8)
    exact = kn.disk_integral(DEEP, F, method="kz", digits=20)
    assert abs(chosen.value - named.value) <= chosen.error + named.error
    assert float(abs(named.value - exact.value)) <= named.error
    assert {chord["rule"] for chord in named.details["plan"][0]["chords"]} == {rule}


@pytest.mark.parametrize(
    ("options", "field"),
    [
        ({"rtol": 0}, "rtol"),
        ({"rtol": -1e-3}, "rtol"),
        ({"rtol": float("nan")}, "rtol"),
        ({"rtol": True}, "rtol"),
        ({"atol": -1}, "atol"),
        ({"digits": 0}, "digits"),
        ({"digits": 2.5}, "digits"),
        ({"method": "magic"}, "method"),
        ({"threads": 0}, "threads"),
        ({"max_points": 0}, "max_points"),
        ({"rule": "magic", "method": "quadrature"}, "rule"),
        ({"rule": "contour"}, "rule"),
        ({"ordering": (1, 2, 3, 4)}, "ordering"),
        ({"ordering": (1, 2, 3, 4, 4)}, "ordering"),
    ],
)
def test_bad_requests_name_their_field(options, field):
    with pytest.raises(kn.InputError) as caught:
        kn.disk_integral(point(), F, **options)
    assert caught.value.field == field


def test_things_that_are_no_integral():
    for kin, f in ((point(), None), (point(), 3), ("x", F), (point(6), F)):
        with pytest.raises(kn.InputError):
            kn.disk_integral(kin, f)
    with pytest.raises(kn.InputError):
        kn.disk_integral(kn.DiskExponents.from_pairs(4, {(1, 2): "-1/2", (2, 3): "-1/2"}), F)


def zero_point():
    """s_13 = s_14 = 0: the five-point integral with its own Parke-Taylor factor vanishes."""
    return kn.Mandelstams.from_pairs(
        5, {(1, 2): "1/3", (1, 3): 0, (1, 4): 0, (2, 3): "1/5", (2, 4): "1/7", (3, 4): "-71/105"}
    )


@pytest.mark.parametrize("method", ["quadrature", "kz", "auto"])
def test_an_exact_zero_is_known_absolutely_only(method):
    at = zero_point()
    result = kn.disk_integral(at, F, method=method)
    assert result.status is kn.Status.ZERO
    assert not result.ok
    assert 0 < result.error < 1e-10
    assert abs(result.value) <= result.error
    assert "atol" in result.status.advice
    assert kn.disk_integral(at, F, method=method, atol=1e-9).ok


@pytest.mark.parametrize("distance", ["1/1000", "1/1000000000"])
def test_near_zeros_keep_their_relative_accuracy_when_asked(distance):
    at = zero_point()
    planar = dict(at.planar())
    planar[2, 3] = planar[2, 3] + kn.Mandelstams.from_planar(4, {(1, 2): distance, (2, 3): 1}).pair(1, 2)
    near = kn.Mandelstams.from_planar(5, planar)
    result = kn.disk_integral(near, F, rtol=1e-9)
    exact = kn.disk_integral(near, F, digits=30)
    assert result.ok
    with mpmath.workdps(30):
        assert abs(result.value - exact.value) <= result.error


def test_the_same_bits_for_any_number_of_threads():
    kin = point(7)
    f = kn.parke_taylor(*range(1, 8))
    values = [kn.disk_integral(kin, f, method="quadrature", rtol=1e-9, threads=k) for k in (1, 2, 4)]
    assert len({(v.value, v.error) for v in values}) == 1
    with ThreadPoolExecutor(4) as pool:
        again = list(pool.map(lambda _: kn.disk_integral(kin, f, method="quadrature", rtol=1e-9).value, range(4)))
    assert set(again) == {values[0].value}


def test_a_result_explains_itself():
    result = kn.disk_integral(DEEP, F, method="quadrature", rtol=1e-8)
    document = json.loads(json.dumps(result.to_dict()))
    chords = document["details"]["plan"][0]["chords"]
    assert len(chords) == 5
    assert all(chord["reason"] and chord["rule"] and chord["Y"] for chord in chords)
    assert any(source.startswith("Z. Koba") for source in result.sources())
    assert result.input_sensitivity > 0


def test_work_is_predicted_and_refused_before_it_starts():
    kin = point(8)
    with pytest.raises(kn.WorkLimitError) as caught:
        kn.disk_integral(kin, kn.parke_taylor(*range(1, 9)), method="quadrature", max_points=1000)
    assert caught.value.predicted > 1000


def test_large_exponents_are_left_to_the_series():
    kin = kn.Mandelstams.from_planar(4, {(1, 2): "-955/3", (2, 3): "3194/10"})
    f = kn.parke_taylor(1, 2, 3, 4)
    with pytest.raises(kn.NotAvailableError):
        kn.disk_integral(kin, f, method="quadrature")
    explicit = kn.disk_integral(kin, f, method="kz")
    assert not explicit.ok
    automatic = kn.disk_integral(kin, f)
    assert automatic.ok
    with mpmath.workdps(60):
        exact = mpmath.beta(mpmath.mpf(-955) / 3, mpmath.mpf(3194) / 10)
        assert abs(automatic.value - exact) <= automatic.error


def test_digits_survive_pickling():
    import pickle

    result = kn.disk_integral(point(4), kn.parke_taylor(1, 2, 3, 4), digits=50)
    assert pickle.loads(pickle.dumps(result)).text == result.text


def test_a_text_a_spec_and_an_integrand_are_the_same():
    kin = point()
    values = {kn.disk_integral(kin, f).value for f in (F, "PT(1,2,3,4,5)", kn.DiskIntegral(5, F))}
    assert len(values) == 1
