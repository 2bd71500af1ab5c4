"""What a formula is made of.

Sums and products keep all their members in one node, so that a long formula is wide and not deep: nesting is what
brackets, functions, powers and signs add, and that is limited when the text is read.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

from ...exact import Exact


@dataclass(frozen=True)
class Number:
    """An exact constant, ``i`` included."""

    value: Exact


@dataclass(frozen=True)
class Pi:
    """The number pi."""


@dataclass(frozen=True)
class Parameter:
    """A named linear combination of the invariants."""

    name: str
    position: int


@dataclass(frozen=True)
class Invariant:
    """The sum of s_ab over the pairs inside a set of labels: a pair invariant or a channel."""

    labels: tuple[int, ...]


@dataclass(frozen=True)
class Sum:
    """``terms`` added, those with a true ``negative`` subtracted."""

    terms: tuple[Node, ...]
    negative: tuple[bool, ...]


@dataclass(frozen=True)
class Product:
    """``factors`` multiplied, those with a true ``inverse`` divided by."""

    factors: tuple[Node, ...]
    inverse: tuple[bool, ...]


@dataclass(frozen=True)
class Power:
    """``base ^ exponent``, principal branch."""

    base: Node
    exponent: Node


@dataclass(frozen=True)
class Call:
    """A function of the list; ``groups`` has one entry, for pFq three (numerators; denominators; argument)."""

    name: str
    groups: tuple[tuple[Node, ...], ...]
    position: int


Node: TypeAlias = Number | Pi | Parameter | Invariant | Sum | Product | Power | Call
