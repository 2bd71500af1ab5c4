"""Going through the points: serially, in processes of our own, or on any executor of ``concurrent.futures``.

Every point is computed by itself, on one thread, from text that is the same everywhere, so its bits cannot depend on
how many workers there are or which of them takes it.  Only this process writes to the store; a result is written as
soon as it arrives, in one transaction with others that arrived at the same moment.
"""

from __future__ import annotations

import multiprocessing
import os
import pickle
import signal
import threading
import traceback
from collections.abc import Collection, Iterable, Iterator, Mapping, Sequence
from concurrent.futures import (
    FIRST_COMPLETED,
    BrokenExecutor,
    CancelledError,
    Executor,
    Future,
    ProcessPoolExecutor,
    wait,
)
from contextlib import contextmanager
from dataclasses import dataclass
from itertools import islice
from pathlib import Path
from typing import Any

from ..errors import InputError, KNError
from ..exact import read_integer
from ..progress import FACES, Progress
from .points import ScanPoint, ScanPoints
from .result import Scan, open_scan
from .store import Store, StoreError
from .task import Evaluate, Record, Task, evaluate_piece, evaluate_point, integrate, make_task, takes_pieces

_AHEAD = 3  # points handed out per worker: enough to keep all busy, few enough to stop soon
_LOSSES = 3  # times that an executor may lose the same point
_UNKNOWN_WORKERS = 32  # for an executor that does not tell
_PIECE = 64  # points computed in one call: milliseconds, which is what a killed process loses
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
                _here(todo, target, counter, task, evaluate)
            elif executor is None:
                with _own_processes(min(count, len(todo))) as pool:
                    _Run(pool, target, counter, task, evaluate, ours=True).go(todo, _AHEAD * count)
            else:
                known = getattr(executor, "_max_workers", None) or _UNKNOWN_WORKERS
                _Run(executor, target, counter, task, evaluate).go(todo, _AHEAD * known)
    return open_scan(path)


def _here(
    todo: Sequence[tuple[int, ScanPoint]], target: Store, counter: Progress, task: Task, evaluate: Evaluate
) -> None:
    """All points in this process: those that compiled code does a piece at a time, the others one by one."""
    size = _PIECE if takes_pieces(task, evaluate) else 1
    for start in range(0, len(todo), size):
        piece = todo[start : start + size]
        records = evaluate_piece(task, [point.kinematics for _, point in piece]) if size > 1 else [None]
        done = [(position, record) for (position, _), record in zip(piece, records, strict=True) if record is not None]
        if done:
            _enter(target, counter, done)
        for (position, point), record in zip(piece, records, strict=True):
            if record is None:
                _enter(target, counter, [(position, evaluate_point(task, point.kinematics, evaluate))])


def _enter(target: Store, counter: Progress, results: Sequence[tuple[int, Record]]) -> None:
    target.write(results)
    for _position, record in results:
        counter.step(None if record.status in _QUIET else record.status)


@dataclass(frozen=True)
class _Failure:
    """What a point raised, brought home as a value: an exception of a future is then the executor's own."""

    error: BaseException


def _guarded(task: Task, kinematics: Mapping[str, Any], evaluate: Evaluate) -> Record | _Failure:
    try:
        return evaluate_point(task, kinematics, evaluate)
    except Exception as error:  # of whatever kind: it is raised again at home
        if not isinstance(error, KNError):
            error.add_note("in a worker:\n" + "".join(traceback.format_exception(error)))
        try:
            pickle.loads(pickle.dumps(error))
        except (pickle.PickleError, TypeError, AttributeError):  # an exception that cannot travel
            return _Failure(RuntimeError(f"{type(error).__name__}: {error}"))
        return _Failure(error)


class _Run:
    """Points on an executor: so many in it at a time, and what arrives is written, also on the way out.

    An executor over a network can lose a point without the point being at fault (its worker died with the result in
    its memory, say); such a point is handed out again, a few times.
    """

    def __init__(
        self,
        executor: Executor,
        target: Store,
        counter: Progress,
        task: Task,
        evaluate: Evaluate,
        ours: bool = False,
    ) -> None:
        # Points in our own pool end with its processes.  Cancelling them too would race with the thread of the pool,
        # which marks the points of dead processes and does not expect cancelled ones among them (Python 3.11).
        self.ours = ours
        self.executor, self.target, self.counter, self.task, self.evaluate = executor, target, counter, task, evaluate
        self.running: dict[Future[Record | _Failure], tuple[int, ScanPoint]] = {}
        self.lost: dict[int, int] = {}

    def go(self, todo: Sequence[tuple[int, ScanPoint]], window: int) -> None:
        """All points; raises what the first failing one raised."""
        waiting = iter(todo)
        try:
            while True:
                for item in islice(waiting, max(0, window - len(self.running))):
                    self._hand_out(item)
                if not self.running:
                    return
                done, _ = wait(self.running, return_when=FIRST_COMPLETED)
                self._collect(done)
        except BaseException as error:
            if not (self.ours or isinstance(error, BrokenExecutor)):
                for future in self.running:
                    future.cancel()
            if isinstance(error, StoreError):
                raise  # nothing more can be written
            finished = [f for f in self.running if f.done() and not f.cancelled() and f.exception() is None]
            results = [(self.running[f][0], f.result()) for f in finished]
            self._write([(position, result) for position, result in results if isinstance(result, Record)])
            if isinstance(error, BrokenExecutor):
                raise KNError(
                    "a worker process ended before its point was done (out of memory, killed, or a script without "
                    'if __name__ == "__main__"); every point that was finished is safe, run the same scan again to '
                    "go on"
                ) from error
            raise

    def _hand_out(self, item: tuple[int, ScanPoint]) -> None:
        self.running[self.executor.submit(_guarded, self.task, item[1].kinematics, self.evaluate)] = item

    def _collect(self, done: Collection[Future[Record | _Failure]]) -> None:
        # Taken out first: after an interrupt in the middle of this nothing may be written twice.
        taken = sorted(((self.running.pop(future), future) for future in done), key=lambda pair: pair[0][0])
        arrived, again = [], []
        for item, future in taken:
            error = CancelledError() if future.cancelled() else future.exception()
            if error is None:
                arrived.append((item[0], future.result()))
            elif isinstance(error, BrokenExecutor):
                self._write(arrived)
                raise error
            else:
                again.append((item, error))
        self._write(arrived)
        for item, error in again:
            self.lost[item[0]] = self.lost.get(item[0], 0) + 1
            if self.lost[item[0]] > _LOSSES:
                raise KNError(
                    f"the executor lost a point {_LOSSES + 1} times ({type(error).__name__}: {error}); every point "
                    "that was finished is safe, run the same scan again to go on"
                ) from error
            self._hand_out(item)

    def _write(self, arrived: Sequence[tuple[int, Record | _Failure]]) -> None:
        """Enter the results; then raise what the first failing point raised."""
        records = [(position, result) for position, result in arrived if isinstance(result, Record)]
        if records:
            _enter(self.target, self.counter, records)
        for _position, result in arrived:
            if isinstance(result, _Failure):
                raise result.error


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
