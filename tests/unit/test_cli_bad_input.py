"""Everything that can be wrong on the command line: one line that names the input, exit code 2, nothing on stdout."""

from __future__ import annotations

import json
import re

import pytest
from click.testing import CliRunner

from kn_integrate.cli import main
from kn_integrate.commands import verb_names

FOUR = ["--planar", "1.2=3/10,2.3=2/5"]
FIVE = ["--planar", "1.2=3/10,2.3=2/5,3.4=1/2,4.5=7/20,5.1=9/20"]
PT4 = ["--integrand", "PT(1,2,3,4)"]
PT5 = ["--integrand", "PT(1,2,3,4,5)"]


def complaint(*args: str) -> str:
    result = CliRunner().invoke(main, list(args))
    assert isinstance(result.exception, SystemExit), result.exc_info
    assert result.exit_code == 2, (result.exit_code, result.output)
    assert result.stdout == ""
    assert result.stderr.count("\n") == 1
    assert re.fullmatch(r"\S.*: found .+; expected .+\n", result.stderr), result.stderr
    return result.stderr


OF_THE_PARSER = {
    "no verb": [],
    "unknown verb": ["dsik"],
    "unknown flag": ["disk", "--plannar", "1.2=1"],
    "unknown global flag": ["--verbose"],
    "flag without a value": ["disk", "--planar"],
    "flag given twice": ["disk", *FOUR, *FOUR, *PT4],
    "two job files": ["disk", "a.toml", "b.toml"],
    "absent job file": ["disk", "absent.toml"],
    "unknown format": ["disk", *FOUR, *PT4, "--format", "yaml"],
    "unknown method": ["disk", *FOUR, *PT4, "--method", "magic"],
    "no kinematics": ["disk", *PT4],
    "no integrand": ["disk", *FOUR],
    "planar with pairs": ["disk", *FOUR, "--pairs", "1.2=1", *PT4],
    "exponents with integrand": ["disk", "--exponents", "1.2=-1/2,1.3=-1/2,2.3=-1", "--n", "4", *PT4],
    "exponents with row sums": ["disk", "--exponents", "1.2=-1/2", "--n", "4", "--row-sums", "0"],
    "not a number": ["disk", "--planar", "1.2=x,2.3=1", *PT4],
    "malformed rational": ["disk", "--planar", "1.2=3//10,2.3=1", *PT4],
    "zero denominator": ["disk", "--planar", "1.2=3/0,2.3=1", *PT4],
    "infinite": ["disk", "--planar", "1.2=inf,2.3=1", *PT4],
    "not a number at all": ["disk", "--planar", "1.2=nan,2.3=1", *PT4],
    "true": ["disk", "--planar", "1.2=True,2.3=1", *PT4],
    "contradiction": ["disk", "--planar", "1.2=1,1.2=2,2.3=1", *PT4],
    "empty assignment": ["disk", "--planar", "1.2=1,,2.3=1", *PT4],
    "bad label": ["disk", "--planar", "1.b=1,2.3=1", *PT4],
    "label zero": ["disk", "--planar", "0.1=1,2.3=1", *PT4],
    "bad ordering": ["disk", *FOUR, *PT4, "--ordering", "1;2;3;4"],
    "n is no integer": ["disk", *FOUR, *PT4, "--n", "4.5"],
    "n is negative": ["disk", *FOUR, *PT4, "--n", "-4"],
    "rtol is no number": ["disk", *FOUR, *PT4, "--rtol", "small"],
    "rtol is complex": ["disk", *FOUR, *PT4, "--rtol", "1j"],
    "digits is no integer": ["disk", *FOUR, *PT4, "--digits", "x"],
    "threads is zero": ["disk", *FOUR, *PT4, "--threads", "0"],
    "max_points is negative": ["disk", *FOUR, *PT4, "--max-points", "-1"],
}

