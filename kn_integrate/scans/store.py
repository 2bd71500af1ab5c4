"""The file that a scan leaves: SQLite, every finished point in it at once, nothing ever taken back.

Schema (version 1)::

    about(name TEXT PRIMARY KEY, value TEXT)
        'task'  the integral and the options, canonical JSON
        'hash'  SHA-256 of that text
        'made'  time of creation, UTC
    versions(id INTEGER PRIMARY KEY, text TEXT UNIQUE)
        JSON: versions of the package, Python, and the numerical libraries
    points(position INTEGER PRIMARY KEY, key TEXT UNIQUE, coordinates TEXT, kinematics TEXT)
        position  from 1, in the order of first mention
        key       SHA-256 of the kinematics: a point is computed once, however often it is asked for
        coordinates, kinematics   JSON, exact numbers as text
    results(position INTEGER PRIMARY KEY, real TEXT, imaginary TEXT, error TEXT, status TEXT, method TEXT,
            evaluations INTEGER, note TEXT, seconds REAL, finished TEXT, versions INTEGER, job TEXT)
        real, imaginary, error   all digits as text; imaginary NULL for a real number, real NULL for no number
        status    OK, ZERO, INACCURATE, ROUND_OFF, NOT_FINITE, ON_POLE, WORK_LIMIT
        job       the hash of the task, so that a row copied elsewhere still tells what it is
    rows      a view that joins the two

A rollback journal with full synchronisation is used, not a write-ahead log: one file is the whole store, it works on
network file systems, and readers need no shared memory.  What a killed writer leaves half-written is rolled back by
the next connection (common practice; SQLite documentation, "Atomic Commit").
"""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from datetime import UTC, datetime
from pathlib import Path
from types import TracebackType
from typing import Any

from ..errors import InputError, KNError
from .lock import WriterLock
from .points import ScanPoint
from .task import Record, Task, canonical, digest

APPLICATION = 0x4B4E5331  # "KNS1", in the header of the file
SCHEMA = 1

_TABLES = """
CREATE TABLE about(name TEXT PRIMARY KEY, value TEXT NOT NULL);
CREATE TABLE versions(id INTEGER PRIMARY KEY, text TEXT NOT NULL UNIQUE);
CREATE TABLE points(
    position INTEGER PRIMARY KEY, key TEXT NOT NULL UNIQUE, coordinates TEXT NOT NULL, kinematics TEXT NOT NULL);
CREATE TABLE results(
    position INTEGER PRIMARY KEY REFERENCES points(position),
    real TEXT, imaginary TEXT, error TEXT, status TEXT NOT NULL, method TEXT NOT NULL, evaluations INTEGER NOT NULL,
    note TEXT NOT NULL, seconds REAL NOT NULL, finished TEXT NOT NULL,
    versions INTEGER NOT NULL REFERENCES versions(id), job TEXT NOT NULL);
CREATE VIEW rows AS
    SELECT points.position, key, coordinates, kinematics, real, imaginary, error, status, method, evaluations, note,
           seconds, finished, versions.text AS versions, job
    FROM points JOIN results USING (position) JOIN versions ON versions.id = results.versions
    ORDER BY points.position;
"""


class StoreError(KNError):
    """The store could not be written any more; what it holds is safe, and the scan can go on from it.

    Attributes
    ----------
    path : str
    reason : str
    """

    def __init__(self, path: str, reason: str) -> None:
        self.path = path
        self.reason = reason
        super().__init__(
            f"store {path}: {reason}; every point that was finished before is safe, run the same scan again to go on"
        )

    def __reduce__(self) -> tuple[Any, ...]:
        return (type(self), (self.path, self.reason))


