"""A scan that is killed, interrupted, locked out or out of disk keeps what it has and goes on from it."""

from __future__ import annotations

import math
import os
import random
import signal
import sqlite3
import subprocess
import sys
import tempfile
import time
from collections import Counter
from fractions import Fraction
from pathlib import Path

import pytest
from scan_evaluate import beta

import kn_integrate as kn

PATHS = [str(Path(__file__).resolve().parent), str(Path(kn.__file__).resolve().parent.parent)]
POINTS = 500
KILLS = 20

SCRIPT = """
import sys
sys.path[:0] = {paths!r}
import scan_evaluate, kn_integrate as kn

if __name__ == "__main__":
    points = kn.ScanPoints.grid(4, {{(1, 2): kn.spaced("1/1000", "1/2", {points})}}, {{(2, 3): "2/5"}})
    kn.scan(points, "PT(1,2,3,4)", store={store!r}, workers={workers}, progress={progress!r},
            evaluate=scan_evaluate.{evaluate})
"""


def script(folder: Path, store: Path, workers: int, evaluate: str, points: int = POINTS, progress: str = "none") -> str:
    path = folder / f"scan_{workers}.py"  # a file, which fresh worker processes can import again
    path.write_text(
        SCRIPT.format(
            paths=PATHS, store=str(store), workers=workers, evaluate=evaluate, points=points, progress=progress
        )
    )
    return str(path)


def finished(store: Path) -> int:
    """Rows in a store that somebody may be writing; integrity is checked on the way."""
    if not store.exists():
        return 0
    connection = sqlite3.connect(store, timeout=60)
    try:
        if not connection.execute("SELECT 1 FROM sqlite_master WHERE name = 'results'").fetchone():
            return 0
        return int(connection.execute("SELECT count(*) FROM results").fetchone()[0])
    finally:
        connection.close()


def assert_sound(store: Path) -> None:
    connection = sqlite3.connect(store, timeout=60)
    assert connection.execute("PRAGMA integrity_check").fetchall() == [("ok",)]
    assert connection.execute("PRAGMA foreign_key_check").fetchall() == []
    connection.close()


def assert_complete(store: Path) -> None:
    scan = kn.open_scan(store)
    assert scan.complete
    assert [row.position for row in scan] == list(range(1, POINTS + 1))
    for k, row in enumerate(scan):
        s = Fraction(1, 1000) + k * Fraction(499, 1000 * 499)
        assert row.coordinates == {"1.2": str(s)}
        expected = math.gamma(float(s)) * math.gamma(0.4) / math.gamma(float(s) + 0.4)
        assert row.value == expected  # the very bits
        assert row.status == "OK"


def calls_in(trace: Path) -> int:
    return trace.read_bytes().count(b"\n") if trace.exists() else 0


@pytest.mark.slow
def test_killed_at_twenty_random_moments(tmp_path):
    store, trace = tmp_path / "scan.sqlite", tmp_path / "trace"
    environment = {**os.environ, "KN_TRACE": str(trace)}
    rng = random.Random(20)
    kills, before = 0, 0
    while kills < KILLS:
        workers = 1 + kills % 2
        command = [sys.executable, script(tmp_path, store, workers, "traced_beta")]
        process = subprocess.Popen(command, env=environment)
        # The kills are spread over the scan, and each comes at any moment: while the process starts, between points, in
        # a point, in the middle of a transaction.
        goal = int((kills + rng.random()) * 0.85 * POINTS / KILLS)
        while calls_in(trace) < goal and process.poll() is None:
            time.sleep(0.001)  # not by way of the store: a reader would get in the writer's way
        time.sleep(rng.random() * 0.01)
        assert process.poll() is None, "the scan came to its end before all kills were done"
        process.kill()
        process.wait()
        kills += 1
        if store.exists():
            assert_sound(store)
        now = finished(store)
        assert now >= before, "finished points were lost"
        before = now
    assert before < POINTS
    done = subprocess.run([sys.executable, script(tmp_path, store, 1, "traced_beta")], env=environment, check=False)
    assert done.returncode == 0
    assert_complete(store)
    calls = Counter(trace.read_text().split())
    assert len(calls) == POINTS
    # A kill loses what was in flight: one point serially, at most three for each of two workers.
    assert sum(calls.values()) - POINTS <= KILLS // 2 * (1 + 6)
    assert not list(tmp_path.glob("scan.sqlite-journal"))


def test_workers_of_a_killed_scan_end(tmp_path):
    store = tmp_path / "scan.sqlite"
    process = subprocess.Popen(
        [sys.executable, script(tmp_path, store, 2, "slow_beta")], start_new_session=True, env=dict(os.environ)
    )
    deadline = time.monotonic() + 60
    while finished(store) < 2 and time.monotonic() < deadline:
        time.sleep(0.01)
    os.kill(process.pid, signal.SIGKILL)
    process.wait()
    while time.monotonic() < deadline:
        try:
            os.killpg(process.pid, 0)
        except ProcessLookupError:
            return
        time.sleep(0.01)
    os.killpg(process.pid, signal.SIGKILL)
    pytest.fail("a worker outlived the scan")


