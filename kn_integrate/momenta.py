"""Momenta: scalar products, and exact rational points on the mass shell.

Metric mostly plus, energy first: ``k^2 = -E^2 + p^2 = -m^2``.  All legs incoming, so momenta add up to zero.
"""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from typing import Any

from .channels import read_count
from .errors import InputError
from .exact import ZERO, Exact, read, read_integer

Vector = tuple[Fraction, ...]
SLACK = 1e-10


def read_vectors(vectors: Any, field: str) -> tuple[tuple[tuple[Exact, ...], ...], bool]:
    """A rectangular array of exact numbers, and whether any came as a floating-point number."""
    if isinstance(vectors, (str, bytes)) or not hasattr(vectors, "__iter__"):
        raise InputError(field, type(vectors).__name__, "an array of vectors")
    rows, rounded = [], False
    for k, vector in enumerate(vectors, start=1):
        if isinstance(vector, (str, bytes)) or not hasattr(vector, "__iter__"):
            raise InputError(f"{field}, entry {k}", repr(vector), "a vector")
        row = []
        for value in vector:
            number, flag = read(value, f"{field}, entry {k}")
            rounded |= flag
            row.append(number)
        rows.append(tuple(row))
    if len({len(row) for row in rows}) > 1 or not rows or len(rows[0]) < 2:
        raise InputError(field, f"vectors of {sorted({len(row) for row in rows})} components", "vectors of one length")
    return tuple(rows), rounded


def dot(k: Sequence[Exact], q: Sequence[Exact]) -> Exact:
    """The product ``-k_0 q_0 + k_1 q_1 + ...``."""
    total: Exact = -(k[0] * q[0])
    for a, b in zip(k[1:], q[1:], strict=True):
        total = total + a * b
    return total


def momentum_products(momenta: Any) -> tuple[list[list[Exact]], bool]:
    """All products ``k_i.k_j`` after the check that momenta add up to zero; and whether they were rounded.

    Raises
    ------
    InputError
        When the sum is not zero (beyond 1e-10 of the largest component for floats).
    """
    vectors, rounded = read_vectors(momenta, "momenta")
    total = [sum(parts, ZERO) for parts in zip(*vectors, strict=True)]
    size = max(abs(value) for vector in vectors for value in vector)
    worst = max(abs(value) for value in total)
    if any(total) and not (rounded and worst <= SLACK * size):
        shown = ", ".join(f"{complex(value):.6g}" if not value.is_real else f"{float(value):.6g}" for value in total)
        raise InputError("momenta", f"a sum of ({shown})", "momenta that add up to zero")
    return [[dot(k, q) for q in vectors] for k in vectors], rounded


def random_momenta(
    n: int, dimension: int, rng: Any = None, masses: Any = 0, exact: bool = True, squared_masses: Any = None
) -> Any:
    """Random momenta of n legs on their mass shells that add up to zero, so that all Gram constraints hold.

    Parameters
    ----------
    n
        Number of legs, at least 3.
    dimension
        Of space-time, at least 3.
    rng
        ``numpy.random.Generator`` or a seed.
    masses
        m_i, one or n of them (``"1j"`` for a tachyon of ``m^2 = -1``); squares must be real and rational.
    exact
        True: a tuple of n vectors of Fractions.  False: an (n, dimension) array of floats.
    squared_masses
        m_i^2 instead.

    Notes
    -----
    Vectors come from light-cone components ``k^2 = -k_plus k_minus + v^2``.  With a massless leg the last but one
    momentum ``x q`` solves a linear equation for x; with massive legs only, the last two have opposite ``k_plus``,
    which makes the mass-shell condition linear in a transverse component (``(k_(n-1) + k_n)^2`` is then positive).

    Examples
    --------
    >>> k = random_momenta(5, 4, 1)
    >>> [sum(column) for column in zip(*k)] == [0, 0, 0, 0]
    True
    """
    n = read_count(n, 3)
    if read_integer(dimension, "dimension", "an integer, at least 3") < 3:
        raise InputError("dimension", dimension, "an integer, at least 3")
    import numpy as np

    generator = rng if hasattr(rng, "integers") else np.random.default_rng(rng)
    squares = _mass_squares(n, masses, squared_masses)
    for _ in range(1000):
        found = _attempt(n, dimension, generator, squares)
        if found is not None:
            break
    else:
        raise InputError("masses", str(masses), "masses that leave room for real momenta in this dimension")
    if exact:
        return found
    return np.array([[float(x) for x in k] for k in found])


