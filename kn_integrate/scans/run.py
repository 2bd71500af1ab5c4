"""Going through the points: serially, in processes of our own, or on any executor of ``concurrent.futures``.

Every point is computed by itself, on one thread, from text that is the same everywhere, so its bits cannot depend on
how many workers there are or which of them takes it.  Only this process writes to the store; a result is written as
soon as it arrives, in one transaction with others that arrived at the same moment.
"""

from __future__ import annotations

import multiprocessing
import os
import signal
import threading
from collections.abc import Collection, Iterable, Iterator, Sequence
from concurrent.futures import FIRST_COMPLETED, BrokenExecutor, Executor, Future, ProcessPoolExecutor, wait
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from ..errors import InputError, KNError
from ..exact import read_integer
from ..progress import FACES, Progress
from .points import ScanPoint, ScanPoints
from .result import Scan, open_scan
from .store import Store
from .task import Evaluate, Record, Task, evaluate_point, integrate, make_task

_AHEAD = 3  # points handed out per worker: enough to keep all busy, few enough to stop soon
_UNKNOWN_WORKERS = 32  # for an executor that does not tell
_QUIET = ("OK", "ZERO")  # statuses that progress does not count separately


def scan(
    points: ScanPoints | Iterable[Any],
    spec: Any = None,
    *,
    store: str | os.PathLike[str],
    executor: Executor | None = None,
    workers: int = 1,
    rtol: float | None = None,
    atol: float | None = None,
    digits: int | None = None,
    method: str | None = None,
    max_points: float | None = None,
    progress: str | bool = "auto",
    evaluate: Evaluate = integrate,
) -> Scan:
    """Compute an integral at many points, and keep every result in a file from which the scan can go on.

    Called again with the same store, integral and options it computes only what is missing; with further points it
    adds them.  Points on a pole, or beyond ``max_points``, are rows of their own status.

    Parameters
    ----------
    points
        :class:`ScanPoints`, or any sequence of kinematic points.
    spec
        :class:`DiskIntegral`, :class:`SphereIntegral`, an Integrand or its text; None for points that are exponents.
    store
        Path of the SQLite file; made when it does not exist.
    executor
        Anything with the interface of ``concurrent.futures.Executor``, local or remote; it stays open.
    workers
        Without an executor: 1 computes here, more use that many fresh processes (a script that asks for them needs
        the usual ``if __name__ == "__main__":``).
    rtol, atol, digits, method, max_points
        As for :func:`disk_integral`; what is not given is not passed on.
    progress
        ``"auto"``, ``"bar"``, ``"notebook"``, ``"lines"``, or ``"none"``; True is auto and False none.
    evaluate
        ``evaluate(integral, place, options) -> Estimate``, in place of this package's integrals; it must be a function
        that the workers can import.

    Returns
    -------
    Scan
        All rows of the store.

    Raises
    ------
    InputError
        Before anything is computed: for points or a specification that cannot be used, a store of another scan, one
        that somebody else is writing, or one that cannot be written.
    StoreError
        When the disk is full; what was finished is safe.
    KeyboardInterrupt
        After Ctrl-C; what was finished is safe.

    Examples
    --------
    >>> import tempfile, kn_integrate as kn
    >>> a = kn.Mandelstams.from_planar(4, {(1, 2): 0, (2, 3): "1/2"})
    >>> b = kn.Mandelstams.from_planar(4, {(1, 2): 1, (2, 3): "1/2"})
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     found = kn.scan(kn.ScanPoints.line(a, b, 3), "PT(1,2,3,4)", store=folder + "/line.sqlite", progress=False)
    >>> [(row.status, row.value and round(row.value, 10)) for row in found]
    [('ON_POLE', None), ('OK', 3.1415926536), ('OK', 2.0)]
    """
    places = ScanPoints.of(points)
    options = {"rtol": rtol, "atol": atol, "digits": digits, "method": method, "max_points": max_points}
    face = {True: "auto", False: "none"}.get(progress, progress) if isinstance(progress, bool) else progress
    if face not in FACES:
        raise InputError("progress", repr(progress), "one of " + ", ".join(FACES))
    count = read_integer(workers, "workers")
    if count < 1:
        raise InputError("workers", str(count), "a positive integer")
    if executor is not None and count != 1:
        raise InputError("workers", f"{count} together with an executor", "one of them")
    task = make_task(places.points, spec, options)
    path = Path(store)
    with Store(path, task) as target:
        positions = target.add_points(places.points)
        there = target.finished()
        todo = [(k, p) for k, p in dict(zip(positions, places, strict=True)).items() if k not in there]
        asked = len(set(positions))
        with Progress("scan", asked, asked - len(todo), face) as counter:
            if executor is None and (count == 1 or len(todo) < 2):
                for position, point in todo:
                    _enter(target, counter, [(position, evaluate_point(task, point.kinematics, evaluate))])
            elif executor is None:
                with _own_processes(min(count, len(todo))) as pool:
                    _run(pool, _AHEAD * count, target, counter, task, todo, evaluate)
            else:
                known = getattr(executor, "_max_workers", None) or _UNKNOWN_WORKERS
                _run(executor, _AHEAD * known, target, counter, task, todo, evaluate)
    return open_scan(path)


