"""All Parke-Taylor integrals of one ordering and all F functions from one run of the recursion."""

from __future__ import annotations

import math
import zlib
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import permutations
from typing import Any

import numpy as np

from ..errors import NotAvailableError, PoleError
from .currents import amputated
from .integral import (
    MARGIN,
    MAX_LEGS,
    MAX_PRECISE_LEGS,
    NOISE,
    PRECISE_CIRCLE,
    SAFETY,
    UNIT,
    is_resonant,
    way_out,
)
from .point import Point
from .series import LANES, f_vector

Word = tuple[int, ...]


@dataclass(frozen=True)
class Vector:
    """Values with bounds on their errors: floats or complex numbers, or mpmath numbers with digits."""

    values: tuple[Any, ...]
    errors: tuple[float, ...]


def f_values(point: Point, digits: int | None = None) -> Vector:
    """F_w for all words w of the labels 2..n-2, in the order of ``itertools.permutations``.

    Raises
    ------
    NotAvailableError
        Beyond 11 legs (9 with digits).
    PoleError
    """
    return _run(point, digits, lambda f, arithmetic: list(f))


def parke_taylor_values(point: Point, cycles: Sequence[Word], digits: int | None = None) -> Vector:
    """``Z_{12..n}(PT(Q))`` for cycles Q of the labels 1..n, from one run.

    With n behind 1 and a word Q', ``Z(1, Q', n) = sum_w N(1 Q' | 1 w n-1) F_w``; any other cycle is a sum of these by
    the relations of Kleiss and Kuijf 1989: ``PT(1, a, n, b) = (-1)^|b| sum PT(1, shuffles of a and reversed b, n)``.
    """
    n = point.n
    words = [combination(n, cycle) for cycle in cycles]

    def contract(f: Any, arithmetic: _Arithmetic) -> list[Any]:
        place = {word: k for k, word in enumerate(permutations(range(2, n - 1)))}
        known: dict[Word, Any] = {}

        def basic(word: Word) -> Any:
            if word not in known:
                total = arithmetic.zero
                current = amputated(word, arithmetic.channel, arithmetic.zero, arithmetic.one)
                # N(1 Q' | R) for every R that starts with 1 and ends with n-1, R over the same letters as 1 Q'
                for other, weight in current.items():
                    if other[0] == 1 and other[-1] == n - 1:
                        total = total + weight * f[place[other[1:-1]]]
                known[word] = total
            return known[word]

        results = []
        for combined in words:
            total = arithmetic.zero
            for sign, word in combined:
                total = total + basic(word) if sign > 0 else total - basic(word)
            results.append(total)
        return results

    return _run(point, digits, contract)


def combination(n: int, cycle: Word) -> tuple[tuple[int, Word], ...]:
    """A Parke-Taylor factor as signed words ``(1, Q')`` with n behind them.

    >>> combination(4, (1, 2, 4, 3))
    ((-1, (1, 2, 3)), (-1, (1, 3, 2)))
    """
    start = cycle.index(1)
    turned = cycle[start:] + cycle[:start]
    place = turned.index(n)
    a, b = turned[1:place], turned[place + 1 :][::-1]
    sign = -1 if len(b) % 2 else 1
    return tuple((sign, (1, *word)) for word in _shuffles(a, b))


def _shuffles(a: Word, b: Word) -> list[Word]:
    if not a or not b:
        return [a + b]
    return [(a[0], *rest) for rest in _shuffles(a[1:], b)] + [(b[0], *rest) for rest in _shuffles(a, b[1:])]


@dataclass(frozen=True)
class _Arithmetic:
    channel: Callable[[Word], Any]
    zero: Any
    one: Any


def _run(point: Point, digits: int | None, contract: Callable[[Any, _Arithmetic], list[Any]]) -> Vector:
    n = point.n
    if n > (MAX_LEGS if digits is None else MAX_PRECISE_LEGS):
        raise NotAvailableError(f"the series engine goes up to n = {MAX_LEGS if digits is None else MAX_PRECISE_LEGS}")
    for (i, j), x in point.planar().items():
        if x.is_integer and x < 0:
            raise PoleError(tuple(range(i, j + 1)), -int(x), x)
    if digits is None:
        found = _double(point, contract)
        if all(math.isfinite(error) for error in found.errors):
            return found
        digits_needed = 20
    else:
        digits_needed = digits
    values, errors = _precise(point, digits_needed, contract)
    if digits is None:
        plain = tuple(float(v) if point.is_real else complex(v) for v in values)
        return Vector(plain, tuple(e + 2 * UNIT * abs(v) for e, v in zip(errors, plain, strict=True)))
    return Vector(values, errors)


