"""Many points, one integral: computed anywhere, kept in one file, gone on with after any interruption."""

from __future__ import annotations

from .points import ScanPoint, ScanPoints, spaced
from .result import Scan, ScanRow, open_scan
from .run import scan
from .store import StoreError

__all__ = ["Scan", "ScanPoint", "ScanPoints", "ScanRow", "StoreError", "open_scan", "scan", "spaced"]
