"""Direct sphere integrals against published closed forms: complex beta with spin, complex Selberg, five points."""

from __future__ import annotations

from itertools import combinations

import pytest

from kn_integrate.closed_forms.sphere import ComplexBeta, ComplexSelberg
from kn_integrate.exact import Exact
from kn_integrate.exponents import SphereExponents
from kn_integrate.integrals import SphereTerm
from kn_integrate.sphere.direct import integrate_terms


def _inside(found, value):
    assert found.ok, found.details
    assert abs(complex(found.value) - complex(value)) <= found.error + 1e-15 * abs(complex(value))


@pytest.mark.parametrize(
    ("a", "ab", "b", "bb", "rtol"),
    [
        ("0.3", "0.3", "0.35", "0.35", 1e-12),
        ("-4.3", "-1.3", "-2.6", "-3.6", 1e-9),  # beyond poles, spins 3 and 1
        ("0.3", "1.3", "-0.4+1j", "1.6+1j", 1e-11),  # odd total spin, complex
        ("-1.3+0.3j", "-1.3+0.3j", "-2.4-0.2j", "-2.4-0.2j", 1e-11),
        ("0.3", "0.3", "0.4+10j", "0.4+10j", 1e-10),
    ],
)
def test_complex_beta(a, ab, b, bb, rtol):
    form = ComplexBeta(a, ab, b, bb)
    order = list(combinations(range(1, 5), 2))
    pairs = tuple(form.left.at(*pair) for pair in order)
    spins = tuple(int((form.right.at(*pair) - form.left.at(*pair)).re) for pair in order)
    # (1 - z), not (z - 1), stands in the closed form; the three finite differences turned round give no sign together
    found = integrate_terms(4, [SphereTerm(Exact(1), pairs, (0,) * 6, spins)], rtol=rtol)
    _inside(found, form.value(25))


@pytest.mark.parametrize(
    ("count", "a", "b", "g", "rtol"),
    [
        (2, "0.3", "0.25", "0.05", 1e-11),
        (2, "-1.3", "-2.43", "0.35", 1e-8),  # beyond poles
        (2, "0.3+0.2j", "0.25-0.1j", "0.05", 1e-8),
        (3, "0.3", "0.25", "0.05", 0.2),
    ],
)
def test_complex_selberg(count, a, b, g, rtol):
    form, n = ComplexSelberg(count, a, b, g), count + 3
    pairs = tuple(form.left.at(*pair) for pair in combinations(range(1, n + 1), 2))
    zero = (0,) * len(pairs)
    found = integrate_terms(n, [SphereTerm(Exact(1), pairs, zero, zero)], rtol=rtol, max_points=3e8)
    _inside(found, form.value(25))


# s12 s13 s23 s24 s34 in hundredths; values from the KLT bilinear (Kawai, Lewellen, Tye 1986) of disk integrals at 30
# digits.  The last has one more power of z_12 and one less of z_24 on the left.
FIVE = [
    ((-52, -61, -53, -57, -39), {}, 42.867981591719854386, 1e-11),
    ((-131, -42, -23, -37, -29), {}, -9.0985141252612476735, 1e-9),
    ((-33, -27, -41, -29, -38), {(1, 2): 1, (2, 4): -1, (1, 5): -1, (4, 5): 1}, 85.151219359277411282, 1e-9),
]


@pytest.mark.parametrize(("hundredths", "left", "value", "rtol"), FIVE)
def test_five_points(hundredths, left, value, rtol):
    keys = [(1, 2), (1, 3), (2, 3), (2, 4), (3, 4)]
    pairs = {key: Exact(x) / 100 for key, x in zip(keys, hundredths, strict=True)}
    found = SphereExponents.from_pairs(5, pairs, left=left, right={})
    term = SphereTerm(Exact(1), found.pairs, found.left, found.right)
    _inside(integrate_terms(5, [term], rtol=rtol), value)
