"""The recursion in python-flint arithmetic.

Balls follow a majorant and blow up in long recursions, so radii are stripped after every step; the error of a result
comes from comparing two working precisions instead.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from .pattern import HalfPattern, StepPattern, step_pattern
from .series import growth_of, series_length


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
    everything = sum(1 << i for i in range(1, legs + 1))
    around = (1 << 1) | (1 << top)
    infinity = [inside(everything) - inside(around | mask << 2) for mask in range(1 << (legs - 3))]
    exponents = [np.array([complex(v.mid()) for v in part]) for part in (a_diagonal, b_diagonal, infinity)]
    growth = growth_of(complex(rho.mid()), *exponents)
    largest = max(abs(complex(rho.mid())), *(float(abs(part).max()) for part in exponents))
    last = max(max(_real(v - rho) for v in a_diagonal), max(-_real(v) for v in b_diagonal))
    count = series_length(growth, largest, last, epsilon)
    meeting = 3 - 2 * (one * 2).sqrt()
    a_order, b_order = pattern.a.order.tolist(), pattern.b.order.tolist()

    total, alternating, series = list(c), list(c), list(c)
    extra, lifted = [zero] * rows, [zero] * rows
    power, double_rho = one, 2 * rho
    for k in range(1, count + 1):
        power = (power * meeting).mid()
        shift = rho + k
        both = [2 * (p + q) for p, q in zip(total, alternating, strict=True)]
        work = []
        for r in range(rows):
            value = b_diagonal[r] * both[r]
            for column, entry in b_rows[r]:
                value = value + entry * both[column]
            work.append(value)
            h = (value + double_rho * lifted[r]) / shift
            lifted[r] = (h - lifted[r]).mid()
            extra[r] = (extra[r] + h * power).mid()
        twice = [2 * q for q in alternating]
        for r in a_order:
            value = (rho - a_diagonal[r]) * twice[r] - work[r]
            for column, entry in a_rows[r]:
                value = value + entry * both[column]
            c[r] = _quotient(value, shift - a_diagonal[r])
            both[r] = c[r] - twice[r]  # what A multiplies: entries of rows below come first
        for r in range(rows):
            total[r] = (total[r] + c[r]).mid()
            alternating[r] = (c[r] - alternating[r]).mid()
            series[r] = (series[r] + c[r] * power).mid()
    factor = (rho * (one / 2).log()).exp()
    f = [(factor * value).mid() for value in series]
    first, second, result, u, image = ([zero] * rows for _ in range(5))
    powers = [one]
    for _ in range(count):
        powers.append((powers[-1] * meeting).mid())
    for k in range(count, 0, -1):
        power = powers[k]
        for r in b_order:
            off = zero
            for column, entry in b_rows[r]:
                off = off + entry * u[column]
            u[r] = _quotient(power * f[r] + first[r] + second[r] - off, b_diagonal[r] + k)
            image[r] = 2 * (off + b_diagonal[r] * u[r])
        for r in range(rows):
            value = a_diagonal[r] * u[r]
            for column, entry in a_rows[r]:
                value = value + entry * u[column]
            value = 2 * value
            first[r] = (first[r] + value).mid()
            second[r] = (value + image[r] - second[r]).mid()
            result[r] = (result[r] + image[r] if k % 2 == 0 else result[r] - image[r]).mid()
    y = [(factor * (series[r] + extra[r]) + first[r] + second[r] + result[r]).mid() for r in range(rows)]
    signs = pattern.target_sign.tolist()
    return [y[t] if sign > 0 else -y[t] for t, sign in zip(pattern.target.tolist(), signs, strict=True)]


def _quotient(value: Any, by: Any) -> Any:
    if by.contains(0):
        raise ZeroDivisionError("resonance")
    return (value / by).mid()


def _real(value: Any) -> float:
    from flint import acb

    return float((value.real if isinstance(value, acb) else value).mid())
