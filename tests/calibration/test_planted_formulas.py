"""A sample of the planted formulas; all of them by ``python tests/calibration/planted_formulas.py``."""

from __future__ import annotations

import pytest
from planted_formulas import Planted, right, wrong

RIGHT, WRONG = right(), wrong()


def _sample(planted: list[Planted], step: int) -> list[Planted]:
    return [p for p in planted[::step] if p.spec.n < 6]


def test_there_are_enough() -> None:
    assert len(RIGHT) >= 30
    assert len(WRONG) >= 40
    assert len({kind for p in WRONG for kind in p.kinds}) >= 8


@pytest.mark.parametrize("planted", _sample(RIGHT, 5), ids=lambda p: p.formula[:40])
def test_right_formulas_are_accepted(planted: Planted) -> None:
    result = planted.examine(trials=16)
    assert result.agrees, str(result)


@pytest.mark.parametrize("planted", _sample(WRONG, 9), ids=lambda p: p.formula[:40])
def test_wrong_formulas_are_rejected_by_name(planted: Planted) -> None:
    result = planted.examine(trials=16)
    assert result.verdict == "disagrees"
    assert result.kind in planted.kinds, str(result)
    assert result.counterexample is not None
