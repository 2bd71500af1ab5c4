from __future__ import annotations

import json
import os
import re
import signal
import subprocess
import sys
import time
from types import ModuleType, SimpleNamespace

import numba
import pytest
from click.testing import CliRunner

import kn_integrate
from kn_integrate.cli import main
from kn_integrate.commands import load_verb, verb_names
from kn_integrate.errors import InputError, KNError, NotAvailableError, PoleError, Status, WorkLimitError
from kn_integrate.estimate import Estimate

POINT = ["--planar", "1.2=3/10,2.3=2/5,3.4=1/2,4.5=7/20,5.1=9/20"]
DISK = ["disk", *POINT, "--integrand", "PT(1,2,3,4,5)"]
JOB = """
version = 1
verb = "disk"
[kinematics]
planar = { "1.2" = "3/10", "2.3" = "2/5", "3.4" = "1/2", "4.5" = "7/20", "1.5" = "9/20" }
[integrand]
f = "PT(1,2,3,4,5)"
"""
GOOD = Estimate(25.914922073927123, 3.2e-12, Status.OK, "quadrature", 273)


def run(*args):
    """The command in this process: its exit code, stdout and stderr."""
    result = CliRunner().invoke(main, list(args))
    assert result.exception is None or isinstance(result.exception, SystemExit), result.exc_info
    return SimpleNamespace(code=result.exit_code, out=result.stdout, err=result.stderr)


def call(*args, **options):
    """The command in its own process."""
    return subprocess.run(
        [sys.executable, "-m", "kn_integrate.cli", *args], capture_output=True, text=True, timeout=120, **options
    )


@pytest.fixture
def engine(monkeypatch):
    """A stand-in for the numerical engine: `engine.answer` is returned, or raised; `engine.calls` are its arguments."""
    stand_in = SimpleNamespace(answer=GOOD, calls=[])

    def disk_integral(*args, **options):
        stand_in.calls.append((args, options))
        if isinstance(stand_in.answer, BaseException):
            raise stand_in.answer
        return stand_in.answer

    module = ModuleType("kn_integrate.api")
    module.disk_integral = disk_integral
    monkeypatch.setitem(sys.modules, "kn_integrate.api", module)
    monkeypatch.setattr(kn_integrate, "api", module, raising=False)
    stand_in.module = module
    return stand_in


def test_table_and_exit_code_of_a_good_value(engine):
    done = run(*DISK)
    assert (done.code, done.err) == (0, "")
    rows = dict(line.split(maxsplit=1) for line in done.out.splitlines())
    assert list(rows) == ["value", "error", "method", "evaluations", "seconds"]
    assert rows["value"] == "25.914922073927123"
    assert rows["error"] == "4e-12"


def test_what_the_engine_is_asked(engine):
    run(*DISK, "--ordering", "1,3,2,4,5", "--rtol", "1e-12", "--atol", "1e-20", "--digits", "30", "--method", "kz")
    ((args, options),) = engine.calls
    assert args[0].n == 5
    assert str(args[0].channel((1, 2))) == "3/10"
    assert args[1] == kn_integrate.parke_taylor(1, 2, 3, 4, 5)
    assert options == {"ordering": (1, 3, 2, 4, 5), "rtol": 1e-12, "atol": 1e-20, "digits": 30, "method": "kz"}
    run("disk", "--exponents", "1.2=-7/10,2.3=-3/5,1.3=-7/10", "--n", "4", "--max-points", "1e6", "--threads", "2")
    args, options = engine.calls[1]
    assert isinstance(args[0], kn_integrate.DiskExponents)
    assert args[1] is None
    assert options == {"ordering": None, "max_points": 1000000, "threads": 2}


@pytest.mark.parametrize(
    ("answer", "name"),
    [
        (GOOD, "ok"),
        (Estimate(1.25 - 0.5j, 1e-3, Status.INACCURATE, "quadrature", 12), "inaccurate"),
        (Estimate(float("nan"), float("inf"), Status.NOT_FINITE, "kz", 7), "not_finite"),
        (PoleError((1, 2), 0, "0"), "pole"),
        (WorkLimitError(3.5e9, 1e6), "work_limit"),
    ],
)
def test_output_looks_as_it_always_did(engine, golden, answer, name):
    engine.answer = answer
    shown = run(*DISK)
    data = run(*DISK, "--format", "json")
    assert shown.code == data.code == (0 if answer is GOOD else 1)
    assert shown.err == data.err == ""
    document = json.loads(data.out, parse_constant=lambda word: pytest.fail(f"{word} in JSON"))
    assert float(document.pop("seconds")) >= 0
    assert set(document.pop("versions")) >= {"kn_integrate", "numpy", "numba", "python"}
    text = re.sub(r"(?m)^(seconds +).*$", r"\1...", shown.out)
    golden(f"cli_{name}.txt", text + json.dumps(document, indent=2) + "\n")


def test_json_of_a_pole_names_channel_level_and_place(engine):
    engine.answer = PoleError((2, 3, 4), 1, kn_integrate.exact.Exact(-1) if hasattr(kn_integrate, "exact") else -1)
    done = run(*DISK, "--format", "json")
    document = json.loads(done.out)
    assert done.code == 1
    assert (document["status"], document["channel"], document["level"]) == ("ON_POLE", [2, 3, 4], 1)
    assert float(document["at"]) == -1
    assert "residue" in document["advice"]


def test_json_repeats_the_job(engine, tmp_path):
    (tmp_path / "job.toml").write_text(JOB)
    by_file = json.loads(run("disk", str(tmp_path / "job.toml"), "--format", "json").out)["job"]
    by_flags = json.loads(run(*DISK, "--format", "json").out)["job"]
    assert by_flags["integrand"] == by_file["integrand"] == {"f": "PT(1,2,3,4,5)"}
    assert by_file["kinematics"]["planar"]["1.2"] == "3/10"


