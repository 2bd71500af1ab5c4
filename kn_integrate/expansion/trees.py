"""The field-theory part: from the functions F to Parke-Taylor integrands.

``Z(1, Q, n) = sum_w N(1 Q | 1 w (n-1)) F_w`` on the ordering 1..n, with N the doubly ordered sum over cubic trees
without its last propagator (bi-adjoint scalar currents; Mafra 2016, arXiv:1603.09731).  For one ordering P the current
is a combination of words, the other orderings:

    ``b(i) = i``,  ``b(P) = (1/s_P) sum over P = XY of [b(X), b(Y)]``,

with commutators of words under concatenation, all parts non-empty, ``s_P`` the sum of ``s_ij`` inside P; ``N(P|R)`` is
``s_P`` times the coefficient of the word R in b(P), and symmetric in P and R.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from itertools import combinations
from typing import TypeAlias

from ..exact import ONE, ZERO, Exact

Word: TypeAlias = tuple[int, ...]
Combination: TypeAlias = dict[Word, Exact]


class Currents:
    """Currents at one kinematic point; ZeroDivisionError where a propagator vanishes."""

    def __init__(self, s: Callable[[int, int], Exact]) -> None:
        self.s = s
        self._known: dict[Word, Combination] = {}
        self._propagators: dict[frozenset[int], Exact] = {}

    def propagator(self, labels: Iterable[int]) -> Exact:
        """The sum of s_ij inside a set of labels."""
        inside = frozenset(labels)
        found = self._propagators.get(inside)
        if found is None:
            found = sum((self.s(i, j) for i, j in combinations(sorted(inside), 2)), ZERO)
            self._propagators[inside] = found
        return found

    def current(self, p: Word) -> Combination:
        """b(P)."""
        found = self._known.get(p)
        if found is None:
            if len(p) == 1:
                found = {p: ONE}
            else:
                inverse = ONE / self.propagator(p)
                found = {word: c * inverse for word, c in self._commutators(p, True).items()}
            self._known[p] = found
        return found

    def numerators(self, p: Word) -> Combination:
        """N(P|R) for all words R that begin with the first label of P; words with N = 0 left out."""
        return self._commutators(p, False)

    def _commutators(self, p: Word, both: bool) -> Combination:
        """The sum of commutators; only the words that begin with the first label of P unless ``both``."""
        found: Combination = {}
        for cut in range(1, len(p)):
            right = self.current(p[cut:])
            for x, a in self.current(p[:cut]).items():
                if not both and x[0] != p[0]:
                    continue
                for y, b in right.items():
                    c = a * b
                    found[x + y] = found.get(x + y, ZERO) + c
                    if both:
                        found[y + x] = found.get(y + x, ZERO) - c
        return {word: c for word, c in found.items() if c}
