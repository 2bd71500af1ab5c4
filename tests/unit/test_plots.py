"""Figures: what they show is right, they can be drawn to every format, and bad requests are refused."""

from __future__ import annotations

import math
import sys
from fractions import Fraction

import pytest
from scan_evaluate import beta

import kn_integrate as kn
from kn_integrate.plots import _style
from kn_integrate.plots.convergence import convergence_data, draw_convergence
from kn_integrate.plots.divisors import divisors

FOUR = kn.Mandelstams.from_planar(4, {(1, 2): "-5/2", (2, 3): "2/5"})


def four_points(tmp_path, count=13, name="a"):
    stop = kn.Mandelstams.from_planar(4, {(1, 2): "1/2", (2, 3): "2/5"})
    points = kn.ScanPoints.line(FOUR, stop, count)
    return kn.scan(points, "PT(1,2,3,4)", store=tmp_path / f"{name}.sqlite", progress=False, evaluate=beta)


def test_energy_line_shows_values_and_resonances(tmp_path):
    scan = four_points(tmp_path)
    shown = kn.energy_line(scan)
    assert shown.axis == "t"
    assert len(shown.x) == len(scan) - scan.counts["ON_POLE"]
    assert [(round(r.x, 12), r.channel, r.level) for r in shown.resonances] == [
        (round(1 / 6, 12), (1, 2), 2),
        (0.5, (1, 2), 1),
        (round(5 / 6, 12), (1, 2), 0),
    ]
    by_channel = kn.energy_line(scan, (1, 2), part="real")
    assert [r.x for r in by_channel.resonances] == pytest.approx([-2, -1, 0])
    values = [row.value for row in scan if row.value is not None]
    assert by_channel.y == tuple(values)
    assert shown.y == tuple(abs(value) for value in values)
    assert kn.energy_line(scan, channels=[(2, 3)]).resonances == ()


def test_no_line_is_drawn_through_a_pole(tmp_path):
    shown = kn.energy_line(four_points(tmp_path))
    xs, _ = shown._with_gaps()
    assert sum(math.isnan(x) for x in xs) == 3


def test_resonances_beside_the_line_tell_how_far(tmp_path):
    points = kn.ScanPoints.line(FOUR, FOUR.moved(FOUR, "-6/5"), 5).map(lambda kin: kn.plus_i_epsilon(kin, "1/100"))
    scan = kn.scan(points, "PT(1,2,3,4)", store=tmp_path / "a.sqlite", progress=False)
    resonances = kn.energy_line(scan, (1, 2)).resonances
    assert [r.distance for r in resonances if r.channel == (1, 2)] == pytest.approx([-0.01, -0.01, -0.01])
    assert not any(math.isnan(x) for x in kn.energy_line(scan, (1, 2))._with_gaps()[0])
    assert any(y != 0 for y in kn.energy_line(scan, part="phase").y)


def test_energy_line_refuses_what_it_cannot_show(tmp_path):
    scan = four_points(tmp_path)
    for arguments, field in (((scan, "x"), "axis"), ((scan, None, "size"), "part")):
        with pytest.raises(kn.InputError) as caught:
            kn.energy_line(*arguments)
        assert caught.value.field == field


def test_divisors_are_where_the_integrals_say_poles_are():
    f = kn.parse_integrand("PT(1,2,3,4,5) + 3*PT(1,3,2,4,5)")
    disk = kn.DiskIntegral(5, f)
    on_poles = kn.Mandelstams.from_planar(5, {(1, 2): -1, (2, 3): 1, (3, 4): 0, (4, 5): "1/2", (1, 5): "1/3"})
    found = {d.channel: -int(d.pole.re) for d in divisors(disk, on_poles) if d.pole.is_integer and d.pole.re <= 0}
    assert found == {tuple(sorted(channel)): level for channel, level, _ in disk.poles(on_poles)}
    assert found
    sphere = kn.SphereIntegral(5, f, "PT(1,2,4,3,5)")
    found = {d.channel: -int(d.pole.re) for d in divisors(sphere, on_poles) if d.pole.is_integer and d.pole.re <= 0}
    assert set(found) == {channel for channel, _, _ in sphere.poles(on_poles)}
    assert found


