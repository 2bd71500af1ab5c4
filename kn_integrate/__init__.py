"""String tree integrals on the disk and the sphere, for any number of points and any kinematics.

Everything public is importable from here.  Names are loaded on first use, so that importing the package (and asking
the command line for help) loads no numerical library.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

__version__ = "0.1.0"

# The home of every public name.  A new name goes here, into the imports below (for type checkers, which do not run
# `__getattr__`) and into `__all__`; tests/unit/test_public_names.py holds the three together.
_HOMES: dict[str, tuple[str, ...]] = {
    "amplitudes": (
        "State",
        "closed_amplitude",
        "closed_superstring_amplitude",
        "closed_tachyon",
        "exchange_residue",
        "gauge_boson",
        "massless_tensor",
        "open_amplitude",
        "open_superstring_amplitude",
        "partial_waves",
        "tachyon",
        "vertex_integrand",
        "yang_mills_amplitude",
    ),
    "errors": ("InputError", "KNError", "NotAvailableError", "PoleError", "Status", "WorkLimitError"),
    "estimate": ("Estimate",),
    "kinematics": ("Mandelstams",),
    "momenta": ("random_momenta",),
    "integrand": ("Integrand", "monomial", "parke_taylor", "parse_integrand"),
    "exponents": ("DiskExponents", "SphereExponents"),
    "integrals": ("DiskIntegral", "SphereIntegral"),
    "momentum_kernel": ("biadjoint", "inverse_klt", "klt_kernel"),
    "sphere.evaluate": ("sphere_integral",),
    "kz.matrices": ("Matrix", "f_matrix", "z_matrix"),
    "checks.cross_check": ("CrossCheck", "cross_check"),
    "checks.examine": ("Examination", "examine_formula"),
    "api": ("disk_integral", "residue"),
    "batch": ("DiskBatch", "disk_batch"),
    "gradient": ("Gradient", "disk_gradient"),
    "planar_points": ("PlanarPoints",),
    "convergence": ("Convergence", "converge"),
    "expansion": ("AlphaSeries", "FEntry", "ZetaSum", "alpha_expansion", "recognise", "reconstruct", "zeta"),
    "plots.complex_plane": ("ComplexPlane", "complex_plane"),
    "plots.energy_line": ("EnergyLine", "energy_line"),
    "plots.error_budget": ("ErrorBudget", "error_budget"),
    "plots.pole_map": ("PoleMap", "pole_map"),
    "report.faces": ("latex_table",),
    "scans": ("Scan", "ScanPoint", "ScanPoints", "ScanRow", "StoreError", "open_scan", "scan", "spaced"),
    "poles": ("LaurentSeries", "laurent_series", "plus_i_epsilon"),
}
_MODULE_OF = {name: module for module, names in _HOMES.items() for name in names}

if TYPE_CHECKING:
    from .amplitudes import (
        State,
        closed_amplitude,
        closed_superstring_amplitude,
        closed_tachyon,
        exchange_residue,
        gauge_boson,
        massless_tensor,
        open_amplitude,
        open_superstring_amplitude,
        partial_waves,
        tachyon,
        vertex_integrand,
        yang_mills_amplitude,
    )
    from .api import disk_integral, residue
    from .batch import DiskBatch, disk_batch
    from .checks.cross_check import CrossCheck, cross_check
    from .checks.examine import Examination, examine_formula
    from .convergence import Convergence, converge
    from .errors import InputError, KNError, NotAvailableError, PoleError, Status, WorkLimitError
    from .estimate import Estimate
    from .expansion import AlphaSeries, FEntry, ZetaSum, alpha_expansion, recognise, reconstruct, zeta
    from .exponents import DiskExponents, SphereExponents
    from .gradient import Gradient, disk_gradient
    from .integrals import DiskIntegral, SphereIntegral
    from .integrand import Integrand, monomial, parke_taylor, parse_integrand
    from .kinematics import Mandelstams
    from .kz.matrices import Matrix, f_matrix, z_matrix
    from .momenta import random_momenta
    from .momentum_kernel import biadjoint, inverse_klt, klt_kernel
    from .planar_points import PlanarPoints
    from .plots.complex_plane import ComplexPlane, complex_plane
    from .plots.energy_line import EnergyLine, energy_line
    from .plots.error_budget import ErrorBudget, error_budget
    from .plots.pole_map import PoleMap, pole_map
    from .poles import LaurentSeries, laurent_series, plus_i_epsilon
    from .report.faces import latex_table
    from .scans import Scan, ScanPoint, ScanPoints, ScanRow, StoreError, open_scan, scan, spaced
    from .sphere.evaluate import sphere_integral

__all__ = [
    "AlphaSeries",
    "ComplexPlane",
    "Convergence",
    "CrossCheck",
    "DiskBatch",
    "DiskExponents",
    "DiskIntegral",
    "EnergyLine",
    "ErrorBudget",
    "Estimate",
    "Examination",
    "FEntry",
    "Gradient",
    "InputError",
    "Integrand",
    "KNError",
    "LaurentSeries",
    "Mandelstams",
    "Matrix",
    "NotAvailableError",
    "PlanarPoints",
    "PoleError",
    "PoleMap",
    "Scan",
    "ScanPoint",
    "ScanPoints",
    "ScanRow",
    "SphereExponents",
    "SphereIntegral",
    "State",
    "Status",
    "StoreError",
    "WorkLimitError",
    "ZetaSum",
    "__version__",
    "alpha_expansion",
    "biadjoint",
    "closed_amplitude",
    "closed_superstring_amplitude",
    "closed_tachyon",
    "complex_plane",
    "converge",
    "cross_check",
    "disk_batch",
    "disk_gradient",
    "disk_integral",
    "energy_line",
    "error_budget",
    "examine_formula",
    "exchange_residue",
    "f_matrix",
    "gauge_boson",
    "inverse_klt",
    "klt_kernel",
    "latex_table",
    "laurent_series",
    "massless_tensor",
    "monomial",
    "open_amplitude",
    "open_scan",
    "open_superstring_amplitude",
    "parke_taylor",
    "parse_integrand",
    "partial_waves",
    "plus_i_epsilon",
    "pole_map",
    "random_momenta",
    "recognise",
    "reconstruct",
    "residue",
    "scan",
    "spaced",
    "sphere_integral",
    "tachyon",
    "vertex_integrand",
    "yang_mills_amplitude",
    "z_matrix",
    "zeta",
]


def __getattr__(name: str) -> Any:
    module = _MODULE_OF.get(name)
    if module is None:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    value = getattr(import_module(f".{module}", __name__), name)
    globals()[name] = value  # the next look-up does not come here
    return value


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})
