"""Amplitudes: vertex operators, momenta and polarisations to numbers."""

from .calls import closed_amplitude, open_amplitude
from .states import State, closed_tachyon, gauge_boson, massless_tensor, tachyon
from .wick import vertex_integrand

__all__ = [
    "State",
    "closed_amplitude",
    "closed_tachyon",
    "gauge_boson",
    "massless_tensor",
    "open_amplitude",
    "tachyon",
    "vertex_integrand",
]
