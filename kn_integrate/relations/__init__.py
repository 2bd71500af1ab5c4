"""Relations that hold for all n, inside and outside the convergence region, as objects an engine can be held against.

``linear``  relations of the form ``sum_k c_k Z_k = 0``: u-equations, cyclic, reflection, monodromy, integration by
            parts, U(1), null vectors of the momentum kernel
``limits``  factorisation, soft and field-theory limits: a number against a product of lower-point numbers

A relation knows its statement, its published source and which integrals it needs; it does not know who computes them.
"""

from .limits import Comparison, factorisation, field_theory_limit, soft_limit
from .linear import (
    Piece,
    Relation,
    Residual,
    cyclic,
    integration_by_parts,
    kernel_null_vector,
    monodromy,
    reflection,
    u_equation,
    u_one,
)

__all__ = [
    "Comparison",
    "Piece",
    "Relation",
    "Residual",
    "cyclic",
    "factorisation",
    "field_theory_limit",
    "integration_by_parts",
    "kernel_null_vector",
    "monodromy",
    "reflection",
    "soft_limit",
    "u_equation",
    "u_one",
]
