"""The same bits from every executor: serial, threads, processes, a cluster that loses a worker."""

from __future__ import annotations

import multiprocessing
import os
from concurrent.futures import Executor, ProcessPoolExecutor, ThreadPoolExecutor
from pathlib import Path

import pytest
import scan_evaluate

import kn_integrate as kn

FIVE = {(2, 3): "2/5", (3, 4): "1/2", (4, 5): "7/20", (1, 5): "9/20"}


def line(count: int = 12) -> kn.ScanPoints:
    """Five points from one pole, past the convergent region, to another."""
    start = kn.Mandelstams.from_planar(5, {**FIVE, (1, 2): "-1"})
    stop = kn.Mandelstams.from_planar(5, {**FIVE, (1, 2): "6/5"})
    return kn.ScanPoints.line(start, stop, count)


def bits(scan: kn.Scan) -> list[tuple[str | None, ...]]:
    return [(row.real, row.imaginary, row.error_text, row.status, row.method, str(row.evaluations)) for row in scan]


def run(folder: Path, name: str, executor: Executor | None = None, workers: int = 1) -> kn.Scan:
    store = folder / f"{name}.sqlite"
    return kn.scan(line(), "PT(1,2,3,4,5)", store=store, executor=executor, workers=workers, progress=False)


@pytest.mark.slow
def test_serial_threads_and_processes_give_the_same_bits(tmp_path):
    serial = run(tmp_path, "serial")
    assert serial.counts == {"OK": 10, "ON_POLE": 2}
    assert serial.ok
    found = {"own processes": run(tmp_path, "own", workers=2)}
    for threads in (1, 2, 4):
        with ThreadPoolExecutor(threads) as pool:
            found[f"{threads} threads"] = run(tmp_path, f"threads{threads}", pool)
    with ProcessPoolExecutor(2, mp_context=multiprocessing.get_context("spawn")) as pool:
        found["spawned processes"] = run(tmp_path, "spawn", pool)
    for name, scan in found.items():
        assert bits(scan) == bits(serial), name


def one_integral(x: str) -> tuple[float, float]:
    kin = kn.Mandelstams.from_planar(5, {**FIVE, (1, 2): x})
    result = kn.disk_integral(kin, kn.parke_taylor(1, 2, 3, 4, 5))
    return result.value, result.error


@pytest.mark.slow
@pytest.mark.filterwarnings("ignore:.*multi-threaded, use of fork.*:DeprecationWarning")
def test_the_integrals_themselves_in_thread_fork_and_spawn_pools():
    # First here, so that a fork copies a process in which the compiler and the kernels have already run.
    inputs = [f"{k}/20" for k in (-13, -7, 1, 4, 9, 15)]
    expected = [one_integral(x) for x in inputs]
    with ThreadPoolExecutor(4) as pool:
        assert list(pool.map(one_integral, inputs)) == expected
    for method in ("fork", "spawn"):
        with ProcessPoolExecutor(2, mp_context=multiprocessing.get_context(method)) as pool:
            assert list(pool.map(one_integral, inputs)) == expected


@pytest.mark.slow
def test_a_cluster_that_loses_a_worker_gives_the_same_bits(tmp_path, monkeypatch):
    distributed = pytest.importorskip("distributed")
    points = kn.ScanPoints.grid(4, {(1, 2): kn.spaced("1/100", "1", 100)}, {(2, 3): "2/5"})
    task = {"spec": "PT(1,2,3,4)", "progress": False}
    serial = kn.scan(points, store=tmp_path / "serial.sqlite", evaluate=scan_evaluate.beta, **task)
    monkeypatch.setenv("KN_TRACE", str(tmp_path / "killed"))
    with (
        distributed.LocalCluster(n_workers=2, threads_per_worker=1, dashboard_address=None) as cluster,
        distributed.Client(cluster) as client,
        client.get_executor() as executor,
    ):
        before = set(client.run(os.getpid).values())
        store = tmp_path / "cluster.sqlite"
        scan = kn.scan(points, store=store, executor=executor, evaluate=scan_evaluate.killed_once, **task)
        lost = [pid for pid in before if not is_running(pid)]
    assert (tmp_path / "killed").exists()
    assert len(lost) == 1
    assert scan.complete
    assert bits(scan) == bits(serial)


def is_running(pid: int) -> bool:
    try:
        os.kill(pid, 0)
    except ProcessLookupError:
        return False
    return True


@pytest.mark.slow
def test_real_integrals_on_a_cluster(tmp_path):
    distributed = pytest.importorskip("distributed")
    serial = run(tmp_path, "serial")
    with (
        distributed.LocalCluster(n_workers=1, threads_per_worker=2, dashboard_address=None) as cluster,
        distributed.Client(cluster) as client,
        client.get_executor() as executor,
    ):
        assert bits(run(tmp_path, "cluster", executor)) == bits(serial)


def test_a_worker_that_dies_is_a_clear_error_and_the_scan_goes_on(tmp_path, monkeypatch):
    monkeypatch.setenv("KN_TRACE", str(tmp_path / "killed"))
    points = kn.ScanPoints.grid(4, {(1, 2): kn.spaced("1/10", "9/10", 9)}, {(2, 3): "2/5"})
    task = {"store": tmp_path / "scan.sqlite", "evaluate": scan_evaluate.killed_once, "progress": False}
    with pytest.raises(kn.KNError, match=r"a worker process ended before its point was done.*run the same scan again"):
        kn.scan(points, "PT(1,2,3,4)", workers=2, **task)
    assert len(kn.open_scan(tmp_path / "scan.sqlite")) < 9
    scan = kn.scan(points, "PT(1,2,3,4)", workers=2, **task)
    assert scan.complete
    assert scan.ok


class Losing(ThreadPoolExecutor):
    """An executor that loses every third answer, as a cluster does whose workers die."""

    def __init__(self, every: int) -> None:
        super().__init__(2)
        self.every, self.calls = every, 0

    def submit(self, *arguments, **options):
        self.calls += 1
        if self.calls % self.every:
            return super().submit(*arguments, **options)
        return super().submit(lost)


def lost() -> None:
    raise TypeError("the answer was not what the executor expected")


def test_points_that_the_executor_loses_are_handed_out_again(tmp_path):
    points = kn.ScanPoints.grid(4, {(1, 2): kn.spaced("1/20", "1", 20)}, {(2, 3): "2/5"})
    task = {"spec": "PT(1,2,3,4)", "progress": False, "evaluate": scan_evaluate.beta}
    serial = kn.scan(points, store=tmp_path / "serial.sqlite", **task)
    with Losing(3) as executor:
        assert bits(kn.scan(points, store=tmp_path / "a.sqlite", executor=executor, **task)) == bits(serial)
    with (
        Losing(1) as executor,
        pytest.raises(kn.KNError, match=r"lost a point 4 times \(TypeError: .*run the same scan"),
    ):
        kn.scan(points, store=tmp_path / "b.sqlite", executor=executor, **task)


@pytest.mark.parametrize("workers", [1, 2])
def test_what_a_point_raises_is_raised_here_and_the_rest_is_kept(tmp_path, workers):
    points = kn.ScanPoints.grid(4, {(1, 2): kn.spaced("1/20", "1", 20)}, {(2, 3): "2/5"})
    with pytest.raises(ZeroDivisionError, match="a slip at 1/2"):
        kn.scan(
            points,
            "PT(1,2,3,4)",
            store=tmp_path / "a.sqlite",
            workers=workers,
            progress=False,
            evaluate=scan_evaluate.slips,
        )
    assert 5 <= len(kn.open_scan(tmp_path / "a.sqlite")) < 20
