"""Published closed forms of disk and sphere integrals, with their sources: what every engine is checked against."""

from .beta import BetaProduct, EulerBeta
from .catalogue import DISK_FORMS, SPHERE_FORMS, find, find_sphere
from .cubical import Cubical
from .dixon_anderson import DixonAnderson
from .dougall import RogersDougall
from .five_point_loci import LOCI, Dixon, FivePointLocus, Gauss, PfaffSaalschuetz, Watson, Whipple
from .form import ClosedForm, DiskForm, Match
from .gammas import UndefinedError
from .hypergeometric import FivePoint, HypergeometricChain
from .pairs import PairExponents
from .selberg import AomotoInsertion, Selberg
from .sphere import ComplexBeta, ComplexSelberg, SphereForm

__all__ = [
    "DISK_FORMS",
    "LOCI",
    "SPHERE_FORMS",
    "AomotoInsertion",
    "BetaProduct",
    "ClosedForm",
    "ComplexBeta",
    "ComplexSelberg",
    "Cubical",
    "DiskForm",
    "Dixon",
    "DixonAnderson",
    "EulerBeta",
    "FivePoint",
    "FivePointLocus",
    "Gauss",
    "HypergeometricChain",
    "Match",
    "PairExponents",
    "PfaffSaalschuetz",
    "RogersDougall",
    "Selberg",
    "SphereForm",
    "UndefinedError",
    "Watson",
    "Whipple",
    "find",
    "find_sphere",
]