def _double(point: Point, contract: Callable[[Any, _Arithmetic], list[Any]]) -> Vector:
    seed = zlib.crc32(repr([str(p) for p in point.pairs]).encode())
    generator = np.random.default_rng(seed)
    known: dict[Word, Any] = {}

    def channel(labels: Word) -> Any:
        key = tuple(sorted(labels))
        if key not in known:
            shake = np.ones(LANES)
            shake[1:] += 4.0 * NOISE * generator.uniform(-1.0, 1.0, LANES - 1)
            known[key] = point.channel(key).value() * shake
        return known[key]

    kind = float if point.is_real else complex
    with np.errstate(all="ignore"):
        lanes = np.array(
            contract(
                f_vector(point, NOISE, seed),
                _Arithmetic(channel, np.zeros(LANES, dtype=kind), np.ones(LANES, dtype=kind)),
            )
        )
        spread = np.abs(lanes[:, 1:] - lanes[:, :1]).max(axis=1)
    values = tuple(value.item() for value in lanes[:, 0])
    errors = tuple(float(SAFETY * (UNIT / NOISE) * s + 4 * UNIT * abs(v)) for s, v in zip(spread, values, strict=True))
    return Vector(values, errors)


def _precise(
    point: Point, digits: int, contract: Callable[[Any, _Arithmetic], list[Any]]
) -> tuple[tuple[Any, ...], tuple[float, ...]]:
    import mpmath
    from flint import acb, arb

    from ..precise.context import as_mpmath, ball, flint_precision
    from .multiprecision import f_vector as precise_vector

    is_complex = not point.is_real
    zero, one = (acb(0), acb(1)) if is_complex else (arb(0), arb(1))

    resonant = is_resonant(point)
    direction, room = way_out(point) if resonant else ((), 1.0)

    def once(sums: Callable[[int], Any], working: float, nought: Any, unit: Any) -> list[Any]:
        known: dict[int, Any] = {}

        def inside(mask: int) -> Any:
            if mask not in known:
                known[mask] = sums(mask)
            return known[mask]

        f = precise_vector(point.n, inside, nought, unit, working)
        channel = _Arithmetic(lambda labels: inside(sum(1 << label for label in labels)), nought, unit)
        return contract(f, channel)

    def at(working: float) -> list[Any]:
        bits = int(working * 3.3220) + 20
        with flint_precision(bits):
            if not resonant:
                found = once(lambda mask: ball(point.inside(mask), is_complex), working, zero, one)
                return [as_mpmath(value, bits) for value in found]
            # all entries are regular there although the recursion is not: their mean over a small circle
            radius = arb(room) * arb(10) ** (-arb(int(working + 10)) / PRECISE_CIRCLE)
            way = Point(point.n, direction)
            half = range(PRECISE_CIRCLE // 2) if point.is_real else range(PRECISE_CIRCLE)
            total: list[Any] = []
            for k in half:
                angle = arb(2 * k + 1) / PRECISE_CIRCLE
                h = radius * acb(angle.cos_pi(), angle.sin_pi())

                def moved(mask: int, h: Any = h) -> Any:
                    return ball(point.inside(mask), True) + h * ball(way.inside(mask), True)

                values = once(moved, working, acb(0), acb(1))
                total = [a + b for a, b in zip(total, values, strict=True)] if total else list(values)
            means = [value / len(half) for value in total]
            return [as_mpmath(v.real if point.is_real else v, bits) for v in means]

    lost = 6.0 + 1.5 * point.n
    while True:
        rough, working = 12.0 + lost, digits + lost + MARGIN
        low, high = at(rough), at(working)
        ctx = mpmath.MPContext()
        ctx.dps = int(working) + 5
        errors = []
        for a, b in zip(low, high, strict=True):
            difference = float(abs(ctx.mpmathify(a) - ctx.mpmathify(b))) + 10.0**-rough * float(abs(b))
            errors.append(difference * 10.0 ** max(MARGIN - (working - rough), -300.0))
        short = [
            math.log10(e / float(abs(v))) + digits for e, v in zip(errors, high, strict=True) if float(abs(v)) > 1e-200
        ]
        if not short or max(short) <= 0 or lost > 500:
            return tuple(high), tuple(errors)
        lost += max(10.0, max(short))
