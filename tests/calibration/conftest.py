"""Campaign scripts and the random cases of the published checks are importable by their plain names."""

from __future__ import annotations

import sys
from pathlib import Path

HERE = Path(__file__).parent
for folder in (HERE, HERE.parent / "published"):
    if str(folder) not in sys.path:
        sys.path.insert(0, str(folder))
