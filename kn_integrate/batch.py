"""One disk integral at many kinematic points in one call."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .api import disk_integral
from .dispatch.family import disk_family
from .dispatch.request import Request, make_request
from .errors import InputError, NotAvailableError, PoleError, Status, WorkLimitError
from .exponents import DiskExponents
from .integrals import DiskIntegral
from .integrand import Integrand
from .kinematics import Mandelstams
from .planar_points import PlanarPoints

ON_POLE, WORK_LIMIT, NOT_AVAILABLE = "ON_POLE", "WORK_LIMIT", "NOT_AVAILABLE"


@dataclass(frozen=True, eq=False)
class DiskBatch:
    """Results for P points, as arrays that cannot be written to.

    Attributes
    ----------
    value : (P,) float64 or complex128
        nan where there is no number (see ``status``).
    error : (P,) float64
        Bounds on ``abs(value - truth)``; inf where there is no number.
    status : (P,) str
        The name of a :class:`~kn_integrate.Status`, or ``"ON_POLE"``, ``"WORK_LIMIT"``, ``"NOT_AVAILABLE"``.
    method : (P,) str
    evaluations : (P,) int64
        Integrand evaluations (series terms for series).
    notes : tuple of (int, str)
        What a point without a number had to say.
    rtol, atol : float
        The request.
    """

    value: NDArray[Any]
    error: NDArray[np.float64]
    status: NDArray[np.str_]
    method: NDArray[np.str_]
    evaluations: NDArray[np.int64]
    notes: tuple[tuple[int, str], ...]
    rtol: float
    atol: float

    def __len__(self) -> int:
        return len(self.value)

    @property
    def ok(self) -> NDArray[np.bool_]:
        """Which points are finite and meet the request."""
        return np.asarray(self.status == Status.OK.name)

    def row(self, k: int) -> dict[str, Any]:
        """Point k in plain values."""
        return {
            "value": self.value[k].item(),
            "error": self.error[k].item(),
            "status": str(self.status[k]),
            "method": str(self.method[k]),
            "evaluations": int(self.evaluations[k]),
        }

    def __iter__(self) -> Iterator[dict[str, Any]]:
        return (self.row(k) for k in range(len(self)))

    def to_dict(self) -> dict[str, Any]:
        """A JSON-ready dictionary of columns: numbers as text, complex as ``[re, im]``, never NaN."""
        from .report.plain import plain_number

        return {
            "value": [plain_number(x) for x in self.value.tolist()],
            "error": [plain_number(x) for x in self.error.tolist()],
            "status": self.status.tolist(),
            "method": self.method.tolist(),
            "evaluations": self.evaluations.tolist(),
            "notes": [list(note) for note in self.notes],
            "rtol": plain_number(self.rtol),
            "atol": plain_number(self.atol),
        }

    def __str__(self) -> str:
        names, counts = np.unique(self.status, return_counts=True)
        found = ", ".join(f"{count} {name}" for name, count in zip(names.tolist(), counts.tolist(), strict=True))
        return f"{len(self)} disk integrals: {found or 'none'}"


def disk_batch(
    points: PlanarPoints | Sequence[Mandelstams | DiskExponents],
    f: Integrand | DiskIntegral | str | None = None,
    *,
    ordering: Sequence[int] | None = None,
    rtol: float | None = None,
    atol: float = 0,
    method: str = "auto",
    max_points: float | None = None,
    threads: int = 1,
) -> DiskBatch:
    """:func:`disk_integral` at many points, with the same bits, in one call.

    Integrals of up to six punctures whose chord exponents are real and above -0.85 are done in compiled code at a few
    microseconds each; the others take as long as single calls.  Quickest from :class:`PlanarPoints`, an array of
    doubles.

    Parameters
    ----------
    points
        :class:`PlanarPoints`, or a sequence of kinematic points (or of :class:`DiskExponents`, then without f).
    f, ordering, rtol, atol, method, max_points
        As for :func:`disk_integral`; f is the same at all points.
    threads
        Python threads; the bits of the results do not depend on it.

    Returns
    -------
    DiskBatch
        One row for every point, in order.  A point on a pole, beyond ``max_points``, or that ``method`` does not serve
        is a row with that status and no number.

    Raises
    ------
    InputError
        For input that is not well formed; names the point where one is at fault.

    Examples
    --------
    >>> import numpy as np, kn_integrate as kn
    >>> points = kn.PlanarPoints(4, {(1, 2): np.array([0.0, 0.5, 1.0]), (2, 3): 0.5})
    >>> batch = kn.disk_batch(points, "PT(1,2,3,4)")
    >>> batch.status.tolist(), batch.value[1:].round(10).tolist()
    (['ON_POLE', 'OK', 'OK'], [3.1415926536, 2.0])
    """
    request = make_request(rtol=rtol, atol=atol, method=method, max_points=max_points, threads=threads)
    if callable(f):
        raise InputError("f", "a function of kinematics", "an integrand with constant coefficients, or single calls")
    if not isinstance(points, PlanarPoints):
        points = tuple(points)
    count = len(points)
    columns = _Columns(count, request)
    quick = method != "kz" and max_points is None
    if count and quick:
        done = _at_once(points, f, ordering, request, columns)
    else:
        done = np.zeros(count, dtype=bool)
    for k in np.flatnonzero(~done).tolist():
        columns.single(k, points[k], f, ordering, method, max_points)
    return columns.batch()


def at_once(
    points: Sequence[Mandelstams | DiskExponents],
    f: Any = None,
    *,
    ordering: Sequence[int] | None = None,
    rtol: float | None = None,
    atol: float = 0,
) -> tuple[NDArray[np.bool_], DiskBatch]:
    """Only the points that compiled code can do: which they are, and a batch whose other rows hold nothing."""
    request = make_request(rtol=rtol, atol=atol)
    columns = _Columns(len(points), request)
    done = _at_once(tuple(points), f, ordering, request, columns)
    return done, columns.batch()


def _at_once(
    points: PlanarPoints | tuple[Any, ...], f: Any, ordering: Any, request: Request, columns: _Columns
) -> NDArray[np.bool_]:
    """Do what compiled code can do; which points that was."""
    from .disk.chords import chord_data
    from .disk.rows import QUICK_N, integrate_rows, rows_of
    from .dispatch.batch import affine_rows

    nobody = np.zeros(len(points), dtype=bool)
    if points[0].n > QUICK_N:
        return nobody
    if isinstance(points, PlanarPoints):
        array = points

        def terms_at(row: Sequence[Fraction]) -> Any:
            return disk_family(array.at(dict(zip(array.channels, row, strict=True))), f, ordering).terms_at({})

        found = affine_rows(array.n, array.values, terms_at)
        if found is not None and found[0]:
            results = integrate_rows(array.n, *found, request.rtol, request.atol, request.threads)
            columns.enter(np.arange(len(array)), results)
            return columns.done
    groups: dict[tuple[int, Any], list[tuple[int, Any]]] = {}
    for k, point in enumerate(points):
        terms = _family(k, point, f, ordering).terms_at({})
        groups.setdefault((point.n, tuple(t.coefficient for t in terms)), []).append((k, terms))
    for (n, coefficients), members in groups.items():
        if not coefficients or n > QUICK_N:
            continue
        data = [[chord_data(n, terms[t].pairs) for _, terms in members] for t in range(len(coefficients))]
        rows_found = [rows_of(column) for column in data]
        if any(row is None for row in rows_found):
            continue  # complex ones among them
        values = [coefficient.value() for coefficient in coefficients]
        results = integrate_rows(
            n, [row for row in rows_found if row], values, request.rtol, request.atol, request.threads
        )
        columns.enter(np.array([k for k, _ in members]), results)
    return columns.done


def _family(k: int, point: Any, f: Any, ordering: Any) -> Any:
    try:
        return disk_family(point, f, ordering)
    except InputError as error:
        raise InputError(f"points, entry {k + 1}: {error.field}", error.found, error.expected) from None


class _Columns:
    """The results while they are being filled in."""

    def __init__(self, count: int, request: Request) -> None:
        self.request = request
        self.done = np.zeros(count, dtype=bool)
        self.value: NDArray[Any] = np.full(count, np.nan)
        self.error = np.full(count, np.inf)
        self.status = np.full(count, Status.OK.name, dtype="<U16")
        self.method = np.full(count, "quadrature", dtype="<U16")
        self.evaluations = np.zeros(count, dtype=np.int64)
        self.notes: list[tuple[int, str]] = []

    def enter(self, places: NDArray[np.int64], results: Any) -> None:
        """Take over what was done of an array of points."""
        fine = places[results.done]
        self.value[fine] = results.value[results.done]
        self.error[fine] = results.error[results.done]
        self.evaluations[fine] = results.evaluations[results.done]
        self.done[fine] = True

    def single(self, k: int, point: Any, f: Any, ordering: Any, method: str, max_points: float | None) -> None:
        """One point by itself."""
        request = self.request
        try:
            found = disk_integral(
                point,
                f,
                ordering=ordering,
                rtol=request.rtol,
                atol=request.atol,
                method=method,
                max_points=max_points,
                threads=request.threads,
            )
        except InputError as error:
            raise InputError(f"points, entry {k + 1}: {error.field}", error.found, error.expected) from None
        except (PoleError, WorkLimitError, NotAvailableError) as error:
            names = {PoleError: ON_POLE, WorkLimitError: WORK_LIMIT, NotAvailableError: NOT_AVAILABLE}
            self.status[k], self.method[k] = names[type(error)], ""
            self.notes.append((k, str(error)))
            return
        if isinstance(found.value, complex) and self.value.dtype.kind != "c":
            self.value = self.value.astype(complex)
        self.value[k], self.error[k] = found.value, found.error
        self.status[k], self.method[k] = found.status.name, found.method
        self.evaluations[k] = found.evaluations

    def batch(self) -> DiskBatch:
        """The finished columns."""
        for column in (self.value, self.error, self.status, self.method, self.evaluations):
            column.setflags(write=False)
        return DiskBatch(
            self.value,
            self.error,
            self.status,
            self.method,
            self.evaluations,
            tuple(self.notes),
            self.request.rtol,
            self.request.atol,
        )
