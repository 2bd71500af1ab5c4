"""Signs of disk integrals in every ordering, against the closed beta form and against relabelling."""

from __future__ import annotations

from itertools import permutations

import mpmath
import pytest
from scipy.special import beta

import kn_integrate as kn
from kn_integrate.exact import Exact


def close(one, other):
    assert abs(one.value - other.value) <= one.error + other.error + 4e-15 * abs(one.value)


@pytest.mark.parametrize("order", list(permutations((1, 2, 3, 4))))
def test_four_point_in_all_24_orderings(order):
    kin = kn.Mandelstams.from_planar(4, {(1, 2): "1/3", (2, 3): "2/5"})
    a, b, c, _ = order
    x, y = float(kin.pair(a, b)), float(kin.pair(b, c))
    # Parke-Taylor on its own ordering: + B
    own = kn.disk_integral(kin, kn.parke_taylor(*order), ordering=order)
    assert own.value == pytest.approx(float(mpmath.beta(x, y)), rel=1e-9)
    # reversed ordering: (-1)^n
    close(own, kn.disk_integral(kin, kn.parke_taylor(*order), ordering=order[::-1]))


@pytest.mark.parametrize("n", [5, 6])
def test_reversal_costs_minus_one_to_the_n_for_parke_taylor(n):
    kin = kn.Mandelstams.random(n, 5, low=0, high=1)
    labels = tuple(range(1, n + 1))
    for cycle in (labels, (1, 3, 2, *labels[3:]), (2, 1, *labels[2:])):
        f = kn.parke_taylor(*cycle)
        forward = kn.disk_integral(kin, f, ordering=labels, rtol=1e-8)
        backward = kn.disk_integral(kin, f, ordering=labels[::-1], rtol=1e-8)
        assert abs(forward.value - (-1) ** n * backward.value) <= forward.error + backward.error


@pytest.mark.parametrize("n", [4, 5, 6])
def test_own_ordering_is_positive_where_the_integral_converges(n):
    labels = tuple(range(1, n + 1))
    for k, order in enumerate(permutations(labels[1:])):
        cycle = (1, *order)
        if n == 6 and k % 10:
            continue
        kin = kn.Mandelstams.random(n, k, low=0, high=1, ordering=cycle)
        assert kn.disk_integral(kin, kn.parke_taylor(*cycle), ordering=cycle, rtol=1e-6).value > 0


@pytest.mark.parametrize("order", list(permutations((1, 2, 3, 4))))
def test_four_tachyons_give_plus_beta_in_every_ordering(order):
    kin = kn.Mandelstams.from_pairs(4, {(1, 2): "-3/5", (2, 3): "-7/10"}, row_sums=-2)
    a, b, c, _ = order
    x, y = float(kin.pair(a, b)) + 1, float(kin.pair(b, c)) + 1
    result = kn.disk_integral(kin, kn.monomial({}), ordering=order)
    assert result.value == pytest.approx(beta(x, y), rel=1e-9)


@pytest.mark.parametrize("n", [4, 5, 6])
def test_signed_integrands_against_the_absolute_value_form(n):
    # the sign of a monomial on P is the product of the signs of its factors at any point of the domain
    kin = kn.Mandelstams.random(n, 11, low=0, high=1)
    labels = tuple(range(1, n + 1))
    for k, order in enumerate(permutations(labels)):
        if k % {4: 1, 5: 5, 6: 53}[n]:
            continue
        cycle = labels
        f = kn.parke_taylor(*cycle)
        signed = kn.disk_integral(kin, f, ordering=order, rtol=1e-7)
        at = {label: place for place, label in enumerate(order)}
        sign = (-1) ** (n - 1)
        for i, j in zip(cycle, cycle[1:] + cycle[:1], strict=True):
            sign *= 1 if at[i] > at[j] else -1
        neighbours = {frozenset(pair) for pair in zip(cycle, cycle[1:] + cycle[:1], strict=True)}
        plain = {}
        for a in range(n):
            for b in range(a + 1, n):
                i, j = order[a], order[b]
                plain[a + 1, b + 1] = kin.pair(i, j) - (1 if frozenset((i, j)) in neighbours else 0)
        absolute = kn.disk_integral(kn.DiskExponents.from_pairs(n, plain), rtol=1e-7)
        assert absolute.value * sign == signed.value


@pytest.mark.parametrize("n", [4, 5, 6])
def test_every_monomial_is_a_shifted_parke_taylor_integral(n):
    # +-Z_P(PT(P)) at s_ij + n_ij + [i, j adjacent in P], which has massless rows
    kin = kn.Mandelstams.random(n, 2, low=0, high=1)
    labels = tuple(range(1, n + 1))
    f = kn.parke_taylor(1, 3, 2, *labels[3:])
    value = kn.disk_integral(kin, f, rtol=1e-8)
    (term,) = f.terms
    powers = dict(term.powers)
    shifted, sign = {}, 1 if term.coefficient == 1 else -1
    for i in labels:
        for j in labels[i:]:
            power = powers.get((i, j), 0)
            adjacent = j - i in (1, n - 1)
            shifted[i, j] = kin.pair(i, j) + power + int(adjacent)
            sign *= (-1) ** power
    moved = kn.Mandelstams.from_pairs(n, shifted)
    assert moved.is_massless
    close_value = kn.disk_integral(moved, kn.parke_taylor(*labels), rtol=1e-8)
    assert abs(value.value - sign * close_value.value) <= value.error + close_value.error


def test_double_poles_and_several_traces():
    # PT(1,2) PT(3,4) = 1/(z12^2 z34^2): B(s12 - 1, s23 + 1) ... = the plain beta function at shifted exponents
    kin = kn.Mandelstams.from_planar(4, {(1, 2): "13/10", (2, 3): "2/5"})
    f = kn.parke_taylor(1, 2) * kn.parke_taylor(3, 4)
    value = kn.disk_integral(kin, f)
    # exponents of z12 and z23: s12 - 2 and s23
    assert value.value == pytest.approx(beta(1.3 - 1, 0.4 + 1), rel=1e-9)


def test_coefficients_that_depend_on_the_kinematics():
    # (1 - s12) z12^-2 z34^-2 at s12 = 1: finite, although the monomial alone has a pole there
    def f(kin):
        return (1 - kin.pair(1, 2)) * kn.monomial({(1, 2): -2, (3, 4): -2})

    kin = kn.Mandelstams.from_planar(4, {(1, 2): 1, (2, 3): "2/5"})
    result = kn.disk_integral(kin, f)
    # (1 - s) Gamma(s - 1) Gamma(t + 1)/Gamma(s + t) -> -1 at s = 1
    assert result.ok
    assert abs(result.value + 1) <= result.error
    near = kn.Mandelstams.from_planar(4, {(1, 2): Exact(1) + Exact("1e-9"), (2, 3): "2/5"})
    assert abs(kn.disk_integral(near, f).value + 1) < 1e-8
