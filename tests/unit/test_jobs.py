from __future__ import annotations

from decimal import Decimal
from fractions import Fraction
from pathlib import Path

import pytest

from kn_integrate import inputs
from kn_integrate.commands.disk import command as disk
from kn_integrate.errors import InputError
from kn_integrate.exact import Exact, read
from kn_integrate.jobs import (
    EXPONENTS,
    INTEGRAND,
    ORDERING,
    PAIRS,
    PLANAR,
    PLANAR_ORDERING,
    ROW_SUMS,
    Job,
    integrand_of,
    job_of_file,
    job_of_flags,
    joined,
    point_of,
    read_file,
)

FULL = """
version = 1
verb = "disk"

[kinematics]
n = 5
planar = { "1.2" = "3/10", "2.3" = 0.4, "3.4" = "1/2", "4.5" = "7/20", "1.5" = "0.45" }
row_sums = 0
ordering = [1, 2, 3, 4, 5]

[integrand]
f = "PT(1,2,3,4,5)"
ordering = "1,2,3,5,4"

[accuracy]
rtol = 1e-12
atol = "1e-20"
method = "quadrature"
max_points = 1000000
threads = 2
"""


def job_of(path: Path) -> Job:
    return job_of_file("JOB", read_file(str(path)), disk.fields)


@pytest.fixture
def write(tmp_path):
    def write_job(text: str) -> Path:
        path = tmp_path / "job.toml"
        path.write_text(text, encoding="utf-8")
        return path

    return write_job


def test_a_full_job_is_read_exactly(write):
    job = job_of(write(FULL))
    assert job.verb == "disk"
    assert job.get(PLANAR) == {
        (1, 2): Exact(Fraction(3, 10)),
        (2, 3): Exact(Fraction(2, 5)),  # a TOML number is the decimal that stands there, not a binary neighbour
        (3, 4): Exact(Fraction(1, 2)),
        (4, 5): Exact(Fraction(7, 20)),
        (1, 5): Exact(Fraction(9, 20)),
    }
    assert job.get(ROW_SUMS) == Exact(Fraction(0))
    assert job.get(PLANAR_ORDERING) == (1, 2, 3, 4, 5)
    assert job.get(ORDERING) == (1, 2, 3, 5, 4)
    assert job.table("accuracy") == {
        "rtol": 1e-12,
        "atol": 1e-20,
        "method": "quadrature",
        "max_points": 1000000,
        "threads": 2,
    }


def test_flags_and_file_make_the_same_job(write):
    from_file = job_of(write(FULL))
    flags = {
        "--n": "5",
        "--planar": "1.2=3/10,2.3=2/5,3.4=0.5,4.5=7/20,1.5=9/20",
        "--row-sums": "0",
        "--planar-ordering": "1,2,3,4,5",
        "--integrand": "PT(1,2,3,4,5)",
        "--ordering": "1,2,3,5,4",
        "--rtol": "1e-12",
        "--atol": "1e-20",
        "--method": "quadrature",
        "--max-points": "1e6",
        "--threads": "2",
    }
    by_option = {field.option: field for field in disk.fields}
    from_flags = job_of_flags("disk", {by_option[flag]: text for flag, text in flags.items()})
    assert from_flags.tables() == from_file.tables()
    assert set(from_flags.names.values()) == set(flags)


def test_every_field_of_a_verb_has_its_own_place_and_flag():
    assert len({field.place for field in disk.fields}) == len(disk.fields)
    assert len({field.option for field in disk.fields}) == len(disk.fields)


def test_flags_complete_a_file_but_never_override_it(write):
    first = job_of(write('version = 1\nverb = "disk"\n[kinematics]\nplanar = { "1.2" = 1, "2.3" = 2 }\n'))
    second = job_of_flags("disk", {INTEGRAND: "PT(1,2,3,4)"})
    assert joined(first, second).tables().keys() == {"kinematics", "integrand"}
    with pytest.raises(
        InputError, match=r"^--planar: found .*file.*; expected either --planar or JOB: kinematics.planar"
    ):
        joined(first, job_of_flags("disk", {PLANAR: "1.2=1"}))


