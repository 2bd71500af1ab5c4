"""Limits and residues against products of lower-point numbers."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import combinations

from ..dispatch.family import disk_family, moved
from ..dispatch.request import make_request
from ..errors import InputError
from ..estimate import Estimate
from ..exact import ZERO
from ..integrand import parke_taylor
from ..kinematics import Mandelstams
from ..momentum_kernel import biadjoint
from ..poles import disk_residue, laurent_series


@dataclass(frozen=True)
class Comparison:
    """Two numbers that a relation says are equal, with bounds on their errors."""

    name: str
    source: str
    left: complex
    right: complex
    error: float

    @property
    def holds(self) -> bool:
        """True when they agree within the claimed errors."""
        return bool(abs(self.left - self.right) <= self.error)


def factorisation(
    kin: Mandelstams, channel: Sequence[int], evaluate: Callable[..., Estimate], rtol: float = 1e-10
) -> Comparison:
    """``Res_{X=0} Z_P(PT(P)) = Z_L Z_R`` for P = 12..n and a planar channel of massless legs."""
    n = kin.n
    f = parke_taylor(*range(1, n + 1))
    family = disk_family(kin, f)
    chord = family.chord(channel)
    found = disk_residue(kin, f, channel=channel, request=make_request(rtol=rtol))
    at = moved(kin, family.ordering, {chord: -kin.channel(family.name(chord))})
    i, j = chord
    product, error = 1.0 + 0.0j, 0.0
    for legs in (list(range(i, j + 1)), [*range(j + 1, n + 1), *range(1, i)]):
        m = len(legs) + 1
        if m < 4:
            continue
        pairs = {(a, b): at.pair(legs[a - 1], legs[b - 1]) for a, b in combinations(range(1, m), 2)}
        factor = evaluate(Mandelstams.from_pairs(m, pairs), parke_taylor(*range(1, m + 1)))
        error = error * abs(factor.value) + factor.error * abs(product)
        product *= complex(factor.value)
    return Comparison("factorisation", "unitarity, common practice", complex(found.value), product, found.error + error)


def field_theory_limit(kin: Mandelstams, ordering: Sequence[int], cycle: Sequence[int]) -> Comparison:
    """The leading Laurent coefficient of ``Z_P(PT(Q))`` at ``x kin``, x -> 0, against the sum over cubic trees.

    Source: F. Cachazo, S. He, E. Y. Yuan, arXiv:1309.0885.
    """
    n = kin.n
    series = laurent_series(kin, parke_taylor(*cycle), ordering=ordering, direction="scale", high=-(n - 3), rtol=1e-9)
    value, error = series.coefficient(-(n - 3))
    trees = biadjoint(kin, ordering, cycle)
    source = "F. Cachazo, S. He, E. Y. Yuan, arXiv:1309.0885"
    return Comparison("field-theory limit", source, complex(value), complex(trees.value()), error)


def soft_limit(hard: Mandelstams, soft: Sequence[object], evaluate: Callable[..., Estimate]) -> Comparison:
    """``Z_n -> (1/s_{n-1,n} + 1/s_{n,1}) Z_{n-1}`` as the momentum of leg n goes to zero; n - 1 = 4 hard legs.

    ``soft`` are the invariants ``s_51, s_52, s_53`` per unit of the small parameter; ``s_54`` follows.
    """
    if hard.n != 4 or len(soft) != 3:
        raise InputError("hard, soft", f"{hard.n} legs, {len(soft)} values", "four hard legs and three soft invariants")
    from ..exact import read

    s15, s25, s35 = (read(value, "soft")[0] for value in soft)
    s45 = -(s15 + s25 + s35)
    r1, r2, r3, r4 = -s15, -s25, -s35, -s45
    t12 = (r1 + r2 - r3 + r4) / 2
    total = {
        **dict.fromkeys(combinations(range(1, 6), 2), ZERO),
        (1, 5): s15,
        (2, 5): s25,
        (3, 5): s35,
        (4, 5): s45,
        (1, 2): t12,
        (1, 3): r1 - t12,
        (2, 3): r2 - t12,
        (3, 4): r4,
    }
    start = {(i, j): hard.pair(i, j) if j < 5 else ZERO for i, j in combinations(range(1, 6), 2)}
    series = laurent_series(
        Mandelstams.from_pairs(5, start),
        parke_taylor(1, 2, 3, 4, 5),
        direction=Mandelstams.from_pairs(5, total),
        low=-2,
        high=-1,
    )
    value, error = series.coefficient(-1)
    four = evaluate(hard, parke_taylor(1, 2, 3, 4))
    factor = complex((1 / s45 + 1 / s15).value())
    return Comparison(
        "soft limit", "common practice", complex(value), factor * complex(four.value), error + abs(factor) * four.error
    )
