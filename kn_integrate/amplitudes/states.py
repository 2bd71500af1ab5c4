"""String states: momenta and polarisations, checked against the mass shell.

Metric mostly plus, energy first, all legs incoming.  ``k^2 = -m^2``: open tachyons have ``m^2 = -1/alpha'``, closed
ones ``m^2 = -4/alpha'``; gauge bosons and the massless tensors of the closed string (graviton, dilaton, B field) have
``k^2 = 0`` and polarisations with ``e.k = 0``.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

from ..errors import InputError
from ..exact import ZERO, Exact, read
from ..kinematics import Mandelstams
from ..momenta import SLACK, dot, read_vectors

Vector = tuple[Exact, ...]

OPEN = ("tachyon", "gauge_boson")
CLOSED = ("closed_tachyon", "massless_tensor")
KINDS = (*OPEN, *CLOSED)


@dataclass(frozen=True)
class State:
    """One external state; made by :func:`tachyon`, :func:`gauge_boson`, :func:`closed_tachyon`,
    :func:`massless_tensor`.

    Attributes
    ----------
    kind : str
    momentum : tuple of Exact
        Energy first, incoming.
    left, right : tuple of Exact or None
        Polarisations; an open gauge boson has ``left`` only.
    rounded : bool
        True when a component came as a floating-point number.
    """

    kind: str
    momentum: Vector
    left: Vector | None = None
    right: Vector | None = None
    rounded: bool = False

    @property
    def is_open(self) -> bool:
        """True for states of the open string."""
        return self.kind in OPEN

    @property
    def is_tachyon(self) -> bool:
        """True for the two tachyons."""
        return self.left is None

    def with_polarisation(self, left: Any, right: Any = None) -> State:
        """The same state with other polarisations (right stays when None)."""
        first, flag = _vector(left, "left")
        second, other = (self.right, False) if right is None else _vector(right, "right")
        return _checked(State(self.kind, self.momentum, first, second, self.rounded or flag or other))


def tachyon(k: Any) -> State:
    """An open-string tachyon of momentum k, ``k^2 = 1/alpha'``."""
    momentum, rounded = _vector(k, "k")
    return State("tachyon", momentum, rounded=rounded)


def gauge_boson(k: Any, e: Any) -> State:
    """A gauge boson of the open string: ``k^2 = 0``, ``e.k = 0``.

    Raises
    ------
    InputError
        For components that are no numbers, vectors of different length, momenta that are not light-like, polarisations
        that are not transverse (exactly, or within 1e-10 for floats).
    """
    momentum, rounded = _vector(k, "k")
    left, flag = _vector(e, "e")
    return _checked(State("gauge_boson", momentum, left, None, rounded or flag))


def closed_tachyon(k: Any) -> State:
    """A closed-string tachyon of momentum k, ``k^2 = 4/alpha'``."""
    momentum, rounded = _vector(k, "k")
    return State("closed_tachyon", momentum, rounded=rounded)


def massless_tensor(k: Any, left: Any, right: Any) -> State:
    """A massless closed-string state of polarisation ``left (x) right``; amplitudes are linear in both.

    Gravitons are symmetric and traceless, the B field antisymmetric, the dilaton the trace of the transverse space:
    sums of products, and so are their amplitudes.

    Raises
    ------
    InputError
        As :func:`gauge_boson`.
    """
    momentum, rounded = _vector(k, "k")
    first, flag = _vector(left, "left")
    second, other = _vector(right, "right")
    return _checked(State("massless_tensor", momentum, first, second, rounded or flag or other))


def _vector(values: Any, field: str) -> tuple[Vector, bool]:
    if isinstance(values, (str, bytes)) or not hasattr(values, "__iter__"):
        raise InputError(field, type(values).__name__, "a vector of numbers, energy first")
    found = [read(value, f"{field}, component {k}") for k, value in enumerate(values)]
    if len(found) < 2:
        raise InputError(field, f"{len(found)} components", "at least 2 components")
    return tuple(value for value, _ in found), any(flag for _, flag in found)


def _size(vector: Vector) -> float:
    return max(abs(value) for value in vector)


def _vanishes(value: Exact, scale: float, rounded: bool) -> bool:
    return not value or (rounded and abs(value) <= SLACK * scale)


