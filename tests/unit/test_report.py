from __future__ import annotations

import enum
import json
import re
from fractions import Fraction

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kn_integrate.errors import PoleError, Status, WorkLimitError
from kn_integrate.estimate import Estimate
from kn_integrate.exact import Exact, read
from kn_integrate.report.faces import latex_number, latex_table
from kn_integrate.report.outcome import (
    json_text,
    outcome_of_estimate,
    outcome_of_facts,
    outcome_of_pole,
    outcome_of_work_limit,
    table,
)
from kn_integrate.report.plain import plain, plain_number
from kn_integrate.report.sources import SOURCES, bibtex_of, sources_of
from kn_integrate.report.text import error_text, number_text, value_with_error
from kn_integrate.report.versions import versions

INF, NAN = float("inf"), float("nan")


COVERED = 1 + Fraction(1, 1000)  # a cut below a thousandth of the error is not worth another unit of its digit


def mp(text: str, digits: int = 50) -> mpmath.mpf:
    with mpmath.workdps(digits):
        return mpmath.mpf(text)


REPRESENTATIONS = [
    # value, error, digits
    (25.914922073927123, 3.2e-12, None),
    (1.5, 0.0, None),
    (-0.25, 1e-3, None),
    (9.9999, 9.6e-5, None),  # the error's digit carries into the next place
    (9.999991, 9.0e-5, None),  # ... and so does the value's
    (0.99999, 0.02, None),
    (12345.6, 300.0, None),
    (123456.0, 1.0, None),
    (1e30 / 3, 4e17, None),
    (1e-30 / 3, 4e-40, None),
    (3.1e-9, 2e-8, None),  # nothing is known but the size
    (0.0, 1e-20, None),
    (0.0, 0.0, None),
    (5e-324, 5e-324, None),
    (1.7976931348623157e308, 1e300, None),
    (1.25 - 0.5j, 1e-3, None),
    (1 - 1e-15j, 1e-12, None),
    (complex(0.0, 2.0), 0.0, None),
    (np.float64(2.5), np.float64(1e-2), None),
    (np.complex128(2.5 + 1j), 1e-2, None),
    (mp("3.14159265358979323846264338327950288419716939937510"), 1e-48, 48),
    (mp("0.1"), 0.0, 50),
    (mpmath.mpc(mp("0.5"), mp("-0.125")), 1e-30, 40),
    (NAN, 1e-3, None),
    (1.0, NAN, None),
    (1.0, INF, None),
    (INF, INF, None),
    (complex(NAN, 1.0), 1e-3, None),
    (mpmath.mpf("nan"), 1e-3, 50),
]


def test_values_with_errors_look_as_they_always_did(golden):
    lines = [f"{number_text(v, d)} | {e!r} | {value_with_error(v, e, d)}\n" for v, e, d in REPRESENTATIONS]
    golden("values_with_errors.txt", "".join(lines))


@settings(deadline=None)
@given(
    st.floats(allow_nan=False, allow_infinity=False),
    st.floats(min_value=0.0, exclude_min=True, allow_infinity=False),
)
def test_printed_interval_contains_the_unprinted_one(value, error):
    shown, bound = (Fraction(part) for part in value_with_error(value, error).split(" +- "))
    exact_error = Fraction(repr(error))
    assert exact_error <= bound
    assert abs(shown - Fraction(value)) + exact_error <= bound * COVERED
    assert bound <= 3 * exact_error  # one digit up (at most double), and half a unit for the cut


@settings(deadline=None)
@given(st.complex_numbers(max_magnitude=1e100), st.floats(min_value=1e-100, max_value=1e100))
def test_printed_disc_contains_the_unprinted_one(value, error):
    left, bound = value_with_error(value, error).split(" +- ")
    text = left.strip("()").replace(" ", "")
    shown = read(text, "shown")[0]
    real, imag = shown.re - Fraction(value.real), shown.im - Fraction(value.imag)
    assert Fraction(repr(error)) <= Fraction(bound)
    slack = Fraction(bound) * COVERED - Fraction(repr(error))
    assert real**2 + imag**2 <= slack**2


@settings(deadline=None)
@given(
    st.one_of(
        st.floats(allow_nan=False, allow_infinity=False), st.complex_numbers(allow_nan=False, allow_infinity=False)
    )
)
def test_all_digits_of_a_double_read_back_to_the_same_double(value):
    assert read(number_text(value), "value")[0].value() == value