HEAD = 'version = 1\nverb = "disk"\n'
BAD_FILES = {
    "": "JOB: version: found nothing; expected version = 1",
    "version = 2": "JOB: version: found 2; expected version = 1",
    "version = true": "JOB: version: found True; expected version = 1",
    'version = "1"': "JOB: version: found '1'; expected version = 1",
    "version = 1": "JOB: verb: found nothing; expected a verb",
    "version = 1\nverb = 3": "JOB: verb: found 3; expected a verb",
    "version = [1": "JOB: found invalid TOML",
    "version = 1\nversion = 1": "JOB: found invalid TOML",
    HEAD + "x = " + "[" * 5000: "JOB: found invalid TOML",
    HEAD + "x = " + "9" * 5000: "JOB: found invalid TOML",
    HEAD + "kinematcs = 1": "JOB: kinematcs: found an unknown name; .*did you mean kinematics",
    HEAD + "[kinematics]\nplaner = 1": "JOB: kinematics.planer: found an unknown name; .*did you mean planar",
    HEAD + "[accuracy]\nmaxpoints = 1": "JOB: accuracy.maxpoints: .*did you mean max_points",
    HEAD + "kinematics = 1": r"JOB: kinematics: found 1; expected a table \[kinematics\]",
    HEAD + "[[kinematics]]\nn = 4": r"JOB: kinematics: found .*an array\); expected a table",
    HEAD + "[kinematics]\nplanar = 3": "JOB: kinematics.planar: found 3; expected label=value",
    HEAD + "[kinematics]\nplanar = {}": "JOB: kinematics.planar: found .*a table.*; expected label=value",
    HEAD + "[kinematics]\nplanar = []": "JOB: kinematics.planar: found .*an array.*; expected label=value",
    HEAD + "[kinematics]\nplanar = { 1.2 = 3 }": 'JOB: kinematics.planar: found the unquoted key 1.2; .*"1.2" = ',
    HEAD + '[kinematics]\nplanar = { "1.2" = true }': "JOB: kinematics.planar 1.2: found True; expected a number",
    HEAD + '[kinematics]\nplanar = { "1.2" = [1] }': "JOB: kinematics.planar 1.2: found .*an array",
    HEAD + '[kinematics]\nplanar = { "1.2" = nan }': "JOB: kinematics.planar 1.2: found .*; expected a finite number",
    HEAD + '[kinematics]\nplanar = { "1.2" = -inf }': "JOB: kinematics.planar 1.2: found .*; expected a finite number",
    HEAD + '[kinematics]\nplanar = { "1.2" = 1e99999999999999999999 }': "JOB: kinematics.planar 1.2: found",
    HEAD + '[kinematics]\nplanar = { "1.2" = 1979-05-27 }': "JOB: kinematics.planar 1.2: found .*date",
    HEAD
    + '[kinematics]\nplanar = { "1-2" = 1 }': "JOB: kinematics.planar: found '1-2'; expected labels joined by dots",
    HEAD
    + '[kinematics]\nplanar = { "1.2" = 1, "1. 2" = 2 }': "JOB: kinematics.planar 1. 2: found 1 and 2; expected one",
    HEAD + "[kinematics]\nn = 4.5": "JOB: kinematics.n: found .*; expected a positive integer",
    HEAD + "[kinematics]\nn = true": "JOB: kinematics.n: found True; expected a positive integer",
    HEAD + "[kinematics]\nn = 0": "JOB: kinematics.n: found 0; expected a positive integer",
    HEAD + "[kinematics]\nordering = [1, 2.0, 3]": "JOB: kinematics.ordering: found .*; expected labels such as",
    HEAD + "[kinematics]\nordering = [true, 2]": "JOB: kinematics.ordering: found .*; expected labels such as",
    HEAD + "[kinematics]\nrow_sums = [0, false]": "JOB: kinematics.row_sums, entry 2: found False; expected a number",
    HEAD + "[kinematics]\nrow_sums = { a = 1 }": "JOB: kinematics.row_sums: found .*a table",
    HEAD + "[integrand]\nf = 1": "JOB: integrand.f: found 1; expected text",
    HEAD + '[integrand]\nf = " "': "JOB: integrand.f: found ' '; expected text",
    HEAD + "[accuracy]\nrtol = true": "JOB: accuracy.rtol: found True; expected a number",
    HEAD + '[accuracy]\nrtol = "1e-8j"': "JOB: accuracy.rtol: found '1e-8j'; expected a real number",
    HEAD + '[accuracy]\nrtol = "1e-999"': "JOB: accuracy.rtol: found '1e-999'; expected zero, or a size",
    HEAD + '[accuracy]\natol = "1e999"': "JOB: accuracy.atol: found '1e999'; expected zero, or a size",
    HEAD + '[accuracy]\nmethod = "magic"': "JOB: accuracy.method: found 'magic'; expected one of auto, quadrature, kz",
    HEAD + "[accuracy]\nthreads = -1": "JOB: accuracy.threads: found -1; expected a positive integer",
}


@pytest.mark.parametrize("text", BAD_FILES, ids=lambda text: BAD_FILES[text][:40])
def test_bad_files_are_named(write, monkeypatch, text):
    path = write(text)
    monkeypatch.chdir(path.parent)
    path.rename("JOB")
    with pytest.raises(InputError, match=f"^{BAD_FILES[text]}") as caught:
        job_of(Path("JOB"))
    assert caught.value.field.startswith("JOB")
    assert "\n" not in str(caught.value)


