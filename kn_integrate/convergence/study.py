"""The study of one integral: rules, peers, rates, as a table, as JSON, and as data for a plot."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..dispatch import integrate_disk_terms
from ..dispatch.family import disk_family
from ..errors import InputError, PoleError
from ..exact import read
from .peers import PEERS, run_peer
from .rules import applicable, predicted_rate, run_rule

DIGITS = (2.0, 3.0, 4.0, 5.0, 6.0, 7.0, 8.0, 9.0, 10.0, 11.0, 12.0, 13.0, 14.0)
FLOOR = 1e-13  # relative errors below this are round-off and say nothing about a rate


@dataclass(frozen=True)
class Measurement:
    """One run: who, with what setting, how many evaluations, how long, how far off, and what it claimed."""

    name: str
    setting: str
    evaluations: int
    nodes: float | None
    seconds: float
    error: float
    claimed: float | None


@dataclass(frozen=True)
class Convergence:
    """What :func:`converge` found.

    Attributes
    ----------
    reference : complex
        The value that errors are measured against.
    reference_error : float
        The bound on its error, relative.
    reference_method : str
    measurements : tuple of Measurement
        Errors are relative to the reference.
    rates : mapping
        rule -> (fitted, predicted) decimal digits per node; None where there are too few points for a fit.
    remarks : mapping
        Why a rule or peer has no (or no further) rows.
    """

    reference: complex
    reference_error: float
    reference_method: str
    measurements: tuple[Measurement, ...]
    rates: dict[str, tuple[float | None, float]]
    remarks: dict[str, str]

    def to_dict(self) -> dict[str, Any]:
        """Plain values, numbers as text."""
        from ..report.plain import plain

        rows = [
            {
                key: plain(getattr(m, key))
                for key in ("name", "setting", "evaluations", "nodes", "seconds", "error", "claimed")
            }
            for m in self.measurements
        ]
        rates = {
            name: {"fitted digits per node": plain(fitted), "predicted digits per node": plain(predicted)}
            for name, (fitted, predicted) in self.rates.items()
        }
        return {
            "reference": plain(self.reference),
            "reference error": plain(self.reference_error),
            "reference method": self.reference_method,
            "measurements": rows,
            "rates": rates,
            "remarks": dict(self.remarks),
        }

    def series(self) -> dict[str, tuple[list[int], list[float], list[float]]]:
        """name -> (evaluations, seconds, errors): what a plot shows."""
        found: dict[str, tuple[list[int], list[float], list[float]]] = {}
        for m in self.measurements:
            evaluations, seconds, errors = found.setdefault(m.name, ([], [], []))
            evaluations.append(m.evaluations)
            seconds.append(m.seconds)
            errors.append(m.error)
        return found

    def __str__(self) -> str:
        lines = [
            f"reference {self.reference:.15g}, relative error {self.reference_error:.1g}, by {self.reference_method}",
            f"{'method':20s}{'setting':>18s}{'evaluations':>13s}{'seconds':>10s}{'error':>10s}{'claimed':>10s}",
        ]
        for m in self.measurements:
            claimed = "-" if m.claimed is None else f"{m.claimed:.1e}"
            lines.append(
                f"{m.name:20s}{m.setting:>18s}{m.evaluations:13d}{m.seconds:10.2g}{m.error:10.1e}{claimed:>10s}"
            )
        for name, (fitted, predicted) in self.rates.items():
            shown = "too few points" if fitted is None else f"{fitted:.2f}"
            lines.append(f"{name}: {shown} digits per node fitted, {predicted:.2f} predicted")
        lines += [f"{name}: {remark}" for name, remark in self.remarks.items()]
        return "\n".join(lines)


def converge(
    kin: Any,
    f: Any = None,
    *,
    ordering: Sequence[int] | None = None,
    rules: Sequence[str] | None = None,
    peers: bool = True,
    seconds: float = 5.0,
    reference: Any = None,
    report: Callable[[str], None] | None = None,
) -> Convergence:
    """Error against points and seconds for every rule that applies to an integral, and for general-purpose peers.

    Parameters
    ----------
    kin, f, ordering
        The integral, as for :func:`kn_integrate.disk_integral`.
    rules
        Families of rules to study; None takes all that apply.
    peers
        Whether to run the general-purpose integrators too.
    seconds
        Time limit for each rule and each peer.
    reference
        The true value if it is known; None computes it as accurately as double precision allows.
    report
        Called with the name of what is being run.

    Returns
    -------
    Convergence
        ``print`` shows a table; ``to_dict()`` and ``series()`` give the data.

    Raises
    ------
    InputError, PoleError
    """
    # also accepts (spec, kin): the integral first
    if f is not None and not hasattr(kin, "row_sums") and hasattr(f, "row_sums"):
        kin, f = f, kin
    limit = float(read(seconds, "seconds")[0])
    if not limit > 0:
        raise InputError("seconds", str(seconds), "a positive number")
    family = disk_family(kin, f, ordering)
    n, terms = family.n, family.terms_at({})
    if not terms:
        raise InputError("f", "an integral that is identically zero", "an integral with at least one term")
    known = applicable(n, terms)
    chosen = known if rules is None else tuple(rules)
    for name in chosen:
        if name not in known:
            raise InputError("rules", repr(name), "rules that serve this integral: " + ", ".join(known))
    best = integrate_disk_terms(n, terms, rtol=1e-13)
    truth, how = complex(best.value), best.method
    accuracy = best.error / abs(truth) if truth else math.inf
    if reference is not None:
        truth, accuracy, how = complex(read(reference, "reference")[0].value()), 2.0**-53, "the caller"
    if not truth:
        raise PoleError((), 0, None, "the value is zero: relative errors do not exist")
    found: list[Measurement] = []
    rates: dict[str, tuple[float | None, float]] = {}
    remarks: dict[str, str] = {}
    for name in chosen:
        if report:
            report(name)
        rows = []
        said: list[str] = []
        for goal, result in run_rule(name, n, terms, DIGITS, limit, said):
            error = abs(result.value - truth) / abs(truth)
            claimed = result.claimed / abs(truth)
            setting = f"{goal:g} digits"
            rows.append(Measurement(name, setting, result.evaluations, result.nodes, result.seconds, error, claimed))
        found += rows
        if said:
            remarks[name] = said[0]
        rates[name] = (_fitted(rows, max(FLOOR, 3.0 * accuracy)), predicted_rate(name, n, terms))
    for name in PEERS if peers else ():
        if report:
            report(name)
        results, remark = run_peer(name, n, terms, limit)
        for peer in results:
            error = abs(peer.value - truth) / abs(truth)
            bar = None if peer.claimed is None else peer.claimed / abs(truth)
            found.append(Measurement(name, peer.setting, peer.evaluations, None, peer.seconds, error, bar))
        if remark:
            remarks[name] = remark
    return Convergence(truth, accuracy, how, tuple(found), rates, remarks)


def _fitted(rows: Sequence[Measurement], floor: float) -> float | None:
    """Digits per node from a straight line through the errors above the floor."""
    points = [(m.nodes, math.log10(m.error)) for m in rows if m.error > floor and m.nodes is not None]
    if len(points) < 3 or len({x for x, _ in points}) < 3:
        return None
    x, y = np.array(points).T
    return float(-np.polyfit(x, y, 1)[0])
