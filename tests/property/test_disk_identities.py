"""Identities that hold for every n inside and outside the convergence region, at points hypothesis chooses."""

from __future__ import annotations

from fractions import Fraction

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import kn_integrate as kn
from kn_integrate.dispatch import integrate_disk_terms
from kn_integrate.dispatch.shifts import chords_of, pair_order, pair_shift
from kn_integrate.exact import ONE, Exact
from kn_integrate.integrals import DiskTerm

COUNT = {4: 40, 5: 40, 6: 12, 7: 3}


def parts(low: int, high: int):
    """Multiples of 1/997 between low and high that are at least 1/50 away from 0, -1, -2, ..."""
    numbers = st.integers(low * 997 + 1, high * 997 - 1).map(lambda k: Fraction(k, 997))
    return numbers.filter(lambda x: abs(x - min(0, round(x))) > Fraction(1, 50))


@st.composite
def exponents(draw, n: int):
    """Chord exponents, in (-2, 2), real or with imaginary parts in (-1, 1)."""
    is_complex = draw(st.booleans())
    values = {}
    for chord in chords_of(n):
        re = draw(parts(-2, 2))
        im = Fraction(draw(st.integers(-996, 996)), 997) if is_complex else Fraction(0)
        values[chord] = Exact(re, im)
    return values


def pairs_of(n: int, chords):
    adjacent = {(i, i + 1) for i in range(1, n)} | {(1, n)}
    base = [Exact(-1) if pair in adjacent else Exact(0) for pair in pair_order(n)]
    return tuple(b + h for b, h in zip(base, pair_shift(n, chords), strict=True))


def value(n: int, pairs):
    rtol = {4: 1e-11, 5: 1e-10, 6: 1e-8, 7: 1e-6}[n]
    return integrate_disk_terms(n, [DiskTerm(ONE, pairs)], method="quadrature", rtol=rtol, max_points=1e8)


def agree(*signed):
    """A signed sum of estimates vanishes within the claimed errors and a rounding unit of the largest."""
    total = sum(sign * result.value for sign, result in signed)
    largest = max(abs(result.value) for _, result in signed)
    assert abs(total) <= sum(result.error for _, result in signed) + 1e-15 * largest


def crossing(n, chord):
    i, j = chord
    return [(a, b) for a, b in chords_of(n) if (a < i <= b < j) or (i < a <= j < b)]


def identity(n):
    def decorate(function):
        chosen = settings(
            deadline=None, max_examples=COUNT[n], suppress_health_check=list(HealthCheck), derandomize=True
        )
        return chosen(given(exponents(n), st.data())(function))

    return decorate


def u_equation(n, chords, data):
    # u_c + prod_(c' crossing c) u_c' = 1 for the dihedral coordinates
    chord = data.draw(st.sampled_from(chords_of(n)))
    raised = {**chords, chord: chords[chord] + 1}
    others = {c: chords[c] + 1 if c in crossing(n, chord) else chords[c] for c in chords}
    if any(y.is_integer and y <= 0 for y in (*raised.values(), *others.values())):
        return
    agree(*((s, value(n, pairs_of(n, c))) for s, c in ((1, chords), (-1, raised), (-1, others))))


def relabelled(n, pairs, image):
    table = {}
    for (i, j), p in zip(pair_order(n), pairs, strict=True):
        a, b = image[i - 1], image[j - 1]
        table[min(a, b), max(a, b)] = p
    return tuple(table[pair] for pair in pair_order(n))


def cyclic(n, chords, data):
    # rotating the positions moves the gauge-fixed punctures as well: this is gauge independence too
    step = data.draw(st.integers(1, n - 1))
    pairs = pairs_of(n, chords)
    turned = relabelled(n, pairs, [(i + step - 1) % n + 1 for i in range(1, n + 1)])
    agree((1, value(n, pairs)), (-1, value(n, turned)))


def reflection(n, chords, data):
    pairs = pairs_of(n, chords)
    agree((1, value(n, pairs)), (-1, value(n, relabelled(n, pairs, list(range(n, 0, -1))))))


@identity(4)
def test_u_equations_4(chords, data):
    u_equation(4, chords, data)


@identity(5)
def test_u_equations_5(chords, data):
    u_equation(5, chords, data)


@identity(6)
def test_u_equations_6(chords, data):
    u_equation(6, chords, data)


@identity(7)
def test_u_equations_7(chords, data):
    u_equation(7, chords, data)


@identity(4)
def test_cyclic_4(chords, data):
    cyclic(4, chords, data)


@identity(5)
def test_cyclic_5(chords, data):
    cyclic(5, chords, data)


@identity(6)
def test_cyclic_6(chords, data):
    cyclic(6, chords, data)


@identity(7)
def test_cyclic_7(chords, data):
    cyclic(7, chords, data)


@identity(5)
def test_reflection_5(chords, data):
    reflection(5, chords, data)


@identity(6)
def test_reflection_6(chords, data):
    reflection(6, chords, data)


@settings(deadline=None, max_examples=20, derandomize=True)
@given(st.permutations([1, 2, 3, 4, 5]), st.fractions(-3, 3), st.fractions(-3, 3), st.integers(0, 10**6))
def test_linearity(order, a, b, seed):
    kin = kn.Mandelstams.random(5, seed, low=0, high=1)
    f, g = kn.parke_taylor(1, 2, 3, 4, 5), kn.parke_taylor(*order)
    whole = kn.disk_integral(kin, a * f + b * g, method="quadrature", atol=1e-9)
    pieces = [kn.disk_integral(kin, part, method="quadrature") for part in (f, g)]
    difference = whole.value - float(a) * pieces[0].value - float(b) * pieces[1].value
    bound = whole.error + abs(float(a)) * pieces[0].error + abs(float(b)) * pieces[1].error
    assert abs(difference) <= bound + 1e-15 * (abs(float(a)) + abs(float(b))) * max(abs(p.value) for p in pieces)


@settings(deadline=None, max_examples=20, derandomize=True)
@given(st.permutations([1, 2, 3, 4, 5, 6]), st.integers(0, 10**6))
def test_labels_are_only_names(order, seed):
    kin = kn.Mandelstams.random(6, seed, low=0, high=1)
    one = kn.disk_integral(kin, kn.parke_taylor(1, 2, 3, 4, 5, 6), method="quadrature", rtol=1e-8)
    names = dict(zip(range(1, 7), order, strict=True))
    other = kn.disk_integral(
        kin.relabelled([names[i] for i in range(1, 7)]),
        kn.parke_taylor(*order),
        ordering=order,
        method="quadrature",
        rtol=1e-8,
    )
    assert one.value == other.value  # the same positions, the same bits
