"""Planar channels and pair invariants: reading the one, computing the other."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from typing import Any

from .channels import Channel, canonical, dotted, is_consecutive, pair_index, pair_order, read_labels
from .errors import InputError
from .exact import ZERO, Exact


def planar_key(labels: Any, n: int, order: Channel) -> Channel:
    """The sorted labels of a planar channel, with an explanation when they are none.

    Raises
    ------
    InputError
    """
    name = tuple(sorted(read_labels(labels, n, f"channel {labels!r}")))
    if not 2 <= len(name) <= n - 2:
        raise InputError(f"channel {dotted(name)}", f"{len(name)} labels", f"between 2 and {n - 2} labels")
    if not is_consecutive(frozenset(name), order):
        expected = f"labels that are neighbours in the ordering {dotted(order)}"
        if len(name) == 2:
            i, j = name
            expected += (
                f" (a channel is named by all its labels: for the pair invariant s_{i}{j} use from_pairs; "
                f"for the chord X_{i},{j} of the polygon give ({dotted(range(i, j))}) here, or use from_chords)"
            )
        raise InputError(f"channel {dotted(name)}", "labels that are not neighbours", expected)
    return name


def row_difference(inside: Iterable[int], outside: Iterable[int], rows: Sequence[Exact]) -> Exact:
    """X of a channel less X of its complement: half the difference of their row sums."""
    left = sum((rows[label - 1] for label in inside), ZERO)
    right = sum((rows[label - 1] for label in outside), ZERO)
    difference: Exact = (left - right) / 2
    return difference


def pairs_of_planar(
    n: int, order: Channel, channels: Mapping[Channel, Exact], rows: Sequence[Exact]
) -> tuple[Exact, ...]:
    """All pairs from the planar invariants: second differences, then conservation for the last leg."""
    everything = frozenset(order)

    def run(first: int, last: int) -> Exact:
        # X of positions first..last, 0-based, not containing the last position of the ordering
        if last <= first:
            return ZERO
        inside = order[first : last + 1]
        outside = everything.difference(inside)
        proper = canonical(inside, order)
        if len(outside) == 1:
            return row_difference(inside, outside, rows)
        value = channels[proper]
        return value if proper == tuple(sorted(inside)) else value + row_difference(inside, outside, rows)

    known = {(a, b): run(a, b) for a in range(n - 1) for b in range(a, n - 1)}
    index = pair_index(n)
    values = [ZERO] * len(pair_order(n))
    last_leg = order[-1]
    for a in range(n - 1):
        rest = rows[order[a] - 1]
        for b in range(n - 1):
            if a == b:
                continue
            low, high = min(a, b), max(a, b)
            k = index[order[low], order[high]]
            if b > a:
                value = known[a, b] - known[a + 1, b] - known[a, b - 1]
                values[k] = value + known[a + 1, b - 1] if b - a > 1 else value
            rest = rest - values[k]
        values[index[order[a], last_leg]] = rest
    return tuple(values)
