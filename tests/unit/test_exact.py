from __future__ import annotations

import operator
import pickle
from decimal import Decimal
from fractions import Fraction

import flint
import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kn_integrate.errors import InputError
from kn_integrate.exact import ONE, ZERO, Exact, read, read_integer

fractions = st.fractions(max_denominator=50).filter(lambda x: abs(x) < 100)
numbers = st.builds(Exact, fractions, fractions)


def as_complex(z):
    """The same number as a pair of Fractions, with arithmetic written out."""
    return z.re, z.im


@settings(deadline=None, max_examples=150)
@given(numbers, numbers)
def test_arithmetic_is_that_of_complex_rationals(z, w):
    (a, b), (c, d) = as_complex(z), as_complex(w)
    assert as_complex(z + w) == (a + c, b + d)
    assert as_complex(z - w) == (a - c, b - d)
    assert as_complex(z * w) == (a * c - b * d, a * d + b * c)
    assert as_complex(-z) == (-a, -b)
    if w:
        assert z / w * w == z
        assert w**-2 * w * w == 1
    assert z**3 == z * z * z
    assert z**0 == ONE
    assert z.conjugate().conjugate() == z
    assert (z == w) is (as_complex(z) == as_complex(w))


@settings(deadline=None, max_examples=150)
@given(numbers)
def test_text_reads_back(z):
    assert Exact(str(z)) == z
    assert eval(repr(z), {"Exact": Exact}) == z
    assert pickle.loads(pickle.dumps(z)) == z
    assert read(str(z), "z") == (z, False)


@settings(deadline=None, max_examples=100)
@given(st.floats(allow_nan=False, allow_infinity=False))
def test_floats_count_at_their_binary_value(x):
    z, rounded = read(x, "x")
    assert rounded
    assert z.re == Fraction(x)
    assert z == x
    assert hash(z) == hash(x)
    assert float(z) == x


@settings(deadline=None, max_examples=100)
@given(fractions, fractions)
def test_order_and_hash_of_reals(a, b):
    x, y = Exact(a), Exact(b)
    for operation in (operator.lt, operator.le, operator.gt, operator.ge, operator.eq):
        assert operation(x, y) is operation(a, b)
        assert operation(x, b) is operation(a, b)
    assert hash(x) == hash(a)
    assert hash(Exact(a, b)) == hash(complex(a, b)) or Fraction(float(a)) != a or Fraction(float(b)) != b


@pytest.mark.parametrize(
    ("value", "expected", "rounded"),
    [
        (3, 3, False), (Fraction(1, 3), Fraction(1, 3), False), (Decimal("0.1"), Fraction(1, 10), False),
        ("-13/10", Fraction(-13, 10), False), ("0.37", Fraction(37, 100), False), ("1e-6", Fraction(1, 10**6), False),
        ("0.3+0.2j", Exact(Fraction(3, 10), Fraction(1, 5)), False), ("2j", Exact(0, 2), False),
        (0.5, Fraction(1, 2), True), (0.5 - 2j, Exact(Fraction(1, 2), Fraction(-2)), True),
        (np.int64(7), 7, False), (np.float32(0.25), Fraction(1, 4), True), (np.complex128(1j), Exact(0, 1), True),
        (mpmath.mpf(2) ** -200, Fraction(1, 2**200), True), (flint.fmpq(2, 7), Fraction(2, 7), False),
        (flint.fmpz(9), 9, False), (Exact(4), 4, False),
    ],
)  # fmt: skip
def test_notations(value, expected, rounded):
    assert read(value, "x") == (expected, rounded)


@pytest.mark.parametrize(
    "value",
    [True, np.bool_(False), None, "", "x", "1/0", "1//2", "nan", "inf", "1e99999999", float("nan"), float("inf"),
     complex(0, float("nan")), mpmath.mpf("nan"), mpmath.inf, Decimal("NaN"), [1], "1+2", "0x10", "1_0/3 j"],
)  # fmt: skip
def test_refused(value):
    with pytest.raises(InputError) as caught:
        read(value, "the field")
    assert caught.value.field == "the field"


def test_parts_must_be_rational():
    for parts in ((0.5,), (1, 0.5), (True,), ("1/2", 1)):
        with pytest.raises(InputError):
            Exact(*parts)


def test_integers():
    assert read_integer(np.int64(3), "n") == 3
    assert int(Exact(-4)) == -4
    with pytest.raises(ValueError, match="not an integer"):
        int(Exact("1/2"))
    for value in (True, 1.5, "3", None):
        with pytest.raises(InputError):
            read_integer(value, "n")


def test_conversions():
    z = Exact(Fraction(1, 3), Fraction(-2))
    assert complex(z) == complex(1 / 3, -2)
    assert abs(Exact(3, 4)) == 5
    with pytest.raises(TypeError):
        float(z)
    with pytest.raises(TypeError):
        z < 1  # noqa: B015
    with mpmath.workdps(40):
        assert abs(mpmath.mpf(1) / 3 - mpmath.mpmathify(Exact("1/3"))) < mpmath.mpf(10) ** -39
    assert isinstance(Exact("1/2") + 0.25, float)
    assert isinstance(Exact("1/2") * (1 + 1j), complex)
    assert not ZERO
    assert bool(ONE)
    with pytest.raises(ZeroDivisionError):
        ONE / ZERO
    with pytest.raises(AttributeError):
        z.re = 3
