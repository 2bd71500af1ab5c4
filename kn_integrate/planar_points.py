"""Many kinematic points as one array of planar invariants."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .channels import Channel, dotted, planar_channels, read_count, read_ordering
from .errors import InputError
from .exact import Exact
from .kinematics import Mandelstams
from .planar import planar_key


@dataclass(frozen=True, init=False, eq=False)
class PlanarPoints:
    """P kinematic points of n legs, given by the planar invariants of one ordering in double precision.

    Doubles are taken at their exact binary value, as everywhere.

    Parameters
    ----------
    n
        Number of legs.
    values
        (P, n(n-3)/2) real array; or a mapping from channels (tuples of all labels) to arrays or numbers.
    channels
        The channels of the columns; :func:`planar_channels` of the ordering when None.
    ordering, row_sums, string
        As for :meth:`Mandelstams.from_planar`.

    Raises
    ------
    InputError
        For a wrong shape, numbers that are not finite, and what :meth:`Mandelstams.from_planar` raises.

    Examples
    --------
    >>> points = PlanarPoints(4, {(1, 2): [0.25, 0.5], (2, 3): 0.5})
    >>> len(points), points[1].pair(1, 2)
    (2, Exact('1/2'))
    """

    n: int
    values: NDArray[np.float64]
    channels: tuple[Channel, ...]
    ordering: Channel
    row_sums: tuple[Exact, ...] = field(default=())
    string: str | None = None

    def __init__(
        self,
        n: int,
        values: Any,
        channels: Sequence[Sequence[int]] | None = None,
        ordering: Sequence[int] | None = None,
        row_sums: Any = 0,
        string: str | None = None,
    ) -> None:
        n = read_count(n)
        order = read_ordering(ordering, n)
        if isinstance(values, Mapping):
            if channels is not None:
                raise InputError("channels", repr(tuple(channels)), "none beside a mapping, which names them")
            channels = tuple(values)
            try:
                columns = np.broadcast_arrays(*[np.atleast_1d(np.asarray(v, dtype=float)) for v in values.values()])
            except (TypeError, ValueError) as error:
                raise InputError("values", str(error), "real numbers and arrays of one length") from None
            values = np.stack(columns, axis=-1) if columns else np.empty((0, 0))
        try:
            array = np.array(values)
            if array.dtype.kind not in "iuf":
                raise ValueError
            array = array.astype(np.float64)
        except (TypeError, ValueError):
            raise InputError("values", type(values).__name__, "an array of real numbers") from None
        names = tuple(planar_channels(order) if channels is None else (tuple(c) for c in channels))
        expected = n * (n - 3) // 2
        if len(names) != expected:
            raise InputError("channels", f"{len(names)} channels", f"n(n-3)/2 = {expected}")
        if array.ndim != 2 or array.shape[1] != expected:
            raise InputError("values", f"an array of shape {array.shape}", f"shape (P, {expected})")
        if not np.isfinite(array).all():
            row = int(np.flatnonzero(~np.isfinite(array).all(axis=1))[0])
            raise InputError(f"values, row {row}", str(array[row].tolist()), "finite numbers")
        sample = Mandelstams.from_planar(n, {c: Fraction(0) for c in names}, order, row_sums, string)
        array.setflags(write=False)
        for name, value in (
            ("n", n),
            ("values", array),
            ("channels", tuple(planar_key(c, n, order) for c in names)),
            ("ordering", order),
            ("row_sums", sample.row_sums),
            ("string", sample.string),
        ):
            object.__setattr__(self, name, value)

    def __len__(self) -> int:
        return len(self.values)

    def __getitem__(self, k: int) -> Mandelstams:
        """Point k, the doubles taken exactly."""
        row = self.values[k]
        if row.ndim != 1:
            raise InputError("index", repr(k), "one integer")
        return self.at(dict(zip(self.channels, map(Fraction, row.tolist()), strict=True)))

    def __iter__(self) -> Iterator[Mandelstams]:
        return (self[k] for k in range(len(self)))

    def at(self, invariants: Mapping[Channel, Fraction]) -> Mandelstams:
        """A point of the same kind at exact invariants, all channels given."""
        return Mandelstams.from_planar(self.n, invariants, self.ordering, self.row_sums, self.string)

    def __repr__(self) -> str:
        return f"PlanarPoints(n={self.n}, {len(self)} points, ordering={dotted(self.ordering)})"
