"""One writer for each store: an operating-system lock on a side file, gone the moment its owner is.

The lock is taken with ``flock``, which the system releases when the process ends in whatever way, so that a killed
scan never has to be unlocked by hand.  It is not taken on the store itself, because SQLite keeps its own locks there
and drops them when any descriptor of the same process on that file is closed.
"""

from __future__ import annotations

import os
import socket
from pathlib import Path
from types import TracebackType

from ..errors import InputError


class WriterLock:
    """A context in which nobody else writes to a store.

    Raises
    ------
    InputError
        On entry: when another writer is at work (named by process and host), or the folder cannot be written.
    """

    def __init__(self, store: Path) -> None:
        self.store = store
        self.path = store.with_name(store.name + ".lock")
        self._file: int | None = None

    def __enter__(self) -> WriterLock:
        while True:
            try:
                handle = os.open(self.path, os.O_RDWR | os.O_CREAT, 0o644)
            except OSError as error:
                raise InputError(
                    f"store {self.store}", f"a folder that cannot be written ({error.strerror})", "a writable folder"
                ) from None
            try:
                _lock(handle)
            except (BlockingIOError, PermissionError):
                owner = os.read(handle, 200).decode("utf-8", "replace").strip() or "another process"
                os.close(handle)
                raise InputError(
                    f"store {self.store}", f"a store that {owner} is writing to", "one writer at a time"
                ) from None
            except OSError as error:
                os.close(handle)
                raise InputError(
                    f"store {self.store}", f"a file system without locks ({error.strerror})", "one that has them"
                ) from None
            if self._is_current(handle):
                break
            os.close(handle)  # its owner removed the file between our open and our lock
        self._file = handle
        os.ftruncate(handle, 0)
        os.write(handle, f"process {os.getpid()} on {socket.gethostname()}\n".encode())
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._file is not None:
            self.path.unlink(missing_ok=True)  # while we own it, so that nobody else's file is removed
            os.close(self._file)
            self._file = None

    def _is_current(self, handle: int) -> bool:
        try:
            there = os.stat(self.path)
        except FileNotFoundError:
            return False
        ours = os.fstat(handle)
        return (there.st_ino, there.st_dev) == (ours.st_ino, ours.st_dev)


def _lock(handle: int) -> None:
    try:
        import fcntl
    except ImportError:  # Windows
        import msvcrt

        # beyond the text, so that others can still read who the owner is
        os.lseek(handle, 1000, os.SEEK_SET)
        msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)  # type: ignore[attr-defined]
        os.lseek(handle, 0, os.SEEK_SET)
        return
    fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
