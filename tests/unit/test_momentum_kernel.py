"""The momentum kernel, its inverse and the cubic trees: counts, closed entries, inversion, null vectors."""

from __future__ import annotations

import math
from itertools import permutations

import mpmath
import numpy as np
import pytest

import kn_integrate as kn
from kn_integrate.exact import Exact


def cot(x) -> float:
    return 1 / math.tan(math.pi * float(x))


@pytest.mark.parametrize(("n", "own", "total"), [(4, 2, 8), (5, 5, 40), (6, 14, 224), (7, 42, 1344)])
def test_tree_counts(n, own, total):
    # all X = 1 counts trees with their signs taken off: 2^(n-2) Catalan(n-2) over all (n-1)! orderings
    from kn_integrate.momentum_kernel import _Shared

    plain = tuple(range(1, n + 1))
    counts = [len(_Shared(plain, (1, *rest)).triangulations()) for rest in permutations(range(2, n + 1))]
    assert counts[0] == own
    assert sum(counts) == total


@pytest.mark.parametrize("n", [4, 5, 6])
def test_kernel_times_inverse_is_one(n):
    kin = kn.Mandelstams.random(n, 2, low=0, high=1)
    words = list(permutations(range(2, n - 1)))
    kernel = np.array(kn.klt_kernel(kin))
    inverse = np.array([[kn.inverse_klt(kin, (1, *t, n - 1, n), (1, *r, n, n - 1)) for r in words] for t in words])
    assert np.abs(-kernel @ inverse - np.eye(len(words))).max() < 1e-12


def test_closed_entries():
    kin = kn.Mandelstams.random(5, 2, low=0, high=1)
    s = [kin.pair(i, i % 5 + 1) for i in range(1, 6)]
    plain = (1, 2, 3, 4, 5)
    own = 1 + sum(cot(s[i]) * cot(s[(i + 2) % 5]) for i in range(5))
    assert kn.inverse_klt(kin, plain, plain) == pytest.approx(own, rel=1e-12)
    swapped = -(cot(s[0]) + cot(s[1])) / math.sin(math.pi * float(s[3]))
    assert kn.inverse_klt(kin, plain, (1, 2, 3, 5, 4)) == pytest.approx(swapped, rel=1e-12)
    assert kn.inverse_klt(kin, plain, (1, 3, 5, 2, 4)) == 0
    four = kn.Mandelstams.random(4, 2, low=0, high=1)
    s12, s23 = four.pair(1, 2), four.pair(2, 3)
    assert kn.inverse_klt(four, (1, 2, 3, 4), (1, 2, 3, 4)) == pytest.approx(cot(s12) + cot(s23), rel=1e-12)
    assert kn.inverse_klt(four, (1, 2, 3, 4), (1, 2, 4, 3)) == pytest.approx(-1 / math.sin(math.pi * float(s12)))


@pytest.mark.parametrize("n", [4, 5, 6])
def test_the_kernel_on_n_minus_two_letters_annihilates_disk_integrals(n):
    # sum_r S[t|r]_1 Z_(1, r, n)(f) = 0 over the words r of 2..n-1
    kin = kn.Mandelstams.random(n, 6, low=0, high=1)
    words = list(permutations(range(2, n)))
    chosen = words[:2]
    kernel = kn.klt_kernel(kin, rows=chosen, columns=words)
    z = kn.z_matrix(kin, [(1, *word, n) for word in words], [tuple(range(1, n + 1))])
    for row in kernel:
        total = sum(k * z.values[i][0] for i, k in enumerate(row))
        size = sum(abs(k * z.values[i][0]) for i, k in enumerate(row))
        assert abs(total) < 1e-12 * size


@pytest.mark.parametrize("n", [4, 5, 6])
def test_field_theory_limit(n):
    # Z_P(PT(Q)) -> the sum over common cubic trees (Cachazo, He, Yuan 2013), as does the inverse kernel
    kin = kn.Mandelstams.random(n, 4, low="1/4", high=1)
    plain = tuple(range(1, n + 1))
    small = kin.scaled("1/1000000")
    for rest in list(permutations(range(2, n + 1)))[:: {4: 1, 5: 3, 6: 17}[n]]:
        other = (1, *rest)
        trees = float(kn.biadjoint(small, plain, other))
        z = kn.z_matrix(small, [plain], [other]).values[0][0]
        m = kn.inverse_klt(small, plain, other) * math.pi ** (n - 3)
        scale = float(kn.biadjoint(small, plain, plain))
        assert abs(z - trees) < 1e-5 * scale
        assert abs(m - trees) < 1e-5 * scale


def test_digits_and_poles():
    kin = kn.Mandelstams.random(5, 2, low=0, high=1)
    plain = (1, 2, 3, 4, 5)
    precise = kn.inverse_klt(kin, plain, plain, digits=40)
    with mpmath.workdps(40):
        values = [
            mpmath.mpf(kin.pair(i, i % 5 + 1).re.numerator) / kin.pair(i, i % 5 + 1).re.denominator for i in range(1, 6)
        ]
        cots = [mpmath.cot(mpmath.pi * v) for v in values]
        exact = 1 + sum(cots[i] * cots[(i + 2) % 5] for i in range(5))
        assert abs(precise - exact) < mpmath.mpf(10) ** -36
    at = kn.Mandelstams.from_planar(4, {(1, 2): 0, (2, 3): "1/2"})
    for function in (kn.biadjoint, kn.inverse_klt):
        with pytest.raises(kn.PoleError):
            function(at, (1, 2, 3, 4), (1, 2, 3, 4))
    with pytest.raises(kn.InputError):
        kn.biadjoint(at, (1, 2, 3), (1, 2, 3, 4))
    assert kn.biadjoint(kn.Mandelstams.from_planar(4, {(1, 2): "1/2", (2, 3): 1}), (1, 2, 3, 4), (1, 2, 3, 4)) == Exact(
        3
    )
