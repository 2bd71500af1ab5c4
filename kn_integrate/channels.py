"""Labels, orderings and channels: checked once, in one canonical form.

A channel is the set of all its labels, written as a sorted tuple.  A channel and its complement are the same
factorisation; of the two the *canonical* one is the smaller, and of equal size the one with the first label of the
ordering.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from functools import lru_cache
from typing import Any

from .errors import InputError
from .exact import read_integer

Channel = tuple[int, ...]
Pair = tuple[int, int]


@lru_cache(maxsize=64)
def pair_order(n: int) -> tuple[Pair, ...]:
    """The order in which the values of all pairs are kept: (1,2), (1,3), ..., (n-1,n)."""
    return tuple((i, j) for i in range(1, n) for j in range(i + 1, n + 1))


@lru_cache(maxsize=64)
def pair_index(n: int) -> dict[Pair, int]:
    """Where a pair stands in :func:`pair_order`; both orders of its labels are keys."""
    index = {pair: k for k, pair in enumerate(pair_order(n))}
    return index | {(j, i): k for (i, j), k in index.items()}


def read_count(n: Any, least: int = 4) -> int:
    """The number of punctures."""
    expected = f"an integer, at least {least}"
    count = read_integer(n, "n", expected)
    if count < least:
        raise InputError("n", count, expected)
    return count


def read_labels(labels: Any, n: int, field: str) -> Channel:
    """Different labels of 1..n, in the order given.

    >>> read_labels([1, 3], 4, "channel")
    (1, 3)
    """
    expected = f"different labels from 1 to {n}"
    if isinstance(labels, (str, bytes)) or not isinstance(labels, Iterable):
        raise InputError(field, repr(labels), expected)
    items = tuple(labels)
    found = tuple(read_integer(label, field, expected) for label in items)
    if any(not 1 <= label <= n for label in found) or len(set(found)) != len(found):
        raise InputError(field, repr(found), expected)
    return found


def read_ordering(ordering: Sequence[int] | None, n: int, field: str = "ordering") -> Channel:
    """A permutation of 1..n; the identity for None."""
    if ordering is None:
        return tuple(range(1, n + 1))
    found = read_labels(ordering, n, field)
    if len(found) != n:
        raise InputError(field, repr(found), f"a permutation of 1..{n}")
    return found


def read_pair(labels: Any, n: int, field: str) -> Pair:
    """Two different labels, the smaller first."""
    found = read_labels(labels, n, field)
    if len(found) != 2:
        raise InputError(field, repr(found), "two labels")
    return (found[0], found[1]) if found[0] < found[1] else (found[1], found[0])


@lru_cache(maxsize=4096)
def is_consecutive(labels: frozenset[int], ordering: Channel) -> bool:
    """Whether labels stand next to each other in the cyclic ordering.

    >>> is_consecutive(frozenset({5, 1}), (1, 2, 3, 4, 5)), is_consecutive(frozenset({1, 3}), (1, 2, 3, 4, 5))
    (True, False)
    """
    n = len(ordering)
    inside = [label in labels for label in ordering]
    return sum(inside[k] != inside[k - 1] for k in range(n)) == 2


def canonical(labels: Iterable[int], ordering: Channel) -> Channel:
    """The canonical one of a channel and its complement, sorted."""
    inside = frozenset(labels)
    outside = frozenset(ordering) - inside
    if len(outside) < len(inside) or (len(outside) == len(inside) and ordering[0] not in inside):
        inside = outside
    return tuple(sorted(inside))


@lru_cache(maxsize=1024)
def planar_channels(ordering: Channel) -> tuple[Channel, ...]:
    """The n(n-3)/2 canonical channels that are planar in an ordering, by size, then by position.

    >>> planar_channels((1, 2, 3, 4, 5))
    ((1, 2), (2, 3), (3, 4), (4, 5), (1, 5))
    """
    n = len(ordering)
    doubled = ordering + ordering
    found: dict[Channel, None] = {}
    for size in range(2, n // 2 + 1):
        for start in range(n):
            found.setdefault(canonical(doubled[start : start + size], ordering))
    return tuple(found)


def dotted(labels: Iterable[int]) -> str:
    """The name of a channel on the command line: ``1.2.3``."""
    return ".".join(map(str, labels))
