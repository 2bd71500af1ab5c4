"""Expansions of disk integrals ``Z_P(f)`` around s = 0 along the ray ``alpha' s``.

The weight-w term of ``Z_P(f)`` is ``alpha'^(w-(n-3))`` times a rational function of the invariants, homogeneous of
that degree, for each product of zeta values of weight w.  Two engines give the functions F: the associator (exact), and
the recursion in balls (numbers); this module only combines them with the field-theory trees, exactly.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from typing import Any, TypeAlias

from ..channels import planar_channels
from ..errors import PoleError
from ..exact import ZERO, Exact
from ..integrand import Integrand
from ..kinematics import Mandelstams
from .associator import expand_integrals
from .fractions import Word, chains
from .lines import Series, through_zeros
from .trees import Currents
from .zetas import Product, ZetaSum, product_weight

Engine: TypeAlias = Callable[[Mandelstams, int], Mapping[Word, Series]]
ZERO_SUM = ZetaSum()


def exact_engine(kin: Mandelstams, weight: int) -> dict[Word, Series]:
    """The functions F of the ordering 1..n as exact series."""
    found = expand_integrals(kin.n, kin.pair, weight)
    return {word: _by_weight(terms, weight) for word, terms in found.items()}


def _by_weight(terms: Mapping[Product, Exact], weight: int) -> Series:
    parts: list[dict[Product, Exact]] = [{} for _ in range(weight + 1)]
    for product, c in terms.items():
        parts[product_weight(product)][product] = c
    return [ZetaSum(part) for part in parts]


def in_standard_order(kin: Mandelstams, f: Integrand, ordering: Sequence[int]) -> tuple[Mandelstams, Integrand]:
    """The same integral with labels renamed so that the ordering is 1..n."""
    new = {label: k for k, label in enumerate(ordering, start=1)}
    return kin.relabelled([new[label] for label in range(1, kin.n + 1)]), f.relabelled(new)


def disk_series(
    kin: Mandelstams,
    f: Integrand,
    ordering: Sequence[int],
    weight: int,
    engine: Engine = exact_engine,
    zero: Any = ZERO_SUM,
) -> Series:
    """The coefficients of ``Z_P(f)`` by weight.

    Parameters
    ----------
    kin
        Massless kinematics.
    f
        A sum of Parke-Taylor factors up to partial fractions.
    ordering
        The ordering P.
    weight
        The highest weight.
    engine, zero
        What gives the functions F, and zero as one of its numbers.

    Raises
    ------
    PoleError
        When a planar channel vanishes and the integral has a pole there for every alpha'.
    NotAvailableError
        When f has double poles.
    """
    point, integrand = in_standard_order(kin, f, ordering)
    words = chains(point.n, integrand)
    try:
        return _combine(point, words, weight, engine, zero)
    except ZeroDivisionError:
        pass
    found = through_zeros(
        point, _propagators(words), weight, lambda moved: _combine(moved, words, weight, engine, zero)
    )
    if found is None:
        raise _pole_error(kin, ordering)
    return found


def _combine(kin: Mandelstams, words: Mapping[Word, Exact], weight: int, engine: Engine, zero: Any) -> Series:
    n = kin.n
    currents = Currents(kin.pair)
    total: Series = [zero] * (weight + 1)
    if not words:
        return total
    for word, series in engine(kin, weight).items():
        factor = ZERO
        for q, c in words.items():
            factor = factor + c * currents.numerator((1, *q), (1, *word, n - 1))
        if factor:
            total = [a + b * factor for a, b in zip(total, series, strict=True)]
    return total


def f_series(kin: Mandelstams, row: Word, column: Word, weight: int, engine: Engine = exact_engine) -> Series:
    """The entry of the matrix F for the domain (1, row, n-1, n) and the word of a column."""
    ordering = (1, *row, kin.n - 1, kin.n)
    new = {label: k for k, label in enumerate(ordering, start=1)}
    point = kin.relabelled([new[label] for label in range(1, kin.n + 1)])
    return engine(point, weight)[tuple(new[label] for label in column)]


def _propagators(words: Iterable[Word]) -> list[Word]:
    """Every set of labels that is a propagator of some tree of some word, the whole word left out."""
    found: dict[Word, None] = {}
    for word in words:
        full = (1, *word)
        for size in range(2, len(full)):
            for start in range(len(full) - size + 1):
                found.setdefault(tuple(sorted(full[start : start + size])))
    return list(found)


def _pole_error(kin: Mandelstams, ordering: Sequence[int]) -> PoleError:
    order = tuple(ordering)
    for channel in planar_channels(order):
        x = kin.channel(channel)
        if not x:
            return PoleError(channel, 0, x)
    raise AssertionError("a pole of a disk integral is planar in its ordering")
