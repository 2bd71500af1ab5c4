"""Points, the store, resuming, rows and their export."""

from __future__ import annotations

import csv
import io
import json
import sqlite3
import sys
from fractions import Fraction

import mpmath
import numpy as np
import pytest
from scan_evaluate import beta

import kn_integrate as kn
from kn_integrate.scans.points import place_of
from kn_integrate.scans.task import integrate


def grid(*values: str) -> kn.ScanPoints:
    return kn.ScanPoints.grid(4, {(1, 2): values}, {(2, 3): "2/5"})


def run(store, points, spec="PT(1,2,3,4)", **options):
    return kn.scan(points, spec, store=store, progress=False, **{"evaluate": beta, **options})


# --- points ---------------------------------------------------------------------------------------------------------


def test_a_line_is_exact_and_has_both_ends():
    start = kn.Mandelstams.from_planar(5, {(1, 2): 1, (2, 3): 2, (3, 4): 3, (4, 5): 4, (1, 5): 5})
    stop = start.scaled(-2)
    points = kn.ScanPoints.line(start, stop, 4)
    assert [p.coordinates["t"] for p in points] == ["0", "1/3", "2/3", "1"]
    assert [p.place for p in points] == [start, start.scaled(0), start.scaled(-1), stop]


def test_a_line_between_different_places_is_refused():
    four = kn.Mandelstams.from_planar(4, {(1, 2): 1, (2, 3): 2})
    for stop in (four.as_closed(), kn.Mandelstams.random(5, 1)):
        with pytest.raises(kn.InputError, match="stop"):
            kn.ScanPoints.line(four, stop, 3)
    with pytest.raises(kn.InputError, match="count"):
        kn.ScanPoints.line(four, four.scaled(2), 1)


def test_a_grid_runs_through_all_combinations():
    axes = {(1, 2): kn.spaced("1/10", "2/10", 2), (2, 3, 4): ["1/2", 2]}
    fixed = {(2, 3): "1/3", (3, 4): "1/4", (4, 5): "1/5"}
    points = kn.ScanPoints.grid(5, axes, fixed)
    named = [tuple(p.coordinates.values()) for p in points]
    assert named == [("1/10", "1/2"), ("1/10", "2"), ("1/5", "1/2"), ("1/5", "2")]
    assert str(points[3].place.channel((1, 5))) == "2"


@pytest.mark.parametrize(
    ("axes", "fixed", "options", "field"),
    [
        ({}, {}, {}, "axes"),
        ({(1, 2): "1/2"}, {(2, 3): 1}, {}, "axis 1.2"),
        ({(1, 2): []}, {(2, 3): 1}, {}, "axis 1.2"),
        ({(1, 2): [1]}, {(1, 2): 1, (2, 3): 1}, {}, "axis 1.2"),
        ({(1, 2): [1]}, {}, {}, "channels"),
        ({(1, 2): [1]}, {(2, 3): 1}, {"kind": "squares"}, "kind"),
        ({(1, 2): [1]}, {(2, 3): 1}, {"kind": "pairs", "ordering": (1, 3, 2, 4)}, "ordering"),
    ],
)
def test_bad_grids_are_refused_by_name(axes, fixed, options, field):
    with pytest.raises(kn.InputError) as caught:
        kn.ScanPoints.grid(4, axes, fixed, **options)
    assert caught.value.field.startswith(field)


def test_a_random_sample_does_not_depend_on_its_length():
    short, long = kn.ScanPoints.random(5, 3, 7), kn.ScanPoints.random(5, 6, 7)
    assert short.points == long.points[:3]
    assert len({p.place for p in long}) == 6
    assert kn.ScanPoints.random(5, 1, 8)[0].place != short[0].place


