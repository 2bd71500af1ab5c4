"""Expansions of disk integrals ``Z_P(f)`` around s = 0 along the ray ``alpha' s``.

The coefficient of ``alpha'^(w-(n-3))`` is a rational function of the invariants, homogeneous of that degree, for each
product of zeta values: of weight w when f is a combination of Parke-Taylor factors, of weight up to w when f has
double poles.  Two engines give the functions F: the associator (exact), and the recursion in balls (numbers); this
module only combines them with the field-theory trees, exactly.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from itertools import permutations
from typing import Any, TypeAlias

from ..channels import canonical
from ..errors import NotAvailableError, PoleError
from ..exact import ZERO, Exact
from ..integrals import DiskIntegral
from ..integrand import Integrand
from ..kinematics import Mandelstams
from .associator import expand_integrals
from .by_parts import reduce_by_parts
from .chains import Word, chains
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
        Any integrand that is Moebius covariant for massless legs.
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
    """
    point, integrand = in_standard_order(kin, f, ordering)
    n = kin.n
    words = uniform_words(n, integrand)

    def at(moved: Mandelstams) -> Series:
        orders = [words] if words is not None else reduce_by_parts(n, integrand, moved.pair, weight + 1)
        return _combine(moved, orders, weight, engine, zero)

    try:
        return at(point)
    except ZeroDivisionError:
        pass
    every = [(1, *word) for word in permutations(range(2, n))] if words is None else [(1, *word) for word in words]
    found = through_zeros(point, _propagators(every), weight, at)
    if found is None:
        raise _pole_error(kin, f, ordering)
    return found


def uniform_words(n: int, f: Integrand) -> dict[Word, Exact] | None:
    """f as a combination of Parke-Taylor factors ``PT(1, w, n)`` without kinematics; None when it has double poles."""
    try:
        return chains(n, f)
    except NotAvailableError:
        return None


def _combine(
    kin: Mandelstams, orders: Sequence[Mapping[Word, Exact]], weight: int, engine: Engine, zero: Any
) -> Series:
    """``sum_k alpha'^k sum_w c_k,w Z(1, w, n)`` on the ordering 1..n."""
    n = kin.n
    currents = Currents(kin.pair)
    total: Series = [zero] * (weight + 1)
    if not any(orders):
        return total
    functions = engine(kin, weight)
    domains = {(1, *word, n - 1): series for word, series in functions.items()}
    every = dict.fromkeys((1, *q) for words in orders for q in words)
    factors: dict[Word, list[Exact]] = {domain: [ZERO] * len(orders) for domain in domains}

    def add(domain: Word, q: Word, tree: Exact) -> None:
        into = factors[domain]
        for k, words in enumerate(orders):
            if q[1:] in words:
                into[k] = into[k] + words[q[1:]] * tree

    if len(every) <= len(domains):  # N is symmetric: expand the fewer words
        for q in every:
            for domain, tree in currents.numerators(q).items():
                if domain in domains:
                    add(domain, q, tree)
    else:
        for domain in domains:
            for q, tree in currents.numerators(domain).items():
                if q in every:
                    add(domain, q, tree)
    for domain, series in domains.items():
        for k, factor in enumerate(factors[domain]):
            if factor:
                for w in range(k, weight + 1):
                    total[w] = total[w] + series[w - k] * factor
    return total


def f_series(kin: Mandelstams, row: Word, column: Word, weight: int, engine: Engine = exact_engine) -> Series:
    """The entry of the matrix F for the domain (1, row, n-1, n) and the word of a column."""
    ordering = (1, *row, kin.n - 1, kin.n)
    new = {label: k for k, label in enumerate(ordering, start=1)}
    point = kin.relabelled([new[label] for label in range(1, kin.n + 1)])
    return engine(point, weight)[tuple(new[label] for label in column)]


def _propagators(words: Iterable[Word]) -> list[Word]:
    """Every set of neighbours in some word, single labels and the whole word left out."""
    found: dict[Word, None] = {}
    for word in words:
        for size in range(2, len(word)):
            for start in range(len(word) - size + 1):
                found.setdefault(tuple(sorted(word[start : start + size])))
    return list(found)


def _pole_error(kin: Mandelstams, f: Integrand, ordering: Sequence[int]) -> PoleError:
    poles = DiskIntegral(kin.n, f, ordering).poles(kin)
    channel, level, x = next(pole for pole in poles if not pole[2])
    return PoleError(canonical(channel, tuple(ordering)), level, x)
