"""Convergence and cost of one integral, rule by rule, beside general-purpose integrators.

``rules``  the disk rules at increasing numbers of nodes
``peers``  nested adaptive quadrature, quasi-Monte Carlo, nested double-exponential quadrature
``study``  puts them together and fits rates
"""

from .study import Convergence, Measurement, converge

__all__ = ["Convergence", "Measurement", "converge"]