@pytest.mark.parametrize(
    "error", [NotAvailableError("digits=: only with method='kz'"), InputError("rtol", "-1", "> 0")]
)
def test_refused_requests_are_bad_input(engine, error):
    engine.answer = error
    done = run(*DISK, "--format", "json")
    assert (done.code, done.out, done.err) == (2, "", f"{error}\n")


def test_other_errors_of_the_package_are_one_line(engine):
    engine.answer = KNError("a relation failed")
    done = run(*DISK)
    assert (done.code, done.out, done.err) == (1, "", "a relation failed\n")


def test_interruption_has_its_own_code(engine):
    engine.answer = KeyboardInterrupt()
    done = run(*DISK, "--format", "json")
    assert (done.code, done.out, done.err.strip()) == (130, "", "interrupted")


@pytest.mark.skipif(os.name != "posix", reason="sends SIGINT")
def test_interrupting_the_process():
    script = (
        "import sys, time, types\n"
        "api = types.ModuleType('kn_integrate.api')\n"
        "def disk_integral(*args, **options):\n"
        "    print('started', file=sys.stderr, flush=True)\n"
        "    time.sleep(60)\n"
        "api.disk_integral = disk_integral\n"
        "sys.modules['kn_integrate.api'] = api\n"
        "from kn_integrate.cli import main\n"
        f"main({DISK!r})\n"
    )
    with subprocess.Popen([sys.executable, "-c", script], stdout=-1, stderr=-1, text=True) as process:
        assert process.stderr.readline() == "started\n"
        time.sleep(0.1)
        process.send_signal(signal.SIGINT)
        out, err = process.communicate(timeout=60)
    assert (process.returncode, out, err.strip()) == (130, "", "interrupted")


def test_a_bug_is_not_dressed_up_as_bad_input(engine):
    engine.answer = ZeroDivisionError("a slip of ours")
    result = CliRunner().invoke(main, DISK)
    assert isinstance(result.exception, ZeroDivisionError)


def test_every_verb_explains_itself():
    assert {"disk", "info"} <= set(verb_names())
    listing = run("--help").out
    for name in verb_names():
        verb = load_verb(name)
        assert verb.name == name
        assert re.search(rf"(?m)^  {name} +\S", listing)
        done = run(name, "--help")
        assert done.code == 0
        for field in verb.fields:
            assert field.option in done.out
        assert "--format" in done.out


def test_version():
    assert run("--version").out == f"kn-integrate, version {kn_integrate.__version__}\n"


def test_info_names_versions_cache_and_machine(monkeypatch, tmp_path):
    monkeypatch.setenv("NUMBA_CACHE_DIR", str(tmp_path))
    document = json.loads(run("info", "--format", "json").out)
    assert document["cache"] == str(tmp_path)
    assert document["cpu"]["cores"] >= 1
    assert document["versions"]["kn_integrate"] == kn_integrate.__version__
    rows = dict(line.split(maxsplit=1) for line in run("info").out.splitlines())
    assert {"kn_integrate", "numpy", "numba", "python", "cache", "cpu.model"} <= set(rows)


def test_info_without_a_writable_installation(monkeypatch, tmp_path):
    """Neither the package nor the home folder: a folder of our own below the temporary one."""
    from kn_integrate.kernels import cache

    monkeypatch.setenv("NUMBA_CACHE_DIR", "")  # empty is none; and put back afterwards
    monkeypatch.setattr(numba.config, "CACHE_DIR", numba.config.CACHE_DIR)
    monkeypatch.setattr(cache.tempfile, "gettempdir", lambda: str(tmp_path))
    plain = cache.writable
    monkeypatch.setattr(cache, "writable", lambda folder: tmp_path in folder.parents and plain(folder))
    found = json.loads(run("info", "--format", "json").out)["cache"]
    assert found.startswith(str(tmp_path))


def test_info_of_a_job_shows_the_prediction(engine, tmp_path):
    (tmp_path / "job.toml").write_text(JOB + "[accuracy]\nrtol = 1e-8\n")
    asked = {}

    def predict(point, integrand, **options):
        asked.update(options, n=point.n)
        return {"ordering": (1, 2, 3, 4, 5), "points": 273, "poles": [{"channel": "1.2", "distance": 0.3}]}

    engine.module.predict = predict
    done = run("info", str(tmp_path / "job.toml"))
    assert done.code == 0
    assert asked == {"n": 5, "ordering": None, "rtol": 1e-8}
    rows = dict(line.split(maxsplit=1) for line in done.out.splitlines())
    assert rows["points"] == "273"
    assert rows["poles.1.channel"] == "1.2"
    assert rows["integral"] == "PT(1,2,3,4,5)"


def test_info_of_a_job_for_an_unknown_verb(tmp_path):
    (tmp_path / "job.toml").write_text('version = 1\nverb = "dsik"\n')
    done = run("info", str(tmp_path / "job.toml"))
    assert done.code == 2
    assert "verb: found 'dsik'; expected one of " in done.err


def test_a_closed_pipe_is_no_traceback():
    script = f"{sys.executable} -m kn_integrate.cli info --format json | true"
    done = subprocess.run(["bash", "-c", script], capture_output=True, text=True, timeout=60)
    assert "Traceback" not in done.stderr


def test_the_installed_command():
    done = call("--version")
    assert (done.returncode, done.stderr) == (0, "")
    done = call("disk", "--plannar", "1.2=1")
    assert (done.returncode, done.stdout) == (2, "")
    assert done.stderr.startswith("--plannar: found an unknown flag; expected one of --")
    assert done.stderr.rstrip().endswith("did you mean --planar?")
