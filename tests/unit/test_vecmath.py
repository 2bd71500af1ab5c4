"""The vectorised elementary functions: how many units in the last place they are off, over their whole domain."""

from __future__ import annotations

import mpmath
import numpy as np
import pytest
from numba import njit

from kn_integrate.kernels import vecmath

CTX = mpmath.MPContext()
CTX.prec = 120


@njit(error_model="numpy", fastmath={"contract"})
def _log(x, out):
    for k in range(len(x)):
        out[k] = vecmath.log(x[k])


@njit(error_model="numpy", fastmath={"contract"})
def _exp(x, out):
    for k in range(len(x)):
        out[k] = vecmath.exp(x[k])


@njit(error_model="numpy", fastmath={"contract"})
def _atan(y, x, out):
    for k in range(len(x)):
        out[k] = vecmath.atan_quotient(y[k], x[k])


@njit(error_model="numpy", fastmath={"contract"})
def _sincos(x, s, c):
    for k in range(len(x)):
        s[k], c[k] = vecmath.sincos(x[k])


def ulps(found, exact) -> float:
    """Largest error in units of the last place of the exact value."""
    worst = 0.0
    for a, b in zip(found.tolist(), exact, strict=True):
        unit = np.spacing(max(abs(float(b)), 1e-300))
        worst = max(worst, float(abs(CTX.mpf(a) - b)) / unit)
    return worst


def sample(rng, low, high, count=4000):
    return np.exp(rng.uniform(np.log(low), np.log(high), count))


@pytest.mark.parametrize(("low", "high"), [(1.0, 10.0), (0.9, 1.1), (1e-300, 1e300), (1 - 1e-9, 1 + 1e-9)])
def test_log(low, high):
    x = sample(np.random.default_rng(1), low, high)
    out = np.empty_like(x)
    _log(x, out)
    exact = [CTX.log(CTX.mpf(v)) for v in x.tolist()]
    # next to 1 the result is small: what counts in the kernels is the error beside 1
    worst = max(float(abs(CTX.mpf(a) - b)) / max(float(abs(b)), 1.0) for a, b in zip(out.tolist(), exact, strict=True))
    assert worst < 2.5e-16
    assert ulps(out, exact) < (2.0 if not 0.5 < low < 2 else 4.0)


def test_log_of_one_is_exactly_zero():
    out = np.empty(1)
    _log(np.ones(1), out)
    assert out[0] == 0.0


@pytest.mark.parametrize(("low", "high"), [(-1.0, 1.0), (-700.0, 700.0), (-1e-8, 1e-8)])
def test_exp(low, high):
    x = np.random.default_rng(2).uniform(low, high, 4000)
    out = np.empty_like(x)
    _exp(x, out)
    assert ulps(out, [CTX.exp(CTX.mpf(v)) for v in x.tolist()]) < 1.5


def test_exp_far_out_stays_finite_or_infinite():
    out = np.empty(2)
    _exp(np.array([-800.0, 720.0]), out)
    assert out[0] < 1e-290
    assert out[1] > 1e300 or np.isinf(out[1])


def test_atan_quotient():
    rng = np.random.default_rng(3)
    x, y = sample(rng, 1e-6, 1e6), sample(rng, 1e-6, 1e6)
    out = np.empty_like(x)
    _atan(y, x, out)
    assert ulps(out, [CTX.atan(CTX.mpf(a) / CTX.mpf(b)) for a, b in zip(y.tolist(), x.tolist(), strict=True)]) < 2.5


@pytest.mark.parametrize("size", [1.0, 10.0, 1000.0])
def test_sincos(size):
    x = np.random.default_rng(4).uniform(-size, size, 4000)
    s, c = np.empty_like(x), np.empty_like(x)
    _sincos(x, s, c)
    for found, function in ((s, CTX.sin), (c, CTX.cos)):
        worst = max(
            abs(float(CTX.mpf(a) - function(CTX.mpf(v)))) for a, v in zip(found.tolist(), x.tolist(), strict=True)
        )
        assert worst < 2.5e-16
