"""The verbs scan, plot and info on job files and flags."""

from __future__ import annotations

import json
from types import SimpleNamespace

import pytest
from click.testing import CliRunner

import kn_integrate as kn
from kn_integrate.cli import main

FOUR = ["--integrand", "PT(1,2,3,4)", "--progress", "none"]
JOB = """
version = 1
verb = "scan"
[kinematics]
planar = { "2.3" = "2/5", "3.4" = 0.5, "4.5" = "7/20", "1.5" = "9/20" }
[integrand]
f = "PT(1,2,3,4,5)"
[scan]
grid = { "1.2" = "0:1/2:3", "2.3" = ["1/3", 0.25] }
store = "FOLDER/a.sqlite"
[accuracy]
rtol = 1e-9
"""


def run(*args):
    result = CliRunner().invoke(main, [str(arg) for arg in args])
    assert result.exception is None or isinstance(result.exception, SystemExit), result.exc_info
    return SimpleNamespace(code=result.exit_code, out=result.stdout, err=result.stderr)


def rows(text: str) -> dict[str, str]:
    return dict(line.split(maxsplit=1) for line in text.splitlines() if len(line.split(maxsplit=1)) == 2)


@pytest.fixture
def job(tmp_path):
    path = tmp_path / "job.toml"
    path.write_text(JOB.replace("FOLDER", str(tmp_path)))
    return path


def test_a_job_file_runs_and_goes_on(job, tmp_path):
    done = run("scan", job, "--progress", "none", "--csv", tmp_path / "a.csv", "--json", tmp_path / "a.json")
    assert done.code == 0, done
    shown = rows(done.out)
    assert shown["points"] == "6 of 6"
    assert "status ON_POLE" in done.out  # 1.2 = 0, twice
    scan = kn.open_scan(tmp_path / "a.sqlite")
    assert scan.counts == {"OK": 4, "ON_POLE": 2}
    assert scan.task["options"] == {"rtol": "1e-09"}
    assert list(scan.rows[0].coordinates) == ["1.2", "2.3"]
    assert (tmp_path / "a.csv").read_text() == scan.to_csv()
    assert json.loads((tmp_path / "a.json").read_text())["total"] == 6
    again = json.loads(run("scan", job, "--progress", "none", "--format", "json").out)
    assert (again["points"], again["finished"], again["ok"]) == (6, 6, True)
    assert again["hash"] == scan.rows[0].job
    assert kn.open_scan(tmp_path / "a.sqlite").rows == scan.rows  # nothing was computed again


def test_a_line_with_i_epsilon_a_sample_and_a_table(tmp_path):
    line = ["--planar", "1.2=-3/2,2.3=1/3", "--to", "1.2=1/2", "--count", 5, "--epsilon", "1/100"]
    assert run("scan", *line, *FOUR, "--store", tmp_path / "line.sqlite").code == 0
    scan = kn.open_scan(tmp_path / "line.sqlite")
    assert [row.coordinates["t"] for row in scan] == ["0", "1/4", "1/2", "3/4", "1"]
    assert str(scan.rows[1].place.pair(1, 2)) == "-1-1/100j"
    sample = ["--n", 4, "--seed", 3, "--count", 2, "--low", "1/10", "--high", 2]
    assert run("scan", *sample, *FOUR, "--store", tmp_path / "sample.sqlite").code == 0
    assert [row.place for row in kn.open_scan(tmp_path / "sample.sqlite")] == [
        point.place for point in kn.ScanPoints.random(4, 2, 3, "1/10", 2)
    ]
    (tmp_path / "points.csv").write_text("name,1.2,2.3\nfirst,1/3,1/2\n")
    table = ["--table", tmp_path / "points.csv"]
    assert run("scan", *table, *FOUR, "--store", tmp_path / "table.sqlite").code == 0
    assert kn.open_scan(tmp_path / "table.sqlite").rows[0].coordinates["name"] == "first"


