"""``kn-integrate info JOB`` tells what a job of any verb takes."""

from __future__ import annotations

import json
import subprocess
import sys

import pytest

CHECK = """
version = 1
verb = "VERB"
[kinematics]
planar = { "1.2" = "3/10", "2.3" = "2/5", "3.4" = "1/2", "4.5" = "7/20", "1.5" = "9/20" }
[integrand]
f = "PT(1,2,3,4,5)"
"""
FORMULA = """
version = 1
verb = "formula"
[integrand]
f = "PT(1,2,3,4,5)"
[formula]
text = "beta(s12,s23)"
trials = 12
"""
AMPLITUDE = """
version = 1
verb = "amplitude"
[amplitude]
states = "tachyon 0,1,0; tachyon 0,0,1; tachyon 0,-1,0; tachyon 0,0,-1"
"""


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        (CHECK.replace("VERB", "check"), {"n": "5", "quadrature points": "368"}),
        (CHECK.replace("VERB", "expand"), {"weight": "8", "basis integrals": "2", "memory": "170 MB"}),
        (FORMULA, {"n": "5", "points": "12", "digits": "20"}),
        (AMPLITUDE, {"legs": "4", "orderings": "6", "theory": "bosonic"}),
    ],
    ids=["check", "expand", "formula", "amplitude"],
)
def test_info_explains_what_a_job_takes(text, expected, tmp_path):
    path = tmp_path / "job.toml"
    path.write_text(text, encoding="utf-8")
    done = subprocess.run(
        [sys.executable, "-m", "kn_integrate.cli", "info", str(path), "--format", "json"],
        capture_output=True,
        text=True,
        check=True,
    )
    found = json.loads(done.stdout)
    assert {name: str(found[name]) for name in expected} == expected
