"""The cross-check: verdicts, a corrupted engine is caught and named, budget, reports, command."""

from __future__ import annotations

import json
import subprocess
import sys
from dataclasses import replace

import pytest

import kn_integrate as kn
from kn_integrate.checks.routes import Route, disk_routes

F5 = kn.parke_taylor(1, 2, 3, 4, 5)


def point(n, low=0):
    return kn.Mandelstams.random(n, 3, low=low, high=1, denominator=997)


@pytest.mark.parametrize(("n", "low"), [(4, 0), (5, 0), (5, -1), (6, 0)])
def test_sound_engines_are_consistent(n, low):
    found = kn.cross_check(point(n, low), kn.parke_taylor(*range(1, n + 1)), rtol=1e-10)
    assert found.verdict == "consistent"
    assert found.suspect is None
    assert sum(row.value is not None for row in found.rows) >= 5
    assert {"quadrature", "series"} <= {row.family for row in found.rows}
    assert "not proof" in str(found)


def test_closed_forms_and_exponents_are_routes():
    exponents = kn.DiskExponents.from_pairs(4, {(1, 2): "-2/3", (2, 3): "-4/5"})
    found = kn.cross_check(exponents)
    assert found.verdict == "consistent"
    assert any(row.family == "closed form" for row in found.rows)


def corrupted(routes, name, factor):
    """The same routes with one answer multiplied by a factor."""
    found = []
    for route in routes:
        if route.name == name:

            def wrong(route=route):
                value, error = route.run()
                return value * factor, error

            route = replace(route, run=wrong)
        found.append(route)
    return found


@pytest.mark.parametrize("name", ["quadrature", "series (KZ)", "monodromy by series"])
@pytest.mark.parametrize("factor", [1 + 1e-6, 1.5, -1])
def test_a_corrupted_route_is_caught_and_named(name, factor):
    kin = point(5)
    routes = corrupted(disk_routes(kin, F5, None, 1e-10, 1), name, factor)
    found = kn.cross_check(kin, F5, routes=routes)
    assert found.verdict == "disagreement"
    assert found.suspect == name
    (row,) = [row for row in found.rows if row.route == name]
    others = sum(row.value is not None for row in found.rows) - 1
    assert len(row.disagrees_with) == others
    assert f"disagrees with {others}" in str(found)
    assert "disagreement" in found.html()


def test_a_corrupted_engine_is_caught(monkeypatch):
    # the engine itself, not a route: everything that rests on it goes wrong, and closed forms and quadrature say so
    import kn_integrate.kz.integral as engine

    sound = engine.f_vector
    monkeypatch.setattr(engine, "f_vector", lambda *a, **k: sound(*a, **k) * (1 + 1e-7))
    found = kn.cross_check(point(5), F5, rtol=1e-10)
    assert found.verdict == "disagreement"
    assert all("quadrature" in row.disagrees_with for row in found.rows if row.route == "series (KZ)")


def test_one_family_alone_is_too_few():
    route = Route("only", "quadrature", "nothing", lambda: (1.0, 1e-9))
    assert kn.cross_check(None, routes=[route]).verdict == "too few routes"
    assert kn.cross_check(None, routes=[route, route]).verdict == "too few routes"

    def nan():
        return float("nan"), 1e-9

    def refuses():
        raise kn.NotAvailableError("no such thing")

    found = kn.cross_check(None, routes=[replace(route, run=nan), replace(route, run=refuses)])
    assert found.verdict == "too few routes"
    assert [row.note for row in found.rows] == ["no finite value", "no such thing"]
    assert found.value is None


def test_the_budget_stops_further_routes():
    found = kn.cross_check(point(6), kn.parke_taylor(*range(1, 7)), budget="1e-9")
    assert [row.value is not None for row in found.rows[:2]] == [True, True]
    assert all("budget" in row.note for row in found.rows[2:])
    with pytest.raises(kn.InputError):
        kn.cross_check(point(5), F5, budget=0)


def test_sphere():
    found = kn.cross_check(point(4), kn.parke_taylor(1, 2, 3, 4), kn.parke_taylor(1, 2, 4, 3), rtol=1e-9)
    assert found.verdict == "consistent"
    assert {"klt", "direct"} <= {row.family for row in found.rows}


def test_poles_are_reported_by_the_engines():
    kin = kn.Mandelstams.from_planar(4, {(1, 2): -1, (2, 3): "1/3"})
    found = kn.cross_check(kin, kn.parke_taylor(1, 2, 3, 4))
    assert all("pole" in row.note for row in found.rows[:2])
    assert found.verdict != "consistent"


def test_reports_are_plain_and_self_contained(tmp_path):
    found = kn.cross_check(point(4), kn.parke_taylor(1, 2, 3, 4))
    document = json.loads(json.dumps(found.to_dict(), allow_nan=False))
    assert document["verdict"] == "consistent"
    html = found.html()
    assert html.startswith("<!DOCTYPE html>")
    assert "http" not in html
    assert "not proof" in html


def test_command(tmp_path):
    command = [sys.executable, "-m", "kn_integrate.cli", "check", "--planar", "1.2=3/10,2.3=2/5"]
    report = tmp_path / "report.html"
    good = subprocess.run(
        [*command, "--integrand", "PT(1,2,3,4)", "--html", str(report), "--format", "json"],
        capture_output=True,
        text=True,
        check=False,
    )
    assert good.returncode == 0, good.stderr
    assert json.loads(good.stdout)["verdict"] == "consistent"
    assert report.stat().st_size > 500
    bad = subprocess.run([*command, "--integrand", "PT(1,2,3)"], capture_output=True, text=True, check=False)
    assert bad.returncode == 2
    assert "Traceback" not in bad.stderr