@pytest.mark.parametrize("digits", [20, 50, 120])
def test_all_digits_of_a_multiple_precision_number_read_back(digits):
    with mpmath.workdps(digits + 7):
        value = mpmath.pi**3 / 7
        text = number_text(value, digits)
        assert mpmath.mpf(text) == value
        assert number_text(mpmath.mpc(value, -value), digits) == f"{text}-{text}j"


def test_multiple_precision_text_does_not_depend_on_the_callers_precision():
    value = mp("0.1", 60)
    with mpmath.workdps(5):
        low = number_text(value, 60)
    assert low == number_text(value, 60)
    assert 0 < abs(Fraction(low) - Fraction(1, 10)) < Fraction(1, 10**60)


def test_error_text_rounds_up():
    assert [error_text(e) for e in (1e-12, 1.0000001e-12, 9.1e-5, 0.0, INF, NAN)] == [
        "1e-12",
        "2e-12",
        "1e-4",
        "0",
        "inf",
        "nan",
    ]


def test_exact_numbers_stay_exact():
    assert number_text(Exact(Fraction(1, 3))) == "1/3"
    assert number_text(Exact(Fraction(1, 3), Fraction(-1, 2))) == "1/3-1/2j"
    assert plain_number(Exact(Fraction(1, 3), Fraction(-1, 2))) == ["1/3", "-1/2"]
    assert value_with_error(Fraction(1, 3), 1e-3) == "0.333 +- 2e-3"


class Colour(enum.Enum):
    RED = "a sentence"


def test_plain_data():
    data = plain(
        {
            (1, 2, 3): Fraction(1, 2),
            "array": np.array([[1.0, NAN], [2.0, 0.5]]),
            "integers": np.array([1, 2]),
            "scalar": np.float64(0.1),
            "int": np.int64(3),
            "flag": np.bool_(True),
            "complex": 1j,
            "mp": mp("0.5"),
            "enum": Colour.RED,
            Colour.RED: {3, 1, 2},
            "infinite": -INF,
            "other": PoleError,
            "none": None,
        }
    )
    assert data == {
        "1.2.3": "1/2",
        "array": [["1.0", None], ["2.0", "0.5"]],
        "integers": [1, 2],
        "scalar": "0.1",
        "int": 3,
        "flag": True,
        "complex": ["0.0", "1.0"],
        "mp": "0.5",
        "enum": "RED",
        "RED": [1, 2, 3],
        "infinite": None,
        "other": str(PoleError),
        "none": None,
    }
    json.dumps(data, allow_nan=False)


def estimate(**changes) -> Estimate:
    base = {
        "value": 25.914922073927123,
        "error": 3.2e-12,
        "status": Status.OK,
        "method": "quadrature",
        "evaluations": 273,
    }
    return Estimate(**{**base, **changes})


ESTIMATES = {
    "ok": estimate(details={"nodes": (9, 9), "smallest": Fraction(1, 3), "note": NAN}),
    "complex": estimate(value=1.25 - 0.5j),
    "inaccurate": estimate(error=1e-3, status=Status.INACCURATE),
    "round_off": estimate(error=1e-8, status=Status.ROUND_OFF),
    "zero": estimate(value=1e-17, error=1e-15, status=Status.ZERO),
    "not_finite": estimate(value=NAN, error=INF, status=Status.NOT_FINITE),
    "digits": estimate(value=mp("0.1", 40), error=1e-38, digits=38, method="kz", rtol=1e-38),
}


def test_estimates_look_as_they_always_did(golden):
    shown = []
    for name, result in ESTIMATES.items():
        outcome = outcome_of_estimate(result)
        shown += [f"# {name}: {result}", table(outcome.rows), json_text(result.to_dict()), ""]
    golden("estimates.txt", "\n".join(shown))


def test_failures_look_as_they_always_did(golden):
    shown = []
    for outcome in (
        outcome_of_pole(PoleError((1, 2), 0, Exact(Fraction(0)))),
        outcome_of_pole(PoleError((2, 3, 4), 2, -2.0 + 0j)),
        outcome_of_work_limit(WorkLimitError(3.5e9, 1e6, hint="use method='kz'")),
        outcome_of_work_limit(WorkLimitError(3.5e9, 1e6, unit="bytes")),
    ):
        assert not outcome.ok
        shown += [table(outcome.rows), json_text(outcome.document), ""]
    golden("failures.txt", "\n".join(shown))


