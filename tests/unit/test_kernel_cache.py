"""Compiled kernels find a place to stay wherever the package is installed."""

from __future__ import annotations

import os
import stat
import subprocess
import sys
from pathlib import Path

import numba
import pytest

from kn_integrate.kernels import cache

SCRIPT = """
import kn_integrate as kn
kin = kn.Mandelstams.from_planar(4, {(1, 2): "1/2", (2, 3): "1/2"})
assert abs(kn.disk_integral(kin, "PT(1,2,3,4)").value - 3.141592653589793) < 1e-9
"""


@pytest.fixture
def nowhere(monkeypatch, tmp_path):
    """Neither the package nor the home folder can be written to."""
    monkeypatch.setenv("NUMBA_CACHE_DIR", "")  # empty is none; and put back afterwards
    monkeypatch.setattr(numba.config, "CACHE_DIR", numba.config.CACHE_DIR)
    monkeypatch.setattr(cache.tempfile, "gettempdir", lambda: str(tmp_path))
    plain = cache.writable
    monkeypatch.setattr(cache, "writable", lambda folder: plain(folder) if tmp_path in Path(folder).parents else False)
    return tmp_path


def test_a_private_folder_below_the_temporary_one(nowhere):
    cache.prepare()
    folder = Path(os.environ["NUMBA_CACHE_DIR"])
    assert folder.parent == nowhere
    assert str(folder) == numba.config.CACHE_DIR
    assert stat.S_IMODE(folder.stat().st_mode) == 0o700
    again = cache.private_folder()
    assert again == folder


def test_a_folder_that_others_can_write_to_is_not_used(nowhere, monkeypatch):
    folder = cache.private_folder()
    folder.chmod(0o777)
    monkeypatch.setattr(cache.tempfile, "mkdtemp", lambda prefix: str(nowhere / "fresh"))
    assert cache.private_folder() == nowhere / "fresh"


def test_what_the_user_asked_for_stays(monkeypatch, tmp_path):
    monkeypatch.setenv("NUMBA_CACHE_DIR", str(tmp_path))
    cache.prepare()
    assert os.environ["NUMBA_CACHE_DIR"] == str(tmp_path)


def test_nothing_is_compiled_twice(tmp_path):
    environment = {**os.environ, "NUMBA_CACHE_DIR": str(tmp_path)}

    def kept():
        subprocess.run([sys.executable, "-c", SCRIPT], env=environment, check=True)
        return {path: path.stat().st_mtime_ns for path in tmp_path.rglob("*.nb?") if path.suffix == ".nbc"}

    first = kept()
    assert first
    assert kept() == first
