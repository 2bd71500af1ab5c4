"""Rules: linear functionals that continue ``int_0^1 t^(Y-1) F(t) dt`` to every Y off the poles 0, -1, -2, ...

A rule is data (nodes, weights, null functionals) made by one function per family:

``radau``       node at 0 plus Gauss-Jacobi nodes; Re Y > -1, the cheapest.
``chebyshev``   interpolation on a real interval that overhangs 0, or on an ellipse around it; any Y.
``disc``        Taylor coefficients on one circle through 1; any Y, best conditioned.
``contour``     circle around 0 in closed form plus a segment; any Y; the independent second opinion.
``residue``     not a value but the residue at Y = -N: a Taylor functional.
"""

from .base import PoleDistance, Rule
from .chebyshev import chebyshev_rule
from .contour import contour_rule
from .disc import disc_rule
from .radau import radau_rule
from .residue import residue_rule

__all__ = ["PoleDistance", "Rule", "chebyshev_rule", "contour_rule", "disc_rule", "radau_rule", "residue_rule"]
