"""Exceptions and statuses: everything that can go wrong has a name and an advice.

Bad input raises :class:`InputError`; a kinematic point on a pole raises :class:`PoleError`; work beyond the
caller's limit raises :class:`WorkLimitError` before it starts.  A number that was computed but is not as accurate
as asked for is *not* an exception: it comes back with a :class:`Status` that says so.
"""

from __future__ import annotations

import enum
from typing import Any


class KNError(Exception):
    """Base of every exception this package raises on purpose."""


class InputError(KNError, ValueError):
    """An input that cannot be used.

    Attributes
    ----------
    field : str
        Which input it was, in the caller's words (``"row_sums"``, ``"ordering"``, ``"--planar"``).
    found, expected : str
        What was there, and what would have been accepted.
    """

    def __init__(self, field: str, found: object, expected: str) -> None:
        self.field = field
        self.found = found if isinstance(found, str) else repr(found)
        self.expected = expected
        super().__init__(f"{field}: found {self.found}; expected {expected}")

    def __reduce__(self) -> tuple[Any, ...]:
        # Exceptions with their own signature need this to travel between processes.
        return (type(self), (self.field, self.found, self.expected))


class PoleError(KNError):
    """The integral has a pole at this kinematic point, so it has no value there.

    Attributes
    ----------
    channel : tuple[int, ...]
        All labels of the channel.
    level : int
        N >= 0: the exponent of the channel's boundary divisor is -N.
    at : object
        The value of the planar invariant X of the channel at the point.
    """

    def __init__(self, channel: tuple[int, ...], level: int, at: object, message: str | None = None) -> None:
        self.channel = tuple(channel)
        self.level = int(level)
        self.at = at
        self.message = message
        name = ".".join(str(label) for label in self.channel)
        super().__init__(
            message
            or f"pole in channel {name} at level {self.level} (X = {at}): the value does not exist here; "
            "ask for the residue, or move the point"
        )

    def __reduce__(self) -> tuple[Any, ...]:
        return (type(self), (self.channel, self.level, self.at, self.message))


class WorkLimitError(KNError):
    """The predicted work is above the limit; nothing was computed.

    Attributes
    ----------
    predicted, limit : float
        Integrand evaluations (or bytes, see ``unit``).
    unit : str
        ``"points"`` or ``"bytes"``.
    """

    def __init__(self, predicted: float, limit: float, unit: str = "points", hint: str = "") -> None:
        self.predicted = float(predicted)
        self.limit = float(limit)
        self.unit = unit
        self.hint = hint
        super().__init__(
            f"predicted work {self.predicted:.3g} {unit} is above the limit of {self.limit:.3g} {unit}"
            + (f"; {hint}" if hint else "")
        )

    def __reduce__(self) -> tuple[Any, ...]:
        return (type(self), (self.predicted, self.limit, self.unit, self.hint))


class NotAvailableError(KNError):
    """A method or option that cannot serve this integral; it is refused, never ignored."""


class Status(enum.Enum):
    """What a result is worth; the value of each member is a sentence of advice.

    Members are ordered from best to worst; :func:`worst` merges several.
    """

    OK = "the error bound meets the requested tolerance"
    ZERO = (
        "the value cannot be told from zero: only its absolute error is known; "
        "give atol= if that is what you need, or digits= to resolve a smaller value"
    )
    INACCURATE = (
        "the error bound is above the requested tolerance; relax rtol=, raise max_points=, or use method='auto'"
    )
    ROUND_OFF = (
        "double precision limits the error here, more points do not help; "
        "ask for digits= (arbitrary precision), or relax rtol="
    )
    NOT_FINITE = "the computation produced a non-finite number; try another method= or digits="

    @property
    def advice(self) -> str:
        """The sentence that tells what to do."""
        return str(self.value)

    @property
    def rank(self) -> int:
        """0 for the best status, larger is worse."""
        return list(Status).index(self)


def worst(*statuses: Status) -> Status:
    """The worst of several statuses.

    >>> worst(Status.OK, Status.ROUND_OFF, Status.ZERO).name
    'ROUND_OFF'
    """
    return max(statuses, key=lambda status: status.rank)
