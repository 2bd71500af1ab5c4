"""Relations that hold for all n, inside and outside the convergence region, as objects an engine can be held against.

``linear``  relations of the form ``sum_k c_k Z_k = 0``: u-equations, cyclic, reflection, monodromy, integration by
            parts, U(1), null vectors of the momentum kernel
``limits``  factorisation, first massive level, soft and field-theory limits, inverse kernel, KLT: two numbers that
            must be equal

A relation knows its statement, its published source and which integrals it needs; it does not know who computes them.
"""

from .limits import (
    Comparison,
    factorisation,
    field_theory_limit,
    first_massive_level,
    inverse_kernel,
    klt,
    soft_limit,
)
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
    "first_massive_level",
    "integration_by_parts",
    "inverse_kernel",
    "kernel_null_vector",
    "klt",
    "monodromy",
    "reflection",
    "soft_limit",
    "u_equation",
    "u_one",
]
