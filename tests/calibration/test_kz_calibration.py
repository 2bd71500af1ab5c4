"""Seeded samples: claimed errors of the KZ engine, and KZ against quadrature where both say they know."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from disk_campaign import exponents_from_chords, random_chords
from kz_campaign import GROUPS, one, summary

import kn_integrate as kn
from kn_integrate.disk.evaluate import integrate_pairs
from kn_integrate.exact import ONE
from kn_integrate.integrals import DiskTerm
from kn_integrate.kz.integral import integrate_terms

pytestmark = pytest.mark.calibration


@pytest.mark.parametrize("group", GROUPS, ids=lambda g: f"{g.name}-{g.regime}")
def test_no_claimed_error_is_too_small(group):
    count = {"deep7": 2, "deep8": 0, "selberg7": 4, "dougall7": 4}.get(group.name, 10)
    figures = summary(group, [one(group, 2_000_000 + seed) for seed in range(count)])
    assert figures["ok but wrong"] == 0
    assert figures["too small"] == 0


@pytest.mark.parametrize(("n", "count"), [(5, 120), (6, 60), (7, 3)])
@pytest.mark.parametrize("is_complex", [False, True])
def test_series_against_quadrature(n, count, is_complex):
    # chord exponents in (-4.9, 2): two routes that share no code must agree within both claimed errors
    rng = np.random.default_rng([n, is_complex])
    compared = 0
    for _ in range(count):
        pairs = exponents_from_chords(n, random_chords(n, rng, is_complex))
        try:
            one = integrate_pairs(n, pairs, 1e-8 if n < 7 else 1e-4, 0.0, max_points=2e7 if n < 7 else 2e9)
        except kn.WorkLimitError:
            continue
        other = integrate_terms(n, [DiskTerm(ONE, pairs)], rtol=1e-9)
        assert abs(one.value - other.value) <= one.error + other.error
        compared += one.error <= (1e-6 if n < 7 else 1e-2) * abs(one.value)
    assert compared >= (0.7 if n < 7 else 0.3) * count


@pytest.mark.parametrize("n", [5, 6, 7])
def test_random_orderings_and_integrands(n):
    rng = np.random.default_rng(n)
    for _ in range({5: 40, 6: 20, 7: 6}[n]):
        p = (rng.permutation(n) + 1).tolist()
        q = (rng.permutation(n) + 1).tolist()
        kin = kn.Mandelstams.random(n, rng, low=Fraction(-6, 5), high=1, ordering=p, denominator=997)
        f = kn.parke_taylor(*q)
        one = kn.disk_integral(kin, f, ordering=p, method="quadrature", rtol=1e-7)
        other = kn.disk_integral(kin, f, ordering=p, method="kz", rtol=1e-9)
        assert abs(one.value - other.value) <= one.error + other.error
