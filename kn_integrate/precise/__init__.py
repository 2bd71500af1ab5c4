"""Arbitrary precision: the lock around python-flint's working precision, and quadrature in it."""