class Store:
    """A store opened for writing; a context manager that holds the writer's lock.

    Raises
    ------
    InputError
        On entry: when the file is no store, belongs to another task, is being written by somebody else, or cannot be
        written.
    """

    def __init__(self, path: str | Path, task: Task) -> None:
        self.path = Path(path)
        self.task = task
        self._lock = WriterLock(self.path)
        self._connection: sqlite3.Connection
        self._versions = 0

    def __enter__(self) -> Store:
        self._lock.__enter__()
        try:
            self._connection = _connect(self.path)
            try:
                self._prepare()
            except BaseException:
                self._connection.close()
                raise
        except BaseException:
            self._lock.__exit__(None, None, None)
            raise
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._connection.close()
        self._lock.__exit__(kind, error, trace)

    def add_points(self, points: Sequence[ScanPoint]) -> list[int]:
        """Enter the points that are not there yet; the position of each, repeated where a point is."""
        with self._writing():
            held = dict(self._connection.execute("SELECT key, position FROM points").fetchall())
            positions, new = [], []
            for point in points:
                kinematics = point.kinematics
                key = digest(kinematics)
                if key not in held:
                    held[key] = len(held) + 1
                    new.append((held[key], key, json.dumps(dict(point.coordinates)), canonical(kinematics)))
                positions.append(held[key])
            self._connection.executemany("INSERT INTO points VALUES (?, ?, ?, ?)", new)
        return positions

    def finished(self) -> set[int]:
        """The positions that have a result."""
        return {row[0] for row in self._connection.execute("SELECT position FROM results")}

    def write(self, results: Sequence[tuple[int, Record]]) -> None:
        """Enter results, all or none; on return they are on the disk.

        Raises
        ------
        StoreError
            When the disk is full or has become unwritable.
        """
        now = datetime.now(UTC).isoformat(timespec="seconds")
        rows = [
            (
                position,
                r.real,
                r.imaginary,
                r.error,
                r.status,
                r.method,
                r.evaluations,
                r.note,
                r.seconds,
                now,
                self._versions,
                self.task.hash,
            )
            for position, r in results
        ]
        with self._writing():
            self._connection.executemany("INSERT INTO results VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)", rows)

    @contextmanager
    def _writing(self) -> Iterator[None]:
        try:
            self._connection.execute("BEGIN IMMEDIATE")
            yield
            self._connection.execute("COMMIT")
        except sqlite3.OperationalError as error:
            self._roll_back()
            raise StoreError(str(self.path), str(error)) from None
        except BaseException:
            self._roll_back()
            raise

    def _roll_back(self) -> None:
        # SQLite has rolled back by itself after some errors (a full disk); the journal stays for the next opening
        # where even that fails.
        if self._connection.in_transaction:
            try:
                self._connection.execute("ROLLBACK")
            except sqlite3.OperationalError:
                self._connection.close()

    def _prepare(self) -> None:
        from ..report.versions import versions

        try:
            self._connection.execute("PRAGMA journal_mode = DELETE")
            self._connection.execute("PRAGMA synchronous = FULL")
            if _is_empty(self._connection):
                made = datetime.now(UTC).isoformat(timespec="seconds")
                about = {"task": self.task.text, "hash": self.task.hash, "made": made}
                with self._writing():
                    for statement in _TABLES.split(";\n"):
                        self._connection.execute(statement)
                    self._connection.executemany("INSERT INTO about VALUES (?, ?)", about.items())
                    self._connection.execute(f"PRAGMA application_id = {APPLICATION}")
                    self._connection.execute(f"PRAGMA user_version = {SCHEMA}")
            about = _read_about(self._connection, self.path)
            if about["hash"] != self.task.hash:
                if self.finished():
                    found = "; ".join(_differences(json.loads(about["task"]), self.task.to_dict()))
                    raise InputError(
                        f"store {self.path}", f"results of another scan ({found})", "the same scan, or a new file"
                    )
                # A first try that failed before any result (a mistyped option, say) binds nobody.
                with self._writing():
                    self._connection.execute("DELETE FROM points")
                    for name, value in (("task", self.task.text), ("hash", self.task.hash)):
                        self._connection.execute("UPDATE about SET value = ? WHERE name = ?", (value, name))
            text = canonical(versions())
            with self._writing():
                self._connection.execute("INSERT OR IGNORE INTO versions(text) VALUES (?)", (text,))
            (self._versions,) = self._connection.execute("SELECT id FROM versions WHERE text = ?", (text,)).fetchone()
        except StoreError as error:
            raise InputError(f"store {self.path}", error.reason, "a file that can be written") from None
        except sqlite3.DatabaseError as error:
            raise InputError(f"store {self.path}", str(error), "a store of kn-integrate scan, or a new file") from None


def read_store(path: str | Path) -> tuple[dict[str, str], int, list[tuple[Any, ...]]]:
    """All of a store, without writing to it: what it is about, the number of points asked for, the rows of the view.

    It may be read while a scan writes to it.

    Raises
    ------
    InputError
        When there is no such file, or it is no store.
    """
    where = Path(path)
    if not where.is_file():
        raise InputError(f"store {where}", "no such file", "a store of kn-integrate scan")
    # Not mode=ro: what a killed writer left in the journal has to be rolled back first, where the folder allows it.
    connection = _connect(where)
    try:
        about = _read_about(connection, where)
        (total,) = connection.execute("SELECT count(*) FROM points").fetchone()
        return about, total, connection.execute("SELECT * FROM rows").fetchall()
    except sqlite3.DatabaseError as error:
        raise InputError(f"store {where}", str(error), "a store of kn-integrate scan") from None
    finally:
        connection.close()


def _connect(path: Path) -> sqlite3.Connection:
    try:
        return sqlite3.connect(path, timeout=60, isolation_level=None)
    except sqlite3.OperationalError as error:
        raise InputError(f"store {path}", str(error), "a file that can be opened") from None


def _is_empty(connection: sqlite3.Connection) -> bool:
    return not connection.execute("SELECT 1 FROM sqlite_master LIMIT 1").fetchone()


def _read_about(connection: sqlite3.Connection, path: Path) -> dict[str, str]:
    (application,) = connection.execute("PRAGMA application_id").fetchone()
    (schema,) = connection.execute("PRAGMA user_version").fetchone()
    if application != APPLICATION:
        raise InputError(
            f"store {path}", "a file that is no store of a scan", "a store of kn-integrate scan, or a new file"
        )
    if schema != SCHEMA:
        raise InputError(
            f"store {path}", f"schema version {schema}", f"version {SCHEMA}; use the release that wrote it"
        )
    return dict(connection.execute("SELECT name, value FROM about").fetchall())


def _differences(held: dict[str, Any], asked: dict[str, Any]) -> Iterator[str]:
    for part in sorted({*held, *asked}):
        ours, theirs = asked.get(part, {}), held.get(part, {})
        for key in sorted({*ours, *theirs}):
            if ours.get(key) != theirs.get(key):
                yield f"{key}: {theirs.get(key)} there, {ours.get(key)} asked for"
