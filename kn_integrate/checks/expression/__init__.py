"""Formulas as text: a small language that can compute and nothing else.

There is no access to Python from inside: the text is split into tokens, the tokens are parsed into the few node types
of :mod:`.nodes`, and these are evaluated by a function that knows them all.
"""

from .evaluate import OutOfRangeError, UndefinedValueError, evaluate
from .linear import Affine, affine_form, solve
from .nodes import Node
from .parser import FUNCTIONS, parse

__all__ = [
    "FUNCTIONS",
    "Affine",
    "Node",
    "OutOfRangeError",
    "UndefinedValueError",
    "affine_form",
    "evaluate",
    "parse",
    "solve",
]
