"""The published values in tests/data/published_values.json as Python objects; the README there has the format."""

from __future__ import annotations

import json
from dataclasses import dataclass, field
from functools import cache
from itertools import combinations
from pathlib import Path

import mpmath

from kn_integrate.closed_forms import PairExponents
from kn_integrate.exact import Exact, read

PATH = Path(__file__).parent.parent / "data" / "published_values.json"


@dataclass(frozen=True)
class Term:
    """coefficient x one integral: ``left`` of |z_ij| on the disk, ``left`` of z_ij and ``right`` of its conjugate."""

    coefficient: Exact
    left: PairExponents
    right: PairExponents | None = None


@dataclass(frozen=True)
class PublishedValue:
    """One entry of the file."""

    id: str
    kind: str  # "disk", "sphere" or "inverse_kernel"
    n: int
    value: mpmath.mpc
    digits: int
    source: str
    note: str = ""
    terms: tuple[Term, ...] = ()
    planar: dict[tuple[int, ...], str] = field(default_factory=dict)  # massless kinematics, channel -> exact text
    ordering: tuple[int, ...] = ()  # disk with planar kinematics
    integrands: tuple[tuple[int, ...], ...] = ()  # one Parke-Taylor cycle on the disk, two on the sphere
    parameters: dict[str, str] = field(default_factory=dict)


def _pairs(n: int, table: dict[str, str]) -> PairExponents:
    keys = [f"{i}.{j}" for i, j in combinations(range(1, n + 1), 2)]
    assert sorted(keys) == sorted(table)
    return PairExponents.of([table[key] for key in keys])


def _value(found: str | list[str], digits: int) -> mpmath.mpc:
    with mpmath.workdps(digits + 10):
        return mpmath.mpc(*found) if isinstance(found, list) else mpmath.mpc(found)


def _entry(raw: dict) -> PublishedValue:
    n = raw["n"]
    terms = tuple(
        Term(
            read(term["coefficient"], "coefficient")[0],
            _pairs(n, term["left"] if "left" in term else term["pairs"]),
            _pairs(n, term["right"]) if "right" in term else None,
        )
        for term in raw.get("terms", [])
    )
    return PublishedValue(
        raw["id"],
        raw["kind"],
        n,
        _value(raw["value"], raw["digits"]),
        raw["digits"],
        raw["source"],
        raw.get("note", ""),
        terms,
        {tuple(map(int, key.split("."))): text for key, text in raw.get("planar", {}).items()},
        tuple(raw.get("ordering", ())),
        tuple(tuple(cycle) for cycle in raw.get("integrands", ())),
        raw.get("parameters", {}),
    )


@cache
def _everything() -> tuple[PublishedValue, ...]:
    return tuple(_entry(raw) for raw in json.loads(PATH.read_text(encoding="utf-8"))["entries"])


def published(kind: str | None = None, n: int | None = None, single: bool = False) -> list[PublishedValue]:
    """Entries of a kind and a number of punctures; ``single`` keeps those that are one integral, not a sum."""
    return [
        entry
        for entry in _everything()
        if kind in (None, entry.kind) and n in (None, entry.n) and not (single and len(entry.terms) != 1)
    ]
