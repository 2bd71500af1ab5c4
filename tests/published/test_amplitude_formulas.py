"""Amplitudes against published formulas: Gamma functions, Yang-Mills theory, factorisation, unitarity."""

from __future__ import annotations

from fractions import Fraction
from itertools import permutations
from math import pi

import mpmath
import numpy as np
import pytest
from string_states import I, massless_three, minus, momenta, plus, polarisation_sum, transverse, vector

import kn_integrate as kn
from kn_integrate.exact import Exact
from kn_integrate.momenta import dot

ALPHA = Fraction(1, 20)


def bosons(n, seed):
    rng = np.random.default_rng(seed)
    k = momenta(n, rng)
    return [kn.gauge_boson(q, transverse(q, rng)) for q in k]


def tensors(n, seed):
    rng = np.random.default_rng(seed)
    k = momenta(n, rng)
    return [kn.massless_tensor(q, transverse(q, rng), transverse(q, rng)) for q in k]


def square(*ks):
    total = plus(*ks)
    return dot(total, total)


# --- four tachyons --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_four_open_tachyons_are_betas(seed):
    """Veneziano 1968: B(-1 - alpha' s, -1 - alpha' t) in each ordering, three functions twice in the sum."""
    k = momenta(4, np.random.default_rng(seed), -1 / ALPHA)
    states = [kn.tachyon(q) for q in k]
    ctx = mpmath.MPContext()
    ctx.dps = 30
    y = [ALPHA * square(k[0], k[j]) - 1 for j in (1, 2, 3)]
    s, u, t = (ctx.mpf(v.re.numerator) / v.re.denominator for v in y)
    found = kn.open_amplitude(states, (1, 2, 3, 4), ALPHA, coupling=3, digits=25)
    expected = 9 * 20 * ctx.beta(s, t)
    assert abs(found.value - expected) <= found.error + 1e-24 * abs(expected)
    found = kn.open_amplitude(states, None, ALPHA)
    expected = 2 * 20 * (ctx.beta(s, t) + ctx.beta(t, u) + ctx.beta(u, s))
    assert found.ok
    assert abs(found.value - expected) <= found.error


@pytest.mark.parametrize("seed", [1, 2])
def test_four_closed_tachyons_are_gammas(seed):
    """Virasoro 1969 and Shapiro 1970, prefactor 16 pi^2 g^2/alpha' (Polchinski I, 6.6.10, number from memory)."""
    k = momenta(4, np.random.default_rng(seed), -4 / ALPHA)
    found = kn.closed_amplitude([kn.closed_tachyon(q) for q in k], ALPHA, coupling=2)
    ctx = mpmath.MPContext()
    ctx.dps = 30
    expected = 4 * 20 * 16 * ctx.pi**2
    for j in (1, 2, 3):
        y = ALPHA * square(k[0], k[j]) / 4 - 1
        x = ctx.mpf(y.re.numerator) / y.re.denominator
        expected *= ctx.gamma(x) / ctx.gamma(1 - x)
    assert found.ok
    assert abs(found.value - expected) <= found.error


@pytest.mark.parametrize("level", [0, 1, 2, 3])
def test_exchange_residue_is_the_residue(level):
    """The polynomial against residues by this package, at more angles than its degree."""
    polynomial = kn.exchange_residue(level)
    assert len(polynomial) == level + 1
    assert polynomial[-1] != 0
    for x in (Fraction(-7, 9), Fraction(-1, 3), Fraction(0), Fraction(2, 7), Fraction(5, 8)):
        t = -Fraction(level + 3, 2) * (1 - x)  # alpha' t; s12 = -alpha' s - 2
        kin = kn.Mandelstams.from_planar(4, {(1, 2): -level - 1, (2, 3): -t - 2}, row_sums=-2)
        found = kn.residue(kin, kn.monomial({}), channel=(1, 2), level=level)
        expected = float(sum(c * x**p for p, c in enumerate(polynomial)))
        assert abs(found.value - expected) <= found.error + 1e-14 * abs(expected)


