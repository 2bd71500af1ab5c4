from __future__ import annotations

import pickle
import random
from fractions import Fraction

import mpmath
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kn_integrate import InputError, ZetaSum, zeta
from kn_integrate.exact import Exact
from kn_integrate.expansion.numeric import ball_of, fixed_zeta, value_of
from kn_integrate.expansion.reduction import composition_of, dual, reduced, shuffle, stuffle, word_of, words_of
from kn_integrate.expansion.zetas import GENERATORS, MAX_WEIGHT, basis, product_weight


def number(value: ZetaSum, digits: int = 50):
    """The value in a context of its own."""
    return value_of(value, digits)


def nested_sum(indices: tuple[int, ...], terms: int) -> float:
    """The definition, cut off."""
    inner = [1.0] * (terms + 1)
    for n in indices:
        total, sums = 0.0, [0.0] * (terms + 1)
        for k in range(1, terms + 1):
            total += inner[k - 1] / k**n
            sums[k] = total
        inner = sums
    return inner[terms]


@pytest.mark.parametrize("indices", [(2,), (3,), (3, 5), (1, 3), (2, 2, 3), (5, 4)])
def test_numbers_follow_the_definition(indices):
    # the tail of the outer sum is below (log K)^(r-1) / K^(n-1); the last index is at least 3 but for zeta(2)
    tail = 1 / 4000 if indices == (2,) else 100 / 4000**2
    assert fixed_zeta(indices, 80) / 2**80 == pytest.approx(nested_sum(indices, 4000), abs=tail)
    assert fixed_zeta(indices, 80) / 2**80 > nested_sum(indices, 4000)


def test_single_sums_and_the_ordering_of_indices():
    with mpmath.workdps(70):
        for n in range(2, 13):
            assert abs(mpmath.mpf(fixed_zeta((n,), 300)) / 2**300 - mpmath.zeta(n)) < 1e-68
    assert f"{float(zeta(3, 5).value()):.4f}" == "0.0377"
    assert f"{float(zeta(5, 3).value()):.4f}" == "0.2047"  # zeta(3) zeta(5) - zeta(8) - zeta(3,5)


@pytest.mark.parametrize("weight", range(2, MAX_WEIGHT + 1))
def test_every_reduction_is_a_true_equation_of_numbers(weight):
    words = words_of(weight)
    chosen = words if len(words) <= 64 else random.Random(weight).sample(words, 64)
    for word in chosen:
        ball = ball_of(ZetaSum(reduced(word)), 300)
        assert abs(ball.re - fixed_zeta(word, 300)) <= ball.error + 2**24
        assert ball.error < 2**60


def test_basis_has_the_conjectured_dimensions_and_pure_weight():
    sizes = [len(basis(w)) for w in range(MAX_WEIGHT + 1)]
    assert all(sizes[w] == sizes[w - 2] + sizes[w - 3] for w in range(3, MAX_WEIGHT + 1))
    assert all(product_weight(p) == w for w in range(MAX_WEIGHT + 1) for p in basis(w))
    assert all(zeta(*g) == ZetaSum([((g,), Exact(1))]) for g in GENERATORS)


def test_known_values():
    z2, z3, z5 = zeta(2), zeta(3), zeta(5)
    assert zeta(1, 2) == z3  # Euler
    assert zeta(4) == Fraction(2, 5) * (z2 * z2)
    assert zeta(6) == Fraction(8, 35) * (z2 * z2 * z2)
    assert zeta(2, 2) == Fraction(3, 10) * (z2 * z2)
    assert zeta(1, 4) == 2 * z5 - z2 * z3
    assert zeta(3, 2) == Fraction(9, 2) * z5 - 2 * z2 * z3
    assert zeta(2, 3) == 3 * z2 * z3 - Fraction(11, 2) * z5
    assert zeta(1, 1, 1, 2) == z5


words = st.sampled_from([w for k in range(2, 7) for w in words_of(k)])


