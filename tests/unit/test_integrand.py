from __future__ import annotations

import pickle
import random
from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kn_integrate import InputError, Integrand, monomial, parke_taylor, parse_integrand
from kn_integrate.exact import Exact
from kn_integrate.integrand import MAX_POWER, Term


def at(f: Integrand, z: dict[int, Fraction]) -> Exact:
    """The value of an integrand at a point, factor by factor."""
    total = Exact(0)
    for term in f.terms:
        value = term.coefficient
        for (i, j), power in term.powers:
            value = value * Exact(z[i] - z[j]) ** power
        total = total + value
    return total


def points(count: int, seed: int) -> dict[int, Fraction]:
    """Different rational points for labels 1..count, not in order."""
    rng = random.Random(seed)
    values = rng.sample(range(-40, 40), count)
    return {label: Fraction(value, 7) for label, value in enumerate(values, start=1)}


@pytest.mark.parametrize("cycle", [(1, 2), (2, 1), (1, 2, 3), (3, 1, 2), (2, 4, 1, 3), (5, 3, 1, 4, 2), (1, 12, 3, 7)])
def test_parke_taylor_is_its_definition_at_any_point(cycle):
    z = points(12, seed=len(cycle))
    product = Fraction(1)
    for k, label in enumerate(cycle):
        product *= z[label] - z[cycle[(k + 1) % len(cycle)]]
    assert at(parke_taylor(*cycle), z) == (-1) ** (len(cycle) - 1) / product


@pytest.mark.parametrize("n", [2, 3, 4, 5, 6])
def test_parke_taylor_is_positive_on_its_own_ordering_and_reversal_gives_minus_one_to_the_n(n):
    rng = random.Random(n)
    cycle = tuple(rng.sample(range(1, n + 1), n))
    ordered = {label: Fraction(k * k + 1) for k, label in enumerate(cycle)}
    assert at(parke_taylor(*cycle), ordered) > 0
    assert parke_taylor(*reversed(cycle)) == (-1) ** n * parke_taylor(*cycle)
    assert parke_taylor(*cycle[1:], cycle[0]) == parke_taylor(*cycle)


def test_two_cycles_and_products_of_cycles():
    assert parke_taylor(1, 2) == monomial({(1, 2): -2})
    assert parke_taylor(1, 2) * parke_taylor(3, 4) == monomial({(1, 2): -2, (3, 4): -2})


def test_monomial_signs_follow_the_label_order():
    assert monomial({(2, 1): 1}) == -monomial({(1, 2): 1})
    assert monomial({(2, 1): -2}) == monomial({(1, 2): -2})
    assert monomial({(1, 2): 2, (2, 1): 1}) == -monomial({(1, 2): 3})
    assert monomial({(1, 2): 1, (2, 1): -1}) == -monomial({})
    assert monomial({}) == 1 + Integrand()
    assert monomial({(1, 2): 0}) == monomial({})


def test_coefficients_of_every_exact_notation():
    f, g = parke_taylor(1, 2, 3, 4), monomial({(1, 2): -2, (3, 4): -2})
    h = 2 * f - "1/3" * g
    assert h == f + f - g / 3 == f * 2 + Fraction(-1, 3) * g
    assert ("1/2-1/3j" * f).terms[0].coefficient in (Exact("1/2-1/3j"), -Exact("1/2-1/3j"))
    assert (0.5 * f) == f / 2
    assert not h - h
    assert (h - h).terms == ()
    assert str(h - h) == "0"
    assert 1 / parke_taylor(1, 2, 3) == parke_taylor(1, 2, 3) ** -1
    assert f**0 == Integrand() ** 0 == monomial({})
    assert f**-2 * f**2 == monomial({})


def test_immutable_hashable_and_survives_pickling():
    f = parke_taylor(1, 2, 3) - parke_taylor(1, 2) * parke_taylor(2, 3)
    assert {f: 1}[parse_integrand(str(f))] == 1
    assert pickle.loads(pickle.dumps(f)) == f
    assert eval(repr(f), {"parse_integrand": parse_integrand}) == f
    with pytest.raises(AttributeError, match="immutable"):
        f.terms = ()
    with pytest.raises(AttributeError, match="immutable"):
        del f.terms


