"""Amplitudes: vertex operators, momenta and polarisations to numbers."""

from .calls import closed_amplitude, open_amplitude
from .resonances import exchange_residue, partial_waves
from .states import State, closed_tachyon, gauge_boson, massless_tensor, tachyon
from .superstring import closed_superstring_amplitude, open_superstring_amplitude
from .wick import vertex_integrand
from .yang_mills import yang_mills_amplitude

__all__ = [
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
]
