"""Batches: the bits of single calls, whatever the points are, and rows for those without a number."""

from __future__ import annotations

import itertools
import math
from fractions import Fraction

import numpy as np
import pytest

import kn_integrate as kn
from kn_integrate.channels import planar_channels
from kn_integrate.kernels.exact_sums import affine


def random_points(n, count, low, high, seed, **options):
    rng = np.random.default_rng(seed)
    order = options.get("ordering") or tuple(range(1, n + 1))
    return kn.PlanarPoints(n, rng.uniform(low, high, (count, len(planar_channels(tuple(order))))), **options)


def assert_same_bits(batch, points, f, **options):
    for k, row in enumerate(batch):
        single = kn.disk_integral(points[k], f, **options)
        assert row == {
            "value": single.value,
            "error": single.error,
            "status": single.status.name,
            "method": single.method,
            "evaluations": single.evaluations,
        }, k


@pytest.mark.parametrize("method", ["auto", "quadrature"])
@pytest.mark.parametrize(
    ("n", "count", "low", "high"),
    [(4, 40, -0.8, 3), (5, 60, 0.05, 2), (5, 40, -1.5, 1), (6, 12, 0.1, 1), (7, 2, 0.3, 1)],
)
def test_bits_of_single_calls(n, count, low, high, method):
    points = random_points(n, count, low, high, 11)
    f = kn.parke_taylor(*range(1, n + 1))
    batch = kn.disk_batch(points, f, method=method, rtol=1e-11)
    assert_same_bits(batch, points, f, method=method, rtol=1e-11)
    again = kn.disk_batch(list(points), f, method=method, rtol=1e-11)  # exact points in place of an array
    assert again.value.tobytes() == batch.value.tobytes()
    assert again.error.tobytes() == batch.error.tobytes()


def test_sums_orderings_tachyons_and_double_poles():
    f = kn.parke_taylor(1, 2, 3, 4, 5) - 3 * kn.parke_taylor(1, 3, 2, 4, 5)
    points = random_points(5, 30, 0.3, 1.5, 3)
    assert_same_bits(kn.disk_batch(points, f), points, f)
    order = (2, 4, 1, 3, 5)
    assert_same_bits(kn.disk_batch(points, f, ordering=order), points, f, ordering=order)
    tachyons = random_points(4, 20, 0.2, 2, 4, row_sums=-2)
    assert_same_bits(kn.disk_batch(tachyons, "1"), tachyons, "1")
    g = "z12^-2*z34^-2"
    four = random_points(4, 20, 1.2, 2.5, 5)
    assert_same_bits(kn.disk_batch(four, g), four, g)


def test_most_points_take_the_compiled_way():
    points = random_points(5, 200, 0.1, 1.5, 8)
    batch = kn.disk_batch(points, "PT(1,2,3,4,5)", rtol=1e-12)
    assert batch.ok.all()
    assert set(batch.method) == {"quadrature"}
    assert batch.evaluations.mean() < 500


def test_closed_form():
    points = random_points(4, 300, -0.8, 4, 21)
    batch = kn.disk_batch(points, "PT(1,2,3,4)", rtol=1e-12)
    assert batch.ok.mean() > 0.95
    for (s, t), value, error in zip(points.values.tolist(), batch.value.tolist(), batch.error.tolist(), strict=True):
        truth = math.gamma(s) * math.gamma(t) / math.gamma(s + t)
        assert abs(value - truth) <= error + 1e-13 * abs(truth)


@pytest.mark.parametrize("threads", [2, 3])
def test_threads_do_not_change_bits(threads):
    points = random_points(5, 400, 0.0, 1.5, 2)
    one, more = (kn.disk_batch(points, "PT(1,2,3,4,5)", threads=t) for t in (1, threads))
    assert one.value.tobytes() == more.value.tobytes()
    assert one.error.tobytes() == more.error.tobytes()


def test_points_without_a_number_are_rows():
    points = kn.PlanarPoints(5, np.array([[0.5] * 5, [0.0, 0.5, 0.5, 0.5, 0.5], [0.25] * 5]))
    batch = kn.disk_batch(points, "PT(1,2,3,4,5)")
    assert batch.status.tolist() == ["OK", "ON_POLE", "OK"]
    assert math.isnan(batch.value[1])
    assert batch.error[1] == math.inf
    assert not batch.ok[1]
    assert [k for k, _ in batch.notes] == [1]
    assert "1.2" in batch.notes[0][1]
    limited = kn.disk_batch(points, "PT(1,2,3,4,5)", max_points=10, method="quadrature")
    assert limited.status.tolist() == ["WORK_LIMIT", "ON_POLE", "WORK_LIMIT"]
    assert "2 OK" in str(batch)
    assert batch.to_dict()["value"][1] is None