def test_points_that_are_not_accurate_enough_are_exit_code_1(tmp_path):
    given = ["--planar", "2.3=2/5", "--grid", "1.2=1/3:1/2:2", "--rtol", "1e-30", "--method", "quadrature"]
    done = run("scan", *given, *FOUR, "--store", tmp_path / "a.sqlite")
    assert done.code == 1
    assert "status ROUND_OFF" in done.out


KIN = ["--planar", "1.2=1/3,2.3=2/5"]


@pytest.mark.parametrize(
    ("args", "flag"),
    [
        ([*KIN], "--store"),
        ([*KIN, "--store", "S"], "points"),
        ([*KIN, "--store", "S", "--to", "1.2=1"], "--count"),
        ([*KIN, "--store", "S", "--to", "1.2=1", "--count", "1"], "count"),
        ([*KIN, "--store", "S", "--to", "1.2=1", "--grid", "1.2=0:1:3"], "--grid"),
        ([*KIN, "--store", "S", "--grid", "1.2=0:1:3", "--count", "3"], "--count"),
        ([*KIN, "--store", "S", "--grid", "1.2=0:1"], "--grid 1.2"),
        ([*KIN, "--store", "S", "--grid", "1.2=0:1:x"], "--grid 1.2"),
        ([*KIN, "--store", "S", "--grid", "1.2"], "--grid"),
        ([*KIN, "--store", "S", "--seed", "1", "--count", "2"], "--planar"),
        (["--store", "S", "--seed", "1"], "--count"),
        (["--store", "S", "--seed", "-1", "--count", "2"], "--seed"),
        ([*KIN, "--store", "S", "--grid", "1.2=0:1:3", "--low", "1"], "--low"),
        ([*KIN, "--store", "S", "--table", "absent.csv"], "absent.csv"),
        ([*KIN, "--store", "S", "--grid", "1.2=1/3:1:3", "--right", "PT(1,2,4,3)"], "--right"),
        ([*KIN, "--store", "S", "--grid", "1.2=1/3:1:3", "--on", "sphere", "--ordering", "1,2,3,4"], "--ordering"),
        ([*KIN, "--store", "S", "--grid", "1.2=1/3:1:3", "--workers", "0"], "--workers"),
        ([*KIN, "--store", "S", "--grid", "1.2=1/3:1:3", "--epsilon", "-1"], "epsilon"),
    ],
)
def test_bad_scans_are_one_line_and_exit_code_2(args, flag, tmp_path):
    given = [str(tmp_path / "a.sqlite") if arg == "S" else arg for arg in args]
    done = run("scan", *given, *FOUR)
    assert (done.code, done.out) == (2, ""), done
    assert done.err.count("\n") == 1
    assert done.err.startswith(f"{flag}: found "), done.err
    assert not (tmp_path / "a.sqlite").exists()


def test_unknown_keys_in_a_job_come_with_a_suggestion(job):
    job.write_text(job.read_text().replace("grid =", "gird ="))
    done = run("scan", job)
    assert done.code == 2
    assert "scan.gird" in done.err
    assert "did you mean grid?" in done.err


def test_info_tells_points_cost_and_what_is_there(job, tmp_path):
    before = rows(run("info", job).out)
    assert before["points"] == "6"
    assert before["coordinates"] == "1.2,2.3"
    assert "MB" in before["memory"]
    assert not (tmp_path / "a.sqlite").exists()  # nothing was run
    run("scan", job, "--progress", "none")
    text = run("info", job).out
    assert "finished in the store" in text
    assert text.split("finished in the store")[1].split()[0] == "6"


