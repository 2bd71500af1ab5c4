"""The quadrature engine: sectors, rules, planning and evaluation of disk integrals."""
