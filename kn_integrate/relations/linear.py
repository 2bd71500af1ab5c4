"""Linear relations among disk integrals; the first piece is always the integral the relation was asked for."""

from __future__ import annotations

import cmath
import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import permutations
from typing import Any

from ..channels import pair_index, read_ordering
from ..dispatch.shifts import Chord, chords_of, pair_shift
from ..errors import InputError
from ..estimate import Estimate
from ..exact import ONE, Exact
from ..exponents import DiskExponents
from ..integrals import DiskIntegral
from ..integrand import Integrand, parke_taylor
from ..kinematics import Mandelstams
from ..momentum_kernel import klt_kernel

EPSILON = 2.0**-52

_MONODROMY = (
    "E. Plahte, Nuovo Cim. A 66 (1970) 713; N. E. J. Bjerrum-Bohr, P. H. Damgaard, P. Vanhove, arXiv:0907.1425; "
    "S. Stieberger, arXiv:0907.2211"
)
_DIHEDRAL = "F. C. S. Brown, arXiv:math/0606419: dihedral coordinates"
_KERNEL = "N. E. J. Bjerrum-Bohr, P. H. Damgaard, T. Sondergaard, P. Vanhove, arXiv:1010.3933: the momentum kernel"


@dataclass(frozen=True)
class Piece:
    """``coefficient * (disk integral)``; the integral as the arguments of :func:`kn_integrate.disk_integral`."""

    coefficient: complex
    kin: Mandelstams | DiskExponents
    f: Integrand | None = None
    ordering: tuple[int, ...] | None = None

    def value(self, evaluate: Callable[..., Estimate]) -> Estimate:
        """The integral, by the engine the caller chooses."""
        if self.f is None:
            return evaluate(self.kin)
        return evaluate(self.kin, self.f, ordering=self.ordering)


@dataclass(frozen=True)
class Residual:
    """A relation's left side: ``value`` should vanish within ``error``; ``scale`` is its largest term."""

    value: complex
    error: float
    scale: float

    @property
    def holds(self) -> bool:
        """True when the residual vanishes within the claimed errors of the integrals."""
        return bool(abs(self.value) <= self.error)


@dataclass(frozen=True)
class Relation:
    """``sum_k coefficient_k Z_k = 0``.

    Attributes
    ----------
    name, statement, source : str
    pieces : tuple of Piece
        The first one is the integral the relation was asked for.
    """

    name: str
    statement: str
    source: str
    pieces: tuple[Piece, ...]

    def residual(self, evaluate: Callable[..., Estimate]) -> Residual:
        """The left side with integrals from ``evaluate(kin, f, ordering=...)``."""
        total, error, scale = 0.0 + 0.0j, 0.0, 0.0
        for piece in self.pieces:
            found = piece.value(evaluate)
            term = piece.coefficient * complex(found.value)
            total += term
            error += abs(piece.coefficient) * found.error + 4 * EPSILON * abs(term)
            scale = max(scale, abs(term))
        return Residual(total, error, scale)

    def solved(self, evaluate: Callable[..., Estimate]) -> tuple[complex, float]:
        """The first integral from the others: value and bound on its error."""
        first, *others = self.pieces
        total, error = 0.0 + 0.0j, 0.0
        for piece in others:
            found = piece.value(evaluate)
            term = piece.coefficient * complex(found.value)
            total -= term
            error += abs(piece.coefficient) * found.error + 4 * EPSILON * abs(term)
        value = total / first.coefficient
        return value, error / abs(first.coefficient) + 4 * EPSILON * abs(value)


def u_equation(exponents: DiskExponents, chord: Chord) -> Relation:
    """``I(Y) = I(Y + e_c) + I(Y + sum of e_c' over the chords that cross c)``.

    From ``u_c + prod_{c' crossing c} u_c' = 1`` under the integral; chords by the first and last position of their
    cluster.
    """
    n = exponents.n
    every = chords_of(n)
    if chord not in every:
        raise InputError("chord", repr(chord), f"one of {every}")
    crossing = [c for c in every if c[0] < chord[0] <= c[1] < chord[1] or chord[0] < c[0] <= chord[1] < c[1]]
    raised = _shifted(exponents, {chord: ONE})
    others = _shifted(exponents, dict.fromkeys(crossing, ONE))
    pieces = (Piece(1.0, exponents), Piece(-1.0, raised), Piece(-1.0, others))
    return Relation(f"u-equation {chord[0]}..{chord[1]}", "u_c + product of the crossing u = 1", _DIHEDRAL, pieces)


def _shifted(exponents: DiskExponents, by: dict[Chord, Exact]) -> DiskExponents:
    n = exponents.n
    moved = [a + h for a, h in zip(exponents.pairs, pair_shift(n, by), strict=True)]
    index = pair_index(n)
    return DiskExponents.from_pairs(n, {(i, j): moved[k] for (i, j), k in index.items() if i < j})


def _parity(f: Integrand, label: int | None) -> int:
    """(-1)^(degree of f in z_label), or of the total degree; all monomials of a covariant f share it."""
    powers = f.terms[0].powers
    odd = sum(p for pair, p in powers if label is None or label in pair) % 2
    return -1 if odd else 1


