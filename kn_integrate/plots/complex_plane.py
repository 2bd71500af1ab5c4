"""The integrand of a sphere integral over the complex plane of one puncture: modulus and phase.

Gauge ``(z_1, z_(n-1), z_n) = (0, 1, infinity)``.  At four points the puncture is z_2; at five and more z_2 with the
others held at given places, a slice.  The factors of the puncture at infinity are dropped.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations
from pathlib import Path
from typing import Any

import numpy as np

from ..channels import pair_index
from ..errors import InputError
from ..exact import read, read_integer
from ._style import axes, check_target, png, save

MAX_SIDE = 1200


@dataclass(frozen=True)
class ComplexPlane:
    """What the figure shows.

    Attributes
    ----------
    x, y : tuple of float
        Grid values of the real and the imaginary part of z_2.
    modulus, phase : tuple of tuple of float
        ``log10`` of the modulus, and the phase in units of pi, one row for each y; None at punctures.
    held : mapping
        Where the other finite punctures stand, by label.
    """

    x: tuple[float, ...]
    y: tuple[float, ...]
    modulus: tuple[tuple[float | None, ...], ...]
    phase: tuple[tuple[float | None, ...], ...]
    held: dict[int, complex]

    def to_dict(self) -> dict[str, Any]:
        """Plain data."""
        return {
            "x": list(self.x),
            "y": list(self.y),
            "log10 modulus": [list(row) for row in self.modulus],
            "phase over pi": [list(row) for row in self.phase],
            "held": {str(label): [z.real, z.imag] for label, z in self.held.items()},
        }

    def draw(self, path: str | Path | None = None) -> Any:
        """The matplotlib figure, written to a .png, .pdf or .svg file where a path is given."""
        if path is not None:
            check_target(path)
        with axes(7.2, 3.2) as (figure, left):
            left.remove()
            areas = figure.subplots(1, 2, sharey=True)
            box = (self.x[0], self.x[-1], self.y[0], self.y[-1])
            # perceptually even for the modulus; a cyclic map for the phase, so that -1 and 1 look the same
            for area, table, colours, name in (
                (areas[0], self.modulus, "cividis", "log10 of the modulus"),
                (areas[1], self.phase, "twilight", "phase / pi"),
            ):
                values = np.array([[math.nan if v is None else v for v in row] for row in table])
                limits = {"vmin": -1.0, "vmax": 1.0} if colours == "twilight" else {}
                image = area.imshow(values, origin="lower", extent=box, cmap=colours, aspect="equal", **limits)
                figure.colorbar(image, ax=area, shrink=0.8, label=name)
                for label, z in self.held.items():
                    area.plot([z.real], [z.imag], marker="o", markersize=3, color="white", markeredgecolor="black")
                    area.annotate(f"z{label}", (z.real, z.imag), textcoords="offset points", xytext=(4, 4), fontsize=7)
                area.set_xlabel("Re z2")
            areas[0].set_ylabel("Im z2")
        if path is not None:
            save(figure, path)
        return figure

    def _repr_png_(self) -> bytes:
        return png(self.draw())


def complex_plane(
    kin: Any,
    f: Any = None,
    g: Any = None,
    *,
    held: Sequence[Any] = (),
    window: Sequence[Any] = (-1, 2, "-3/2", "3/2"),
    side: int = 200,
) -> ComplexPlane:
    """Modulus and phase of ``prod |z_ij|^{2 s_ij} f conj(g)`` over the plane of z_2.

    Parameters
    ----------
    kin, f, g
        The sphere integral, as for :func:`kn_integrate.sphere_integral`.
    held
        Places of z_3, ..., z_{n-2}, one for each (none at four points).
    window
        First and last real part, first and last imaginary part.
    side
        Grid values on each axis, at most 1200.

    Raises
    ------
    InputError

    Examples
    --------
    >>> import kn_integrate as kn
    >>> kin = kn.Mandelstams.from_planar(4, {(1, 2): "1/2", (2, 3): "1/3"})
    >>> figure = complex_plane(kin, kn.parke_taylor(1, 2, 3, 4), side=5)
    >>> len(figure.modulus), len(figure.x)
    (5, 5)
    """
    from ..sphere.evaluate import sphere_terms

    n, terms = sphere_terms(kin, f, g)
    count = read_integer(side, "side", "an integer")
    if not 2 <= count <= MAX_SIDE:
        raise InputError("side", count, f"between 2 and {MAX_SIDE}")
    places = [complex(read(z, f"held, entry {k}")[0].value()) for k, z in enumerate(held, start=1)]
    if len(places) != n - 4:
        raise InputError("held", f"{len(places)} places", f"{n - 4}: one for each of z_3..z_{n - 2}")
    edges = [read(value, "window")[0] for value in window]
    if len(edges) != 4 or not all(e.is_real for e in edges) or not (edges[0] < edges[1] and edges[2] < edges[3]):
        raise InputError("window", str([str(e) for e in edges]), "real numbers: first < last, twice")
    fixed: dict[int, complex] = {1: 0.0 + 0.0j, n - 1: 1.0 + 0.0j}
    fixed.update(dict(zip(range(3, n - 1), places, strict=True)))
    x = np.linspace(float(edges[0]), float(edges[1]), count)
    y = np.linspace(float(edges[2]), float(edges[3]), count)
    z = x[None, :] + 1j * y[:, None]
    index = pair_index(n)
    total = np.zeros(z.shape, dtype=complex)
    with np.errstate(all="ignore"):
        for term in terms:
            log = np.full(z.shape, cmath.log(complex(term.coefficient.value())), dtype=complex)
            for i, j in combinations(range(1, n), 2):
                k = index[i, j]
                difference = np.asarray((z if i == 2 else fixed[i]) - (z if j == 2 else fixed[j]), dtype=complex)
                size, turn = np.log(np.abs(difference)), np.angle(difference)
                log = log + (2 * term.pairs[k].value() + term.left[k] + term.right[k]) * size
                log = log + 1j * (term.left[k] - term.right[k]) * turn
            total = total + np.exp(log)
        modulus, phase = np.log10(np.abs(total)), np.angle(total) / math.pi
    return ComplexPlane(tuple(x.tolist()), tuple(y.tolist()), _table(modulus), _table(phase), fixed)


def _table(values: Any) -> tuple[tuple[float | None, ...], ...]:
    return tuple(tuple(v if math.isfinite(v) else None for v in row) for row in values.tolist())