def _checked(state: State) -> State:
    k = state.momentum
    square = dot(k, k)
    if not _vanishes(square, _size(k) ** 2, state.rounded):
        raise InputError("k", f"k^2 = {_short(square)}", "k^2 = 0, the mass shell of a massless state")
    for name, e in (("left" if state.right else "e", state.left), ("right", state.right)):
        if e is None:
            continue
        if len(e) != len(k):
            raise InputError(name, f"{len(e)} components", f"{len(k)}, as the momentum has")
        product = dot(e, k)
        if not _vanishes(product, _size(k) * _size(e), state.rounded):
            raise InputError(name, f"{name}.k = {_short(product)}", "a transverse polarisation, e.k = 0")
    return state


def _short(value: Exact) -> str:
    text = str(value)
    return text if len(text) <= 40 else str(value.value())


def read_states(states: Iterable[State], string: str) -> tuple[State, ...]:
    """States of one string in one dimension, at least three.

    Raises
    ------
    InputError
        Names the entry.
    """
    if not isinstance(states, Iterable):
        raise InputError("states", type(states).__name__, "a sequence of states such as tachyon(k)")
    found = tuple(states)
    allowed = OPEN if string == "open" else CLOSED
    for place, state in enumerate(found, start=1):
        if not isinstance(state, State):
            raise InputError(f"states, entry {place}", type(state).__name__, "a state such as tachyon(k)")
        if state.kind not in allowed:
            raise InputError(f"states, entry {place}", state.kind, f"a state of the {string} string: {allowed}")
    if len(found) < 3:
        raise InputError("states", f"{len(found)} states", "at least three states")
    if len({len(state.momentum) for state in found}) > 1:
        sizes = sorted({len(state.momentum) for state in found})
        raise InputError("states", f"momenta of {sizes} components", "momenta of one length")
    return found


def read_alpha_prime(alpha_prime: Any) -> Exact:
    """A positive exact number."""
    value = read(alpha_prime, "alpha_prime")[0]
    if not value.is_real or not value > 0:
        raise InputError("alpha_prime", str(alpha_prime), "a positive number")
    return value


def check_shells(states: Sequence[State], alpha_prime: Exact) -> tuple[Exact, ...]:
    """Mass squares of the states after the checks of mass shell and conservation.

    Raises
    ------
    InputError
        Names the state that is off its shell, or the sum of the momenta.
    """
    vectors, rounded = read_vectors([state.momentum for state in states], "momenta")
    rounded |= any(state.rounded for state in states)
    total = [sum(parts, ZERO) for parts in zip(*vectors, strict=True)]
    size = max(_size(vector) for vector in vectors)
    if not all(_vanishes(value, size, rounded) for value in total):
        shown = ", ".join(_short(value) for value in total)
        raise InputError("momenta", f"a sum of ({shown})", "momenta that add up to zero, all legs incoming")
    squares = []
    for place, state in enumerate(states, start=1):
        tension = 1 if state.is_open else 4
        wanted = -(tension / alpha_prime) if state.is_tachyon else ZERO
        found = -dot(state.momentum, state.momentum)
        if not _vanishes(found - wanted, max(_size(state.momentum) ** 2, abs(wanted)), state.rounded):
            raise InputError(
                f"states, entry {place}", f"a {state.kind} of m^2 = {_short(found)}", f"m^2 = {_short(wanted)}"
            )
        squares.append(wanted)
    return tuple(squares)


def kinematics_of(states: Sequence[State], alpha_prime: Exact) -> Mandelstams:
    """The invariants of at least four states: ``s_ij = 2 alpha' k_i.k_j`` (open), ``(alpha'/2) k_i.k_j`` (closed).

    The string tag is left out, so that both chiral halves of a closed string can be handed to disk integrals.
    """
    squares = check_shells(states, alpha_prime)
    coupling = 2 * alpha_prime if states[0].is_open else alpha_prime / 2
    rows = [coupling * square for square in squares]
    # `dot` of exact momenta conserves exactly; floats are projected onto the declared rows
    momenta = [state.momentum for state in states]
    n = len(states)
    rounded = any(state.rounded for state in states)
    from ..conservation import completed

    given = {
        (i + 1, j + 1): (coupling * dot(momenta[i], momenta[j]), rounded) for i in range(n) for j in range(i + 1, n)
    }
    values, shift = completed(n, given, rows, "momenta")
    return Mandelstams(n, values, tuple(rows), None, shift)