def test_tables_from_csv_json_and_lists_agree(tmp_path):
    rows = [{"name": "a", "1.2": "0.1", "2.3": "2/5"}, {"name": "b", "1.2": "3/10", "2.3": "-1.25"}]
    comma, text = tmp_path / "points.csv", tmp_path / "points.json"
    comma.write_text("name,1.2,2.3\na,0.1,2/5\nb, 3/10, -1.25\n")
    text.write_text(json.dumps([{**row, "1.2": float(eval_fraction(row["1.2"]))} for row in rows[:1]] + rows[1:]))
    expected = kn.ScanPoints.table(rows, 4)
    assert [str(p.place.pair(1, 2)) for p in expected] == ["1/10", "3/10"]
    assert kn.ScanPoints.table(comma, 4) == expected
    assert [p.place for p in kn.ScanPoints.table(text, 4)] == [p.place for p in expected]
    assert [p.coordinates["name"] for p in kn.ScanPoints.table(text, 4)] == ["a", "b"]


def eval_fraction(text: str) -> float:
    return {"0.1": 0.1}[text]


@pytest.mark.parametrize(
    ("name", "content", "message"),
    [
        ("a.csv", "1.2,2.3\n1/10\n", "row 1: found another number of values"),
        ("a.csv", "1.2,2.3\n1/10,1,2\n", "row 1: found another number of values"),
        ("a.csv", "1.2,2.3\n1/10,x\n", "row 1: X_2.3"),
        ("a.csv", "1.2,1.2\n1/10,1\n", "a column given twice"),
        ("a.csv", "1.2,1.3\n1/10,1\n", "row 1: "),
        ("a.csv", "1.2,2.3\n", "points: found none"),
        ("a.json", "{", "invalid JSON"),
        ("a.json", "{}", "a list of objects"),
        ("a.json", "[3]", "row 1"),
        ("missing.csv", None, "No such file"),
    ],
)
def test_bad_tables_are_refused_by_file_and_row(tmp_path, name, content, message):
    path = tmp_path / name
    if content is not None:
        path.write_text(content)
    with pytest.raises(kn.InputError) as caught:
        kn.ScanPoints.table(path, 4)
    assert message in str(caught.value)


def test_places_come_back_from_their_plain_data():
    exponents = kn.DiskExponents.from_pairs(4, {(1, 2): "-1/2", (2, 3): "-1/3"})
    tachyons = kn.Mandelstams.from_planar(4, {(1, 2): "1/2+2j", (1, 4): 1}, row_sums=-2, string="open")
    given = {(1, 2): "-1/3", (2, 3): "-1/4"}
    sphere = kn.SphereExponents.from_pairs(4, given, left={(1, 2): -1, (3, 4): -1}, right={(1, 3): -1, (2, 4): -1})
    for place in (exponents, tachyons, sphere):
        data = json.loads(json.dumps(kn.ScanPoint({}, place).kinematics))
        assert place_of(data) == place


# --- the store ------------------------------------------------------------------------------------------------------


def test_a_scan_leaves_rows_with_all_digits(tmp_path):
    scan = run(tmp_path / "a.sqlite", grid("1/10", "0", "1/3"))
    assert [row.status for row in scan] == ["OK", "ON_POLE", "OK"]
    assert scan.counts == {"OK": 2, "ON_POLE": 1}
    assert scan.complete
    assert scan.ok
    row = scan.rows[2]
    exact = beta({}, row.place, {})
    assert (row.value, row.error) == (exact.value, exact.error)
    assert row.coordinates == {"1.2": "1/3"}
    assert row.versions["kn_integrate"] == kn.__version__
    pole = scan.rows[1]
    assert pole.value is None
    assert pole.error is None
    assert "channel 1.2 at level 0" in pole.note


