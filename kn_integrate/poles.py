"""Residues and Laurent coefficients of disk integrals, and kinematics just off the real axis.

Residues of the quadrature engine are functionals on the same kernels as values (``disk.rules.residue``).  Laurent
coefficients beyond them, finite parts at a pole, and everything in multiple precision come from Cauchy's formula on a
circle in kinematic space (``dispatch.circle``), exact up to an aliasing error that is part of the bound.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from .channels import Channel, dotted, pair_order, read_labels
from .disk.terms import Term, integrate_terms
from .dispatch.circle import Laurent
from .dispatch.family import DiskFamily, disk_family
from .dispatch.integral import Shift, along, exponents_of
from .dispatch.request import Request, make_request
from .dispatch.shifts import Chord, chord_exponents, chords_of, pair_shift
from .errors import InputError, NotAvailableError, PoleError, Status
from .estimate import Estimate, judge
from .exact import ONE, ZERO, Exact, read, read_integer
from .kinematics import Mandelstams


@dataclass(frozen=True)
class LaurentSeries:
    """Laurent coefficients ``c_k`` of an integral in one variable.

    Attributes
    ----------
    variable : str
        What the expansion is in.
    orders : tuple of int
        The k of the coefficients, ascending.
    values : tuple
        ``c_k``: float, complex, or mpmath numbers with digits.
    errors : tuple of float
        Bounds on the errors of ``c_k``.
    evaluations : int
    """

    variable: str
    orders: tuple[int, ...]
    values: tuple[Any, ...]
    errors: tuple[float, ...]
    evaluations: int

    def coefficient(self, k: int) -> tuple[Any, float]:
        """``c_k`` and the bound on its error."""
        if k not in self.orders:
            raise InputError("k", k, f"one of {self.orders[0]}..{self.orders[-1]}")
        place = self.orders.index(k)
        return self.values[place], self.errors[place]

    def to_dict(self) -> dict[str, Any]:
        """Plain values, numbers as text."""
        from .report.plain import plain

        rows = zip(self.orders, self.values, self.errors, strict=True)
        return {
            "variable": self.variable,
            "coefficients": [{"order": k, "value": plain(v), "error": plain(e)} for k, v, e in rows],
            "evaluations": self.evaluations,
        }

    def __str__(self) -> str:
        from .report.text import value_with_error

        rows = zip(self.orders, self.values, self.errors, strict=True)
        return "\n".join([f"in {self.variable}:", *(f"  c_{k} = {value_with_error(v, e)}" for k, v, e in rows)])


def disk_residue(
    kin: Any,
    f: Any = None,
    *,
    channel: Any,
    level: Any = 0,
    ordering: Sequence[int] | None = None,
    hold: Iterable[Sequence[int]] | None = None,
    request: Request,
) -> Estimate:
    """The residue of a disk integral in planar channels; see :func:`kn_integrate.residue`."""
    family = disk_family(kin, f, ordering)
    chords, levels = _channels(family, channel, level)
    offsets = _offsets(family)
    shift, direction = _onto_poles(family, chords, levels, offsets, hold)
    if request.digits is not None:
        if len(chords) > 1:
            raise NotAvailableError("several residues at once are not available with digits=")
        laurent = _laurent_at(family, shift, direction, request, -1, -1)
        value, error = laurent.coefficient(-1)
        return _estimate(value, error, laurent.evaluations, request)
    terms = _singular(family, shift, chords)
    if not terms:
        details = {"choice": "no term has a pole there"}
        return Estimate(0.0, 0.0, Status.OK, "residue", 0, request.rtol, request.atol, None, details)
    _refuse_further_poles(family, terms, chords, shift)
    every = chords_of(family.n)
    return integrate_terms(
        family.n,
        terms,
        rtol=request.rtol,
        atol=request.atol,
        max_points=request.max_points,
        threads=request.threads,
        residues=frozenset(every.index(chord) for chord in chords),
    )


def laurent_series(
    kin: Mandelstams,
    f: Any = None,
    *,
    ordering: Sequence[int] | None = None,
    channel: Any = None,
    level: Any = 0,
    hold: Iterable[Sequence[int]] | None = None,
    direction: Any = None,
    low: int | None = None,
    high: int = 1,
    rtol: Any = None,
    digits: int | None = None,
) -> LaurentSeries:
    """Laurent coefficients of a disk integral at a pole or along a line in kinematic space.

    Parameters
    ----------
    kin, f, ordering
        As for :func:`kn_integrate.disk_integral`.
    channel, level, hold
        Expand in ``X - X_pole`` of this channel about its pole of this level, as for :func:`kn_integrate.residue`.
        Order 0 is the finite part there.
    direction
        Instead of ``channel``: ``"scale"`` expands the integral at ``x * kin`` about x = 0 (massless legs), a
        massless :class:`Mandelstams` expands at ``kin + x * direction``.
    low, high
        Lowest and highest order; low defaults to ``-(n-3)``.
    rtol, digits
        Accuracy of the evaluations on the circle.

    Raises
    ------
    InputError
        Unless exactly one of ``channel`` and ``direction`` is given.

    Examples
    --------
    >>> import kn_integrate as kn
    >>> kin = kn.Mandelstams.from_planar(4, {(1, 2): 1, (2, 3): 2})
    >>> series = kn.laurent_series(kin, kn.parke_taylor(1, 2, 3, 4), direction="scale")
    >>> print(f"{series.coefficient(-1)[0]:.9f}")  # 1/s + 1/t
    1.500000000
    """
    request = make_request(rtol=rtol, digits=digits)
    if (channel is None) == (direction is None):
        raise InputError("channel, direction", "both or none", "one of the two")
    high = read_integer(high, "high")
    if channel is not None:
        family = disk_family(kin, f, ordering)
        chords, levels = _channels(family, channel, level)
        if len(chords) > 1:
            raise InputError("channel", f"{len(chords)} channels", "one channel")
        shift, speed = _onto_poles(family, chords, levels, _offsets(family), hold)
        name = f"X_{dotted(family.name(chords[0]))} - ({_target(family, chords[0], shift)})"
    else:
        if isinstance(direction, str):
            if direction != "scale":
                raise InputError("direction", repr(direction), "'scale' or massless Mandelstams")
            base, towards, name = kin.scaled(0), kin, "x (all invariants times x)"
        else:
            if not isinstance(direction, Mandelstams) or direction.n != kin.n or not direction.is_massless:
                raise InputError("direction", repr(direction), f"massless Mandelstams of {kin.n} legs, or 'scale'")
            base, towards, name = kin, direction, "x (along the direction)"
        family = disk_family(base, f, ordering)
        shift = {}
        speed = {(i, j): towards.channel(family.ordering[i - 1 : j]) for i, j in chords_of(family.n)}
    low = -(family.n - 3) if low is None else read_integer(low, "low")
    if low > high:
        raise InputError("low, high", f"{low}, {high}", "low <= high")
    found = _laurent_at(family, shift, speed, request, low, high)
    values = tuple(_number(value, request, found.symmetric) for value in found.values)
    return LaurentSeries(name, tuple(range(low, high + 1)), values, found.errors, found.evaluations)


def plus_i_epsilon(kin: Mandelstams, epsilon: Any = "1/1000000", incoming: Sequence[int] = (1, 2)) -> Mandelstams:
    """Physical 2 -> n-2 kinematics moved off the cuts in the direction that Feynman's prescription asks for.

    ``X = -alpha' s`` in a timelike channel, so the usual ``s + i0`` is ``Im X < 0``.  The invariants add up to zero, so
    not all can move the same way: every pair of final legs gets ``-i epsilon``, the pairs of an incoming and a final
    leg share the compensation equally, and the pair of incoming legs follows from conservation.  Then Im X < 0 in
    every channel of final legs only (every channel that can be timelike) and in the channel of the two incoming ones;
    channels with one incoming leg get Im X >= 0.

    Parameters
    ----------
    kin
        Real kinematics.
    epsilon
        A positive number; exact.
    incoming
        The labels of the two incoming legs.

    Examples
    --------
    >>> kin = Mandelstams.from_planar(4, {(1, 2): "-3/2", (2, 3): "1/2"})
    >>> plus_i_epsilon(kin, "1/100").pair(1, 2)
    Exact('-3/2-1/100j')
    """
    size = read(epsilon, "epsilon")[0]
    if not size.is_real or not size > 0:
        raise InputError("epsilon", str(epsilon), "a positive number")
    pair = read_labels(incoming, kin.n, "incoming")
    if len(pair) != 2:
        raise InputError("incoming", repr(tuple(incoming)), "two labels")
    step = Exact(0, size.re)
    n = kin.n
    moved = {}
    for i, j in pair_order(n):
        inside = (i in pair) + (j in pair)
        change = {0: -step, 1: Fraction(n - 3, 2) * step, 2: -Fraction((n - 2) * (n - 3), 2) * step}[inside]
        moved[i, j] = kin.pair(i, j) + change
    return kin.with_pairs(moved)


# --- inside ---------------------------------------------------------------------------------------------------------


def _channels(family: DiskFamily, channel: Any, level: Any) -> tuple[list[Chord], list[int]]:
    """One or several channels with their levels; several must be compatible."""
    if isinstance(channel, (str, bytes)) or not hasattr(channel, "__iter__"):
        raise InputError("channel", repr(channel), "the labels of a channel, such as (1, 2), or several of these")
    items = list(channel)
    several = bool(items) and all(hasattr(item, "__iter__") and not isinstance(item, str) for item in items)
    names = [read_labels(item, family.n, "channel") for item in (items if several else [items])]
    chords = [family.chord(name) for name in names]
    if len(set(chords)) != len(chords):
        raise InputError("channel", ", ".join(map(dotted, names)), "different channels")
    raw = list(level) if hasattr(level, "__iter__") else [level] * len(chords)
    if len(raw) != len(chords):
        raise InputError("level", f"{len(raw)} levels", f"one level, or {len(chords)}")
    levels = [read_integer(item, "level", "an integer, at least 0") for item in raw]
    if any(item < 0 for item in levels):
        raise InputError("level", str(levels), "integers, at least 0")
    for k, one in enumerate(chords):
        for other in chords[k + 1 :]:
            if _cross(one, other):
                found = f"{dotted(family.name(one))} and {dotted(family.name(other))}, which cross"
                raise InputError("channel", found, "compatible channels")
    return chords, levels


def _cross(one: Chord, other: Chord) -> bool:
    """Whether two chords cross: their clusters overlap and neither contains the other (position n is in neither)."""
    low, high = sorted((one, other))
    return low[0] < high[0] <= low[1] < high[1]


def _offsets(family: DiskFamily) -> Mapping[Chord, int]:
    """The least integer ``Y - X`` over the terms, for every chord."""
    every = chords_of(family.n)
    probe: Shift = {c: Exact(Fraction(1, 97 + 2 * k)) for k, c in enumerate(every)} if family.varying else {}
    exponents = exponents_of(family.n, family.terms_at(probe), probe)
    if family.invariants is None:
        return dict.fromkeys(every, 0)
    found = {}
    for chord, ys in exponents.items():
        differences = [y - family.invariants[chord] for y in ys]
        found[chord] = min((int(d) for d in differences), default=0)
    return found


def _place(family: DiskFamily, chord: Chord) -> Exact:
    """The planar invariant of a chord at the point (its exponent when there are only exponents)."""
    if family.invariants is not None:
        return family.invariants[chord]
    return chord_exponents(family.n, family.terms_at({})[0].pairs)[chord]


def _target(family: DiskFamily, chord: Chord, shift: Shift) -> Exact:
    place: Exact = _place(family, chord) + shift.get(chord, ZERO)
    return place


def _onto_poles(
    family: DiskFamily,
    chords: Sequence[Chord],
    levels: Sequence[int],
    offsets: Mapping[Chord, int],
    hold: Iterable[Sequence[int]] | None,
) -> tuple[dict[Chord, Exact], dict[Chord, Exact]]:
    """The shift of planar invariants that puts the chords on their poles, and its direction."""
    away = [Exact(-n) - offsets[c] - _place(family, c) for c, n in zip(chords, levels, strict=True)]
    if hold is None:
        direction = dict.fromkeys(chords, ONE)
        return dict(zip(chords, away, strict=True)), direction
    if len(chords) > 1:
        raise InputError("hold", "several channels", "one channel when hold= is given")
    direction = _held(family, chords[0], hold)
    return {chord: away[0] * v for chord, v in direction.items()}, direction


def _held(family: DiskFamily, chord: Chord, hold: Iterable[Sequence[int]]) -> dict[Chord, Exact]:
    """The direction that changes X of one chord by 1 and holds the given channels (any sets of labels)."""
    from flint import fmpq, fmpq_mat

    n = family.n
    every = chords_of(n)
    names: list[Channel] = [read_labels(item, n, "hold") for item in hold]
    if len(names) != len(every) - 1:
        raise InputError("hold", f"{len(names)} channels", f"n(n-3)/2 - 1 = {len(every) - 1} channels to hold")
    place = {label: k for k, label in enumerate(family.ordering, start=1)}
    order = pair_order(n)
    rows = []
    for name in names:
        inside = {place[label] for label in name}
        row = []
        for c in every:
            moved = pair_shift(n, {c: ONE})
            total = sum((h for (i, j), h in zip(order, moved, strict=True) if i in inside and j in inside), ZERO)
            row.append(int(total))
        rows.append(row)
    rows.append([int(c == chord) for c in every])
    matrix = fmpq_mat(len(rows), len(every), [fmpq(x) for row in rows for x in row])
    right = fmpq_mat(len(rows), 1, [fmpq(0)] * (len(rows) - 1) + [fmpq(1)])
    try:
        solution = matrix.solve(right)
    except ZeroDivisionError:
        raise InputError("hold", ", ".join(map(dotted, names)), "channels that leave this one free") from None
    found = {c: Exact(Fraction(int(solution[k, 0].p), int(solution[k, 0].q))) for k, c in enumerate(every)}
    return {c: v for c, v in found.items() if v}


def _singular(family: DiskFamily, shift: Shift, chords: Sequence[Chord]) -> list[Term]:
    """The terms that have poles in all the chords at the moved point."""
    kept = []
    for term in family.terms_at(shift):
        exponents = chord_exponents(family.n, term.pairs)
        if all(exponents[c].is_integer and exponents[c] <= 0 for c in chords):
            kept.append(term)
    return kept


def _refuse_further_poles(family: DiskFamily, terms: Sequence[Term], chords: Sequence[Chord], shift: Shift) -> None:
    """A compatible chord that sits on a pole too would make the residue itself infinite."""
    for term in terms:
        for chord, y in chord_exponents(family.n, term.pairs).items():
            if chord in chords or any(_cross(chord, other) for other in chords):
                continue
            if y.is_integer and y <= 0:
                raise PoleError(family.name(chord), -int(y), _target(family, chord, shift))


def _laurent_at(family: DiskFamily, shift: Shift, speed: Shift, request: Request, low: int, high: int) -> Laurent:
    def terms_at(by: Shift) -> Sequence[Term]:
        total = dict(shift)
        for chord, h in by.items():
            total[chord] = total.get(chord, ZERO) + h
        return family.terms_at(total)

    every = chords_of(family.n)
    probe: Shift = {c: Exact(Fraction(1, 97 + 2 * k)) for k, c in enumerate(every)} if family.varying else {}
    exponents = exponents_of(family.n, terms_at(probe), probe)
    terms = terms_at(probe)
    real = all(t.coefficient.is_real and all(p.is_real for p in t.pairs) for t in terms)
    real = real and all(v.is_real for v in speed.values())
    return along(family.n, terms_at, exponents, speed, request, real, low, high)


def _number(value: Any, request: Request, real: bool) -> Any:
    if request.digits is not None:
        return value
    return float(value.real) if real else complex(value)


def _estimate(value: Any, error: float, evaluations: int, request: Request) -> Estimate:
    status = judge(complex(value), error, request.rtol, request.atol, error)
    details = {"choice": "coefficient -1 on a circle in kinematic space"}
    return Estimate(value, error, status, "residue", evaluations, request.rtol, request.atol, request.digits, details)
