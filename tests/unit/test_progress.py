"""Progress on a terminal, in a log, and in a notebook."""

from __future__ import annotations

import importlib
import io
import os
import pty
import re
import subprocess
import sys
import time
import types
from pathlib import Path

import pytest

import kn_integrate as kn
from kn_integrate.progress import Progress, chosen_face, duration

ROOT = str(Path(kn.__file__).resolve().parent.parent)


class Clock:
    def __init__(self) -> None:
        self.now = 100.0

    def __call__(self) -> float:
        return self.now


def test_lines_tell_rate_and_time_left_of_this_run():
    clock, stream = Clock(), io.StringIO()
    with Progress("scan", 1000, 400, "lines", stream, clock) as progress:
        for k in range(30):
            clock.now += 0.5
            progress.step("ON_POLE" if k == 4 else None)
    lines = stream.getvalue().splitlines()
    assert lines[0] == "scan: 400 of 1000 there, 600 to do"
    assert lines[1] == "scan: 404 of 1000 (40 %), 2/s, 5 min left"
    assert lines[2] == "scan: 412 of 1000 (41 %), 2/s, 4.9 min left, 1 ON_POLE"  # the pause has doubled
    assert lines[-1] == "scan: 430 of 1000 after 15 s, 1 ON_POLE"
    assert len(lines) == 5


def test_nothing_is_said_where_nothing_is_wanted():
    stream = io.StringIO()
    with Progress("scan", 3, 0, "none", stream) as progress:
        progress.step()
    assert stream.getvalue() == ""
    assert progress.done == 1


def test_nothing_to_do_is_one_line():
    stream = io.StringIO()
    with Progress("scan", 3, 3, "lines", stream) as progress:
        pass
    assert stream.getvalue() == "scan: 3 of 3 there, 0 to do\n"
    assert progress.line() == "scan: 3 of 3 (100 %)"


def test_a_bar_starts_where_an_earlier_run_stopped():
    stream = io.StringIO()
    with Progress("scan", 10, 4, "bar", stream) as progress:
        for _ in range(3):
            progress.step("ON_POLE")
    shown = stream.getvalue()
    assert "40%" in shown
    assert "7/10" in shown
    assert "ON_POLE=3" in shown


@pytest.mark.parametrize(
    ("seconds", "text"),
    [(0.05, "0.05 s"), (59, "59 s"), (61, "1 min"), (601, "10 min"), (3599, "60 min"), (7200, "2 h"), (1e6, "12 days")],
)
def test_durations_read_well(seconds, text):
    assert duration(seconds) == text


def in_notebook(monkeypatch, widgets: bool) -> None:
    """Make this process look like a notebook kernel."""
    ipython = types.ModuleType("IPython")
    shell = types.SimpleNamespace(kernel=object())
    ipython.get_ipython = lambda: shell  # type: ignore[attr-defined]
    monkeypatch.setitem(sys.modules, "IPython", ipython)
    monkeypatch.setitem(sys.modules, "ipywidgets", types.ModuleType("ipywidgets") if widgets else None)


def test_a_notebook_gets_a_widget_or_a_bar(monkeypatch):
    assert chosen_face(io.StringIO()) == "lines"
    in_notebook(monkeypatch, widgets=False)
    assert chosen_face(io.StringIO()) == "bar"
    in_notebook(monkeypatch, widgets=True)
    assert chosen_face(io.StringIO()) == "notebook"


def test_the_widget_is_driven_like_the_bar(monkeypatch):
    calls = []

    class Widget:
        def __init__(self, **options):
            calls.append(options)

        def update(self, count):
            calls.append(count)

        def set_postfix(self, notes, refresh):
            calls.append(dict(notes))

        def close(self):
            calls.append("closed")

    module = types.ModuleType("tqdm.notebook")
    module.tqdm = Widget  # type: ignore[attr-defined]
    importlib.import_module("tqdm")
    monkeypatch.setitem(sys.modules, "tqdm.notebook", module)
    with Progress("scan", 10, 4, "notebook") as progress:
        progress.step()
        progress.step("ZERO")
    assert calls == [{"total": 10, "initial": 4, "desc": "scan", "unit": ""}, 1, {"ZERO": 1}, 1, "closed"]


COMMAND = [sys.executable, "-m", "kn_integrate.cli", "scan", "--integrand", "PT(1,2,3,4)", "--planar", "2.3=2/5"]


def environment() -> dict[str, str]:
    return {**os.environ, "PYTHONPATH": ROOT, "COLUMNS": "100", "TERM": "dumb"}


def test_redirected_output_has_lines_and_the_result_stays_clean(tmp_path):
    command = [*COMMAND, "--grid", "1.2=0:1/2:6", "--store", str(tmp_path / "a.sqlite")]
    done = subprocess.run(command, capture_output=True, text=True, env=environment(), check=False)
    assert done.returncode == 0
    assert done.stderr.splitlines()[0] == "scan: 0 of 6 there, 6 to do"
    assert re.fullmatch(r"scan: 6 of 6 after [\d.]+ s, 1 ON_POLE", done.stderr.splitlines()[-1])
    assert "\r" not in done.stderr
    assert "scan:" not in done.stdout
    assert re.search(r"points +6 of 6", done.stdout)


def on_terminal(command: list[str], until: bytes = b"", send: bytes = b"") -> tuple[int, bytes]:
    """Run a command on a pseudo-terminal of its own; after `until` was seen, type `send`."""
    pid, terminal = pty.fork()
    if pid == 0:
        os.execvpe(command[0], command, environment())
    shown = b""
    deadline = time.monotonic() + 60
    while time.monotonic() < deadline:
        try:
            piece = os.read(terminal, 4096)
        except OSError:  # the other end is closed
            break
        if not piece:
            break
        shown += piece
        if send and until in shown:
            os.write(terminal, send)
            send = b""
    _, status = os.waitpid(pid, 0)
    os.close(terminal)
    return os.waitstatus_to_exitcode(status), shown


@pytest.mark.slow
@pytest.mark.filterwarnings("ignore:.*multi-threaded.*:DeprecationWarning")
def test_on_a_terminal_there_is_a_bar_and_ctrl_c_leaves_a_store_that_goes_on(tmp_path):
    store = tmp_path / "a.sqlite"
    command = [*COMMAND, "--grid", "1.2=1/1000:1/2:300", "--store", str(store)]
    code, shown = on_terminal(command, until=b"/300", send=b"")
    assert code == 0
    assert b"100%" in shown
    assert b"300/300" in shown
    for workers in ("1", "2"):
        other = tmp_path / f"{workers}.sqlite"
        command = [*COMMAND, "--grid", "1.2=1/1000:1/2:20000", "--store", str(other), "--workers", workers]
        code, shown = on_terminal(command, until=b"1/20000", send=b"\x03")
        assert code == 130, shown
        assert b"run the same command again to go on" in shown
        assert b"Traceback" not in shown
        scan = kn.open_scan(other)
        assert 0 < len(scan) < scan.total == 20000
        assert not other.with_name(other.name + ".lock").exists()
