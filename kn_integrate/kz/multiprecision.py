"""The recursion in python-flint arithmetic.

Balls follow a majorant and blow up in long recursions, so radii are stripped after every step; the error of a result
comes from comparing two working precisions instead.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

from .pattern import HalfPattern, StepPattern, step_pattern
from .series import terms_needed


def f_vector(n: int, inside: Callable[[int], Any], zero: Any, one: Any, epsilon: float) -> list[Any]:
    """All F_w as in :func:`kn_integrate.kz.series.f_vector`, in the current flint precision.

    Parameters
    ----------
    n
        Number of legs.
    inside
        The sum of s over the pairs in a set of labels (bit i for label i), an arb or acb.
    zero, one
        Of the same type.
    epsilon
        Series are cut where their terms fall below 10^-epsilon.

    Raises
    ------
    ZeroDivisionError
        At an exact resonance or pole.
    """
    f = [one]
    for legs in range(3, n):
        f = _step(legs, inside, f, zero, one, epsilon)
    return f


def _rows(
    half: HalfPattern, inside: Callable[[int], Any], root: int, z: int
) -> tuple[list[list[tuple[int, Any]]], list[Any]]:
    """Off-diagonal entries of each row as (column, value), and the diagonal."""
    table, diagonal = [], []
    start, column, prefix, sign = half.start.tolist(), half.column.tolist(), half.prefix.tolist(), half.sign.tolist()
    base, ends = 1 << root, (1 << root) | (1 << z)
    entry: dict[tuple[int, int], tuple[Any, Any]] = {}
    for row, word in enumerate(half.words.tolist()):
        letters = [letter + 2 for letter in word if letter >= 0]
        sums = []
        mask = base
        for here in letters:
            # sum of s between a letter and what stands before it: a difference of two sums over pairs
            if (mask, here) not in entry:
                value = inside(mask | 1 << here) - inside(mask)
                entry[mask, here] = (value, -value)
            sums.append(entry[mask, here])
            mask |= 1 << here
        table.append(
            [
                (column[e], sums[prefix[e]][0] if sign[e] > 0 else sums[prefix[e]][1])
                for e in range(start[row], start[row + 1])
            ]
        )
        diagonal.append(inside(mask & ~base | ends))
    return table, diagonal


def _step(legs: int, inside: Callable[[int], Any], start: list[Any], zero: Any, one: Any, epsilon: float) -> list[Any]:
    pattern: StepPattern = step_pattern(legs - 3)
    z, top = legs - 1, legs
    a_rows, a_diagonal = _rows(pattern.a, inside, 1, z)
    b_rows, b_diagonal = _rows(pattern.b, inside, top, z)
    rho = inside(sum(1 << i for i in range(1, legs)))
    rows = len(pattern.splits)
    c = [zero] * rows
    for row, value in zip(pattern.full.tolist(), start, strict=True):
        c[row] = value
    growth = max([0.0, *(_real(v) for v in a_diagonal)]) + max([0.0, *(-_real(v) for v in b_diagonal)])
    largest = max(abs(complex(v)) for v in (*a_diagonal, *b_diagonal, rho))
    count = max(_count(growth, epsilon), math.ceil(largest) + math.ceil(3.33 * epsilon))
    half = one / 2
    a_order, b_order = pattern.a.order.tolist(), pattern.b.order.tolist()

    total, series, extra = list(c), list(c), [zero] * rows
    power = one
    for k in range(1, count + 1):
        power = power * half
        shift = rho + k
        part = power / shift
        work = []
        for r in range(rows):
            value = b_diagonal[r] * total[r]
            for column, entry in b_rows[r]:
                value = value + entry * total[column]
            work.append(value)
            extra[r] = (extra[r] + value * part).mid()
        for r in a_order:
            value = -work[r]
            for column, entry in a_rows[r]:
                value = value + entry * c[column]
            c[r] = _quotient(value, shift - a_diagonal[r])
        for r in range(rows):
            total[r] = (total[r] + c[r]).mid()
            series[r] = (series[r] + c[r] * power).mid()
    factor = (rho * half.log()).exp()
    f = [(factor * value).mid() for value in series]
    result, u = [zero] * rows, [zero] * rows
    power = half**count
    for k in range(count, 0, -1):
        for r in b_order:
            value = power * f[r] + result[r]
            for column, entry in b_rows[r]:
                value = value - entry * u[column]
            u[r] = _quotient(value, b_diagonal[r] + k)
        for r in range(rows):
            value = result[r] + a_diagonal[r] * u[r]
            for column, entry in a_rows[r]:
                value = value + entry * u[column]
            result[r] = value.mid()
        power = power * 2
    y = [(factor * (series[r] + extra[r]) + result[r]).mid() for r in range(rows)]
    signs = pattern.target_sign.tolist()
    return [y[t] if sign > 0 else -y[t] for t, sign in zip(pattern.target.tolist(), signs, strict=True)]


def _quotient(value: Any, by: Any) -> Any:
    if by.contains(0):
        raise ZeroDivisionError("resonance")
    return (value / by).mid()


def _real(value: Any) -> float:
    from flint import acb

    return float((value.real if isinstance(value, acb) else value).mid())


def _count(growth: float, epsilon: float) -> int:
    return (
        terms_needed(0.5, growth, 10.0 ** -min(epsilon, 300.0))
        if epsilon <= 300
        else int(terms_needed(0.5, growth, 1e-300) + (epsilon - 300) * 3.4)
    )