def _mass_squares(n: int, masses: Any, squared: Any) -> tuple[Fraction, ...]:
    raw = masses if squared is None else squared
    name = "masses" if squared is None else "squared_masses"
    values = [raw] * n if isinstance(raw, str) or not hasattr(raw, "__iter__") else list(raw)
    if len(values) != n:
        raise InputError(name, f"{len(values)} values", f"one value, or {n}")
    found = []
    for value in values:
        number = read(value, name)[0]
        square = number * number if squared is None else number
        if not square.is_real:
            raise InputError(name, str(value), "a mass with a real square")
        found.append(square.re)
    return tuple(found)


def _number(generator: Any) -> Fraction:
    value = Fraction(int(generator.integers(1, 31)), int(generator.integers(5, 14)))
    return value if generator.random() < 0.5 else -value


def _on_shell(plus: Fraction, transverse: Sequence[Fraction], square: Fraction) -> Vector:
    minus = (sum((v * v for v in transverse), Fraction(0)) + square) / plus
    return ((plus + minus) / 2, (plus - minus) / 2, *transverse)


def _product(k: Vector, q: Vector) -> Fraction:
    return -k[0] * q[0] + sum((a * b for a, b in zip(k[1:], q[1:], strict=True)), Fraction(0))


def _sum(vectors: Sequence[Vector]) -> Vector:
    return tuple(sum(parts, Fraction(0)) for parts in zip(*vectors, strict=True))


def _attempt(n: int, dimension: int, generator: Any, squares: Sequence[Fraction]) -> tuple[Vector, ...] | None:
    massless = [i for i, square in enumerate(squares) if not square]
    order = list(range(n))
    if massless:
        # a massless leg that is not the last one: its scale is what is solved for
        place = massless[-1]
        order.remove(place)
        order.insert(n - 2, place)
    transverse = dimension - 2

    def random_leg(square: Fraction) -> Vector:
        return _on_shell(_number(generator), [_number(generator) for _ in range(transverse)], square)

    first = [random_leg(squares[i]) for i in order[: n - 2]]
    if massless:
        total = _sum(first)
        null = random_leg(Fraction(0))
        slope = 2 * _product(total, null)
        if not slope:
            return None
        x = -(_product(total, total) + squares[order[-1]]) / slope
        if not x:
            return None
        legs = [*first, tuple(x * value for value in null)]
    else:
        if n == 3:
            return None
        plus = -sum((k[0] + k[1] for k in first[:-1]), Fraction(0))
        if not plus:
            return None
        first[-1] = _on_shell(plus, [_number(generator) for _ in range(transverse)], squares[order[n - 3]])
        total = _sum(first)
        minus = total[0] - total[1]
        a = _number(generator)
        # transverse parts w + y e and -(V + w + y e), plus parts a and -a: the sum of both k_minus is -minus
        w = [_number(generator) for _ in range(transverse)]
        side = total[2:]
        w_square = sum((v * v for v in w), Fraction(0))
        other = sum(((v + s) ** 2 for v, s in zip(w, side, strict=True)), Fraction(0))
        if not side[0]:
            return None
        y = (w_square + squares[order[n - 2]] - other - squares[order[n - 1]] + minus * a) / (2 * side[0])
        w[0] += y
        legs = [*first, _on_shell(a, w, squares[order[n - 2]])]
    legs.append(tuple(-value for value in _sum(legs)))
    if _product(legs[-1], legs[-1]) != -squares[order[-1]]:
        return None
    result: list[Vector] = [()] * n
    for place, leg in zip(order, legs, strict=True):
        result[place] = leg
    return tuple(result)