def test_terms_given_in_any_form_are_collected():
    raw = [Term(Exact(2), (((2, 1), 1),)), Term(Exact(3), (((1, 2), 1), ((3, 4), 0)))]
    assert Integrand(raw) == monomial({(1, 2): 1})
    with pytest.raises(InputError, match="Term objects"):
        Integrand([3])  # type: ignore[list-item]


def test_relabelling_moves_labels_with_their_signs():
    f = monomial({(1, 2): -1, (2, 3): 1})
    assert f.relabelled({1: 3, 3: 1}) == monomial({(3, 2): -1, (2, 1): 1})
    assert f.n == 3
    assert f.relabelled({3: 11}).n == 11


numbers = st.builds(Fraction, st.integers(-9, 9), st.integers(1, 5))
exacts = st.builds(Exact, numbers, st.sampled_from([Fraction(0), Fraction(1, 2), Fraction(-3)]))
labels = st.integers(1, 12)
pairs = st.tuples(labels, labels).filter(lambda pair: pair[0] != pair[1])
monomials = st.builds(lambda c, m: c * monomial(m), exacts, st.dictionaries(pairs, st.integers(-3, 3), max_size=3))
integrands = st.lists(monomials, max_size=4).map(lambda parts: sum(parts, Integrand()))


@settings(deadline=None, max_examples=150)
@given(integrands, integrands, integrands, exacts)
def test_algebra(f, g, h, c):
    assert f + g == g + f
    assert (f + g) + h == f + (g + h)
    assert f * g == g * f
    assert (f * g) * h == f * (g * h)
    assert f * (g + h) == f * g + f * h
    assert f - g == -(g - f)
    assert c * f == f * c
    assert f + 0 == f
    assert f * 1 == f
    assert not 0 * f
    assert f**2 == f * f
    assert f**3 == f * f * f
    assert parse_integrand(str(f)) == f
    assert hash(f + g) == hash(g + f)


@settings(deadline=None, max_examples=60)
@given(integrands, integrands, st.integers(0, 1000))
def test_algebra_is_the_algebra_of_values(f, g, seed):
    z = points(12, seed)
    assert at(f * g - f, z) == at(f, z) * at(g, z) - at(f, z)


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("PT(1,2,3,4,5)", parke_taylor(1, 2, 3, 4, 5)),
        (" PT ( 2 , 1 ) ", parke_taylor(1, 2)),
        ("2*PT(1,2)*PT(3,4) - 1/3*z12^-2*z34^-2", "5/3" * monomial({(1, 2): -2, (3, 4): -2})),
        ("z(1,2)", monomial({(1, 2): 1})),
        ("z21**3", monomial({(2, 1): 3})),
        ("-z12^2", -monomial({(1, 2): 2})),
        ("(-z12)^2", monomial({(1, 2): 2})),
        ("--2*-z12", -2 * monomial({(1, 2): 1})),
        ("z12/2/3", monomial({(1, 2): 1}) / 6),
        ("1/(z12*z(11,3)^2)", monomial({(1, 2): -1, (3, 11): -2})),
        ("z12^(-2)", monomial({(1, 2): -2})),
        ("0.25*z12 + 1e-3 - .5", "1/4" * monomial({(1, 2): 1}) + Fraction(1, 1000) - Fraction(1, 2)),
        ("(1+2j)*z12", "1+2j" * monomial({(1, 2): 1})),
        ("(z12 + z23)^2", (monomial({(1, 2): 1}) + monomial({(2, 3): 1})) ** 2),
        ("0*z12", Integrand()),
        ("1/2^2", monomial({}) / 4),
    ],
)
def test_parser(text, expected):
    assert parse_integrand(text) == expected