def test_partial_waves_in_26_dimensions():
    """No ghosts in D = 26 through level 4, and the scalar of the second level is absent; D = 27 has a ghost there."""
    for level in range(5):
        for string in ("open", "closed"):
            residue = kn.exchange_residue(level, string)
            assert len(residue) - 1 == level * (1 if string == "open" else 2)
            assert all(c >= 0 for c in kn.partial_waves(residue, 26))
    assert kn.partial_waves(kn.exchange_residue(2), 26)[0] == 0
    assert kn.partial_waves(kn.exchange_residue(2), 27)[0] < 0
    assert kn.partial_waves(kn.exchange_residue(2), 25)[0] > 0


# --- three particles ------------------------------------------------------------------------------------------------


def test_three_gauge_bosons():
    """Yang-Mills vertex plus ``2 alpha' (e1.k2)(e2.k3)(e3.k1)`` (Polchinski I, 6.5.15, number from memory)."""
    states = bosons(3, 5)
    (k1, k2, k3), (e1, e2, e3) = [s.momentum for s in states], [s.left for s in states]
    vertex = dot(e1, e2) * dot(k1, e3) + dot(e2, e3) * dot(k2, e1) + dot(e3, e1) * dot(k3, e2)
    assert kn.yang_mills_amplitude(states) == vertex
    cubic = dot(e1, k2) * dot(e2, k3) * dot(e3, k1)
    for alpha in (Fraction(1, 7), Fraction(5, 2)):
        found = kn.open_amplitude(states, (1, 2, 3), alpha, coupling=2)
        expected = 2 * 2 / (2 * float(alpha)) ** 0.5 * (vertex + 2 * alpha * cubic).value()
        assert found.ok
        assert abs(found.value - expected) <= found.error + 1e-14 * abs(expected)
    assert abs(cubic) > 0.1


def test_three_tensors_are_squares():
    """Closed = open x open at alpha'/4 (Kawai, Lewellen, Tye 1986); here ``pi alpha'/2`` with both normalisations."""
    states = tensors(3, 6)
    alpha = Fraction(3, 5)
    halves = [
        kn.open_amplitude([kn.gauge_boson(s.momentum, getattr(s, side)) for s in states], (1, 2, 3), alpha / 4).value
        for side in ("left", "right")
    ]
    found = kn.closed_amplitude(states, alpha)
    expected = pi * float(alpha) / 2 * halves[0] * halves[1]
    assert abs(found.value - expected) <= found.error + 1e-13 * abs(expected)
    found = kn.closed_superstring_amplitude(states, alpha)
    ym = [
        kn.yang_mills_amplitude([kn.gauge_boson(s.momentum, getattr(s, side)) for s in states])
        for side in ("left", "right")
    ]
    assert abs(found.value - 4 * pi * (ym[0] * ym[1]).value()) <= found.error + 1e-13 * abs(found.value)


# --- gauge invariance -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize("n", [3, 4, 5, 6])
def test_open_gauge_invariance_is_exact(n):
    """A longitudinal polarisation makes the integrand a total derivative, past any number of poles."""
    states = bosons(n, 10 + n)
    order = tuple(np.random.default_rng(n).permutation(n) + 1)
    alpha = Fraction(1, 9)
    found = kn.open_amplitude(states, order, alpha)
    assert found.ok
    assert abs(found.value) > 100 * found.error
    for i in (0, n - 1):
        changed = list(states)
        k = changed[i].momentum
        changed[i] = kn.gauge_boson(k, k)
        zero = kn.open_amplitude(changed, order, alpha)
        assert zero.value == 0
        assert zero.error == 0
        assert zero.ok


@pytest.mark.parametrize(("tachyons", "vectors"), [(1, 2), (2, 2), (3, 1), (1, 3), (2, 3)])
def test_mixed_gauge_invariance_by_both_methods(tachyons, vectors):
    """The same by numerical integration of every monomial, which knows nothing of integration by parts."""
    n = tachyons + vectors
    rng = np.random.default_rng(n)
    if n == 3:
        # vectors of momenta k and -p-k are light-like when 2 p.k = -p^2
        alpha = Fraction(1, 5)
        p, first = vector(0, 0, 1, 2, 0), vector(Fraction(3, 2), 1, Fraction(-1, 2), -1, 0)
        k = (p, first, minus(plus(p, first)))
    else:
        alpha = ALPHA
        k = momenta(n, rng, [-1 / alpha] * tachyons + [0] * vectors)
    states = [kn.tachyon(q) if i < tachyons else kn.gauge_boson(q, transverse(q, rng)) for i, q in enumerate(k)]
    order = tuple(rng.permutation(n) + 1)
    found = kn.open_amplitude(states, order, alpha)
    direct = kn.open_amplitude(states, order, alpha, method="monomials")
    assert found.ok
    assert direct.ok
    assert abs(found.value - direct.value) <= found.error + direct.error
    states[-1] = kn.gauge_boson(k[-1], k[-1])
    zero = kn.open_amplitude(states, order, alpha)
    assert zero.value == zero.error == 0
    direct = kn.open_amplitude(states, order, alpha, method="monomials", atol=1e-6)
    assert direct.ok
    assert abs(direct.value) <= direct.error