def test_the_schema_is_what_the_documentation_says(tmp_path):
    import kn_integrate.scans.store as store

    run(tmp_path / "a.sqlite", grid("1/10"))
    connection = sqlite3.connect(tmp_path / "a.sqlite")
    for table in ("about", "versions", "points", "results"):
        columns = [row[1] for row in connection.execute(f"PRAGMA table_info({table})")]
        documented = store.__doc__.split(f"    {table}(")[1].split(")\n")[0]
        for column in columns:
            assert column in documented
    (text,) = connection.execute("SELECT value FROM about WHERE name = 'task'").fetchone()
    assert json.loads(text)["integral"]["kind"] == "disk"
    connection.close()


def test_more_points_are_added_and_old_ones_kept(tmp_path):
    store = tmp_path / "a.sqlite"
    first = run(store, grid("1/10", "1/5"))
    second = run(
        store, grid("3/10", "1/10", "0.2"), evaluate=lambda *a: pytest.fail("again") if is_old(a) else beta(*a)
    )
    assert second.rows[:2] == first.rows
    assert [row.coordinates["1.2"] for row in second] == ["1/10", "1/5", "3/10"]
    assert run(store, grid("1/5"), evaluate=lambda *a: pytest.fail("again")).rows == second.rows


def is_old(arguments) -> bool:
    return str(arguments[1].pair(1, 2)) in ("1/10", "1/5")


def test_a_point_asked_for_twice_is_computed_once(tmp_path):
    calls = []
    scan = run(tmp_path / "a.sqlite", grid("1/10", "0.1", "1/10"), evaluate=lambda *a: calls.append(1) or beta(*a))
    assert len(calls) == 1
    assert len(scan) == scan.total == 1


def test_another_integral_or_accuracy_is_refused(tmp_path):
    store = tmp_path / "a.sqlite"
    run(store, grid("1/10"), rtol=1e-8)
    with pytest.raises(kn.InputError, match=r"another scan \(rtol: 1e-08 there, 1e-09 asked for\)"):
        run(store, grid("1/10"), rtol=1e-9)
    with pytest.raises(kn.InputError, match=r"another scan \(f: .* ordering: "):
        run(store, grid("1/10"), kn.DiskIntegral(4, "PT(1,3,2,4)", (1, 3, 2, 4)), rtol=1e-8)
    assert len(kn.open_scan(store)) == 1


def test_a_first_try_without_results_binds_nobody(tmp_path):
    store = tmp_path / "a.sqlite"
    with pytest.raises(kn.InputError, match="rtol"):
        run(store, grid("1/10", "1/5"), rtol=-1.0, evaluate=integrate)
    assert len(kn.open_scan(store)) == 0
    scan = run(store, grid("1/10"), rtol=1e-8)
    assert (len(scan), scan.total) == (1, 1)


def test_the_same_number_is_the_same_option(tmp_path):
    store = tmp_path / "a.sqlite"
    run(store, grid("1/10"), rtol=2.0**-30, max_points=1000)
    run(store, grid("1/10"), rtol=np.float64(2.0**-30), max_points=1e3)
    run(store, grid("1/10"), rtol=Fraction(1, 2**30), max_points=np.int64(1000))


def test_a_scan_inside_a_scan_on_one_store_is_refused(tmp_path):
    store = tmp_path / "a.sqlite"

    def evaluate(*arguments):
        with pytest.raises(kn.InputError, match="one writer at a time"):
            run(store, grid("1/10"))
        return beta(*arguments)

    assert run(store, grid("1/10", "1/5"), evaluate=evaluate).complete


def test_files_that_are_no_store_are_refused_and_left_alone(tmp_path):
    text, database = tmp_path / "text", tmp_path / "database"
    text.write_text("not a database, and long enough to be told from an empty file\n" * 20)
    connection = sqlite3.connect(database)
    connection.execute("CREATE TABLE mine(a)")
    connection.commit()
    connection.close()
    for path in (text, database):
        kept = path.read_bytes()
        with pytest.raises(kn.InputError, match="store"):
            run(path, grid("1/10"))
        with pytest.raises(kn.InputError, match="store"):
            kn.open_scan(path)
        assert path.read_bytes() == kept
    with pytest.raises(kn.InputError, match="no such file"):
        kn.open_scan(tmp_path / "missing")
    with pytest.raises(kn.InputError, match="cannot be written"):
        run(tmp_path / "no" / "folder.sqlite", grid("1/10"))