def test_complex_points_among_real_ones():
    real = kn.Mandelstams.from_planar(4, {(1, 2): "1/3", (2, 3): "1/2"})
    other = kn.Mandelstams.from_planar(4, {(1, 2): "1/3+1/5j", (2, 3): "1/2"})
    batch = kn.disk_batch([real, other], "PT(1,2,3,4)")
    assert batch.value.dtype == complex
    assert batch.ok.all()
    assert batch.value[0] == kn.disk_integral(real, "PT(1,2,3,4)").value


def test_exponents_that_are_no_doubles():
    """Exact thirds, given as exponents: rounded once, as in single calls."""
    third = Fraction(1, 3)
    exponents = []
    for k in range(10):
        s, t = third + Fraction(k, 7), third + Fraction(k, 11)
        table = {(1, 2): s - 1, (3, 4): s - 1, (2, 3): t - 1, (1, 4): t - 1, (1, 3): -s - t, (2, 4): -s - t}
        exponents.append(kn.DiskExponents.from_pairs(4, table))
    assert_same_bits(kn.disk_batch(exponents), exponents, None)


def test_an_integrand_that_is_not_covariant():
    points = random_points(4, 6, 0.3, 1, 7, row_sums=-2)
    with pytest.raises(kn.InputError, match="covariance"):
        kn.disk_batch(points, "PT(1,2,3,4)")


def test_bad_input():
    with pytest.raises(kn.InputError, match="values"):
        kn.PlanarPoints(5, np.zeros((3, 4)))
    with pytest.raises(kn.InputError, match="values, row 1"):
        kn.PlanarPoints(4, np.array([[0.5, 0.5], [0.5, math.nan]]))
    with pytest.raises(kn.InputError, match="values"):
        kn.PlanarPoints(4, [["a", "b"]])
    with pytest.raises(kn.InputError, match="channel"):
        kn.PlanarPoints(5, np.zeros((1, 5)), channels=[(1, 2), (2, 3), (3, 4), (4, 5), (1, 3)])
    with pytest.raises(kn.InputError, match="f:"):
        kn.disk_batch(kn.PlanarPoints(4, np.full((1, 2), 0.5)), lambda kin: kn.parke_taylor(1, 2, 3, 4))
    good = kn.Mandelstams.from_planar(4, {(1, 2): "1/3", (2, 3): "1/2"})
    with pytest.raises(kn.InputError, match="points, entry 2"):
        kn.disk_batch([good, "nonsense"], "PT(1,2,3,4)")


def test_empty():
    assert len(kn.disk_batch([], "PT(1,2,3,4)")) == 0
    assert len(kn.disk_batch(kn.PlanarPoints(4, np.zeros((0, 2))), "PT(1,2,3,4)")) == 0


def test_sums_are_correctly_rounded():
    rng = np.random.default_rng(5)
    values = rng.uniform(-1, 1, (400, 5)) * 10.0 ** rng.integers(-18, 3, (400, 5))
    values[::7] = np.round(values[::7] * 4) / 4
    coefficients = rng.integers(-2, 3, (6, 5))
    constants = np.array([0.0, 1.0, -2.0, 0.5, -1.0, 3.0])
    out = np.empty((400, 6))
    affine(values, coefficients, constants, out)
    for p, m in itertools.product(range(400), range(6)):
        exact = Fraction(constants[m]) + sum(
            int(c) * Fraction(x) for c, x in zip(coefficients[m], values[p], strict=True)
        )
        assert out[p, m] == float(exact)


def test_a_scan_takes_pieces_and_stores_what_single_points_give(tmp_path):
    import kn_integrate.scans.run as run
    from kn_integrate.scans.task import evaluate_point, make_task

    a = kn.Mandelstams.from_planar(5, dict.fromkeys([(1, 2), (2, 3), (3, 4), (4, 5), (1, 5)], "1/7"))
    b = kn.Mandelstams.from_planar(5, dict.fromkeys([(1, 2), (2, 3), (3, 4), (4, 5), (1, 5)], "-9/7"))
    points = kn.ScanPoints.line(a, b, 80)
    whole = kn.scan(points, "PT(1,2,3,4,5)", store=tmp_path / "a.sqlite", progress=False)
    task = make_task(points.points, "PT(1,2,3,4,5)", {})
    assert run.takes_pieces(task, run.integrate)
    spent = []
    for row, point in zip(whole, points, strict=True):
        alone = evaluate_point(task, point.kinematics)
        assert (row.status, row.method, row.evaluations) == (alone.status, alone.method, alone.evaluations)
        assert (row.value is None) == (alone.real is None)
        if alone.real is not None:
            assert row.value == float(alone.real)
            assert row.error == float(alone.error)
        spent.append(row.evaluations)
    assert min(spent) < 500 < 3000 < max(spent)  # both ways were taken