@pytest.mark.parametrize("n", [3, 4, 5])
def test_closed_gauge_invariance_is_exact(n):
    states = tensors(n, 20 + n)
    found = kn.closed_amplitude(states, ALPHA)
    assert abs(found.value) > 100 * found.error
    k, left, right = states[1].momentum, states[1].left, states[1].right
    for pair in ((k, right), (left, k)):
        changed = list(states)
        changed[1] = kn.massless_tensor(k, *pair)
        assert kn.closed_amplitude(changed, ALPHA).value == 0


def test_four_tensors_by_integration_over_the_plane():
    """The same amplitude by direct integration of all products of monomials, which uses neither reduction nor KLT."""
    states = tensors(4, 26)
    kin = kn.Mandelstams.from_momenta([s.momentum for s in states], alpha_prime=ALPHA, string="closed")
    f, g = (kn.vertex_integrand(states, ALPHA, side) for side in ("left", "right"))
    found = kn.closed_amplitude(states, ALPHA)
    direct = kn.sphere_integral(kin, f, g, method="direct", rtol=1e-8)
    assert direct.ok
    # (8 pi/alpha') (2 pi) (alpha'/2)^4
    factor = 8 * pi * 20 * 2 * pi / 40**4
    assert abs(found.value - factor * direct.value) <= found.error + 1e-8 * abs(found.value)
    monomials = kn.closed_amplitude(states, ALPHA, method="monomials")
    assert monomials.ok
    assert abs(found.value - monomials.value) <= 1e-10 * abs(found.value)


@pytest.mark.parametrize("n", [4, 5])
def test_closed_amplitudes_do_not_depend_on_the_order_of_states(n):
    """The bilinear singles out three legs; the amplitude must not."""
    states = tensors(n, 30 + n)
    found = kn.closed_amplitude(states, ALPHA)
    turned = kn.closed_amplitude(states[2:] + states[:2], ALPHA)
    assert abs(found.value - turned.value) <= found.error + turned.error
    found = kn.closed_superstring_amplitude(states, ALPHA)
    turned = kn.closed_superstring_amplitude(states[2:] + states[:2], ALPHA)
    assert abs(found.value - turned.value) <= found.error + turned.error


# --- factorisation --------------------------------------------------------------------------------------------------


def spacelike_point():
    for seed in range(40, 80):
        states = bosons(4, seed)
        if square(states[0].momentum, states[1].momentum) > 0:
            return states
    raise AssertionError


def test_four_gauge_bosons_factorise_on_the_tachyon():
    """``A -> A3 A3/(k^2 - 1/alpha')``; legs are massless, so that alpha' alone can be moved onto the pole."""
    states = spacelike_point()
    k = [s.momentum for s in states]
    exchanged = plus(k[0], k[1])
    on = 1 / dot(exchanged, exchanged).re
    left = kn.open_amplitude([states[0], states[1], kn.tachyon(minus(exchanged))], (1, 2, 3), on)
    right = kn.open_amplitude([kn.tachyon(exchanged), states[2], states[3]], (1, 2, 3), on)
    alpha = on * (1 + Fraction(1, 10**9))
    found = kn.open_amplitude(states, (1, 2, 3, 4), alpha, digits=20)
    residue = float(found.value) * float(dot(exchanged, exchanged).re - 1 / alpha)
    assert residue == pytest.approx(left.value * right.value, rel=1e-6)
    with pytest.raises(kn.PoleError) as caught:
        kn.open_amplitude(states, (1, 2, 3, 4), on)
    assert caught.value.channel == (1, 2)
    assert caught.value.level == 0


