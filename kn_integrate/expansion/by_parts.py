"""Integration by parts: any integrand as a combination of Parke-Taylor factors, order by order in alpha'.

With ``z_n`` at infinity the punctures 2, 3, ..., n-2 are taken in turn.  Those already taken hang as chains (words) on
the remaining ones, the roots, and the coefficient of each such forest is a sum of monomials in differences of roots.
Under the integral over the taken punctures, a forest F obeys

    ``d/dz_v F = sum over roots p != v of 1/(z_v - z_p) sum_F' Omega^p_(F F') F'``,

with Omega linear in the invariants: moving the whole chain of v along with v leaves only the factors ``s_ab/z_ab`` with
a in the chain of v and b in the chain of p, and on the path v..a b..p one of the differences can be cancelled against
``z_v - z_p``.  (This is the Knizhnik-Zamolodchikov connection, in a form that divides by nothing.)  A total derivative
of ``x (z_v - z_p)^(1-m) F`` lowers a pole of order m >= 2, if ``x (1 - m + Omega^p)`` is its coefficient; likewise
powers ``(z_v - z_1)^k`` through ``k + 1 + sum_p Omega^p``.  In a power series in alpha' both inverses divide by
integers only.  What is left has simple poles: v hangs on p.

Coefficients are therefore power series in alpha', with the k-th one a homogeneous polynomial of degree k in the
invariants.  (Integration by parts among Parke-Taylor factors: He, Teng, Zhang 2018, arXiv:1812.03369; reduction
one variable at a time is common practice in twisted cohomology.)
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from itertools import pairwise
from typing import TypeAlias

from ..errors import WorkLimitError
from ..exact import ZERO, Exact
from ..integrand import Integrand
from .chains import Pair, Word, shuffles, tree_words

Forest: TypeAlias = tuple[Word, ...]  # one word for each root, in the order of the roots
Monomial: TypeAlias = tuple[tuple[Pair, int], ...]
Orders: TypeAlias = list[Exact]  # coefficients of 1, alpha', alpha'^2, ...
State: TypeAlias = dict[tuple[Forest, Monomial], Orders]

MAX_STATE = 200_000


def reduce_by_parts(n: int, f: Integrand, s: Callable[[int, int], Exact], orders: int) -> list[dict[Word, Exact]]:
    """The integrand as ``sum_k alpha'^k sum_w c_k,w PT(1, w, n)`` for invariants ``alpha' s``, up to total derivatives.

    Parameters
    ----------
    n
        Number of punctures; every monomial of f has degree -2 in each of them.
    s
        The invariants ``s(i, j)``, massless.
    orders
        How many orders in alpha' are kept.

    Returns
    -------
    list of {w: c}
        Permutations w of 2..n-1 by order.  The combination is not unique: the factors are not independent.
    """
    work = _Reduction(n, s, orders)
    state: State = {}
    empty: Forest = ((),) * (n - 1)
    for term in f.terms:
        monomial = tuple((pair, k) for pair, k in term.powers if pair[1] < n)
        _add(state, (empty, monomial), [term.coefficient, *[ZERO] * (orders - 1)])
    for v in range(2, n - 1):
        state = work.take(v, state)
    found: list[dict[Word, Exact]] = [{} for _ in range(orders)]
    for (forest, monomial), c in state.items():
        # two roots are left, 1 and n-1, and the monomial is a power of z_1,n-1; degrees fix it to -1
        assert monomial == (((1, n - 1), -1),), monomial
        words = joined_words(forest[0], n - 1, forest[1])
        for k, value in enumerate(c):
            if value:
                for word in words:
                    found[k][word] = found[k].get(word, ZERO) - value  # 1/z_1,n-1 = -1/(z_n-1 - z_1)
    return [{word: c for word, c in each.items() if c} for each in found]


def _add(state: State, key: tuple[Forest, Monomial], c: Orders) -> None:
    known = state.get(key)
    state[key] = list(c) if known is None else [a + b for a, b in zip(known, c, strict=True)]


def joined_words(word: Word, label: int, below: Word) -> list[Word]:
    """A label with its chain hung on the root of another chain."""
    return list(shuffles(word, (label, *below)))


def _times(monomial: Monomial, i: int, j: int, power: int) -> tuple[int, Monomial]:
    """Sign and monomial of ``z_ij^power`` times a monomial."""
    sign = -1 if i > j and power % 2 else 1
    powers = dict(monomial)
    pair = (min(i, j), max(i, j))
    powers[pair] = powers.get(pair, 0) + power
    return sign, tuple(sorted((p, k) for p, k in powers.items() if k))


class _Reduction:
    def __init__(self, n: int, s: Callable[[int, int], Exact], orders: int) -> None:
        self.n, self.s, self.orders = n, s, orders

    # --- one puncture ---------------------------------------------------------------------------------------------

    def take(self, v: int, state: State) -> State:
        """Integrate over z_v: the state over the roots without v."""
        self.v = v
        self.roots = (1, *range(v, self.n))
        self.connection: dict[tuple[int, Forest], list[tuple[Forest, Exact]]] = {}
        self.poles: dict[tuple[int, int], State] = {}
        self.powers: dict[int, State] = {}
        for (forest, monomial), c in state.items():
            self.split(forest, monomial, c)
        while self.powers:
            k = max(self.powers)
            self.lower_power(k, self.powers.pop(k))
        while (order := max((m for _, m in self.poles), default=1)) > 1:
            p = next(p for p, m in self.poles if m == order)
            self.lower_pole(p, order, self.poles.pop((p, order)))
        following: State = {}
        for (p, _), part in self.poles.items():
            for (forest, monomial), c in part.items():
                for hung in self.hung(forest, p):
                    _add(following, (hung, monomial), c)
        if len(following) > MAX_STATE:
            raise WorkLimitError(len(following), MAX_STATE, "terms", "the integrand has too many and too high poles")
        return {key: c for key, c in following.items() if any(c)}

    def hung(self, forest: Forest, p: int) -> list[Forest]:
        """The forests without the root v, hung with its chain on the root p."""
        words = dict(zip(self.roots, forest, strict=True))
        below = words.pop(self.v)
        return [
            tuple(word if root == p else words[root] for root in words)
            for word in joined_words(words[p], self.v, below)
        ]

    def split(self, forest: Forest, monomial: Monomial, c: Orders) -> None:
        """Partial fractions in z_v."""
        own: dict[int, int] = {}
        rest: Monomial = ()
        sign = 1
        for (i, j), k in monomial:
            if self.v in (i, j):
                own[j if i == self.v else i] = k
                sign = -sign if j == self.v and k % 2 else sign  # factors as z_v - z_p
            else:
                rest = (*rest, ((i, j), k))
        self.spread(forest, rest, own, c if sign > 0 else [-value for value in c])

    def spread(self, forest: Forest, rest: Monomial, own: dict[int, int], c: Orders) -> None:
        """Add ``rest * prod_p (z_v - z_p)^own[p]``, one elementary step at a time."""
        todo: dict[tuple[Monomial, Monomial], Orders] = {}

        def push(mono: Monomial, powers: dict[int, int], value: Orders) -> None:
            key = (mono, tuple(sorted(((p, 0), k) for p, k in powers.items() if k)))
            known = todo.get(key)
            todo[key] = value if known is None else [a + b for a, b in zip(known, value, strict=True)]

        push(rest, own, c)
        while todo:
            (mono, packed), value = todo.popitem()
            if not any(value):
                continue
            powers = {p: k for (p, _), k in packed}
            low = [p for p, k in powers.items() if k < 0]
            high = [p for p, k in powers.items() if k > 0]
            if low and high:  # (v - q) = (v - p) + (p - q)
                p, q = low[0], high[0]
                push(mono, {**powers, q: powers[q] - 1, p: powers[p] + 1}, value)
                sign, changed = _times(mono, p, q, 1)
                push(changed, {**powers, q: powers[q] - 1}, value if sign > 0 else [-x for x in value])
            elif len(low) > 1:  # 1/((v - p)(v - q)) = (1/(v - p) - 1/(v - q))/(p - q)
                p, q = low[0], low[1]
                sign, changed = _times(mono, p, q, -1)
                plus = value if sign > 0 else [-x for x in value]
                push(changed, {**powers, q: powers[q] + 1}, plus)
                push(changed, {**powers, p: powers[p] + 1}, [-x for x in plus])
            elif low:
                self.add_pole(low[0], -powers[low[0]], forest, mono, value)
            elif any(p != 1 for p in high):  # powers of z_v - z_1 only
                q = next(p for p in high if p != 1)
                push(mono, {**powers, q: powers[q] - 1, 1: powers.get(1, 0) + 1}, value)
                sign, changed = _times(mono, 1, q, 1)
                push(changed, {**powers, q: powers[q] - 1}, value if sign > 0 else [-x for x in value])
            else:
                self.add_power(powers.get(1, 0), forest, mono, value)

    def add_pole(self, p: int, m: int, forest: Forest, monomial: Monomial, c: Orders) -> None:
        _add(self.poles.setdefault((p, m), {}), (forest, monomial), c)

    def add_power(self, k: int, forest: Forest, monomial: Monomial, c: Orders) -> None:
        _add(self.powers.setdefault(k, {}), (forest, monomial), c)

    # --- total derivatives ------------------------------------------------------------------------------------------

    def lower_pole(self, p: int, m: int, part: State) -> None:
        x = self.solved(part, 1 - m, (p,))
        for q in self.others(p):
            for (forest, monomial), c in self.image(x, q).items():
                # (v-p)^(1-m)/(v-q) = (q-p)^(1-m)/(v-q) - sum_j (q-p)^(j-m) (v-p)^-j, j = 1..m-1
                sign, changed = _times(monomial, q, p, 1 - m)
                self.add_pole(q, 1, forest, changed, [-sign * a for a in c])
                for j in range(1, m):
                    sign, changed = _times(monomial, q, p, j - m)
                    self.add_pole(p, j, forest, changed, [sign * a for a in c])

    def lower_power(self, k: int, part: State) -> None:
        x = self.solved(part, k + 1, self.others(None))
        for q in self.others(1):
            for (forest, monomial), c in self.image(x, q).items():
                # (v-1)^(k+1)/(v-q) - (v-1)^k = sum_(j<k) (q-1)^(k-j) (v-1)^j + (q-1)^(k+1)/(v-q)
                for j in range(k):
                    sign, changed = _times(monomial, q, 1, k - j)
                    self.add_power(j, forest, changed, [-sign * a for a in c])
                sign, changed = _times(monomial, q, 1, k + 1)
                self.add_pole(q, 1, forest, changed, [-sign * a for a in c])

    def others(self, p: int | None) -> tuple[int, ...]:
        return tuple(root for root in self.roots if root not in (self.v, p))

    def solved(self, part: State, integer: int, at: Iterable[int]) -> State:
        """x with ``x (integer + alpha' sum_(p in at) Omega^p) = part``, order by order."""
        places = tuple(at)
        x: State = {key: [c[0] / integer, *[ZERO] * (self.orders - 1)] for key, c in part.items()}
        for k in range(1, self.orders):
            pushed: dict[tuple[Forest, Monomial], Exact] = {}
            for (forest, monomial), c in x.items():
                if c[k - 1]:
                    for p in places:
                        for image, factor in self.omega(p, forest):
                            key = (image, monomial)
                            pushed[key] = pushed.get(key, ZERO) + c[k - 1] * factor
            for key in dict.fromkeys((*part, *pushed)):
                given = part[key][k] if key in part else ZERO
                x.setdefault(key, [ZERO] * self.orders)[k] = (given - pushed.get(key, ZERO)) / integer
        return x

    def image(self, x: State, q: int) -> State:
        """``alpha' x Omega^q``."""
        found: State = {}
        for (forest, monomial), c in x.items():
            if any(c[:-1]):
                for image, factor in self.omega(q, forest):
                    _add(found, (image, monomial), [ZERO, *[a * factor for a in c[:-1]]])
        return found

    def omega(self, p: int, forest: Forest) -> list[tuple[Forest, Exact]]:
        """The row of Omega^p of a forest."""
        key = (p, forest)
        if key not in self.connection:
            collected: dict[Forest, Exact] = {}
            words = dict(zip(self.roots, forest, strict=True))
            mine, yours = (self.v, *words[self.v]), (p, *words[p])
            for at, a in enumerate(mine):
                for bt, b in enumerate(yours):
                    factor = self.s(a, b)
                    if factor:
                        for sign, left, right in cuts(mine, at, yours, bt):
                            image = tuple(
                                left if root == self.v else right if root == p else words[root] for root in self.roots
                            )
                            collected[image] = collected.get(image, ZERO) + sign * factor
            self.connection[key] = [(image, c) for image, c in collected.items() if c]
        return self.connection[key]


def cuts(mine: Word, at: int, yours: Word, bt: int) -> list[tuple[int, Word, Word]]:
    """``(z_v - z_p)/z_ab`` times two chains, a in the first and b in the second, as signed pairs of words.

    On the path v..a b..p, ``z_v - z_p`` is the sum of the differences of neighbours; each cancels one factor and leaves
    two trees, rooted at v and at p.
    """
    path = (*mine[: at + 1], *yours[bt::-1])
    hanging = {mine[at]: mine[at + 1 : at + 2], yours[bt]: yours[bt + 1 : bt + 2]}
    tails = {label: (below,) for word in (mine[at + 1 :], yours[bt + 1 :]) for label, below in pairwise(word)}
    found = []
    for cut in range(len(path) - 1):
        children: dict[int, tuple[int, ...]] = dict(tails)
        for label, below in hanging.items():
            children[label] = (*children.get(label, ()), *below)
        for parent, child in pairwise(path[: cut + 1]):
            children[parent] = (*children.get(parent, ()), child)
        back = path[:cut:-1]
        for parent, child in pairwise(back):
            children[parent] = (*children.get(parent, ()), child)
        # factors of the path run from v to p; those of chains from child to parent: the first `at` factors, and the
        # `cut` factors that hang on v now, point the other way
        sign = (-1) ** (at + cut)
        for left in tree_words(children, path[0]):
            for right in tree_words(children, path[-1]):
                found.append((sign, left, right))
    return found