def test_files_that_cannot_be_read_are_named(tmp_path):
    with pytest.raises(InputError, match=r"absent.toml: found No such file or directory; expected a TOML job file"):
        read_file(str(tmp_path / "absent.toml"))
    with pytest.raises(InputError, match=r"found Is a directory"):
        read_file(str(tmp_path))
    (tmp_path / "latin.toml").write_bytes(b"version = 1 # \xe9")
    with pytest.raises(InputError, match=r"latin.toml: found not UTF-8 text"):
        read_file(str(tmp_path / "latin.toml"))
    with pytest.raises(InputError, match="expected a TOML job file"):
        read_file("a\0b")


@pytest.mark.parametrize("text", ["0.37", "3/10", "-13/10", "1e-6", "0.3+0.2j", "7"])
def test_quoted_and_bare_numbers_mean_the_same(text):
    by_text = inputs.number(text, "x")
    assert by_text == read(text, "x")[0]
    if "/" not in text and "j" not in text:
        assert inputs.number(Decimal(text), "x") == by_text


@pytest.mark.parametrize("text", ["", "1,", "1,,2", "a", "1.5", "-1", "0", "1 2", "²", "99999"])
def test_labels_are_positive_integers(text):
    with pytest.raises(InputError, match=r"^--ordering: found"):
        inputs.labels(text, "--ordering")


@pytest.mark.parametrize("text", ["", "1.2", "1.2=", "=3", "1.2=3,", "1.2==3", "1..2=3", "1.2=3/0", "1.2=1__0"])
def test_bad_assignments_name_their_flag(text):
    with pytest.raises(InputError, match=r"^--planar"):
        inputs.assignments(text, "--planar")


def test_one_value_given_twice_must_agree():
    assert inputs.assignments("1.2=1/2,1.2=0.5", "--pairs") == {(1, 2): Exact(Fraction(1, 2))}
    with pytest.raises(InputError, match=r"^--pairs 1.2: found 1/2 and 3/5; expected one value"):
        inputs.assignments("1.2=1/2,1.2=0.6", "--pairs")


def test_row_sums_are_one_number_or_a_list():
    assert inputs.values("-2", "x") == Exact(Fraction(-2))
    assert inputs.values("0,-2, 1/2", "x") == (Exact(Fraction(0)), Exact(Fraction(-2)), Exact(Fraction(1, 2)))
    assert inputs.values(["0", -2], "x") == (Exact(Fraction(0)), Exact(Fraction(-2)))


def flags(**given: str) -> Job:
    by_name = {"planar": PLANAR, "pairs": PAIRS, "exponents": EXPONENTS, "row_sums": ROW_SUMS, "f": INTEGRAND}
    by_name |= {"ordering": ORDERING, "planar_ordering": PLANAR_ORDERING}
    return job_of_flags("disk", {by_name[name]: text for name, text in given.items()})


@pytest.mark.parametrize(
    ("given", "message"),
    [
        ({}, "^kinematics: found nothing; expected one of --planar"),
        ({"planar": "1.2=1,2.3=1", "pairs": "1.2=1"}, "^--pairs: found it together with --planar"),
        ({"pairs": "1.2=1", "exponents": "1.2=1"}, "^--exponents: found it together with --pairs"),
        ({"exponents": "1.2=1", "row_sums": "0"}, "^--row-sums: found it together with --exponents"),
        ({"pairs": "1.2=1", "planar_ordering": "1,2,3,4"}, "^--planar-ordering: found it together with --pairs"),
    ],
)
def test_conflicting_ways_to_give_a_point(given, message):
    with pytest.raises(InputError, match=message):
        point_of(flags(**given))


def test_exponents_leave_no_room_for_an_integrand():
    assert integrand_of(flags(exponents="1.2=-1/2")) is None
    with pytest.raises(InputError, match=r"^--integrand: found it together with --exponents"):
        integrand_of(flags(exponents="1.2=-1/2", f="PT(1,2,3,4)"))
    with pytest.raises(InputError, match=r"^--integrand: found nothing; expected an integrand"):
        integrand_of(flags(planar="1.2=1,2.3=1"))


@pytest.mark.parametrize(
    ("given", "n"),
    [
        ({"planar": "1.2=3/10,2.3=2/5", "f": "PT(1,2,3,4)"}, 4),  # no label 4 in the channels
        ({"planar": "1.2=3/10,2.3=2/5,3.4=1/2,4.5=7/20,5.1=9/20"}, 5),
        ({"pairs": "1.2=3/10,2.3=2/5", "ordering": "1,3,2,4"}, 4),
        ({"pairs": "1.2=3/10,2.3=2/5", "row_sums": "0,0,0,0"}, 4),
    ],
)
def test_number_of_points_is_the_largest_that_any_input_speaks_of(given, n):
    assert point_of(flags(**given)).n == n
