"""The integrals a formula may belong to by mistake: another ordering, another integrand, exchanged labels."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from itertools import combinations, permutations
from typing import Any

from ..channels import Channel, planar_channels
from ..errors import InputError
from ..integrals import DiskIntegral, SphereIntegral
from ..integrand import parke_taylor
from ..kinematics import Mandelstams

Value = Callable[[Mandelstams], Any]


def _cycles(n: int) -> Iterator[Channel]:
    """The (n-1)!/2 orderings up to rotation and reflection."""
    for rest in permutations(range(2, n + 1)):
        if rest[0] < rest[-1]:
            yield (1, *rest)


def _names(labels: Sequence[int]) -> str:
    return "(" + ",".join(map(str, labels)) + ")"


def _candidates(spec: DiskIntegral | SphereIntegral) -> Iterator[tuple[str, Any, Channel | None]]:
    """Name, integral, and new labels of the kinematics (None for the same)."""
    n = spec.n
    for order in _cycles(n):
        pt = parke_taylor(*order)
        if isinstance(spec, DiskIntegral):
            yield f"the same integrand on the ordering P = {_names(order)}", DiskIntegral(n, spec.f, order), None
            yield (
                f"the integrand PT{_names(order)}, on the ordering asked for",
                DiskIntegral(n, pt, spec.ordering),
                None,
            )
        else:
            yield f"the right integrand PT{_names(order)}", SphereIntegral(n, spec.f, pt), None
            yield f"the left integrand PT{_names(order)}", SphereIntegral(n, pt, spec.g), None
    for labels in permutations(range(1, n + 1)):
        if n <= 4 or (n == 5 and labels[0] == 1) or sum(a != k for k, a in enumerate(labels, start=1)) <= 2:
            yield f"the same integral with the labels 1..{n} called {_names(labels)}", spec, labels


def other_integral(
    spec: DiskIntegral | SphereIntegral,
    points: Sequence[Mandelstams],
    formula: Value,
    integral: Callable[[Any, Mandelstams], Any],
    same: Callable[[Any, Any], bool],
) -> str | None:
    """The name of an integral that the formula equals up to its sign at all points, None if there is none.

    Parameters
    ----------
    spec
        The integral that was asked for.
    points
        Kinematics; the first sieves the candidates.
    formula, integral, same
        Values (None where there is none), and equality.
    """
    wanted = [formula(kin) for kin in points]
    if any(value is None or not value for value in wanted):
        return None
    tried: set[Any] = set()
    for name, candidate, labels in _candidates(spec):
        signs = set()
        for kin, value in zip(points, wanted, strict=True):
            try:
                place = kin if labels is None else kin.relabelled(labels)
            except InputError:
                break
            if labels is not None:
                if place == kin or (kin is points[0] and place.pairs in tried):
                    break
                tried.add(place.pairs)
            found = integral(candidate, place)
            if found is None or not found:
                break
            signs.add(1 if same(value, found) else -1 if same(value, -found) else 0)
            if 0 in signs:
                break
        else:
            if signs in ({1}, {-1}):
                return name + (" (up to the sign)" if signs == {-1} else "")
    return _exchanged(spec, points, wanted, integral, same)


def _exchanged(
    spec: DiskIntegral | SphereIntegral,
    points: Sequence[Mandelstams],
    wanted: Sequence[Any],
    integral: Callable[[Any, Mandelstams], Any],
    same: Callable[[Any, Any], bool],
) -> str | None:
    """The formula with two planar invariants written for each other."""
    ordering = spec.ordering if isinstance(spec, DiskIntegral) else tuple(range(1, spec.n + 1))
    for first, second in combinations(planar_channels(ordering), 2):
        for kin, value in zip(points, wanted, strict=True):
            values = kin.planar(ordering)
            values[first], values[second] = values[second], values[first]
            found = integral(spec, Mandelstams.from_planar(kin.n, values, ordering, kin.row_sums))
            if found is None or not same(value, found):
                break
        else:
            names = [".".join(map(str, labels)) for labels in (first, second)]
            return f"the same integral with X.{names[0]} and X.{names[1]} exchanged"
    return None