def test_a_newer_schema_is_refused(tmp_path):
    store = tmp_path / "a.sqlite"
    run(store, grid("1/10"))
    connection = sqlite3.connect(store)
    connection.execute("PRAGMA user_version = 2")
    connection.close()
    with pytest.raises(kn.InputError, match="schema version 2"):
        run(store, grid("1/10"))


def test_bad_input_is_found_before_anything_is_computed(tmp_path):
    store = tmp_path / "a.sqlite"
    cases = [
        ({"spec": 3}, "spec"),
        ({"spec": "PT(1,2,3)"}, "f at 1.2 = 1/10"),
        ({"workers": 0}, "workers"),
        ({"progress": "loud"}, "progress"),
        ({"points": []}, "points"),
        ({"points": 3}, "points"),
        ({"points": [3]}, "points, entry 1"),
        ({"points": [kn.Mandelstams.random(4, 1), kn.Mandelstams.random(5, 1)]}, "points, entry 2"),
        ({"points": [kn.DiskExponents.from_pairs(4, {(1, 2): "-1/2", (2, 3): "-1/3"})]}, "spec"),
    ]
    for changes, field in cases:
        given = {"points": grid("1/10"), "spec": "PT(1,2,3,4)", "progress": False, **changes}
        with pytest.raises(kn.InputError) as caught:
            kn.scan(store=store, evaluate=beta, **given)
        assert caught.value.field.startswith(field)
        assert not store.exists()


def test_a_failure_that_nobody_foresaw_keeps_what_is_finished(tmp_path):
    def breaks(integral, place, options):
        if str(place.pair(1, 2)) == "1/3":
            raise ZeroDivisionError("a slip")
        return beta(integral, place, options)

    store = tmp_path / "a.sqlite"
    with pytest.raises(ZeroDivisionError):
        run(store, grid("1/10", "1/5", "1/3", "1/2"), evaluate=breaks)
    assert len(kn.open_scan(store)) == 2
    assert run(store, grid("1/10", "1/5", "1/3", "1/2")).complete


def test_numbers_without_a_bound_and_no_numbers(tmp_path):
    answers = iter(
        [
            kn.Estimate(1.5, float("inf"), kn.Status.NOT_FINITE, "kz"),
            kn.Estimate(float("nan"), float("nan"), kn.Status.NOT_FINITE, "kz"),
            kn.Estimate(complex(1.0, float("nan")), 1.0, kn.Status.NOT_FINITE, "kz"),
        ]
    )
    scan = run(tmp_path / "a.sqlite", grid("1/10", "1/5", "1/3"), evaluate=lambda *a: next(answers))
    assert [(row.value, row.error) for row in scan] == [(1.5, float("inf")), (None, None), (None, None)]
    assert "1.5 ± inf" in scan._repr_html_()
    assert r"$1.5 \pm \infty$ \textsf{(NOT\_FINITE)}" in kn.latex_table(scan)
    assert json.loads(scan.to_json())["rows"][0]["error"] is None
    assert json.dumps(kn.energy_line(scan).to_dict(), allow_nan=False)
    assert not scan.ok


# --- real integrals -------------------------------------------------------------------------------------------------


def test_work_limits_are_rows(tmp_path):
    points = [kn.Mandelstams.random(6, k, low="1/10") for k in range(2)]
    scan = run(
        tmp_path / "a.sqlite",
        points,
        "PT(1,2,3,4,5,6)",
        method="quadrature",
        max_points=5,
        evaluate=integrate,
    )
    assert scan.counts == {"WORK_LIMIT": 2}
    assert "limit" in scan.rows[0].note
    assert not scan.ok