def _enter(target: Store, counter: Progress, results: Sequence[tuple[int, Record]]) -> None:
    target.write(results)
    for _position, record in results:
        counter.step(None if record.status in _QUIET else record.status)


def _run(
    executor: Executor,
    window: int,
    target: Store,
    counter: Progress,
    task: Task,
    todo: Sequence[tuple[int, ScanPoint]],
    evaluate: Evaluate,
) -> None:
    """Keep ``window`` points in the executor until all are done; write what arrives, also on the way out."""
    waiting = iter(todo)
    running: dict[Future[Record], int] = {}

    def hand_out() -> None:
        for position, point in waiting:
            running[executor.submit(evaluate_point, task, point.kinematics, evaluate)] = position
            if len(running) >= window:
                break

    try:
        hand_out()
        while running:
            done, _ = wait(running, return_when=FIRST_COMPLETED)
            _collect(done, running, target, counter)
            hand_out()
    except BaseException as error:
        for future in running:
            future.cancel()
        finished = {f for f in running if f.done() and not f.cancelled() and f.exception() is None}
        _collect(finished, running, target, counter)
        if isinstance(error, BrokenExecutor):
            raise KNError(
                "a worker process ended before its point was done (out of memory, killed, or a script without "
                'if __name__ == "__main__"); every point that was finished is safe, run the same scan again to go on'
            ) from error
        raise


def _collect(
    done: Collection[Future[Record]], running: dict[Future[Record], int], target: Store, counter: Progress
) -> None:
    """Write what has arrived, in the order of the points; then raise the first failure there is."""
    # Taken out first: after an interrupt in the middle of this nothing may be written twice.
    taken = sorted(((running.pop(future), future) for future in done), key=lambda item: item[0])
    arrived, failure = [], None
    for position, future in taken:
        error = future.exception()
        if error is None:
            arrived.append((position, future.result()))
        elif failure is None:
            failure = error
    if arrived:
        _enter(target, counter, arrived)
    if failure is not None:
        raise failure


@contextmanager
def _own_processes(workers: int) -> Iterator[Executor]:
    """A pool of fresh processes (spawn: a fork would copy locks and threads in whatever state they are)."""
    pool = ProcessPoolExecutor(workers, mp_context=multiprocessing.get_context("spawn"), initializer=_prepare_worker)
    try:
        yield pool
    except BaseException:
        # Ctrl-C, or a failure: do not wait for points that may take hours; they are computed again next time.
        processes = list((getattr(pool, "_processes", None) or {}).values())
        pool.shutdown(wait=False, cancel_futures=True)
        for process in processes:
            process.terminate()
        raise
    pool.shutdown()


def _prepare_worker() -> None:
    """In a worker: leave Ctrl-C to the process that asked, and end with it, even when it was killed.

    The terminal sends Ctrl-C to the whole group.  And the pipe a worker waits on has its other end in the worker too,
    so that it would wait for ever for a process that is gone.
    """
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    parent = multiprocessing.parent_process()
    if parent is not None:
        threading.Thread(target=_end_with, args=(parent,), daemon=True).start()


def _end_with(parent: Any) -> None:
    parent.join()
    os._exit(1)