@pytest.mark.parametrize(
    ("text", "match"),
    [
        ("", "the end of the text"),
        ("PT(1,2", "'\\)'|','"),
        ("PT(1,1,2)", "all different"),
        ("PT(1)", "at least two labels"),
        ("PT()", "a label"),
        ("PT(1.5,2)", "a label"),
        ("z(1,1)", "two different labels"),
        ("z(0,1)", "label from 1"),
        ("z123", "two labels below ten"),
        ("z(1,2,3)", "two labels"),
        ("z12 z23", "at character 5"),
        ("z12^", "integer exponent"),
        ("z12^1.5", "integer exponent"),
        ("z12^2^3", "brackets"),
        ("z12^99999", f"within \\+-{MAX_POWER}"),
        ("(z12+z23)^-1", "one term"),
        ("1/0", "zero to the power -1"),
        ("1/2j", "imaginary divisor"),
        ("2 * * 3", "at character 5"),
        ("x + 1", "'x \\+ 1' at character 1"),
        ("1 + é", "at character 5"),
        ("１", "at character 1"),
        ("__import__('os')", "at character 1"),
        ("(" * 200 + "1" + ")" * 200, "deep"),
        ("(z12+z13+z14+z23)^900", "at most"),
        ("9^999*9^999^999", "raised again"),
        ("(9^999)^999", "bits"),
        ("1e99999", "decimal exponent"),
    ],
)
def test_parser_names_the_place_of_bad_text(text, match):
    with pytest.raises(InputError, match=match):
        parse_integrand(text)


def test_parser_survives_random_text():
    pieces = ["PT", "z", "z12", "z(", "(", ")", "*", "/", "^", "**", "-", "+", "1", "2", "31", "1/3", "0.5", "1e5"]
    pieces += ["e", "j", "i", " ", ",", "zz", "é", "9" * 40, "1e99999", "\n", "\x00", "^-", "PT(1,2)", "PT(1,2,3"]
    rng = random.Random(20)
    accepted = unplaced = 0
    for _ in range(10_000):
        text = "".join(rng.choices(pieces, k=rng.randint(0, 12)))
        try:
            found = parse_integrand(text)
        except InputError as error:
            unplaced += "character" not in str(error)
        else:
            accepted += 1
            assert parse_integrand(str(found)) == found
    assert accepted > 100
    assert not unplaced


@pytest.mark.parametrize(
    "bad",
    [
        lambda: monomial({(1, 1): 2}),
        lambda: monomial({(1, 2, 3): 2}),
        lambda: monomial({(1, 2): 0.5}),  # type: ignore[dict-item]
        lambda: monomial({(1, 2): True}),
        lambda: monomial({(0, 2): 1}),
        lambda: monomial({(1, 2): 10**6}),
        lambda: monomial([(1, 2)]),  # type: ignore[arg-type]
        lambda: monomial({12: 1}),  # type: ignore[dict-item]
        lambda: parke_taylor(),
        lambda: parke_taylor(1),
        lambda: parke_taylor(1, 2, 2),
        lambda: parke_taylor(1, "2"),  # type: ignore[arg-type]
        lambda: parke_taylor(1, True),
        lambda: parke_taylor(1, -2),
        lambda: "x" * parke_taylor(1, 2),
        lambda: parke_taylor(1, 2) * float("nan"),
        lambda: parke_taylor(1, 2) ** 0.5,  # type: ignore[operator]
        lambda: parke_taylor(1, 2) / 0,
        lambda: Integrand() ** -1,
        lambda: parse_integrand(12),  # type: ignore[arg-type]
        lambda: parse_integrand("1+" * 600_000 + "1"),
        lambda: parke_taylor(1, 2) ** 1001,
        lambda: parke_taylor(1, 2) ** 501,
    ],
)
def test_bad_input_is_an_input_error(bad):
    with pytest.raises(InputError):
        bad()


def test_foreign_objects_are_a_type_error():
    with pytest.raises(TypeError):
        _ = parke_taylor(1, 2) * object()
    with pytest.raises(TypeError):
        _ = parke_taylor(1, 2) - [1]
    assert parke_taylor(1, 2) != "z12^-2"