def test_exponents_can_be_scanned(tmp_path):
    places = [kn.DiskExponents.from_pairs(4, {(1, 2): f"-{k}/4", (2, 3): "-1/2"}) for k in (1, 2, 3)]
    scan = run(tmp_path / "a.sqlite", places, None, evaluate=integrate)
    assert scan.integral is None
    assert scan.rows[1].value == pytest.approx(float(mpmath.beta(0.5, 0.5)), rel=1e-12)
    assert [row.coordinates for row in scan] == [{"point": "1"}, {"point": "2"}, {"point": "3"}]


def test_complex_values_keep_both_parts(tmp_path):
    points = grid("-1/2", "1/2").map(kn.plus_i_epsilon)
    scan = run(tmp_path / "a.sqlite", points, evaluate=integrate)
    row = scan.rows[0]
    direct = kn.disk_integral(row.place, kn.parke_taylor(1, 2, 3, 4))
    assert row.value == direct.value
    assert isinstance(row.value, complex)


def test_many_digits_come_back_whole(tmp_path):
    from kn_integrate import Estimate, Status

    context = mpmath.MPContext()
    context.dps = 60
    numbers = [mpmath.mp.make_mpf((context.mpf(k) / 2**k / 3)._mpf_) for k in range(1, 200)]
    results = iter(numbers)

    scan = run(
        tmp_path / "a.sqlite",
        grid(*(f"{k}/300" for k in range(1, 200))),
        digits=50,
        evaluate=lambda *a: Estimate(next(results), 1e-55, Status.OK, "kz", digits=50),
    )
    assert [row.value._mpf_ for row in scan] == [number._mpf_ for number in numbers]
    assert scan.rows[0].digits == 50


# --- export ---------------------------------------------------------------------------------------------------------


def test_exports_agree(tmp_path):
    scan = run(tmp_path / "a.sqlite", grid("1/10", "0", "1/3"))
    rows = list(csv.DictReader(io.StringIO(scan.to_csv(tmp_path / "a.csv"))))
    assert (tmp_path / "a.csv").read_text() == scan.to_csv()
    document = json.loads(scan.to_json(tmp_path / "a.json"))
    for row, line, item in zip(scan, rows, document["rows"], strict=True):
        assert line["1.2"] == item["coordinates"]["1.2"] == row.coordinates["1.2"]
        assert line["real"] == (item["value"] or "") == (row.real or "")
        assert line["status"] == item["status"] == row.status
    assert document["task"]["integral"]["ordering"] == [1, 2, 3, 4]
    with pytest.raises(kn.InputError, match="can be written"):
        scan.to_csv(tmp_path / "no" / "a.csv")


def test_notebook_and_latex_faces(tmp_path):
    scan = run(tmp_path / "<a>.sqlite", grid("1/10", "0", "1/3"))
    html = scan._repr_html_()
    assert "&lt;a&gt;.sqlite: 3 of 3 points (2 OK, 1 ON_POLE)" in html
    assert html.count("<tr>") == 4
    lines = kn.latex_table(scan).splitlines()
    assert lines[2] == r"$X_{1.2}$ & value \\"
    assert lines[5] == r"$0$ & \textsf{ON\_POLE} \\"
    assert lines[6].startswith("$1/3$ & $")
    many = run(tmp_path / "b.sqlite", grid(*(f"{k}/100" for k in range(1, 31))))
    assert "and 10 more" in many._repr_html_()


def test_pandas_frame(tmp_path, monkeypatch):
    scan = run(tmp_path / "a.sqlite", grid("1/10", "1/3"))
    pytest.importorskip("pandas")
    frame = scan.to_pandas()
    assert list(frame["1.2"]) == ["1/10", "1/3"]
    assert list(frame["value"]) == [row.value for row in scan]
    monkeypatch.setitem(sys.modules, "pandas", None)
    with pytest.raises(kn.NotAvailableError, match="pandas"):
        scan.to_pandas()
