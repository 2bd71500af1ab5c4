"""Limits and residues against products of lower-point numbers."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import combinations, permutations

from ..dispatch.family import disk_family, moved
from ..dispatch.request import make_request
from ..errors import InputError
from ..estimate import Estimate
from ..exact import ZERO, Exact
from ..exponents import DiskExponents
from ..integrand import Integrand, parke_taylor
from ..kinematics import Mandelstams
from ..momentum_kernel import biadjoint, inverse_klt, klt_kernel
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


def first_massive_level(kin: Mandelstams, evaluate: Callable[..., Estimate], rtol: float = 1e-10) -> Comparison:
    """``Res_{s12=-1} Z_n = -sum_{j=3}^{n-1} A_2j I_{n-1}[A_1j + A_2j merged, one less at j]`` for PT(12..n).

    A are the full exponents at s12 = -1.  In the gauge z_n = infinity the residue is the derivative of the integrand at
    ``z_2 = z_1``; the exponents at infinity follow from the row sums, term by term.
    """
    n = kin.n
    f = parke_taylor(*range(1, n + 1))
    found = disk_residue(kin, f, channel=(1, 2), level=1, request=make_request(rtol=rtol))
    at = moved(kin, tuple(range(1, n + 1)), {(1, 2): -1 - kin.pair(1, 2)})
    full = {(i, j): at.pair(i, j) - (1 if j - i in (1, n - 1) else 0) for i, j in combinations(range(1, n + 1), 2)}
    total, error = 0.0 + 0.0j, 0.0
    for j in range(3, n):
        value, bound = _merged(n, full, j, evaluate)
        factor = complex(full[2, j].value())
        total -= factor * value
        error += abs(factor) * bound
    return Comparison(
        "first massive level", "common practice, derived above", complex(found.value), total, found.error + error
    )


def _merged(
    n: int, full: dict[tuple[int, int], Exact], j: int, evaluate: Callable[..., Estimate]
) -> tuple[complex, float]:
    """The (n-1)-point integral with punctures 1 and 2 merged and one power less of ``z_j - z_1``."""
    m = n - 1
    if m == 3:
        return 1.0 + 0.0j, 0.0
    table = {}
    for a, b in combinations(range(1, m), 2):
        table[a, b] = full[1, b + 1] + full[2, b + 1] if a == 1 else full[a + 1, b + 1]
    table[1, j - 1] = table[1, j - 1] - 1
    for a in range(1, m):
        table[a, m] = -2 - sum((v for pair, v in table.items() if a in pair and m not in pair), ZERO)
    # z_{m-1} - z_1 = 1 in this gauge: its exponent is free, and makes the last row right
    excess = (-2 - sum((table[a, m] for a in range(1, m)), ZERO)) / 2
    table[1, m - 1] = table[1, m - 1] - excess
    table[1, m] = table[1, m] + excess
    table[m - 1, m] = table[m - 1, m] + excess
    result = evaluate(DiskExponents.from_pairs(m, table))
    return complex(result.value), result.error


def inverse_kernel(kin: Mandelstams) -> Comparison:
    """``-sum_t S[r|t]_1 m(1,t,n-1,n | 1,r,n,n-1) = 1`` for the first word r.

    Source: S. Mizera, arXiv:1610.04230, arXiv:1706.08527.
    """
    n = kin.n
    words = list(permutations(range(2, n - 1)))
    (row,) = klt_kernel(kin, rows=words[:1])
    first = words[0]
    terms = [
        complex(s) * complex(inverse_klt(kin, (1, *t, n - 1, n), (1, *first, n, n - 1)))
        for s, t in zip(row, words, strict=True)
    ]
    error = 64 * len(words) * 2.0**-52 * sum(abs(term) for term in terms)
    source = "S. Mizera, arXiv:1610.04230, arXiv:1706.08527"
    return Comparison("inverse kernel", source, -sum(terms, 0.0 + 0.0j), 1.0 + 0.0j, error)


def klt(
    kin: Mandelstams, f: Integrand, g: Integrand, direct: Callable[..., Estimate], bilinear: Callable[..., Estimate]
) -> Comparison:
    """The sphere integral over complex planes against the bilinear of disk integrals.

    Source: H. Kawai, D. C. Lewellen, S.-H. H. Tye, Nucl. Phys. B 269 (1986) 1.
    """
    one, other = direct(kin, f, g), bilinear(kin, f, g)
    source = "H. Kawai, D. C. Lewellen, S.-H. H. Tye, Nucl. Phys. B 269 (1986) 1"
    return Comparison("KLT", source, complex(one.value), complex(other.value), one.error + other.error)
