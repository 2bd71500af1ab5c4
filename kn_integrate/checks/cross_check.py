"""One value by every independent route within a time budget, and what their agreement is worth."""

from __future__ import annotations

import math
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

from ..errors import InputError, KNError
from ..exact import read
from ..integrals import SphereIntegral
from .routes import Route, disk_routes, sphere_routes

EVIDENCE = "Agreement of independent routes is evidence, not proof."
VERDICTS = ("consistent", "disagreement", "too few routes")


@dataclass(frozen=True)
class Row:
    """One route and what came of it.

    Attributes
    ----------
    route, independent_of : str
    value : complex | None
        None when it gave no value; ``note`` says why.
    error : float | None
    agreement : float | None
        Decimal digits to which it agrees with the value of the smallest error.
    disagrees_with : tuple of str
        Routes from which it differs by more than both claimed errors.
    seconds : float
    note : str
    family : str
        What the route rests on.
    """

    route: str
    independent_of: str
    value: complex | None
    error: float | None
    agreement: float | None
    disagrees_with: tuple[str, ...]
    seconds: float
    note: str
    family: str


@dataclass(frozen=True)
class CrossCheck:
    """What :func:`cross_check` found.

    Attributes
    ----------
    verdict : str
        ``"consistent"``: every two routes agree within their claimed errors, and at least two rest on different
        foundations.  ``"disagreement"``, ``"too few routes"``.
    rows : tuple of Row
    suspect : str | None
        The route that disagrees with most of the others.
    value, error
        Of the route with the smallest claimed error.
    """

    verdict: str
    rows: tuple[Row, ...]
    suspect: str | None
    value: complex | None
    error: float | None

    def to_dict(self) -> dict[str, Any]:
        """Plain values, numbers as text."""
        from ..report.plain import plain

        keys = ("route", "value", "error", "agreement", "independent_of", "disagrees_with", "seconds", "note")
        rows = [{key: plain(getattr(row, key)) for key in keys} for row in self.rows]
        return {
            "verdict": self.verdict,
            "value": plain(self.value),
            "error": plain(self.error),
            "suspect": self.suspect,
            "rows": rows,
            "meaning": EVIDENCE,
        }

    def __str__(self) -> str:
        width = max((len(row.route) for row in self.rows), default=5)
        lines = [f"{'route':{width}s}  {'value':>40s} {'error':>8s} {'digits':>7s} {'sec':>7s}  independent of"]
        for row in self.rows:
            if row.value is None:
                lines.append(f"{row.route:{width}s}  {row.note}")
                continue
            digits = "-" if row.agreement is None else f"{row.agreement:.1f}"
            shown, other = _shown(row.value), row.independent_of
            lines.append(
                f"{row.route:{width}s}  {shown:>40s} {row.error:8.1e} {digits:>7s} {row.seconds:7.2f}  {other}"
            )
            if row.disagrees_with:
                lines.append(
                    f"{'':{width}s}  disagrees with {len(row.disagrees_with)}: {', '.join(row.disagrees_with)}"
                )
        lines.append(f"verdict: {self.verdict}" + (f"; suspect: {self.suspect}" if self.suspect else ""))
        lines.append(EVIDENCE)
        return "\n".join(lines)

    def html(self) -> str:
        """The report as one self-contained HTML page."""
        from .html import page

        return page(self)


def _shown(value: complex) -> str:
    return f"{value.real:.15g}" if not value.imag else f"{value.real:.15g}{value.imag:+.15g}j"


def cross_check(
    kin: Any,
    f: Any = None,
    g: Any = None,
    *,
    ordering: Sequence[int] | None = None,
    budget: Any = 10.0,
    rtol: float = 1e-12,
    threads: int = 1,
    routes: Sequence[Route] | None = None,
    report: Callable[[str], None] | None = None,
) -> CrossCheck:
    """Compute one integral by every route that applies and fits the budget, and compare.

    Parameters
    ----------
    kin, f, ordering
        A disk integral, as for :func:`kn_integrate.disk_integral`.
    g
        The right integrand: makes it the sphere integral J(f|g); a :class:`SphereIntegral` as f does too.
    budget
        Seconds; no further route is started once they are spent (the first two always run).
    rtol
        What each engine is asked for.
    threads
        Threads for quadrature.
    routes
        Other routes than the built-in ones; see :class:`kn_integrate.checks.routes.Route`.
    report
        Called with the name of each route as it starts.

    Returns
    -------
    CrossCheck
        Routes that gave no value are listed with the reason and not counted.

    Raises
    ------
    InputError

    Examples
    --------
    >>> import kn_integrate as kn
    >>> kin = kn.Mandelstams.from_planar(4, {(1, 2): "1/3", (2, 3): "1/5"})
    >>> kn.cross_check(kin, kn.parke_taylor(1, 2, 3, 4)).verdict
    'consistent'
    """
    limit = float(read(budget, "budget")[0])
    if not limit > 0:
        raise InputError("budget", str(budget), "a positive number of seconds")
    if routes is None:
        is_sphere = g is not None or isinstance(f, SphereIntegral) or hasattr(kin, "left")
        routes = sphere_routes(kin, f, g, rtol, threads) if is_sphere else disk_routes(kin, f, ordering, rtol, threads)
    start = time.perf_counter()
    answers: list[tuple[Route, complex | None, float, float, str]] = []
    for k, route in enumerate(routes):
        if k >= 2 and time.perf_counter() - start > limit:
            answers.append((route, None, math.inf, 0.0, "not run: the time budget is spent"))
            continue
        if report:
            report(route.name)
        before = time.perf_counter()
        try:
            value, error = route.run()
        except (KNError, ArithmeticError) as refused:
            answers.append((route, None, math.inf, time.perf_counter() - before, str(refused)))
            continue
        seconds = time.perf_counter() - before
        if not (math.isfinite(abs(value)) and math.isfinite(error)):
            answers.append((route, None, math.inf, seconds, "no finite value"))
            continue
        answers.append((route, value, error, seconds, ""))
    return _compared(answers)


def _compared(answers: Sequence[tuple[Route, complex | None, float, float, str]]) -> CrossCheck:
    known = [(route, value, error) for route, value, error, _, _ in answers if value is not None]
    best = min(known, key=lambda item: item[2], default=None)
    rows = []
    for route, value, error, seconds, note in answers:
        if value is None or best is None:
            rows.append(Row(route.name, route.independent_of, None, None, None, (), seconds, note, route.family))
            continue
        against = tuple(
            other.name
            for other, v, e in known
            if other is not route and not abs(v - value) <= e + error + 1e-15 * abs(v)
        )
        size = abs(best[1])
        off = max(abs(value - best[1]), best[2], 1e-17 * size)
        agreement = None if route is best[0] or not size else -math.log10(off / size)
        rows.append(
            Row(route.name, route.independent_of, value, error, agreement, against, seconds, note, route.family)
        )
    worst = max(rows, key=lambda row: len(row.disagrees_with), default=None)
    suspect = None
    if worst is not None and worst.disagrees_with:
        verdict = "disagreement"
        tops = [row for row in rows if len(row.disagrees_with) == len(worst.disagrees_with)]
        suspect = worst.route if len(tops) == 1 else None
    elif len({route.family for route, _, _ in known}) < 2:
        verdict = "too few routes"
    else:
        verdict = "consistent"
    if best is None:
        return CrossCheck(verdict, tuple(rows), suspect, None, None)
    return CrossCheck(verdict, tuple(rows), suspect, best[1], best[2])
