"""One file for each verb of the command line.

A verb ``kn-integrate xyz`` is a module ``xyz.py`` here that holds ``command``, made by :func:`._verb.verb`; nothing
else has to know about it.  Modules whose names begin with an underscore are shared pieces.  A verb imports numerical
modules only inside its function, so that listing all verbs stays fast.
"""

from __future__ import annotations

from importlib import import_module
from pkgutil import iter_modules

from ._verb import Verb


def verb_names() -> list[str]:
    """The names of all verbs, sorted."""
    return sorted(module.name for module in iter_modules(__path__) if not module.name.startswith("_"))


def load_verb(name: str) -> Verb:
    """The command of a verb."""
    command = import_module(f".{name}", __name__).command
    assert isinstance(command, Verb)
    return command
