"""Exact reduction of any integrand to Parke-Taylor factors, by integration by parts at one kinematic point.

With ``z_n`` at infinity the punctures 2, 3, ..., n-2 are taken in turn.  Those already taken hang as chains on the
remaining ones, the roots; the coefficient of each such forest is a sum of monomials in differences of roots.  Under the
integral over what was taken, the vector of all forests obeys ``d/dz_v F = sum_p Omega^p F/(z_v - z_p)`` with exact
matrices linear in the invariants.  The total derivative of ``x (z_v - z_p)^(1-m) F`` lowers a pole of order m >= 2
when ``x (1 - m + Omega^p)`` is its coefficient, that of ``x (z_v - z_1)^(k+1) F`` lowers a power when
``x (k + 1 + sum_p Omega^p)`` is.  In contrast to :mod:`kn_integrate.expansion.by_parts`, which does this order by
order in alpha', the two matrices are inverted exactly here, in rational numbers.

What it buys: all monomials of an amplitude end on the (n-2)! factors PT(1, w, n), and these on (n-3)! functions F; one
run of the series engine serves them all, and cancellations among monomials (tachyon poles, gauge invariance) happen
in exact arithmetic.  (Integration by parts among Parke-Taylor factors: He, Teng, Zhang 2018, arXiv:1812.03369; one
variable at a time is common practice in twisted cohomology.)
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from functools import cache
from itertools import combinations, permutations
from typing import Any, TypeAlias

from ..errors import KNError
from ..exact import Exact
from ..expansion.by_parts import cuts, joined_words
from ..integrand import Integrand

Word: TypeAlias = tuple[int, ...]
Forest: TypeAlias = tuple[Word, ...]
Pair: TypeAlias = tuple[int, int]
Powers: TypeAlias = tuple[tuple[Pair, int], ...]
Row: TypeAlias = list[Any]  # fmpq: one entry a forest; for complex points real parts, then imaginary parts


class ResonanceError(KNError):
    """A matrix of the reduction is singular at this point; the integral is not necessarily."""


def parke_taylor_form(n: int, f: Integrand, s: Callable[[int, int], Exact]) -> dict[Word, Exact]:
    """The integrand as ``sum_w c_w PT(1, w, n)`` up to total derivatives.

    Parameters
    ----------
    n
        Number of punctures, at least 4; every monomial of f has degree -2 in each of them.
    s
        The invariants ``s(i, j)``, with massless rows.

    Returns
    -------
    dict
        Permutations w of 2..n-1 and their coefficients.  The factors are not independent, so the form is not unique.

    Raises
    ------
    ResonanceError
        When an invariant of some set of labels is such an integer that a total derivative vanishes.
    """
    everything = {(i, j): s(i, j) for i, j in combinations(range(1, n), 2)}
    is_complex = not all(value.is_real for value in everything.values()) or not all(
        term.coefficient.is_real for term in f.terms
    )
    state: dict[Powers, Row] = {}
    for term in f.terms:
        # the factors z_in leave z_n^-2 and an even number of signs, as they do in PT(1, w, n)
        powers = tuple((pair, k) for pair, k in term.powers if pair[1] < n)
        _add(state, powers, _row(term.coefficient, is_complex), 1)
    forests: tuple[Forest, ...] = (((),) * (n - 1),)
    for v in range(2, n - 1):
        step = _Step(n, v, forests, everything, is_complex)
        state = step.take(state)
        forests = step.following
    if not state:
        return {}
    # two roots are left, 1 and n-1, and the degrees fix their power to -1: 1/z_1,n-1 = -1/(z_n-1 - z_1)
    ((powers, row),) = state.items()
    assert powers == (((1, n - 1), -1),), powers
    found: dict[Word, Exact] = {}
    for place, (below_first, below_last) in enumerate(forests):
        value = _entry(row, place, is_complex)
        if value:
            for word in joined_words(below_first, n - 1, below_last):
                found[word] = found.get(word, Exact(0)) - value
    return {word: value for word, value in found.items() if value}


def _row(value: Exact, is_complex: bool) -> Row:
    from flint import fmpq

    p, q, d = value.as_ratio()
    return [fmpq(p, d), fmpq(q, d)] if is_complex else [fmpq(p, d)]


def _entry(row: Row, place: int, is_complex: bool) -> Exact:
    re = row[place]
    if not is_complex:
        return Exact.from_ratio(int(re.p), 0, int(re.q))
    im = row[place + len(row) // 2]
    return Exact.from_ratio(int(re.p * im.q), int(im.p * re.q), int(re.q * im.q))


def _add(state: dict[Any, Row], key: Any, row: Row, times: int) -> None:
    if times != 1:
        row = [times * value for value in row]
    known = state.get(key)
    state[key] = row if known is None else [a + b for a, b in zip(known, row, strict=True)]


@cache
def _times(powers: Powers, other: Powers) -> Powers:
    total = dict(powers)
    for pair, k in other:
        total[pair] = total.get(pair, 0) + k
    return tuple(sorted((pair, k) for pair, k in total.items() if k))


def _difference(i: int, j: int, power: int) -> tuple[int, Powers]:
    """Sign and powers of ``(z_i - z_j)^power``."""
    if not power:
        return 1, ()
    return (-1 if i > j and power % 2 else 1), (((min(i, j), max(i, j)), power),)


# --- partial fractions ----------------------------------------------------------------------------------------------

Simple: TypeAlias = tuple[int, int]  # (p, -m) for the pole (z_v - z_p)^-m; (1, k) for the power (z_v - z_1)^k, k >= 0


@cache
def partial_fractions(own: tuple[tuple[int, int], ...]) -> tuple[tuple[Simple, Powers, int], ...]:
    """``prod_p (z_v - z_p)^k_p`` as a sum of simple pieces times powers of differences of roots, integer coefficients.

    >>> partial_fractions(((1, -1), (3, -1)))
    (((1, -1), (((1, 3), -1),), 1), ((3, -1), (((1, 3), -1),), -1))
    """
    low = [(p, k) for p, k in own if k < 0]
    high = [(p, k) for p, k in own if k > 0]
    if not high and len(low) == 1:
        return ((low[0], (), 1),)
    if not low and all(p == 1 for p, _ in high):
        return (((1, high[0][1] if high else 0), (), 1),)
    powers = dict(own)
    if low and high:  # (v - q) = (v - p) + (p - q)
        (p, _), (q, _) = low[0], high[0]
        steps = [({q: -1, p: 1}, (1, ())), ({q: -1}, _difference(p, q, 1))]
    elif low:  # 1/((v - p)(v - q)) = (1/(v - p) - 1/(v - q))/(p - q)
        (p, _), (q, _) = low[0], low[1]
        sign, factor = _difference(p, q, -1)
        steps = [({q: 1}, (sign, factor)), ({p: 1}, (-sign, factor))]
    else:
        q = next(p for p, _ in high if p != 1)
        steps = [({q: -1, 1: 1}, (1, ())), ({q: -1}, _difference(1, q, 1))]
    total: dict[tuple[Simple, Powers], int] = {}
    for change, (sign, factor) in steps:
        changed = dict(powers)
        for p, k in change.items():
            changed[p] = changed.get(p, 0) + k
        for simple, mono, c in partial_fractions(tuple(sorted((p, k) for p, k in changed.items() if k))):
            key = (simple, _times(mono, factor))
            total[key] = total.get(key, 0) + sign * c
    return tuple((simple, mono, c) for (simple, mono), c in total.items() if c)


# --- one puncture ---------------------------------------------------------------------------------------------------


class _Step:
    """Integration over z_v."""

    def __init__(self, n: int, v: int, forests: tuple[Forest, ...], s: dict[Pair, Exact], is_complex: bool) -> None:
        self.v, self.s, self.is_complex = v, s, is_complex
        self.roots = (1, *range(v, n))
        self.others = tuple(root for root in self.roots if root != v)
        self.forests = forests
        self.place = {forest: k for k, forest in enumerate(forests)}
        self._omega: dict[int, Any] = {}
        self._lowering: dict[tuple[int, int, int], Any] = {}
        self.following = _forests(tuple(range(2, v + 1)), len(self.others))
        self.next_place = {forest: k for k, forest in enumerate(self.following)}

    def take(self, state: dict[Powers, Row]) -> dict[Powers, Row]:
        """The state over the roots without v."""
        pieces: dict[Simple, dict[Powers, Row]] = {}
        for powers, row in state.items():
            own: dict[int, int] = {}
            rest: list[tuple[Pair, int]] = []
            sign = 1
            for (i, j), k in powers:
                if self.v in (i, j):
                    own[j if i == self.v else i] = k
                    sign = -sign if j == self.v and k % 2 else sign
                else:
                    rest.append(((i, j), k))
            mono = tuple(rest)
            for simple, factor, c in partial_fractions(tuple(sorted(own.items()))):
                _add(pieces.setdefault(simple, {}), _times(mono, factor), row, sign * c)
        while (top := max((simple[1] for simple in pieces if simple[1] >= 0), default=-1)) >= 0:
            self.lower_power(top, pieces.pop((1, top)), pieces)
        while (low := min((simple for simple in pieces), key=lambda each: (each[1], each[0]), default=(1, -1)))[1] < -1:
            self.lower_pole(low[0], -low[1], pieces.pop(low), pieces)
        found: dict[Powers, Row] = {}
        width = len(self.following)
        for (p, _), part in pieces.items():
            targets = [self.hung(forest, p) for forest in self.forests]
            for mono, row in part.items():
                hung: Row = [row[0] * 0] * (2 * width if self.is_complex else width)
                for k, value in enumerate(row):
                    if value:
                        half, place = divmod(k, len(self.forests))
                        for target in targets[place]:
                            hung[half * width + target] += value
                _add(found, mono, hung, 1)
        return {mono: row for mono, row in found.items() if any(row)}

    def hung(self, forest: Forest, p: int) -> list[int]:
        """The forests without the root v, hung with its chain on the root p, by number."""
        words = dict(zip(self.roots, forest, strict=True))
        below = words.pop(self.v)
        return [
            self.next_place[tuple(word if root == p else words[root] for root in words)]
            for word in joined_words(words[p], self.v, below)
        ]

    def lower_pole(self, p: int, m: int, part: dict[Powers, Row], pieces: dict[Simple, dict[Powers, Row]]) -> None:
        for q in self.others:
            if q == p:
                continue
            for mono, row in self.image(part, 1 - m, (p,), q):
                # (v-p)^(1-m)/(v-q) = (q-p)^(1-m)/(v-q) - sum_j (q-p)^(j-m) (v-p)^-j, j = 1..m-1
                sign, factor = _difference(q, p, 1 - m)
                _add(pieces.setdefault((q, -1), {}), _times(mono, factor), row, -sign)
                for j in range(1, m):
                    sign, factor = _difference(q, p, j - m)
                    _add(pieces.setdefault((p, -j), {}), _times(mono, factor), row, sign)

    def lower_power(self, k: int, part: dict[Powers, Row], pieces: dict[Simple, dict[Powers, Row]]) -> None:
        for q in self.others[1:]:
            for mono, row in self.image(part, k + 1, self.others, q):
                # (v-1)^(k+1)/(v-q) - (v-1)^k = sum_(j<k) (q-1)^(k-j) (v-1)^j + (q-1)^(k+1)/(v-q)
                for j in range(k):
                    sign, factor = _difference(q, 1, k - j)
                    _add(pieces.setdefault((1, j), {}), _times(mono, factor), row, -sign)
                sign, factor = _difference(q, 1, k + 1)
                _add(pieces.setdefault((q, -1), {}), _times(mono, factor), row, -sign)

    def image(self, part: dict[Powers, Row], integer: int, at: tuple[int, ...], q: int) -> Iterable[tuple[Powers, Row]]:
        """``c (integer + sum_(p in at) Omega^p)^-1 Omega^q`` for every row c."""
        from flint import fmpq_mat

        if not part:
            return []
        rows = list(part.values())
        product = fmpq_mat(len(rows), len(rows[0]), [x for row in rows for x in row]) * self.lowering(integer, at, q)
        return zip(part, product.tolist(), strict=True)

    def lowering(self, integer: int, at: tuple[int, ...], q: int) -> Any:
        key = (integer, at[0] if len(at) == 1 else 0, q)
        if key not in self._lowering:
            total = self.omega(at[0])
            for p in at[1:]:
                total = total + self.omega(p)
            size = total.nrows()
            for k in range(size):
                total[k, k] = total[k, k] + integer
            try:
                self._lowering[key] = total.inv() * self.omega(q)
            except ZeroDivisionError:
                raise ResonanceError(f"no total derivative lowers the pole of z_{self.v} at this point") from None
        return self._lowering[key]

    def omega(self, p: int) -> Any:
        """Omega^p as a matrix acting on rows from the right; a fresh copy."""
        from flint import fmpq, fmpq_mat

        if p not in self._omega:
            size = len(self.forests)
            entries: dict[Pair, Exact] = {}
            for row, forest in enumerate(self.forests):
                words = dict(zip(self.roots, forest, strict=True))
                mine, yours = (self.v, *words[self.v]), (p, *words[p])
                for at, a in enumerate(mine):
                    for bt, b in enumerate(yours):
                        factor = self.s[min(a, b), max(a, b)]
                        for sign, left, right in cuts(mine, at, yours, bt):
                            image = tuple(
                                left if root == self.v else right if root == p else words[root] for root in self.roots
                            )
                            key = (row, self.place[image])
                            entries[key] = entries.get(key, Exact(0)) + sign * factor
            full = 2 * size if self.is_complex else size
            matrix = fmpq_mat(full, full)
            for (i, j), value in entries.items():
                re, im, d = value.as_ratio()
                matrix[i, j] = fmpq(re, d)
                if self.is_complex:  # (a, b) (M + i N) = (a M - b N, a N + b M)
                    matrix[i + size, j + size] = fmpq(re, d)
                    matrix[i, j + size] = fmpq(im, d)
                    matrix[i + size, j] = fmpq(-im, d)
            self._omega[p] = matrix
        return self._omega[p] * 1


@cache
def _forests(letters: Word, roots: int) -> tuple[Forest, ...]:
    """All ways to hang letters as ordered chains on a number of roots."""
    if roots == 1:
        return tuple((word,) for word in permutations(letters))
    found = []
    for size in range(len(letters) + 1):
        for first in permutations(letters, size):
            rest = tuple(letter for letter in letters if letter not in first)
            found += [(first, *others) for others in _forests(rest, roots - 1)]
    return tuple(found)
