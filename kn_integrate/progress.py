"""Progress of work that takes a while: a bar where somebody watches, a line now and then where a log is written.

Three faces: a bar on a terminal, a widget (or a bar, without the widget library) in a notebook, and elsewhere lines
such as ``scan: 120 of 500 (24 %), 3.2/s, 2 min left``.  The rate counts what was done in this run, not what an earlier
one left.
"""

from __future__ import annotations

import os
import sys
import time
from collections.abc import Callable
from types import TracebackType
from typing import Any, TextIO

FACES = ("auto", "bar", "notebook", "lines", "none")
_FIRST_PAUSE, _LONGEST_PAUSE = 2.0, 60.0  # seconds between lines; the pause doubles, for logs of long scans


class Progress:
    """A context that counts steps.

    Parameters
    ----------
    name
        What is counted.
    total
        All steps, those of earlier runs included.
    done
        Steps of earlier runs.
    face
        ``"bar"``, ``"notebook"``, ``"lines"``, ``"none"``, or ``"auto"``: a widget in a notebook, a bar on a terminal,
        lines elsewhere.
    stream
        Where to write; stderr when None.
    clock
        For tests.
    """

    def __init__(
        self,
        name: str,
        total: int,
        done: int = 0,
        face: str = "auto",
        stream: TextIO | None = None,
        clock: Callable[[], float] = time.monotonic,
    ) -> None:
        self.name, self.total, self.done, self.before = name, total, done, done
        self.stream = sys.stderr if stream is None else stream
        self.face = chosen_face(self.stream) if face == "auto" else face
        self.notes: dict[str, int] = {}
        self._clock = clock
        self._bar: Any = None
        self._started = self._last = clock()
        self._pause = _FIRST_PAUSE

    def __enter__(self) -> Progress:
        self._started = self._last = self._clock()
        options = {"total": self.total, "initial": self.done, "desc": self.name, "unit": ""}
        if self.face == "notebook":
            from tqdm.notebook import tqdm as widget

            self._bar = widget(**options)
        elif self.face == "bar":
            from tqdm import tqdm

            # A terminal that does not tell its size gets a bar for a usual one (tqdm would show nothing there).
            width = {"dynamic_ncols": True} if _columns(self.stream) else {"ncols": 80, "nrows": 24}
            self._bar = tqdm(file=self.stream, **width, **options)
        elif self.face == "lines":
            self._say(f"{self.name}: {self.done} of {self.total} there, {self.total - self.done} to do")
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._bar is not None:
            self._bar.close()
        elif self.face == "lines" and self.done > self.before:
            taken = duration(self._clock() - self._started)
            notes = "".join(f", {count} {note}" for note, count in sorted(self.notes.items()))
            self._say(f"{self.name}: {self.done} of {self.total} after {taken}{notes}")

    def step(self, note: str | None = None) -> None:
        """One more is done; a note (a status other than all well) is counted."""
        self.done += 1
        if note is not None:
            self.notes[note] = self.notes.get(note, 0) + 1
        if self._bar is not None:
            if note is not None:
                self._bar.set_postfix(self.notes, refresh=False)
            self._bar.update(1)
        elif self.face == "lines" and self._clock() - self._last >= self._pause:
            self._last = self._clock()
            self._pause = min(2 * self._pause, _LONGEST_PAUSE)
            self._say(self.line())

    def line(self) -> str:
        """Where it stands, how fast it goes and how long it will take."""
        elapsed = self._clock() - self._started
        steps = self.done - self.before
        percent = 100 * self.done // self.total if self.total else 100
        text = f"{self.name}: {self.done} of {self.total} ({percent} %)"
        if steps and elapsed > 0:
            rate = steps / elapsed
            text += f", {rate:.2g}/s, {duration((self.total - self.done) / rate)} left"
        return text + "".join(f", {count} {note}" for note, count in sorted(self.notes.items()))

    def _say(self, text: str) -> None:
        print(text, file=self.stream, flush=True)


def chosen_face(stream: TextIO) -> str:
    """What suits where this runs."""
    if _in_notebook():
        try:
            import ipywidgets  # noqa: F401
        except ImportError:
            return "bar"
        return "notebook"
    return "bar" if stream.isatty() else "lines"


def _columns(stream: TextIO) -> int:
    try:
        return os.get_terminal_size(stream.fileno()).columns
    except (OSError, ValueError):  # no terminal, no file
        return 0


def _in_notebook() -> bool:
    # IPython puts its shell here; a shell with a kernel is a notebook (or another front end that shows widgets).
    ipython = sys.modules.get("IPython")
    shell = None if ipython is None else ipython.get_ipython()
    return shell is not None and hasattr(shell, "kernel")


def duration(seconds: float) -> str:
    """A time that people read.

    >>> duration(3.2), duration(125), duration(9000), duration(200000)
    ('3.2 s', '2.1 min', '2.5 h', '2.3 days')
    """
    if seconds < 60:
        return f"{seconds:.2g} s"
    if seconds < 3600:
        return f"{seconds / 60:.2g} min" if seconds < 600 else f"{seconds / 60:.0f} min"
    return f"{seconds / 3600:.2g} h" if seconds < 48 * 3600 else f"{seconds / 86400:.2g} days"
