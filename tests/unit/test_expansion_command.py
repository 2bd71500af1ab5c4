from __future__ import annotations

import json
import runpy
from pathlib import Path

import pytest
from click.testing import CliRunner

from kn_integrate.cli import main

POINT = ["expand", "--planar", "1.2=2,2.3=3,3.4=5,4.5=7,1.5=11"]


def run(*args):
    result = CliRunner().invoke(main, list(args))
    assert result.exception is None or isinstance(result.exception, SystemExit), result.exc_info
    return result.exit_code, result.stdout, result.stderr


def test_command_prints_a_table_json_and_latex():
    code, out, err = run(*POINT, "--integrand", "PT(1,2,3,4,5)", "--weight", "3")
    assert (code, err) == (0, "")
    assert "alpha'^1   200.97142530539421 +- 5e-14  = 64368/385*zeta(3)" in out.splitlines()
    code, out, _ = run(*POINT, "--integrand", "PT(1,2,3,4,5)", "--weight", "3", "--format", "json")
    document = json.loads(out)
    assert code == 0
    assert document["verb"] == "expand"
    assert document["coefficients"][3]["exact"] == "64368/385*zeta(3)"
    assert r"\zeta_{3}" in document["latex"]
    code, out, _ = run(*POINT, "--row", "2,3", "--weight", "2", "--form", "latex")
    assert out.splitlines()[0].endswith(
        r"\left(-47 \zeta_{2}\right) {\alpha'}^{2} + \mathcal{O}\left({\alpha'}^{3}\right)"
    )


def test_command_on_the_sphere_and_with_numbers():
    code, out, _ = run(*POINT, "--integrand", "PT(1,2,3,4,5)", "--right", "PT(1,3,2,4,5)", "--weight", "3")
    assert code == 0
    assert "-15872/77*zeta(3)" in out
    code, out, _ = run(
        *POINT, "--row", "3,2", "--column", "2,3", "--method", "recursion", "--digits", "40", "--weight", "3"
    )
    assert code == 0
    assert "-260*zeta(3)" in out
    assert "recognised from" in out


@pytest.mark.parametrize(
    ("args", "code", "text"),
    [
        (["--integrand", "PT(1,2,3)"], 2, "puncture 4"),
        (["--integrand", "PT(1,2,3,4,5)", "--weight", "-1"], 2, "weight"),
        (["--integrand", "PT(1,2,3,4,5)", "--weight", "0"], 0, ""),
        (["--integrand", "PT(1,2,3,4,5)", "--weight", "20"], 2, "weight"),
        (["--integrand", "PT(1,2,3,4,5)", "--row", "2,3"], 2, "only one of them"),
        (["--row", "2,4"], 2, "permutation"),
        ([], 2, "integrand"),
    ],
)
def test_command_complains_in_words(args, code, text):
    found, _, err = run(*POINT, *args)
    assert found == code
    assert text in err


def test_command_names_a_pole():
    code, out, _ = run("expand", "--planar", "1.2=0,2.3=1", "--integrand", "PT(1,2,3,4)")
    assert code == 1
    assert "ON_POLE" in out


def test_example_of_effective_couplings_runs(capsys):
    path = Path(__file__).resolve().parents[2] / "examples" / "effective_couplings.py"
    runpy.run_path(str(path), run_name="__main__")
    out = capsys.readouterr().out
    assert "F^4                      zeta(2)    x  -s12*s14" in out
    assert "-2*s12*s14 - 2*s14^2" in out
    assert "string scale 1/sqrt(alpha') above 773 GeV" in out
