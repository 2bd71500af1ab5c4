from __future__ import annotations

import os
from collections.abc import Callable
from pathlib import Path

import pytest

GOLDEN = Path(__file__).resolve().parent.parent / "golden"


@pytest.fixture
def golden() -> Callable[[str, str], None]:
    """Compare a text with tests/golden/NAME; KN_UPDATE_GOLDEN=1 writes the file instead, to be read before commit."""

    def compare(name: str, text: str) -> None:
        path = GOLDEN / name
        if os.environ.get("KN_UPDATE_GOLDEN"):
            path.write_text(text, encoding="utf-8")
        assert path.exists(), f"no golden file {name}; write it with KN_UPDATE_GOLDEN=1"
        assert text == path.read_text(encoding="utf-8")

    return compare
