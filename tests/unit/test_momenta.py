from __future__ import annotations

from fractions import Fraction

import flint
import numpy as np
import pytest

import kn_integrate as kn
from kn_integrate.exact import Exact
from kn_integrate.momenta import dot


def square(k):
    return -(k[0] ** 2) + sum(x * x for x in k[1:])


@pytest.mark.parametrize("n", [4, 5, 6, 8])
@pytest.mark.parametrize("dimension", [3, 4, 10])
@pytest.mark.parametrize("squares", [0, -1, 2, "mixed"])
def test_exact_momenta_are_on_shell_and_conserved(n, dimension, squares):
    mixed = [Fraction(-1), Fraction(0), Fraction(3, 4), *[Fraction(0)] * 5]
    wanted = mixed[:n] if squares == "mixed" else [squares] * n
    k = kn.random_momenta(n, dimension, 5, squared_masses=wanted)
    assert all(isinstance(x, Fraction) for q in k for x in q)
    assert [square(q) for q in k] == [-m for m in wanted]
    assert all(sum(column) == 0 for column in zip(*k, strict=True))
    assert len(set(k)) == n


@pytest.mark.parametrize(("n", "dimension"), [(6, 3), (6, 4), (8, 4), (7, 5)])
def test_gram_constraints(n, dimension):
    """n - 1 independent momenta span at most D dimensions: the Gram matrix has rank D, never more."""
    k = kn.random_momenta(n, dimension, 11)
    rows = [[Exact(x) for x in q] for q in k[:-1]]
    gram = flint.fmpq_mat(n - 1, n - 1, [_fmpq(dot(p, q)) for p in rows for q in rows])
    assert gram.rank() == min(n - 1, dimension)


def _fmpq(value):
    p, _, d = value.as_ratio()
    return flint.fmpq(p, d)


def test_the_generator_decides():
    assert kn.random_momenta(5, 4, 3) == kn.random_momenta(5, 4, np.random.default_rng(3))
    assert kn.random_momenta(5, 4, 3) != kn.random_momenta(5, 4, 4)


def test_floats():
    k = kn.random_momenta(5, 4, 3, masses=[0, 1, 0, 2.5, "1j"], exact=False)
    assert k.shape == (5, 4)
    assert k.dtype == float
    assert np.abs(k.sum(axis=0)).max() < 1e-12 * np.abs(k).max()
    assert -(k[1] @ np.diag([-1, 1, 1, 1]) @ k[1]) == pytest.approx(1, abs=1e-8 * np.abs(k).max() ** 2)


@pytest.mark.parametrize(
    ("arguments", "field"),
    [
        ((2, 4, 1), "n"),
        ((True, 4, 1), "n"),
        ((4, 2, 1), "dimension"),
        ((4, 4.5, 1), "dimension"),
        ((4, 4, 1, [0, 0]), "masses"),
        ((4, 4, 1, "heavy"), "masses"),
        ((4, 4, 1, "1+1j"), "masses"),
        ((4, 4, 1, float("nan")), "masses"),
        ((3, 4, 1), "masses"),
    ],
)
def test_bad_input(arguments, field):
    with pytest.raises(kn.InputError) as caught:
        kn.random_momenta(*arguments)
    assert caught.value.field == field


@pytest.mark.parametrize(
    "momenta",
    [
        [(1, 0, 0), (1, 0, 0), (-1, 0, 0)],
        [(1, 0, 0), (-1, 0)],
        [],
        "abc",
        3,
        [1, 2],
        [(1, "x"), (-1, 0)],
        [(True, 1), (-1, -1)],
        [(float("nan"), 1.0), (0.0, -1.0)],
    ],
)
def test_bad_momenta(momenta):
    with pytest.raises(kn.InputError):
        kn.Mandelstams.from_momenta(momenta)
