"""Low-energy expansions: rational numbers times multiple zeta values, order by order in alpha'."""

from .calls import alpha_expansion
from .reconstruct import CoefficientFunction, reconstruct
from .relations import Recognition, recognise
from .result import AlphaSeries, Coefficient
from .specs import FEntry
from .zetas import ZetaSum, zeta

__all__ = [
    "AlphaSeries",
    "Coefficient",
    "CoefficientFunction",
    "FEntry",
    "Recognition",
    "ZetaSum",
    "alpha_expansion",
    "recognise",
    "reconstruct",
    "zeta",
]
