"""Integrands as combinations of Parke-Taylor factors: partial fractions, no kinematics.

With ``z_n`` at infinity, ``PT(1, w, n)`` is the chain ``prod_k 1/(z_(w_k) - z_(w_(k-1)))`` that starts at label 1, and
these (n-2)! chains span all integrands with logarithmic singularities.  A numerator ``z_ab`` is the sum of the
differences along a path of denominators from b to a, each of which cancels a denominator; what is left is a spanning
tree, and a tree is the sum of the chains in which every label comes after its parent (shuffles of the branches).
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from functools import cache
from typing import TypeAlias

from ..errors import NotAvailableError
from ..exact import ZERO, Exact
from ..integrand import Integrand

Word: TypeAlias = tuple[int, ...]
Pair: TypeAlias = tuple[int, int]
_Powers: TypeAlias = tuple[tuple[Pair, int], ...]


def chains(n: int, f: Integrand) -> dict[Word, Exact]:
    """The integrand as ``sum_w c_w PT(1, w, n)`` over permutations w of 2..n-1; zero coefficients left out.

    Parameters
    ----------
    n
        Number of punctures; every monomial of f has degree -2 in each of them.

    Raises
    ------
    NotAvailableError
        For integrands with double poles (such as ``PT(1,2)*PT(3,4)``), which are no such combination.

    Examples
    --------
    >>> from kn_integrate.integrand import parke_taylor
    >>> {w: str(c) for w, c in chains(4, parke_taylor(1, 2, 4, 3)).items()}
    {(2, 3): '-1', (3, 2): '-1'}
    """
    current: dict[_Powers, Exact] = {}
    for term in f.terms:
        # the n-th puncture at infinity: its factors -z_n have the total power -2, so no sign is left
        powers = tuple((pair, k) for pair, k in term.powers if pair[1] < n)
        current[powers] = current.get(powers, ZERO) + term.coefficient
    trees: dict[_Powers, Exact] = {}
    while current:
        following: dict[_Powers, Exact] = {}
        for powers, c in current.items():
            if not c:
                continue
            numerator = next((pair for pair, k in powers if k > 0), None)
            if numerator is None:
                trees[powers] = trees.get(powers, ZERO) + c
                continue
            for sign, reduced in _cancelled(dict(powers), numerator):
                following[reduced] = following.get(reduced, ZERO) + (c if sign > 0 else -c)
        current = following
    found: dict[Word, Exact] = {}
    for powers, c in trees.items():
        if c:
            sign, words = _words_of_tree(n, powers)
            for word in words:
                found[word] = found.get(word, ZERO) + (c if sign > 0 else -c)
    return {word: c for word, c in found.items() if c}


def _cancelled(powers: dict[Pair, int], numerator: Pair) -> list[tuple[int, _Powers]]:
    a, b = numerator
    path = _path(powers, a, b)
    if path is None:
        raise _double_pole(f"z_{a}{b} in the numerator")
    powers[numerator] -= 1
    found = []
    for i, j in path:  # z_ab = sum of z_ij along the path
        sign, pair = (1, (i, j)) if i < j else (-1, (j, i))
        changed = dict(powers)
        changed[pair] += 1
        found.append((sign, tuple(sorted((p, k) for p, k in changed.items() if k))))
    return found


def _path(powers: dict[Pair, int], a: int, b: int) -> list[Pair] | None:
    """The steps of a shortest path from a to b along denominators."""
    came_from: dict[int, int] = {a: a}
    front = [a]
    while front and b not in came_from:
        reached = []
        for at in front:
            for (i, j), k in powers.items():
                if k < 0 and at in (i, j):
                    other = j if at == i else i
                    if other not in came_from:
                        came_from[other] = at
                        reached.append(other)
        front = reached
    if b not in came_from:
        return None
    steps = []
    while b != a:
        steps.append((came_from[b], b))
        b = came_from[b]
    return steps[::-1]


def _words_of_tree(n: int, powers: _Powers) -> tuple[int, Iterable[Word]]:
    edges = [pair for pair, _ in powers]
    if any(k != -1 for _, k in powers) or len(edges) != n - 2:
        raise _double_pole(" ".join(f"z_{i}{j}^{k}" for (i, j), k in powers))
    children: dict[int, list[int]] = {}
    sign, seen, front = 1, {1}, [1]
    while front:
        at = front.pop()
        children[at] = []
        for i, j in edges:
            if at in (i, j) and (other := j if at == i else i) not in seen:
                seen.add(other)
                children[at].append(other)
                front.append(other)
                # the chain has 1/(z_child - z_parent); the monomial has 1/z_ij with i < j
                sign = -sign if at < other else sign
    if len(seen) != n - 1:
        raise _double_pole(" ".join(f"z_{i}{j}^{k}" for (i, j), k in powers))

    return sign, tree_words(children, 1)


def tree_words(children: Mapping[int, Sequence[int]], root: int) -> list[Word]:
    """The words whose chains add up to a rooted tree: every label after its parent, the root left out.

    >>> tree_words({1: (2, 3), 3: (4,)}, 1)
    [(2, 3, 4), (3, 2, 4), (3, 4, 2)]
    """
    found: list[Word] = [()]
    for child in children.get(root, ()):
        tails = [(child, *rest) for rest in tree_words(children, child)]
        found = [mixed for word in found for tail in tails for mixed in shuffles(word, tail)]
    return found


@cache
def shuffles(u: Word, v: Word) -> tuple[Word, ...]:
    """All interleavings of two words.

    >>> shuffles((1,), (2, 3))
    ((1, 2, 3), (2, 1, 3), (2, 3, 1))
    """
    if not u or not v:
        return (u + v,)
    return tuple((u[0], *w) for w in shuffles(u[1:], v)) + tuple((v[0], *w) for w in shuffles(u, v[1:]))


def _double_pole(what: str) -> NotAvailableError:
    return NotAvailableError(
        f"this needs an integrand that is a sum of Parke-Taylor factors up to partial fractions, and {what} is not"
    )