@pytest.mark.parametrize("name", ESTIMATES)
def test_dictionary_has_text_for_numbers_and_never_nan(name):
    result = ESTIMATES[name]
    data = json.loads(json_text(result.to_dict()))
    keys = ["value", "error", "ok", "status", "advice", "method", "evaluations", "rtol", "atol", "digits", "details"]
    assert list(data) == keys
    assert data["ok"] is (data["status"] == "OK")
    assert data["advice"] == result.status.advice
    if name == "complex":
        assert [float(part) for part in data["value"]] == [1.25, -0.5]
    elif name == "not_finite":
        assert data["value"] is None
        assert data["error"] is None
    else:
        assert float(data["value"]) == float(result.value)
        assert float(data["error"]) == result.error


def test_facts_become_rows():
    outcome = outcome_of_facts({"a": {"b": 1, "c": [1, 2]}, "d": [{"e": True}, {"e": None}], "f": []})
    assert outcome.rows == (("a.b", "1"), ("a.c", "1,2"), ("d.1.e", "yes"), ("d.2.e", "-"), ("f", "-"))


def test_sources_are_given_once_and_in_order():
    joint = sources_of("quadrature+kz", {"techniques": ["gauss-jacobi", "common practice", "gauss-jacobi"]})
    used = dict.fromkeys([*SOURCES["quadrature"], *SOURCES["kz"], *SOURCES["gauss-jacobi"]])
    assert joint == tuple(source.text for source in used)
    assert estimate().sources() == tuple(source.text for source in SOURCES["quadrature"])
    assert sources_of("unheard of", {}) == ()


def test_versions_are_those_of_the_imported_libraries():
    found = versions()
    assert found["numpy"] == np.__version__
    assert found["mpmath"] == mpmath.__version__
    assert set(found) == {"kn_integrate", "python", "numpy", "scipy", "numba", "mpmath", "python-flint"}


def test_bibtex_has_one_entry_for_each_publication():
    text = bibtex_of("quadrature+kz", {"techniques": ["u-equations"]})
    keys = re.findall(r"@article\{(\w+),", text)
    assert len(keys) == len(set(keys))
    assert keys[0] == "KobaNielsen1969"
    assert "used for: the integrals; the relations among dihedral coordinates" in text
    assert "author = {Koba, Z. and Nielsen, H. B.}" in text
    assert "eprint = {math/0606419}" in text
    for entry in text.split("\n\n"):
        assert entry.count("{") == entry.count("}")
    assert estimate().bibtex() == bibtex_of("quadrature", {})


def test_every_source_is_whole():
    keys: dict[str, tuple[str, ...]] = {}
    for source in (source for each in SOURCES.values() for source in each):
        assert all((source.key, source.authors, source.title, source.journal, source.volume, source.year, source.pages))
        assert source.year in source.key
        assert keys.setdefault(source.key, (source.title, source.pages)) == (source.title, source.pages)


@pytest.mark.parametrize(
    ("text", "latex"),
    [
        ("25.914922073927 +- 4e-12", r"25.914922073927 \pm 4 \times 10^{-12}"),
        ("1.25e+20 +- 1e+07", r"1.25 \times 10^{20} \pm 10^{7}"),
        ("(1.250 - 0.500j) +- 1e-3", r"(1.250 - 0.500\mathrm{i}) \pm 10^{-3}"),
        ("1.5 +- inf", r"1.5 \pm \infty"),
        ("nan +- nan", r"\mathrm{nan} \pm \mathrm{nan}"),
    ],
)
def test_latex_numbers(text, latex):
    assert latex_number(text) == latex


def test_faces_of_a_result(golden):
    faces = []
    for each in (
        estimate(),
        estimate(value=1.25 - 0.5j, error=1e-3, status=Status.INACCURATE),
        estimate(value=float("nan"), error=float("inf"), status=Status.NOT_FINITE),
    ):
        faces += [each._repr_html_(), each._repr_latex_()]
    golden("faces.txt", "\n".join(faces) + "\n")


def test_latex_tables():
    text = latex_table({"a": estimate(), "b": estimate(status=Status.ZERO)}, caption="Values.", label="tab:values")
    assert text.startswith("\\begin{table}\n\\centering\n\\begin{tabular}{ll}")
    assert text.count(r"\\") == 3
    assert r"\textsf{(ZERO)}" in text
    assert "\\caption{Values.}\n\\label{tab:values}\n\\end{table}" in text
