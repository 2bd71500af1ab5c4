"""One look for all figures, and no state shared with anybody's own plots.

Colours are those of M. Okabe and K. Ito, "Color Universal Design" (2008), which people with any common colour
blindness tell apart; every curve also has its own dash or marker, so that a print in grey can be read.  Figures are
made without pyplot: no global list of figures, no display, any thread.
"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from io import BytesIO
from itertools import cycle, islice
from pathlib import Path
from typing import Any

from ..errors import InputError, NotAvailableError

BLACK, ORANGE, SKY, GREEN, YELLOW, BLUE, RED, PURPLE = (
    "#000000",
    "#E69F00",
    "#56B4E9",
    "#009E73",
    "#F0E442",
    "#0072B2",
    "#D55E00",
    "#CC79A7",
)
# Yellow is left out of lines: too light on paper.
LINES = (BLUE, RED, GREEN, PURPLE, ORANGE, SKY, BLACK)
DASHES = ("-", "--", "-.", ":", (0, (5, 1, 1, 1, 1, 1)))
MARKERS = ("o", "s", "^", "D", "v", "P", "X")
SUFFIXES = (".png", ".pdf", ".svg")

_SETTINGS: Any = {
    "font.size": 9,
    "axes.labelsize": 9,
    "axes.titlesize": 9,
    "legend.fontsize": 8,
    "legend.frameon": False,
    "xtick.labelsize": 8,
    "ytick.labelsize": 8,
    "axes.linewidth": 0.6,
    "lines.linewidth": 1.2,
    "lines.markersize": 4,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "pdf.fonttype": 42,  # fonts stay text in print
    "svg.hashsalt": "kn-integrate",  # the same file for the same figure
    "svg.fonttype": "none",
}


@contextmanager
def axes(width: float = 5.0, height: float = 3.4) -> Iterator[tuple[Any, Any]]:
    """A figure and its axes in this style; inches.

    Raises
    ------
    NotAvailableError
        When matplotlib is not installed.
    """
    try:
        import matplotlib
        from matplotlib.figure import Figure
    except ImportError:
        raise NotAvailableError(
            "drawing needs matplotlib, which is not installed: pip install 'kn-integrate[plot]'"
        ) from None
    with matplotlib.rc_context(_SETTINGS):
        figure = Figure(figsize=(width, height), layout="constrained")
        yield figure, figure.add_subplot()


def line_style(k: int) -> dict[str, Any]:
    """Colour and dash of the k-th curve, from 0; pairs repeat after 35."""
    return {"color": LINES[k % len(LINES)], "linestyle": DASHES[k % len(DASHES)]}


def marker_styles(count: int) -> list[dict[str, Any]]:
    """Colours and markers for several series."""
    pairs = zip(cycle(LINES), cycle(MARKERS), strict=False)
    return [{"color": color, "marker": marker} for color, marker in islice(pairs, count)]


def check_target(path: str | Path) -> None:
    """Refuse a file name before the work for the figure is done.

    Raises
    ------
    InputError
        For a name that does not end in .png, .pdf or .svg.
    """
    if Path(path).suffix.lower() not in SUFFIXES:
        raise InputError("figure", repr(str(path)), "a file name ending in " + ", ".join(SUFFIXES))


def save(figure: Any, path: str | Path) -> None:
    """Write the figure; the same figure gives the same bytes.

    Raises
    ------
    InputError
        For a name that does not end in .png, .pdf or .svg, and for a file that cannot be written.
    """
    check_target(path)
    kind = Path(path).suffix.lower()[1:]
    dateless = {"png": {"Software": None}, "pdf": {"CreationDate": None}, "svg": {"Date": None}}[kind]
    try:
        import matplotlib

        with matplotlib.rc_context(_SETTINGS):
            figure.savefig(path, dpi=200, format=kind, metadata=dateless)
    except OSError as error:
        raise InputError("figure", f"{path}: {error.strerror}", "a file that can be written") from None


def png(figure: Any) -> bytes:
    """The figure as a PNG, for notebooks."""
    target = BytesIO()
    figure.savefig(target, dpi=120, format="png")
    return target.getvalue()