def test_pole_map_is_exact_and_agrees_with_the_integral():
    kin = kn.Mandelstams.from_planar(5, {(1, 2): 1, (2, 3): 1, (3, 4): 1, (4, 5): 1, (1, 5): 1})
    # channels of the other ordering are oblique in this plane
    spec = kn.DiskIntegral(5, "PT(1,3,2,4,5)", (1, 3, 2, 4, 5))
    shown = kn.pole_map(kin, spec, ((1, 2), -2, 1), ((4, 5), "-3/2", 1), ordering=(1, 2, 3, 4, 5))
    assert shown.lines
    for line in shown.lines:
        middle = [(a + b) / 2 for a, b in zip(line.start, line.stop, strict=True)]
        for x, y in (line.start, middle, line.stop):
            place = kn.Mandelstams.from_planar(5, {**kin.planar(), (1, 2): x, (4, 5): y})
            poles = {(tuple(sorted(channel)), level) for channel, level, _ in spec.poles(place)}
            assert (line.channel, line.level) in poles
            assert -2 <= x <= 1
            assert Fraction(-3, 2) <= y <= 1


def test_pole_map_region_is_where_all_exponents_are_positive():
    kin = kn.Mandelstams.from_planar(5, {(1, 2): 1, (2, 3): 1, (3, 4): 1, (4, 5): 1, (1, 5): 1})
    shown = kn.pole_map(kin, "PT(1,2,3,4,5)", ((1, 2), -1, 1), ((3, 4), -1, 2))
    assert set(shown.region) == {(0, 0), (1, 0), (1, 2), (0, 2)}
    nowhere = kn.Mandelstams.from_planar(5, {**kin.planar(), (2, 3): -1})
    shown = kn.pole_map(nowhere, "PT(1,2,3,4,5)", ((1, 2), -1, 1), ((3, 4), -1, 2))
    assert shown.region == ()
    assert shown.everywhere == (((2, 3), 1),)


def test_pole_map_on_the_sphere_has_all_channels():
    kin = kn.Mandelstams.from_planar(4, {(1, 2): 1, (2, 3): 1})
    shown = kn.pole_map(kin, kn.SphereIntegral(4, "PT(1,2,3,4)"), ((1, 2), -1, 1), ((2, 3), -1, 1))
    assert {line.channel for line in shown.lines} >= {(1, 2), (2, 3)}


@pytest.mark.parametrize(
    ("changes", "field"),
    [
        ({"x": ((1, 3), -1, 1)}, "x"),
        ({"y": ((1, 2), -1, 1)}, "y"),
        ({"x": ((1, 2), 1, 1)}, "x"),
        ({"kin": kn.plus_i_epsilon(FOUR)}, "kin"),
        ({"kin": 3}, "kin"),
    ],
)
def test_pole_map_refuses_what_it_cannot_show(changes, field):
    given = {"kin": FOUR, "spec": "PT(1,2,3,4)", "x": ((1, 2), -1, 1), "y": ((2, 3), -1, 1), **changes}
    with pytest.raises(kn.InputError) as caught:
        kn.pole_map(**given)
    assert caught.value.field == field


def estimate(**changes):
    given = {
        "value": -2.0,
        "error": 3e-10,
        "status": kn.Status.OK,
        "method": "quadrature",
        "details": {"truncation": 1e-10, "roundoff": 2e-10},
        **changes,
    }
    return kn.Estimate(**given)


