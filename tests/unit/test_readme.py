"""Every snippet and command of the README runs, and the worked example prints what it says."""

from __future__ import annotations

import re
import shlex
import subprocess
import sys
from pathlib import Path

import pytest

README = Path(__file__).resolve().parent.parent.parent / "README.md"
TEXT = README.read_text(encoding="utf-8")
BLOCKS = re.findall(r"```(\w*)\n(.*?)```", TEXT, re.S)
COMMANDS = [
    line.split("&&")[-1].strip()
    for kind, block in BLOCKS
    if not kind
    for line in block.splitlines()
    if "kn-integrate " in line and not line.startswith("#")
]


def run(command: str):
    words = shlex.split(command)
    assert words[0] == "kn-integrate"
    return subprocess.run(
        [sys.executable, "-m", "kn_integrate.cli", *words[1:]], capture_output=True, text=True, check=False
    )


def test_python_snippets_run_in_order(capsys):
    namespace: dict = {}
    snippets = [block for kind, block in BLOCKS if kind == "python"]
    assert len(snippets) >= 4
    for snippet in snippets:
        exec(compile(snippet, "README.md", "exec"), namespace)
    printed = capsys.readouterr().out
    promised = next(line.partition("# ")[2] for line in snippets[0].splitlines() if line.startswith("print(Z)"))
    assert printed.startswith(promised + "\n")
    assert "(1, 2) 1 -1" in printed


@pytest.mark.parametrize("command", [c for c in COMMANDS if " scan " not in c])
def test_commands_run(command):
    result = run(command)
    assert result.returncode == 0, result.stderr


def test_the_worked_example_prints_what_the_readme_says():
    shown = next(block for kind, block in BLOCKS if not kind and block.startswith("value"))
    result = run(COMMANDS[0])
    lines = [line for line in result.stdout.splitlines() if not line.startswith("seconds")]
    found, wanted = (dict(line.split(None, 1) for line in text) for text in (lines, shown.splitlines()))
    assert found.keys() == wanted.keys()
    assert abs(float(found["value"]) - float(wanted["value"])) < 1e-13  # the last bits depend on the processor
    assert found["method"] == wanted["method"]
    assert found["evaluations"] == wanted["evaluations"]


def test_the_job_file_is_a_job(tmp_path):
    job = tmp_path / "job.toml"
    job.write_text(next(block for kind, block in BLOCKS if kind == "toml"), encoding="utf-8")
    result = run(f"kn-integrate disk {job}")
    assert result.returncode == 0, result.stderr
    assert "25.9149220739" in result.stdout


def test_the_first_command_ends_as_printed():
    text = TEXT
    command = next(line.partition("&& ")[2] for line in text.splitlines() if line.startswith("pip install . && "))
    promised = text.partition("The first command ends with\n\n```\n")[2].partition("```")[0]
    assert promised in run(command).stdout
