"""The language of formulas: what it computes, where it says no, and that nothing else can happen in it."""

from __future__ import annotations

import random
from fractions import Fraction

import mpmath
import pytest

from kn_integrate.checks.expression import FUNCTIONS, OutOfRangeError, UndefinedValueError, evaluate, parse
from kn_integrate.closed_forms.working import context
from kn_integrate.errors import InputError, KNError
from kn_integrate.exact import Exact


def invariant(labels: tuple[int, ...]) -> Exact:
    return Exact(Fraction(3, 10)) if labels == (1, 2) else Exact(Fraction(2, 5))


def value(text: str, digits: int = 30) -> mpmath.mpf:
    node = parse(text, 12, ["a"])
    return evaluate(node, context(digits), invariant, {"a": Exact(Fraction(1, 7))})


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("1+2*3^2/6-1", 3),
        ("-2^2", -4),
        ("2^-1", Fraction(1, 2)),
        ("2**3^2", 512),
        ("1.5e1*s12", Fraction(9, 2)),
        ("s.1.12 + X.1.2.3", Fraction(4, 5)),
        ("a*7", 1),
        ("i*i", -1),
        ("1/gamma(s12-3/10)", 0),
        ("hyp2f1(-2,1,3;1)", Fraction(1, 2)),
        ("gamma(6)/120 - zeta(0) + log(exp(1)) + sin(0) + cos(pi)", Fraction(3, 2)),
    ],
)
def test_arithmetic(text: str, expected: Fraction | int) -> None:
    assert abs(value(text) - mpmath.mpf(Fraction(expected).numerator) / Fraction(expected).denominator) < 1e-15


def test_unit_argument_is_continued_beyond_the_series() -> None:
    # Gauss, DLMF 15.4.20, at excess c - a - b = -1.6, where the series diverges
    gauss = value("gamma(1/3)*gamma(-8/5)/(gamma(1/3-6/5)*gamma(1/3-11/15))")
    assert abs(value("hyp2f1(6/5,11/15,1/3,1)") - gauss) < abs(gauss) * mpmath.mpf(10) ** -14
    # a pair of equal parameters drops out of a 3F2
    assert abs(value("hyp3f2(6/5,11/15,a,1/3,a,1)") - gauss) < abs(gauss) * mpmath.mpf(10) ** -14


def test_precision_is_private_and_as_asked() -> None:
    before = mpmath.mp.prec
    ctx = context(80)
    found = evaluate(parse("beta(1/2,1/2)", 4), ctx, invariant, {})
    assert abs(found - ctx.pi) < ctx.mpf(10) ** -78
    assert mpmath.mp.prec == before


@pytest.mark.parametrize(
    ("text", "position"),
    [
        ("gamma(s12).real", 11),
        ("s12 + os", 7),
        ("__import__('os')", 12),
        ("eval(s12)", 1),
        ("sqrt(s12)", 1),
        ("2 s12", 3),
        ("(1+2", 5),
        ("s11", 1),
        ("s.1.13", 1),
        ("X.1", 1),
        ("beta(1)", 1),
        ("pFq(1;2)", 1),
        ("", 1),
        ("1 + [2]", 5),
        ("lambda", 1),
        ("(" * 41 + "1" + ")" * 41, 42),
        ("-" * 41 + "1", 42),
        ("9" * 61, 1),
        ("1e999", 1),
        ("gamma", 1),
    ],
)
def test_refused_with_its_position(text: str, position: int) -> None:
    with pytest.raises(InputError) as caught:
        parse(text, 12, ["a"])
    assert caught.value.field == f"formula, position {position}"


def test_too_long() -> None:
    with pytest.raises(InputError, match="at most"):
        parse("1+" * 20_000 + "1", 4)


def test_long_and_wide_is_fine() -> None:
    assert value("+".join(["1"] * 9_000)) == 9_000


@pytest.mark.parametrize("text", ["1/(s12-3/10)", "gamma(-3)", "zeta(1)", "log(0)", "0^-1", "hyp2f1(1,1,2,1)"])
def test_undefined(text: str) -> None:
    with pytest.raises(UndefinedValueError):
        value(text)


@pytest.mark.parametrize("text", ["2^(10^6)", "gamma(10^9)", "hyp3f2(1,1,1,2,2,5)", "pFq(1,1;;1/2)", "exp(exp(20))"])
def test_out_of_range(text: str) -> None:
    with pytest.raises(OutOfRangeError):
        value(text)


PIECES = [
    "s12",
    "s.1.2",
    "X.1.2",
    "a",
    "1",
    "2.5",
    "e",
    "1e9",
    "(",
    ")",
    "+",
    "-",
    "*",
    "/",
    "^",
    "**",
    "gamma(",
    "beta(",
    "hyp3f2(",
    "pFq(",
    "exp(",
    "log(",
    "zeta(",
    "sin(",
    ";",
    ",",
    "i",
    "pi",
    "__import__",
    "os.system",
    ".",
    "'",
    '"',
    "[",
    "]",
    "{",
    "}",
    "lambda",
    ":",
    "=",
    "eval(",
    "open(",
    "0",
    "é",
]


def _formula(rng: random.Random, depth: int) -> str:
    if depth == 0 or rng.random() < 0.2:
        return rng.choice(["s12", "a", "1", "2.5", "i", "pi", "s23", "0", "1e9", "-3"])
    if rng.random() < 0.5:
        return f"({_formula(rng, depth - 1)}){rng.choice('+-*/^')}{_formula(rng, depth - 1)}"
    name = rng.choice(list(FUNCTIONS))
    count = FUNCTIONS[name]
    if count is None:
        return "pFq(" + ";".join(_formula(rng, depth - 1) for _ in range(3)) + ")"
    return name + "(" + ",".join(_formula(rng, depth - 1) for _ in range(count)) + ")"


def test_twelve_thousand_random_strings() -> None:
    """Nothing but a number or one of the package's own exceptions comes out."""
    rng = random.Random(20)
    values = refused = 0
    for k in range(12_000):
        if k % 2:
            text = _formula(rng, rng.randint(1, 3))
        else:
            text = "".join(rng.choice(PIECES) for _ in range(rng.randint(1, 12)))
        try:
            value(text, 15)
            values += 1
        except KNError:
            refused += 1
    assert values > 2_000
    assert refused > 2_000