def shifted_point(z, rng):
    """Four light-like momenta; legs 1 and 3 moved by ``z q`` (Britto, Cachazo, Feng and Witten 2005)."""
    q = vector(0, 0, 1, I, 0, 0)
    n = momenta(4, rng)[1]
    k1, k3 = vector(1, 1, 0, 0, 0, 0), vector(3, -3, 0, 0, 0, 0)
    p = minus(plus(k1, k3))
    x = dot(p, p) / (2 * dot(n, p))
    k2 = tuple(x * a for a in n)
    k4 = plus(p, minus(k2))
    move = tuple(z * a for a in q)
    return [plus(k1, move), k2, plus(k3, minus(move)), k4], q


def along_reference(k, b, r):
    c = dot(b, k) / dot(r, k)
    return tuple(x - c * y for x, y in zip(b, r, strict=True))


def test_four_gauge_bosons_factorise_on_the_gauge_boson():
    rng_of = lambda: np.random.default_rng(7)  # noqa: E731
    base, q = shifted_point(Exact(0), rng_of())
    pole = -square(base[0], base[1]) / (2 * dot(q, base[1]))
    rng = np.random.default_rng(8)
    fixed = [vector(*(int(c) for c in rng.integers(-4, 5, 6))) for _ in range(4)]
    reference = vector(5, 0, 0, 0, 3, 4)
    alpha = Fraction(1, 11)

    def at(z):
        k, _ = shifted_point(z, rng_of())
        return [kn.gauge_boson(p, along_reference(p, b, reference)) for p, b in zip(k, fixed, strict=True)]

    states = at(pole)
    exchanged = plus(states[0].momentum, states[1].momentum)
    assert not dot(exchanged, exchanged)
    total = 0
    for sign, e in polarisation_sum(exchanged, reference):
        left = kn.open_amplitude([states[0], states[1], kn.gauge_boson(minus(exchanged), e)], (1, 2, 3), alpha)
        right = kn.open_amplitude([kn.gauge_boson(exchanged, e), states[2], states[3]], (1, 2, 3), alpha)
        total += sign * complex(left.value) * complex(right.value)
    near = at(pole + Exact(Fraction(1, 10**9)))
    found = kn.open_amplitude(near, (1, 2, 3, 4), alpha, digits=20)
    residue = complex(found.value) * square(near[0].momentum, near[1].momentum).value()
    assert abs(residue - total) <= 1e-5 * abs(total)
    with pytest.raises(kn.PoleError):
        kn.open_amplitude(states, (1, 2, 3, 4), alpha)


# --- Yang-Mills theory and the superstring --------------------------------------------------------------------------


@pytest.mark.parametrize("n", [4, 5, 6])
def test_yang_mills_currents(n):
    """Gauge invariance, cyclicity, reflection, U(1) decoupling, all exact."""
    states = bosons(n, 50 + n)
    value = kn.yang_mills_amplitude(states)
    order = tuple(range(1, n + 1))
    assert value
    assert kn.yang_mills_amplitude(states, order[1:] + order[:1]) == value
    assert kn.yang_mills_amplitude(states, order[::-1]) == (-1) ** n * value
    inserted = [(*order[1:k], 1, *order[k:]) for k in range(1, n)]
    assert sum((kn.yang_mills_amplitude(states, o) for o in inserted), Exact(0)) == 0
    k = states[2].momentum
    states[2] = kn.gauge_boson(k, k)
    assert kn.yang_mills_amplitude(states) == 0


@pytest.mark.parametrize("n", [3, 4, 5, 6])
def test_both_strings_reach_yang_mills(n):
    """Bosonic string: first correction alpha'; superstring: alpha'^2 (n > 3)."""
    states = bosons(n, 60 + n)
    ym = kn.yang_mills_amplitude(states).value()
    order = tuple(range(1, n + 1))
    misses = {"bosonic": [], "superstring": []}
    for alpha in (Fraction(1, 10**6), Fraction(1, 2 * 10**6)):
        scale = 2 * (2 * float(alpha)) ** (-(n - 2) / 2) * ym
        for name, compute in (("bosonic", kn.open_amplitude), ("superstring", kn.open_superstring_amplitude)):
            misses[name].append(abs(complex(compute(states, order, alpha, rtol=1e-15, digits=20).value) / scale - 1))
    assert misses["bosonic"][0] < 1e-2
    assert misses["bosonic"][0] / misses["bosonic"][1] == pytest.approx(2, rel=0.02)
    if n == 3:
        assert max(misses["superstring"]) < 1e-14
    else:
        assert misses["superstring"][0] / misses["superstring"][1] == pytest.approx(4, rel=0.02)


