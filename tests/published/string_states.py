"""Exact momenta and transverse polarisations for tests of amplitudes."""

from __future__ import annotations

from fractions import Fraction

from kn_integrate.exact import Exact
from kn_integrate.momenta import dot, random_momenta

I = Exact(0, 1)  # noqa: E741


def vector(*components):
    return tuple(Exact(c) if isinstance(c, (int, Fraction, str)) else c for c in components)


def transverse(k, rng):
    """A random polarisation; its energy component makes it transverse."""
    e = [Exact(Fraction(int(rng.integers(-9, 10)), int(rng.integers(1, 7)))) for _ in k]
    rest = sum((a * b for a, b in zip(e[1:], k[1:], strict=True)), Exact(0))
    e[0] = rest / k[0]
    return tuple(e)


def massless_three():
    """Three light-like momenta that add up to zero and are not parallel: complex, as real ones do not exist."""
    k1, k2 = vector(1, 1, 0, 0, 0, 0), vector(1, 1, I, 1, 0, 0)
    assert not dot(k2, k2)
    assert not dot(k1, k2)
    return k1, k2, tuple(-(a + b) for a, b in zip(k1, k2, strict=True))


def momenta(n, rng, squared_masses=0, dimension=6):
    if n == 3:
        return massless_three()
    found = random_momenta(n, dimension, rng, squared_masses=squared_masses)
    return tuple(vector(*k) for k in found)


def minus(k):
    return tuple(-a for a in k)


def plus(*ks):
    return tuple(sum(parts, Exact(0)) for parts in zip(*ks, strict=True))


def polarisation_sum(k, reference):
    """Signs and vectors e with ``sum sign e^m e^n = eta - (k q + q k)/(q.k)``, q light-like."""
    found = []
    for i in range(len(k)):
        b = tuple(Exact(1 if i == j else 0) for j in range(len(k)))
        c = dot(b, k) / dot(reference, k)
        found.append((-1 if i == 0 else 1, tuple(x - c * y for x, y in zip(b, reference, strict=True))))
    return found
