"""The result object: a value together with an error that bounds it, and what was done to get it."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from types import MappingProxyType
from typing import Any

from .errors import Status


def judge(value: complex, error: float, rtol: float, atol: float, floor: float = 0.0) -> Status:
    """The status a value with this error deserves for this request.

    Non-finite numbers are looked for first: a NaN compares false with everything and must never look converged.

    Parameters
    ----------
    value, error
        The number and the bound on its error (a modulus).
    rtol, atol
        The request: ``error <= max(atol, rtol * abs(value))``.
    floor
        The part of ``error`` that more points cannot reduce (round-off).

    >>> judge(1.0, 1e-12, 1e-10, 0.0).name, judge(float("nan"), 0.0, 1e-10, 0.0).name
    ('OK', 'NOT_FINITE')
    """
    finite = math.isfinite(abs(value)) and math.isfinite(error)
    if not finite or not error >= 0:
        return Status.NOT_FINITE
    if error <= max(atol, rtol * abs(value)):
        return Status.OK
    if abs(value) <= error:
        return Status.ZERO
    if floor > max(atol, rtol * abs(value)) * 0.5:
        return Status.ROUND_OFF
    return Status.INACCURATE


@dataclass(frozen=True)
class Estimate:
    """A computed integral.

    Attributes
    ----------
    value : float | complex | mpmath.mpf | mpmath.mpc
        The value; multiple-precision when ``digits`` was asked for.
    error : float
        A bound on ``abs(value - truth)``, truncation and round-off included, for the exact (or projected) input.
    status : Status
        What the result is worth; ``status.advice`` is a sentence.
    method : str
        The route taken: ``"quadrature"``, ``"kz"``, ``"direct"``, ``"klt"``, ``"residue"``...
    evaluations : int
        Integrand evaluations (series terms for a series method).
    rtol, atol : float
        The request that ``status`` was judged by.
    digits : int | None
        Requested decimal digits, None in double precision.
    details : Mapping
        How the work was planned and why; plain values only.
    """

    value: Any
    error: float
    status: Status
    method: str
    evaluations: int = 0
    rtol: float = 1e-10
    atol: float = 0.0
    digits: int | None = None
    details: Mapping[str, Any] = field(default_factory=dict)
    _sensitivity: Callable[[], float] | None = field(default=None, repr=False, compare=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "details", MappingProxyType(dict(self.details)))

    def __getstate__(self) -> dict[str, Any]:
        # Lazily computed pieces hold closures; a result sent to another process carries their values instead.
        state = {name: getattr(self, name) for name in self.__dataclass_fields__ if name != "_sensitivity"}
        state["details"] = dict(self.details)
        state["value"] = _packed(self.value)
        state["input_sensitivity"] = self.input_sensitivity
        return state

    def __setstate__(self, state: dict[str, Any]) -> None:
        sensitivity = state.pop("input_sensitivity")
        state["value"] = _unpacked(state["value"])
        for name, value in state.items():
            object.__setattr__(self, name, value)
        object.__setattr__(self, "details", MappingProxyType(dict(self.details)))
        object.__setattr__(self, "_sensitivity", None)
        self.__dict__["input_sensitivity"] = sensitivity

    @property
    def ok(self) -> bool:
        """True when the result is finite and its error meets the request."""
        return self.status is Status.OK

    @cached_property
    def input_sensitivity(self) -> float:
        """``sum |dZ/ds| |ds|`` for one unit in the last place of every invariant (nan when not available).

        What the rounding of double-precision *input* costs; ``error`` does not contain it.
        """
        return float("nan") if self._sensitivity is None else self._sensitivity()

    @property
    def text(self) -> str:
        """All digits of the value, as text."""
        from .report.text import number_text

        return number_text(self.value, self.digits)

    def __str__(self) -> str:
        from .report.text import value_with_error

        return value_with_error(self.value, self.error, self.digits)

    def sources(self) -> tuple[str, ...]:
        """The published sources of the methods that were used."""
        from .report.sources import sources_of

        return sources_of(self.method, self.details)

    def bibtex(self) -> str:
        """The same as BibTeX entries."""
        from .report.sources import bibtex_of

        return bibtex_of(self.method, self.details)

    def _repr_html_(self) -> str:
        from .report.faces import html_of

        return html_of(self)

    def _repr_latex_(self) -> str:
        from .report.faces import latex_of

        return latex_of(self)

    def to_dict(self) -> dict[str, Any]:
        """A JSON-ready dictionary: numbers as text, complex as ``[re, im]``, never NaN.

        Keys: ``value, error, ok, status, advice, method, evaluations, rtol, atol, digits, details``.
        """
        from .report.plain import estimate_to_dict

        return estimate_to_dict(self)


def _packed(value: Any) -> Any:
    """A value that survives pickling with all its digits: mpmath rounds its numbers to the precision at unpickling."""
    for kind in ("_mpf_", "_mpc_"):
        if hasattr(value, kind):
            return (kind, getattr(value, kind))
    return value


def _unpacked(value: Any) -> Any:
    if not isinstance(value, tuple):
        return value
    from mpmath import mp

    kind, raw = value
    return mp.make_mpf(raw) if kind == "_mpf_" else mp.make_mpc(raw)
