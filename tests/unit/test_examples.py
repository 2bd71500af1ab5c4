"""What the examples print is what is recorded beside them."""

from __future__ import annotations

import importlib.util
import sys
from pathlib import Path

import pytest

EXAMPLES = Path(__file__).resolve().parents[2] / "examples"


def run(name: str, monkeypatch, *arguments: str) -> None:
    spec = importlib.util.spec_from_file_location(name, EXAMPLES / f"{name}.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    monkeypatch.setitem(sys.modules, name, module)
    monkeypatch.setattr(sys, "argv", [name, *arguments])
    spec.loader.exec_module(module)
    module.main()


def test_the_campaign_prints_what_is_recorded(tmp_path, monkeypatch, capsys):
    pytest.importorskip("matplotlib")
    run("resonance_campaign", monkeypatch, "--full", "--out", str(tmp_path))
    assert capsys.readouterr().out == (EXAMPLES / "recorded" / "resonance_campaign.txt").read_text()
    for name in ("amplitude.png", "poles.png", "errors.png", "report.tex", "methods.bib"):
        assert (tmp_path / name).stat().st_size > 200
    assert (tmp_path / "report.tex").read_text().count(r"\begin{") == (tmp_path / "report.tex").read_text().count(
        r"\end{"
    )


@pytest.mark.slow
def test_the_cluster_prints_what_is_recorded(monkeypatch, capsys):
    pytest.importorskip("distributed")
    run("cluster_scan", monkeypatch)
    assert capsys.readouterr().out == (EXAMPLES / "recorded" / "cluster_scan.txt").read_text()


def test_the_trusted_value_prints_what_is_recorded(monkeypatch, capsys):
    run("trust_a_value", monkeypatch)
    assert capsys.readouterr().out == (EXAMPLES / "recorded" / "trust_a_value.txt").read_text()
