"""The field-theory part: from the functions F to Parke-Taylor integrands.

``Z(1, Q, n) = sum_w N(1 Q | 1 w (n-1)) F_w`` on the ordering 1..n, with N the doubly ordered sum over cubic trees
(bi-adjoint scalar currents; Mafra 2016, arXiv:1603.09731) without its last propagator:

    ``s_P phi_(P|R) = sum over P = XY, R = VW of (phi_(X|V) phi_(Y|W) - phi_(Y|V) phi_(X|W))``,

phi_(i|j) = delta_ij, all parts non-empty, ``s_P`` the sum of ``s_ij`` inside P.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from itertools import combinations
from typing import TypeAlias

from ..exact import ONE, ZERO, Exact

Word: TypeAlias = tuple[int, ...]


class Currents:
    """Doubly ordered currents at one kinematic point; raises ZeroDivisionError on a vanishing propagator."""

    def __init__(self, s: Callable[[int, int], Exact]) -> None:
        self.s = s
        self._known: dict[tuple[Word, Word], Exact] = {}
        self._propagators: dict[frozenset[int], Exact] = {}

    def propagator(self, labels: Iterable[int]) -> Exact:
        """The sum of s_ij inside a set of labels."""
        inside = frozenset(labels)
        found = self._propagators.get(inside)
        if found is None:
            found = sum((self.s(i, j) for i, j in combinations(sorted(inside), 2)), ZERO)
            self._propagators[inside] = found
        return found

    def numerator(self, p: Word, r: Word) -> Exact:
        """phi_(P|R) without the propagator of the whole word."""
        total = ZERO
        for cut in range(1, len(p)):
            x, y = p[:cut], p[cut:]
            total = total + self.current(x, r[:cut]) * self.current(y, r[cut:])
            total = total - self.current(y, r[: len(y)]) * self.current(x, r[len(y) :])
        return total

    def current(self, p: Word, r: Word) -> Exact:
        """phi_(P|R)."""
        if len(p) == 1:
            return ONE if p == r else ZERO
        key = (p, r)
        found = self._known.get(key)
        if found is None:
            found = ZERO
            if frozenset(p) == frozenset(r):
                found = self.numerator(p, r)
                if found:
                    found = found / self.propagator(p)
            self._known[key] = found
        return found
