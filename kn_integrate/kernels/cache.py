"""Where compiled kernels are kept when neither the installation nor the home folder can be written to.

numba keeps them beside the source, else in the user's cache folder, else it refuses to compile.  Then a folder of our
own below the temporary one serves: only if it is ours alone, for what is loaded from it is executed.
"""

from __future__ import annotations

import os
import stat
import tempfile
from pathlib import Path


def writable(folder: Path) -> bool:
    """Whether a file can be made in a folder, which is made if it does not exist."""
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            return True
    except OSError:
        return False


def private_folder() -> Path:
    """A folder below the temporary one that belongs to this user and nobody else can write to; a new one at worst."""
    user = os.getuid() if hasattr(os, "getuid") else 0
    folder = Path(tempfile.gettempdir()) / f"kn_integrate-kernels-{user}"
    try:
        folder.mkdir(mode=0o700, exist_ok=True)
        found = folder.lstat()
        alone = stat.S_ISDIR(found.st_mode) and not found.st_mode & 0o077
        if alone and (not hasattr(os, "getuid") or found.st_uid == user) and writable(folder):
            return folder
    except OSError:
        pass
    return Path(tempfile.mkdtemp(prefix="kn_integrate-kernels-"))


def _homes() -> tuple[Path, Path]:
    """The places numba would take by itself."""
    user = Path(os.environ.get("XDG_CACHE_HOME") or os.path.join(os.path.expanduser("~"), ".cache"))
    return Path(__file__).parent / "__pycache__", user / "numba"


def place() -> str:
    """Where compiled kernels are kept."""
    prepare()
    chosen = os.environ.get("NUMBA_CACHE_DIR")
    return chosen or str(next(folder for folder in _homes() if writable(folder)))


def prepare() -> None:
    """Name a folder for compiled kernels to numba if it would find none by itself."""
    if os.environ.get("NUMBA_CACHE_DIR") or any(writable(folder) for folder in _homes()):
        return
    os.environ["NUMBA_CACHE_DIR"] = str(private_folder())
    import numba

    setattr(numba.config, "CACHE_DIR", os.environ["NUMBA_CACHE_DIR"])  # noqa: B010 - unknown to type checkers