OF_THE_MATHEMATICS = {
    "n below 4": (["disk", "--n", "3", "--pairs", "1.2=0", "--integrand", "PT(1,2,3)"], "--pairs"),
    "missing channel": (["disk", "--planar", "1.2=1,2.3=1,3.4=1,4.5=1", *PT5], "--planar"),
    "surplus channel": (["disk", *FOUR, "--n", "5", *PT5], "--planar"),
    "channel with a repeated label": (["disk", "--planar", "1.1=1,2.3=1", *PT4], "--planar"),
    "channel with a label beyond n": (["disk", "--planar", "1.2=1,2.7=1", "--n", "4", *PT4], "--planar"),
    "contradicting complements": (["disk", "--planar", "1.2=1,3.4=2,2.3=1", *PT4], "--planar"),
    "ambiguous channel": (["disk", "--planar", "1.2=1,1.3=1", *PT4], "--planar"),
    "planar ordering is no permutation": (["disk", *FOUR, "--planar-ordering", "1,2,2,4", *PT4], "--planar"),
    "row sums of the wrong length": (["disk", *FIVE, "--row-sums", "0,0", *PT5], "--planar"),
    "pairs that break conservation": (
        ["disk", "--pairs", "1.2=1,1.3=1,1.4=1,2.3=1,2.4=1,3.4=1", *PT4],
        "--pairs",
    ),
    "too few pairs": (["disk", "--pairs", "1.2=1", "--n", "5", *PT5], "--pairs"),
    "chord that is an edge": (["disk", "--chords", "1.2=1,2.4=1", "--n", "4", *PT4], "--chords"),
    "exponents that miss their rows": (
        ["disk", "--exponents", "1.2=1,1.3=1,1.4=1,2.3=1,2.4=1,3.4=1"],
        "--exponents",
    ),
    "integrand that is no formula": (["disk", *FOUR, "--integrand", "PT(1,2,3"], "--integrand"),
    "integrand with an unknown name": (["disk", *FOUR, "--integrand", "QT(1,2,3,4)"], "--integrand"),
    "integrand with code in it": (["disk", *FOUR, "--integrand", "__import__('os')"], "--integrand"),
    "integrand with a repeated label": (["disk", *FOUR, "--integrand", "PT(1,2,2,4)"], "--integrand"),
}


@pytest.mark.parametrize("name", OF_THE_PARSER)
def test_the_parser_complains(name):
    complaint(*OF_THE_PARSER[name])


def test_complaints_of_the_parser_look_as_they_always_did(golden):
    complaints = "".join(f"{name}: {complaint(*args)}" for name, args in OF_THE_PARSER.items())
    golden("bad_input.txt", complaints.replace(", ".join(verb_names()), "VERBS"))  # new verbs change nothing else


@pytest.mark.parametrize("name", OF_THE_MATHEMATICS)
def test_kinematics_and_integrand_complain_under_the_name_of_the_flag(name):
    args, flag = OF_THE_MATHEMATICS[name]
    assert complaint(*args).startswith(flag)


# These are found where the integral is put together.
OF_THE_INTEGRAL = {
    "ordering is no permutation": ["disk", *FOUR, *PT4, "--ordering", "1,2,2,4"],
    "ordering of another length": ["disk", *FOUR, *PT4, "--ordering", "1,2,3"],
    "row sums against the integrand": ["disk", *FOUR, "--row-sums", "-2", *PT4],
    "integrand of fewer points": ["disk", *FIVE, *PT4],
    "integrand of more points": ["disk", *FOUR, "--n", "4", *PT5],
    "rtol is zero": ["disk", *FOUR, *PT4, "--rtol", "0"],
    "rtol is negative": ["disk", *FOUR, *PT4, "--rtol", "-1e-8"],
    "atol is negative": ["disk", *FOUR, *PT4, "--atol", "-1e-8"],
}


@pytest.mark.parametrize("name", OF_THE_INTEGRAL)
def test_the_integral_complains(name):
    complaint(*OF_THE_INTEGRAL[name])


def test_rows_that_break_moebius_covariance_name_the_puncture_the_sum_and_the_need():
    text = complaint("disk", *FOUR, "--row-sums", "0,0,0,-1", *PT4)
    assert "4" in text
    assert "-2" in text


@pytest.mark.parametrize("format", ["table", "json"])
def test_bad_input_leaves_stdout_empty_in_every_format(format):
    complaint("disk", "--planar", "1.2=x", *PT4, "--format", format)


def test_a_job_file_for_another_verb(tmp_path):
    (tmp_path / "job.toml").write_text('version = 1\nverb = "info"\n')
    assert 'verb = "disk" for this command' in complaint("disk", str(tmp_path / "job.toml"))


def test_a_flag_and_the_job_file_may_not_give_the_same_value(tmp_path):
    (tmp_path / "job.toml").write_text('version = 1\nverb = "disk"\n[accuracy]\nrtol = 1e-8\n')
    text = complaint("disk", str(tmp_path / "job.toml"), *FOUR, *PT4, "--rtol", "1e-8")
    assert text.startswith("--rtol: found")
    assert "accuracy.rtol" in text


def test_json_of_a_good_run_is_one_document():
    result = CliRunner().invoke(main, ["disk", *FOUR, *PT4, "--format", "json"])
    assert result.exit_code == 0
    assert json.loads(result.stdout)["ok"] is True