def cyclic(kin: Mandelstams, f: Integrand, ordering: Sequence[int] | None = None) -> Relation:
    """The same ordering started one label later: another gauge, other sectors, another inner integral."""
    order = read_ordering(ordering, kin.n)
    turned = (*order[1:], order[0])
    sign = _parity(f, order[0])
    pieces = (Piece(1.0, kin, f, order), Piece(-float(sign), kin, f, turned))
    return Relation("cyclic", "an ordering may start anywhere on the circle", "common practice", pieces)


def reflection(kin: Mandelstams, f: Integrand, ordering: Sequence[int] | None = None) -> Relation:
    """The reversed ordering, up to the sign of the integrand."""
    order = read_ordering(ordering, kin.n)
    pieces = (Piece(1.0, kin, f, order), Piece(-float(_parity(f, None)), kin, f, order[::-1]))
    return Relation("reflection", "Z_P(f) = +-Z_reversed(f)", "common practice", pieces)


def monodromy(kin: Mandelstams, f: Integrand, ordering: Sequence[int] | None = None) -> Relation:
    """``Z(1,2,..,n) + e^{i pi s12} Z(2,1,3,..) + e^{i pi (s12+s13)} Z(2,3,1,..) + ... = 0`` at fixed integrand."""
    order = read_ordering(ordering, kin.n)
    moving, rest = order[0], order[1:]
    if _parity(f, moving) != 1:
        raise InputError("f", "an odd power of the moving puncture", "an integrand of even degree in it")
    pieces = [Piece(1.0, kin, f, order)]
    phase = Exact(0)
    for k in range(1, kin.n - 1):
        phase = phase + kin.pair(moving, rest[k - 1])
        pieces.append(Piece(_turn(phase), kin, f, (*rest[:k], moving, *rest[k:])))
    return Relation("monodromy", "one puncture moved around the circle picks up phases", _MONODROMY, tuple(pieces))


def _turn(x: Exact) -> complex:
    """``exp(i pi x)``."""
    whole = round(x.re)
    rest: Exact = x - whole
    value = cmath.exp(1j * math.pi * rest.value())
    return -value if whole % 2 else value


def u_one(kin: Mandelstams, cycle: Sequence[int], ordering: Sequence[int] | None = None) -> Relation:
    """``sum_j Z_P(PT(2..j,1,j+1..n)) = 0``: a leg inserted everywhere (decoupling of a U(1))."""
    cycle = read_ordering(cycle, kin.n, "cycle")
    order = read_ordering(ordering, kin.n)
    moving, rest = cycle[0], cycle[1:]
    pieces = [Piece(1.0, kin, parke_taylor(*rest[:k], moving, *rest[k:]), order) for k in range(kin.n - 1)]
    return Relation(
        "U(1)",
        "the sum over insertions of a leg vanishes",
        "R. Kleiss, H. Kuijf, Nucl. Phys. B 312 (1989) 616",
        tuple(pieces),
    )


def integration_by_parts(kin: Mandelstams, cycle: Sequence[int], ordering: Sequence[int] | None = None) -> Relation:
    """``sum_j (s12 + .. + s1j) Z_P(PT(2..j,1,j+1..n)) = 0``; the cycle starts with the moving leg.

    The piece asked for is the one in which the leg stands between the first two others.
    """
    cycle = read_ordering(cycle, kin.n, "cycle")
    order = read_ordering(ordering, kin.n)
    moving, rest = cycle[1], (cycle[0], *cycle[2:])
    pieces = []
    total = Exact(0)
    for k in range(1, kin.n - 1):
        total = total + kin.pair(moving, rest[k - 1])
        pieces.append(Piece(complex(total.value()), kin, parke_taylor(*rest[:k], moving, *rest[k:]), order))
    return Relation(
        "integration by parts",
        "total derivatives in one puncture integrate to zero",
        "C. R. Mafra, O. Schlotterer, S. Stieberger, arXiv:1106.2646 (from memory)",
        tuple(pieces),
    )


def kernel_null_vector(kin: Mandelstams, f: Integrand, ordering: Sequence[int] | None = None) -> Relation:
    """``sum_r S[t|r]_1 Z_(1,r,n)(f) = 0`` over the words r of the n - 2 labels between, t the word of the ordering."""
    order = read_ordering(ordering, kin.n)
    if order[0] != 1:
        raise InputError("ordering", repr(order), "an ordering that starts with 1")
    last, word = order[-1], order[1:-1]
    words = [word, *(w for w in permutations(sorted(word)) if w != word)]
    (row,) = klt_kernel(kin, rows=[word], columns=words)
    pieces = tuple(Piece(complex(c), kin, f, (1, *w, last)) for c, w in zip(row, words, strict=True))
    return Relation("kernel null vector", "the kernel on n - 2 letters annihilates disk integrals", _KERNEL, pieces)


def single_term(kin: Any, f: Any, ordering: Sequence[int] | None) -> tuple[Exact, DiskExponents] | None:
    """Coefficient and exponents of an integral with one monomial; None when there are several."""
    if isinstance(kin, DiskExponents):
        return ONE, kin
    terms = DiskIntegral(kin.n, f, ordering).terms(kin)
    if len(terms) != 1:
        return None
    n = kin.n
    index = pair_index(n)
    table = {(i, j): terms[0].pairs[k] for (i, j), k in index.items() if i < j}
    return terms[0].coefficient, DiskExponents.from_pairs(n, table)
