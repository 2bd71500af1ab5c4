"""Disk integrals by quadrature against closed forms and published values; sources stand with the forms and values."""

from __future__ import annotations

from fractions import Fraction

import mpmath
import numpy as np
import pytest
from cases import random_case
from load import published

import kn_integrate as kn
from kn_integrate.closed_forms import FivePoint, Selberg, find
from kn_integrate.dispatch import integrate_disk_terms
from kn_integrate.exact import ONE, Exact
from kn_integrate.integrals import DiskTerm


def off(value, reference) -> float:
    with mpmath.workdps(40):
        return float(abs(mpmath.mpmathify(value) - reference))


def of_entry(entry, **options):
    terms = [DiskTerm(term.coefficient, term.left.flat) for term in entry.terms]
    return integrate_disk_terms(entry.n, terms, method="quadrature", **options)


# these values lie 20 and more orders below the integrand; double precision cannot see them and must say so
OUT_OF_REACH = {"F07", "F07b"}


@pytest.mark.parametrize("entry", published("disk"), ids=lambda e: e.id)
def test_every_published_disk_value(entry):
    deepest = min(float(y.re) for term in entry.terms for _, y in term.left.chords())
    rtol = 1e-10 if entry.n <= 7 else 1e-8
    result = of_entry(entry, rtol=rtol)
    # the claimed error is true, whatever the kinematics
    assert off(result.value, entry.value) <= result.error + 10.0 ** (1 - entry.digits) * abs(entry.value)
    if entry.id in OUT_OF_REACH:
        assert result.status in (kn.Status.ZERO, kn.Status.ROUND_OFF)
    elif deepest > -1:
        assert result.ok
        assert off(result.value, entry.value) <= rtol * abs(entry.value)


LOCI = ["beta", "3F2", "betas5", "chain6", "dixon-anderson6", "dougall7", "selberg5", "selberg6", "selberg7"]


@pytest.mark.parametrize("kind", LOCI)
@pytest.mark.parametrize("regime", ["convergent", "mild", "complex"])
def test_random_members_of_the_classical_families(kind, regime):
    rng = np.random.default_rng(20)
    n7 = kind in ("dougall7", "selberg7")
    for _ in range(1 if n7 else 3):
        case = random_case(kind, rng, regime)
        exponents = kn.DiskExponents.from_pairs(case.n, case.exponents())
        result = kn.disk_integral(exponents, method="quadrature", rtol=1e-8 if n7 else 1e-10, max_points=3e7)
        assert off(result.value, case.value(30)) <= result.error


@pytest.mark.parametrize("n", [5, 6, 7, 8])
def test_selberg_with_insertion_of_aomoto(n):
    # prod_(j=1..k) (alpha + (N-j) g) / (alpha + beta + (2N-j-1) g) is the mean of the elementary symmetric product of
    # k points; in the ordered integral the k = 1 insertion is the sum over the points, divided by N
    count = n - 3
    alpha, beta, g = Exact("0.7"), Exact("0.9"), Exact("0.2")
    form = Selberg(count, alpha, beta, g)
    base = form.pairs()
    terms = []
    for j in range(2, n - 1):
        # one more power of z_j = |z_j - z_1|: rows are restored by the pairs with the last position
        table = {(a, b): base.at(a, b) for a in range(1, n) for b in range(a + 1, n + 1)}
        table[1, j] = table[1, j] + 1
        table[1, n - 1] = table[1, n - 1] - 1
        table[j, n] = table[j, n] - 1
        table[n - 1, n] = table[n - 1, n] + 1
        flat = tuple(table[a, b] for a in range(1, n) for b in range(a + 1, n + 1))
        terms.append(DiskTerm(Exact(Fraction(1, count)), flat))
    result = integrate_disk_terms(n, terms, method="quadrature", rtol=1e-10 if n < 8 else 1e-8)
    factor = (alpha + (count - 1) * g) / (alpha + beta + (2 * count - 2) * g)
    with mpmath.workdps(40):
        exact = form.value(30) * mpmath.mpf(factor.re.numerator) / factor.re.denominator
    assert result.ok
    assert off(result.value, exact) <= result.error


@pytest.mark.parametrize("seed", range(5))
def test_bardakci_ruegg_five_point_formula(seed):
    # Z_12345(12345) = B(s45,s34) B(s12,s23) 3F2(s45, s12, s23+s34-s51; s45+s34, s12+s23; 1)   [DLMF 16.5.2]
    kin = kn.Mandelstams.random(5, seed, low=0, high=1)
    s12, s23, s34, s45, s51 = (kin.pair(i, i % 5 + 1) for i in range(1, 6))
    exact = FivePoint(s23 + s34 - s51, s45, s12, s45 + s34, s12 + s23).value(25)
    result = kn.disk_integral(kin, kn.parke_taylor(1, 2, 3, 4, 5), method="quadrature")
    assert result.ok
    assert off(result.value, exact) <= result.error


def test_the_matcher_finds_what_the_engine_computes():
    rng = np.random.default_rng(3)
    for kind in ("beta", "betas6", "dixon-anderson6", "dougall7"):
        case = random_case(kind, rng, "convergent")
        matches = find(case.pairs)
        assert matches
        result = integrate_disk_terms(case.n, [DiskTerm(ONE, case.pairs.flat)], method="quadrature", rtol=1e-9)
        for match in matches:
            assert off(result.value, match.form.value(25)) <= result.error
