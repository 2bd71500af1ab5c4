r"""The rational-function identity behind the matrices A and B, in exact arithmetic.

Let z move with unit velocity, the letters of a follow it as a dilation about 0 (velocity ``t/z``), those of b as a
dilation about 1 (velocity ``(t-1)/(z-1)``).  Along this flow the derivative of (Koba-Nielsen factor) x psi_{a;b} plus
the divergence of the flow is the integrand of f' up to total derivatives.  Pairs inside {0, z} and a, or inside {1, z}
and b, give the diagonals; D_0(a) and D_1(b) are homogeneous and cancel the divergence.  What is left is, for every
(a; b),

    ``sum_{k in a} t_k     sum_{j in 1, b} s_kj/(t_k - t_j)  psi_{a;b} = (off-diagonal part of A) psi``,
    ``sum_{l in b} (t_l-1) sum_{j in 0, a} s_lj/(t_l - t_j)  psi_{a;b} = (off-diagonal part of B) psi``,

rational functions of the letters, compared here at random rational points (the equality of two rational functions of
bounded degree at a generic point is their equality with probability one).
"""

from __future__ import annotations

from fractions import Fraction
from itertools import combinations

import numpy as np
import pytest

from kn_integrate.kz.pattern import entry_count, nested_bracket, step_pattern


def chain(root, word, s, at):
    """``D_root(word)``."""
    total = Fraction(1)
    for k, here in enumerate(word):
        total *= sum(s[frozenset((j, here))] / (at[here] - at[j]) for j in (root, *word[:k]))
    return total


@pytest.mark.parametrize("m", [1, 2, 3, 4])
@pytest.mark.parametrize("mirror", [False, True])
def test_the_matrices_as_rational_functions(m, mirror):
    rng = np.random.default_rng(10 * m + mirror)
    letters = list(range(m))
    names = ["0", "1", *letters]
    s = {frozenset(p): Fraction(int(rng.integers(-50, 50)), int(rng.integers(1, 20))) for p in combinations(names, 2)}
    pattern = step_pattern(m)
    half = pattern.b if mirror else pattern.a
    root, other_root = ("1", "0") if mirror else ("0", "1")
    at = {"0": Fraction(0), "1": Fraction(1)}
    for letter in letters:
        at[letter] = Fraction(int(rng.integers(-(10**6), 10**6)), 997)
    psi = [chain("0", a, s, at) * chain("1", b, s, at) for a, b in pattern.splits]
    moved = 0
    for row, (a, b) in enumerate(pattern.splits):
        word, other = (b, a) if mirror else (a, b)
        left = sum(
            (at[k] - at[root]) * s[frozenset((k, j))] / (at[k] - at[j]) for k in word for j in (other_root, *other)
        )
        right = Fraction(0)
        for e in range(half.start[row], half.start[row + 1]):
            p = int(half.prefix[e])
            c = sum(s[frozenset((j, word[p]))] for j in (root, *word[:p]))
            right += int(half.sign[e]) * c * psi[half.column[e]]
            assert len(pattern.splits[half.column[e]][1 if mirror else 0]) < len(word)
            moved += 1
        assert left * psi[row] == right
    assert moved == entry_count(m)


@pytest.mark.parametrize("m", [0, 1, 2, 3, 4, 5])
def test_entry_counts(m):
    pattern = step_pattern(m)
    assert len(pattern.a.column) == len(pattern.b.column) == entry_count(m)
    assert entry_count(m) == [0, 1, 10, 108, 1392, 21480][m]


def test_nested_brackets():
    assert nested_bracket(1) == (((0,), 1),)
    assert len(nested_bracket(5)) == 16
    assert sum(sign for _, sign in nested_bracket(4)) == 0
