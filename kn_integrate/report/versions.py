"""The versions that a number depends on."""

from __future__ import annotations

import platform
from importlib.metadata import PackageNotFoundError, version

from .. import __version__

_LIBRARIES = ("numpy", "scipy", "numba", "mpmath", "python-flint")


def versions() -> dict[str, str]:
    """Versions of this package, of Python and of the numerical libraries, without importing any of them."""
    found = {"kn_integrate": __version__, "python": platform.python_version()}
    for name in _LIBRARIES:
        try:
            found[name] = version(name)
        except PackageNotFoundError:
            found[name] = "not installed"
    return found