def test_superstring_four_point():
    """F = Gamma(1+s) Gamma(1+t)/Gamma(1+s+t) = 1 - zeta(2) s t + ..., no tachyon pole."""
    states = spacelike_point()
    k = [s.momentum for s in states]
    ym = kn.yang_mills_amplitude(states).value()
    s, t = (ALPHA * square(*pair).re for pair in ((k[0], k[1]), (k[1], k[2])))
    found = kn.open_superstring_amplitude(states, (1, 2, 3, 4), ALPHA)
    factor = mpmath.gamma(1 + float(s)) * mpmath.gamma(1 + float(t)) / mpmath.gamma(1 + float(s + t))
    assert found.value == pytest.approx(20 * ym * float(factor), rel=1e-12)
    on = 1 / square(k[0], k[1]).re
    assert kn.open_superstring_amplitude(states, (1, 2, 3, 4), on).ok
    ratio = float(kn.open_superstring_amplitude(states, (1, 2, 3, 4), Fraction(1, 10**7), digits=30).value) / (
        10**7 * ym
    )
    st = float(s * t) * (20 / 10**7) ** 2
    assert (ratio - 1) / st == pytest.approx(-(pi**2) / 6, rel=0.02)


def test_superstring_five_point_zeta2():
    """``F = 1 + zeta(2) P2`` (Schlotterer and Stieberger 2012, arXiv:1205.1516, row from memory and checked)."""
    states = bosons(5, 77)
    alpha = Fraction(1, 10**5)
    kin = kn.Mandelstams.from_momenta([s.momentum for s in states], alpha_prime=alpha)
    s1, _, s3, s4, s5 = (kin.pair(i, i % 5 + 1) for i in range(1, 6))
    ym = kn.yang_mills_amplitude(states)
    swapped = kn.yang_mills_amplitude(states, (1, 3, 2, 4, 5))
    correction = (-s3 * s4 + s1 * (s3 - s5)) * ym + kin.pair(1, 3) * kin.pair(2, 4) * swapped
    found = kn.open_superstring_amplitude(states, (1, 2, 3, 4, 5), alpha, digits=25)
    root = mpmath.sqrt(mpmath.mpf(alpha.denominator) / (2 * alpha.numerator)) ** 3 * 2
    ratio = float((found.value / root - ym.value()) / correction.value())
    assert ratio == pytest.approx(pi**2 / 6, rel=1e-2)


def test_closed_superstring_four_point():
    """The field-theory tree times ``prod Gamma(1+x)/Gamma(1-x)`` (Green and Schwarz 1982)."""
    states = tensors(4, 81)
    k = [s.momentum for s in states]
    tree = kn.closed_superstring_amplitude(states, Fraction(1, 10**6)).value
    found = kn.closed_superstring_amplitude(states, ALPHA)
    factor = 1.0
    for j in (1, 2, 3):
        x = float(ALPHA * square(k[0], k[j]).re / 4)
        factor *= float(mpmath.gamma(1 + x) / mpmath.gamma(1 - x))
    assert found.ok
    assert found.value == pytest.approx(tree * factor, rel=1e-9)
    bosonic = kn.closed_amplitude(states, Fraction(1, 10**6)).value
    assert bosonic == pytest.approx(tree, rel=1e-2)


def test_sum_over_orderings_is_the_sum():
    states = bosons(4, 90)
    total = kn.open_amplitude(states, None, ALPHA)
    parts = [kn.open_amplitude(states, (1, *word), ALPHA) for word in permutations((2, 3, 4))]
    assert abs(total.value - sum(part.value for part in parts)) <= total.error + sum(part.error for part in parts)
    assert kn.open_amplitude(bosons(5, 91), None, ALPHA).value == 0  # photons: Furry's theorem


def test_massless_three_is_generic():
    k = massless_three()
    assert all(not dot(a, b) for a in k for b in k)
