"""From the exponents of a sum of disk integrals to a number: which engine, what tolerance, what about poles.

``request``  what the caller asks for, validated
``shifts``   moving a kinematic point along planar channels
``engines``  quadrature, KZ series or multiple precision for one set of terms; choice and escalation
``circle``   values at points where single terms have poles but their sum has none
``integral`` puts these together; :func:`integrate_disk_terms` is what other layers call
"""

from .integral import integrate_disk_terms, integrate_family
from .request import Request, make_request

__all__ = ["Request", "integrate_disk_terms", "integrate_family", "make_request"]
