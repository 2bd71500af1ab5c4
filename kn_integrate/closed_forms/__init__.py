"""Published closed forms of disk and sphere integrals, with their sources: what every engine is checked against."""

from .beta import BetaProduct, EulerBeta
from .cubical import Cubical
from .form import ClosedForm, DiskForm, Match
from .gammas import UndefinedError
from .hypergeometric import FivePoint, HypergeometricChain
from .pairs import PairExponents
from .selberg import AomotoInsertion, Selberg

__all__ = [
    "AomotoInsertion",
    "BetaProduct",
    "ClosedForm",
    "Cubical",
    "DiskForm",
    "EulerBeta",
    "FivePoint",
    "HypergeometricChain",
    "Match",
    "PairExponents",
    "Selberg",
    "UndefinedError",
]