def test_error_budget_is_relative_to_the_value():
    shown = kn.error_budget({"a": estimate(), "b": estimate(details={}, atol=1e-3)})
    assert shown.rows["a"] == {"truncation": 5e-11, "roundoff": 1e-10, "error": 1.5e-10, "tolerance": 1e-10}
    assert shown.rows["b"] == {"error": 1.5e-10, "tolerance": 5e-4}
    assert kn.error_budget(estimate(_sensitivity=lambda: 4e-16)).rows["result"]["input"] == 2e-16
    for bad in (0.0, math.nan):
        with pytest.raises(kn.InputError, match="a finite value other than zero"):
            kn.error_budget(estimate(value=bad))


SERIES = {"one": ([10, 100], [0.1, 1.0], [1e-3, 1e-9]), "two": ([20, 200], [0.2, 2.0], [1e-2, 0.0])}


def test_convergence_gives_its_data():
    rows = convergence_data(SERIES)
    assert rows[1] == {"name": "one", "evaluations": 100, "seconds": 1.0, "error": 1e-9}
    assert len(rows) == 4


@pytest.mark.parametrize("suffix", ["png", "pdf", "svg"])
def test_every_figure_is_drawn_to_every_format_and_the_same_each_time(tmp_path, suffix):
    pytest.importorskip("matplotlib")
    scan = four_points(tmp_path)
    figures = {
        "line": kn.energy_line(scan).draw,
        "phase": kn.energy_line(scan, part="phase").draw,
        "map": kn.pole_map(FOUR, "PT(1,2,3,4)", ((1, 2), -2, 1), ((2, 3), -1, 1)).draw,
        "budget": kn.error_budget({"a": estimate(), "b": estimate()}).draw,
        "convergence": lambda path: draw_convergence(SERIES, path),
        "seconds": lambda path: draw_convergence(SERIES, path, against="seconds"),
    }
    for name, draw in figures.items():
        first, again = (tmp_path / f"{name}{k}.{suffix}" for k in (1, 2))
        draw(first)
        draw(again)
        assert first.stat().st_size > 1000
        assert first.read_bytes() == again.read_bytes(), name
    for figure in (kn.energy_line(scan), kn.error_budget(estimate())):
        assert figure._repr_png_().startswith(b"\x89PNG")


def test_bad_targets_are_refused(tmp_path):
    pytest.importorskip("matplotlib")
    shown = kn.error_budget(estimate())
    for path in (tmp_path / "a.xyz", tmp_path / "no" / "a.png"):
        with pytest.raises(kn.InputError) as caught:
            shown.draw(path)
        assert caught.value.field == "figure"


def test_without_matplotlib_the_data_is_there_and_drawing_says_what_is_missing(monkeypatch):
    monkeypatch.setitem(sys.modules, "matplotlib", None)
    shown = kn.error_budget(estimate())
    assert shown.to_dict()
    with pytest.raises(kn.NotAvailableError, match="matplotlib"):
        shown.draw()


def test_colours_differ_for_the_colour_blind():
    # Simulation of full red-green blindness (F. Vienot, H. Brettel, J. Mollon, Color Res. Appl. 24 (1999) 243; the
    # matrices from memory, rows in linear RGB): any two line colours stay apart, or differ in dash and marker anyway.
    protan = ((0.11238, 0.88762, 0.0), (0.11238, 0.88762, 0.0), (0.00401, -0.00401, 1.0))
    deutan = ((0.29275, 0.70725, 0.0), (0.29275, 0.70725, 0.0), (-0.02234, 0.02234, 1.0))
    colours = [[(int(c[k : k + 2], 16) / 255) ** 2.2 for k in (1, 3, 5)] for c in _style.LINES]
    for matrix in (protan, deutan):
        seen = [[sum(m * c for m, c in zip(row, colour, strict=True)) for row in matrix] for colour in colours]
        for k, first in enumerate(seen):
            for second in seen[:k]:
                assert math.dist(first, second) > 0.05
    neighbours = [(_style.line_style(k), _style.line_style(k + 1)) for k in range(34)]
    assert all(a["linestyle"] != b["linestyle"] and a["color"] != b["color"] for a, b in neighbours)