@pytest.mark.parametrize("workers", [1, 2])
def test_ctrl_c_leaves_a_store_that_goes_on(tmp_path, workers):
    store = tmp_path / "scan.sqlite"
    process = subprocess.Popen(
        [sys.executable, script(tmp_path, store, workers, "slow_beta", 200)],
        start_new_session=True,
        stderr=subprocess.PIPE,
        text=True,
    )
    while finished(store) < 3:
        assert process.poll() is None
        time.sleep(0.01)
    os.killpg(process.pid, signal.SIGINT)  # as a terminal does: to all processes of the group
    _, errors = process.communicate(timeout=60)
    assert process.returncode in (-signal.SIGINT, 130)
    assert errors.count("KeyboardInterrupt") == 1, errors  # of the process that asked; none of a worker
    assert not list(tmp_path.glob("*.lock"))
    before = finished(store)
    assert 3 <= before < 200
    again = subprocess.run([sys.executable, script(tmp_path, store, 1, "beta", 200)], check=False)
    assert again.returncode == 0
    assert kn.open_scan(store).complete


def points(count: int = 5) -> kn.ScanPoints:
    return kn.ScanPoints.grid(4, {(1, 2): kn.spaced("1/10", "9/10", count)}, {(2, 3): "2/5"})


def test_second_writer_is_refused(tmp_path):
    store = tmp_path / "scan.sqlite"
    process = subprocess.Popen([sys.executable, script(tmp_path, store, 1, "slow_beta")])
    try:
        while finished(store) < 1:
            assert process.poll() is None
            time.sleep(0.01)
        with pytest.raises(kn.InputError, match=rf"process {process.pid} on .* is writing to.*one writer at a time"):
            kn.scan(points(), "PT(1,2,3,4)", store=store, progress=False, evaluate=beta)
        reading = kn.open_scan(store)  # readers are welcome
        assert 1 <= len(reading) < reading.total == POINTS
    finally:
        process.kill()
        process.wait()


def test_a_lock_file_left_by_a_killed_scan_is_no_obstacle(tmp_path):
    store = tmp_path / "scan.sqlite"
    (tmp_path / "scan.sqlite.lock").write_text("process 1 on elsewhere\n")
    assert kn.scan(points(), "PT(1,2,3,4)", store=store, progress=False, evaluate=beta).complete
    assert [path.name for path in tmp_path.iterdir()] == ["scan.sqlite"]


FULL = """
import resource, signal, sys
from concurrent.futures import ThreadPoolExecutor
sys.path[:0] = {paths!r}
import scan_evaluate, kn_integrate as kn

resource.setrlimit(resource.RLIMIT_FSIZE, ({limit}, resource.RLIM_INFINITY))
points = kn.ScanPoints.grid(4, {{(1, 2): kn.spaced("1/1000", "1/2", {points})}}, {{(2, 3): "2/5"}})
try:
    kn.scan(points, "PT(1,2,3,4)", store={store!r}, progress="none", evaluate=scan_evaluate.beta,
            executor={executor})
except kn.KNError as error:
    print(type(error).__name__, error)
    sys.exit(7)
"""


@pytest.mark.parametrize("executor", ["None", "ThreadPoolExecutor(2)"])
def test_full_target_is_a_clear_error_and_nothing_is_lost(tmp_path, executor):
    store = tmp_path / "scan.sqlite"
    # All points go in first; then the system refuses to let the file grow, as a full disk or a quota does.
    limit = 250 * 1024  # the whole scan takes about 284 KiB
    code = FULL.format(paths=PATHS, limit=limit, points=POINTS, store=str(store), executor=executor)
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert done.returncode == 7, done
    assert done.stdout.startswith("StoreError"), done
    assert "every point that was finished before is safe, run the same scan again" in done.stdout
    assert done.stderr == ""
    assert_sound(store)
    before = finished(store)
    assert 0 < before < POINTS
    subprocess.run([sys.executable, script(tmp_path, store, 1, "beta")], check=True)
    assert_complete(store)


READ_ONLY = """
import os, sys
sys.path[:0] = {paths!r}
import scan_evaluate, kn_integrate as kn

points = kn.ScanPoints.grid(4, {{(1, 2): kn.spaced("1/10", "9/10", 5)}}, {{(2, 3): "2/5"}})
kn.scan(points, "PT(1,2,3,4)", store={other!r}, progress="none", evaluate=scan_evaluate.beta)  # all is imported now
if os.geteuid() == 0:  # permissions do not bind root
    os.setgid(65534)
    os.setuid(65534)
try:
    kn.scan(points, "PT(1,2,3,4)", store={store!r}, progress="none", evaluate=scan_evaluate.beta)
except kn.InputError as error:
    print(error)
    sys.exit(7)
"""


@pytest.mark.skipif(os.name != "posix", reason="permissions of POSIX")
def test_read_only_target_is_a_clear_error_and_nothing_is_lost(tmp_path):
    # Not below pytest's own folder, which other users cannot enter.
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        folder.chmod(0o755)
        store = folder / "scan.sqlite"
        kn.scan(points(3), "PT(1,2,3,4)", store=store, progress=False, evaluate=beta)
        kept = store.read_bytes()
        store.chmod(0o444)
        for mode, message in ((0o555, "a folder that cannot be written"), (0o777, "readonly database")):
            folder.chmod(mode)
            other = str(tmp_path / f"{mode}.sqlite")
            code = READ_ONLY.format(paths=PATHS, store=str(store), other=other)
            done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
            assert done.returncode == 7, done
            assert message in done.stdout
            assert store.read_bytes() == kept
        folder.chmod(0o755)
        assert len(kn.open_scan(store)) == 3