@pytest.mark.parametrize(
    ("verb", "tables"),
    [
        ("disk", ""),
        ("sphere", "[accuracy]\nrtol = 1e-8\n"),
        ("residue", '[residue]\nchannel = "1.2"\n'),
        ("converge", "[converge]\nseconds = 2\n"),
        ("expand", "[expansion]\nweight = 4\n"),
        ("plot", '[plot]\nkind = "error-budget"\nout = "a.png"\n'),
    ],
)
def test_info_explains_a_job_of_every_verb(tmp_path, verb, tables):
    path = tmp_path / "job.toml"
    start = 'version = 1\nverb = "VERB"\n[kinematics]\nplanar = { "1.2" = "1/3", "2.3" = "2/5" }\n'
    path.write_text(start.replace("VERB", verb) + '[integrand]\nf = "PT(1,2,3,4)"\n' + tables)
    done = run("info", path)
    assert done.code == 0, done
    assert rows(done.out)["verb"] == verb
    if verb == "sphere":
        assert "direct seconds" in done.out
    if verb == "disk":
        assert "quadrature seconds" in done.out
        assert "series seconds" in done.out
        assert "auto: quadrature first" in done.out


def test_info_of_a_store(tmp_path):
    store = tmp_path / "a.sqlite"
    run("scan", "--planar", "2.3=2/5", "--grid", "1.2=0:1/2:3", *FOUR, "--store", store)
    shown = rows(run("info", store).out)
    assert (shown["points"], shown["finished"], shown["status.ON_POLE"]) == ("3", "3", "1")


def test_plots_from_the_command_line(tmp_path):
    pytest.importorskip("matplotlib")
    store = tmp_path / "a.sqlite"
    run("scan", "--planar", "2.3=2/5", "--grid", "1.2=-3/2:1/2:9", *FOUR, "--store", store)
    line = run("plot", "--kind", "energy-line", "--store", store, "--axis", "1.2", "--out", tmp_path / "a.png")
    assert line.code == 0, line
    assert (tmp_path / "a.png").read_bytes().startswith(b"\x89PNG")
    point = [*KIN, "--integrand", "PT(1,2,3,4)"]
    window = ["--window", "1.2=-2:1:2,2.3=-2:1:2"]
    poles = run("plot", "--kind", "pole-map", *point, *window, "--data", tmp_path / "a.json", "--format", "json")
    assert poles.code == 0, poles
    assert json.loads((tmp_path / "a.json").read_text()) == json.loads(poles.out)["shows"]
    assert len(json.loads(poles.out)["shows"]["lines"]) == 6
    budget = run("plot", "--kind", "error-budget", *point, "--out", tmp_path / "a.svg")
    assert budget.code == 0, budget
    assert "<svg" in (tmp_path / "a.svg").read_text()


@pytest.mark.parametrize(
    ("args", "flag"),
    [
        ([], "--kind"),
        (["--kind", "pie"], "--kind"),
        (["--kind", "energy-line"], "--out"),
        (["--kind", "energy-line", "--out", "a.png"], "--store"),
        (["--kind", "energy-line", "--out", "a.xyz"], "figure"),
        (["--kind", "energy-line", "--out", "a.png", "--store", "absent"], "store absent"),
        (["--kind", "energy-line", "--out", "a.png", "--planar", "1.2=1"], "--planar"),
        (["--kind", "pole-map", "--out", "a.png", *KIN, "--integrand", "PT(1,2,3,4)"], "--window"),
        (["--kind", "error-budget", "--out", "a.png"], "kinematics"),
    ],
)
def test_bad_plots_are_one_line_and_exit_code_2(args, flag):
    done = run("plot", *args)
    assert (done.code, done.out) == (2, "")
    assert done.err.startswith(f"{flag}: found "), done.err
    assert done.err.count("\n") == 1


def test_sphere_integrals_are_scanned_too(tmp_path):
    given = ["--on", "sphere", "--planar", "2.3=1/3", "--grid", "1.2=-1/3:1/2:3"]
    store = tmp_path / "a.sqlite"
    done = run("scan", *given, "--integrand", "PT(1,2,3,4)", "--right", "PT(1,2,4,3)", "--store", store)
    assert done.code == 0, done
    scan = kn.open_scan(store)
    for row in scan:
        assert row.value == kn.sphere_integral(row.place, "PT(1,2,3,4)", "PT(1,2,4,3)").value
    assert {r.level for r in kn.energy_line(scan).resonances if r.channel == (1, 2)} == {0}
    facts = rows(run("info", tmp_path / "a.sqlite").out)
    assert facts["integral.kind"] == "sphere"
