"""Examining a formula: verdicts, what they are based on, and the command."""

from __future__ import annotations

import json
import random
from fractions import Fraction
from pathlib import Path

import mpmath
import pytest
from click.testing import CliRunner

import kn_integrate as kn
from kn_integrate.checks.examine import compare, integral_value
from kn_integrate.checks.formulas import Measured
from kn_integrate.checks.sampling import Locus
from kn_integrate.cli import main
from kn_integrate.errors import WorkLimitError
from kn_integrate.exact import Exact

D4 = kn.DiskIntegral(4, kn.parke_taylor(1, 2, 3, 4))
D5 = kn.DiskIntegral(5, kn.parke_taylor(1, 2, 3, 4, 5))


def test_text_with_parameters_agrees() -> None:
    result = kn.examine_formula("gamma(a)*gamma(b)/gamma(a+b)", D4, parameters={"a": "s12", "b": "s23"}, trials=12)
    assert result.agrees
    assert result.digits >= 20
    assert "evidence, not proof" in str(result)
    assert {"inside", "continued", "complex"} <= {t.region for t in result.trials}


def test_same_input_same_answer() -> None:
    first, second = (kn.examine_formula("2*beta(s12,s23)", D4, trials=8) for _ in range(2))
    assert first.to_dict() == second.to_dict()


def test_function_in_double_precision_is_held_to_ten_digits() -> None:
    result = kn.examine_formula(lambda p: mpmath.beta(p.s(1, 2), p.s(2, 3)), D4, trials=10)
    assert result.agrees
    assert 10 <= result.digits < 14


def test_function_in_full_precision() -> None:
    result = kn.examine_formula(lambda p: p.ctx.beta(p["a"], p.X(2, 3)), D4, parameters={"a": "s12"}, trials=10)
    assert result.agrees
    assert result.digits >= 20


def test_a_small_mistake_is_seen() -> None:
    result = kn.examine_formula("beta(s12,s23)*(1+10^-17)", D4, trials=6)
    assert result.verdict == "disagrees"


def test_only_the_locus_counts() -> None:
    claimed = "beta(s45,s34)*beta(s12,s23)"
    assert kn.examine_formula(claimed, D5, where={"s24": "0"}, trials=10).agrees
    assert kn.examine_formula(claimed, D5, trials=6).verdict == "disagrees"


def test_locus_holds_exactly() -> None:
    locus = Locus(D5, {"s24": "1/3-s13", "a": "2*s12"}, {"a": "s45+1"})
    for kind in ("inside", "continued", "complex", "any"):
        kin = locus.draw(kind, random.Random(3))
        if kin is not None:
            assert kin.pair(2, 4) + kin.pair(1, 3) == Exact(Fraction(1, 3))
            assert kin.pair(4, 5) + 1 == 2 * kin.pair(1, 2)


def test_undecided_is_no_agreement() -> None:
    def refuses(spec: object, kin: object, digits: int) -> Measured:
        raise WorkLimitError(1e9, 1e6)

    result = kn.examine_formula("beta(s12,s23)", D4, trials=4, source=refuses)
    assert result.verdict == "undecided"
    assert not result.agrees


def test_one_undecided_point_withholds_agreement() -> None:
    calls = []

    def sometimes(spec: kn.DiskIntegral, kin: kn.Mandelstams, digits: int) -> Measured:
        calls.append(1)
        if len(calls) == 3:
            raise WorkLimitError(1e9, 1e6)
        return integral_value(spec, kin, digits)

    assert kn.examine_formula("beta(s12,s23)", D4, trials=8, source=sometimes).verdict == "undecided"


@pytest.mark.parametrize(
    ("a", "b", "error", "verdict"),
    [
        (1.0, 1.0, 1e-30, "agrees"),
        (1.0, 1.0, 1e-5, "undecided"),
        (1.0, 1.001, 1e-5, "disagrees"),
        (1.0, 1.00001, 1e-5, "undecided"),
        (1.0, float("nan"), 1e-30, "undecided"),
        (1.0, 1.0, float("nan"), "undecided"),
    ],
)
def test_compare(a: float, b: float, error: float, verdict: str) -> None:
    assert compare(Measured(a, error), Measured(b, error), 10, None)[0] == verdict


@pytest.mark.parametrize(
    ("where", "parameters", "field"),
    [
        ({"s12": "s12+1"}, {}, "where"),
        ({"s12": "s23^2"}, {}, "where s12 = s23^2"),
        ({}, {"s12": "1"}, "parameters"),
        ({}, {"a": "s12*s23"}, "parameter a"),
        ({"q": "1"}, {}, "where q = 1, position 1"),
    ],
)
def test_bad_locus(where: dict[str, str], parameters: dict[str, str], field: str) -> None:
    with pytest.raises(kn.InputError) as caught:
        kn.examine_formula("1", D4, where=where, parameters=parameters)
    assert caught.value.field == field


def run(*arguments: str) -> tuple[int, str]:
    result = CliRunner().invoke(main, ["formula", *arguments])
    return result.exit_code, result.output


def test_command_agrees() -> None:
    code, output = run(
        "--formula", "beta(a,s23)", "--parameters", "a=s12", "--integrand", "PT(1,2,3,4)", "--trials", "8"
    )
    assert code == 0
    assert "agrees" in output
    assert "evidence, not proof" in output


def test_command_disagrees_with_a_job_that_runs(tmp_path: Path) -> None:
    code, output = run(
        "--formula", "3*beta(s12,s23)", "--integrand", "PT(1,2,3,4)", "--trials", "8", "--format", "json"
    )
    assert code == 1
    document = json.loads(output)
    assert document["verdict"] == "disagrees"
    assert document["diagnosis"] == "the formula is the integral times 3 at every point"
    path = tmp_path / "failing.toml"
    path.write_text(document["counterexample"])
    again = CliRunner().invoke(main, ["disk", str(path)])
    assert again.exit_code == 0


def test_command_refuses_bad_text() -> None:
    code, output = run("--formula", "beta(s12,s23).real", "--integrand", "PT(1,2,3,4)")
    assert code == 2
    assert "position 14" in output