@settings(deadline=None, max_examples=100)
@given(words, words)
def test_products_are_shuffles_and_stuffles(u, v):
    if sum(u) + sum(v) > MAX_WEIGHT:
        return
    product = zeta(*u) * zeta(*v)
    by_stuffle = sum((zeta(*w) * c for w, c in stuffle(u, v).items()), ZetaSum())
    by_shuffle = sum((zeta(*composition_of(w)) * c for w, c in shuffle(word_of(u), word_of(v)).items()), ZetaSum())
    assert product == by_stuffle == by_shuffle
    assert zeta(*dual(u)) == zeta(*u)


sums = st.lists(
    st.tuples(st.sampled_from([p for w in range(6) for p in basis(w)]), st.integers(-5, 5), st.integers(-2, 2)),
    max_size=4,
).map(lambda items: ZetaSum((p, Exact(Fraction(a, 3), Fraction(b))) for p, a, b in items))


@settings(deadline=None, max_examples=80)
@given(sums, sums, sums)
def test_algebra(a, b, c):
    assert a + b == b + a
    assert a * b == b * a
    assert a * (b + c) == a * b + a * c
    assert (a * b) * c == a * (b * c)
    assert a - b == -(b - a)
    assert a * 1 == a + 0 == a
    assert not a * 0
    assert 1 - a == -(a - 1)
    assert (a * 3) / 3 == a
    assert pickle.loads(pickle.dumps(a)) == a
    assert hash(a + b) == hash(b + a)
    with mpmath.workdps(40):
        size = sum(abs(complex(k)) for _, k in a.terms) * sum(abs(complex(k)) for _, k in b.terms) + 1
        assert abs(number(a, 40) * number(b, 40) - number(a * b, 40)) < 1e-35 * size * 10


def test_digits_survive_cancellation():
    # 1e30 (zeta(4) - 2/5 zeta(2)^2) is zero exactly, and a near miss keeps its relative digits
    tiny = zeta(3) * 10**30 - ZetaSum([((), Exact(Fraction(1202056903159594285399738161511449, 1000)))])
    with mpmath.workdps(80):
        want = mpmath.zeta(3) * 10**30 - mpmath.mpf(1202056903159594285399738161511449) / 1000
        assert abs(number(tiny, 30) - want) < abs(want) * mpmath.mpf(10) ** -29
    assert number(ZetaSum()) == 0


def test_texts():
    value = "1/2" * zeta(3, 5) - 3 * zeta(2) * zeta(2) + Exact("1-2j") * zeta(3)
    assert str(value) == "(1-2j)*zeta(3) - 3*zeta(2)^2 + 1/2*zeta(3,5)"
    assert value.latex() == r"\left(1 - 2 i\right) \zeta_{3} -3 \zeta_{2}^{2} + \frac{1}{2} \zeta_{3,5}".replace(
        " -3", " - 3"
    )
    assert value.to_dict() == {"zeta(3)": "1-2j", "zeta(2)^2": "-3", "zeta(3,5)": "1/2"}
    assert str(ZetaSum()) == ZetaSum().latex() == "0"
    assert str(zeta(2) * 0 + 1) == "1"
    assert value.weights == (3, 4, 8)
    assert not value.is_real
    assert value.coefficient(2, 2) == -3
    assert value.coefficient((3, 5)) == Exact("1/2")
    assert value.coefficient(5) == 0


@pytest.mark.parametrize(
    "bad",
    [
        lambda: zeta(1),
        lambda: zeta(2, 1),
        lambda: zeta(),
        lambda: zeta(0, 2),
        lambda: zeta(13),
        lambda: zeta(2.0),  # type: ignore[arg-type]
        lambda: zeta(True, 2),
        lambda: zeta(2).coefficient(4),
    ],
)
def test_bad_input_is_an_input_error(bad):
    with pytest.raises(InputError):
        bad()


def test_foreign_objects_are_a_type_error():
    with pytest.raises(TypeError):
        _ = zeta(2) * object()
    with pytest.raises(TypeError):
        _ = [1] - zeta(2)
