r"""General-purpose integrators on the same integral, as a yardstick; they know nothing of its structure.

The ordered domain ``0 < z_2 < ... < z_{n-2} < 1`` is the unit cube in ``u`` with ``z_k = z_{k+1} u_k`` (common
practice); there the integrand has endpoint powers that these methods are left to cope with.  They apply where the
integral converges and nowhere else.

Methods: nested adaptive Gauss-Kronrod quadrature (QUADPACK, Piessens et al. 1983, through scipy), scrambled Sobol
sequences (Owen 1998, through scipy), nested tanh-sinh quadrature (Takahasi and Mori 1974, through mpmath).  The error
bars they claim are shown for comparison and never used.
"""

from __future__ import annotations

import time
import warnings
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..channels import pair_order
from ..disk.terms import Term
from ..dispatch.shifts import chord_exponents

PEERS = ("nested adaptive", "quasi-Monte Carlo", "nested tanh-sinh")


@dataclass(frozen=True)
class PeerResult:
    """One run of a peer: evaluations, seconds, value and its own error bar (None when it has none)."""

    evaluations: int
    seconds: float
    value: complex
    claimed: float | None
    setting: str


class OutOfTimeError(Exception):
    """A peer used up its time."""


def converges(n: int, terms: Sequence[Term]) -> bool:
    """Whether every term converges absolutely: Re Y > 0 for every chord."""
    return all(y.re > 0 for term in terms for y in chord_exponents(n, term.pairs).values())


class CubeIntegrand:
    """The sum of the terms as a function on the unit cube, vectorised over points; counts its evaluations."""

    def __init__(self, n: int, terms: Sequence[Term], deadline: float) -> None:
        self.dimension = n - 3
        self.count = 0
        self.deadline = deadline
        order = pair_order(n)
        self.pairs = [pair for pair in order if pair[1] < n]
        self.parts = []
        for term in terms:
            exponents = np.array([term.pairs[k].value() for k, pair in enumerate(order) if pair[1] < n])
            self.parts.append((term.coefficient.value(), exponents))
        self.is_complex = any(isinstance(c, complex) or np.iscomplexobj(a) for c, a in self.parts)
        self.n = n

    def __call__(self, u: NDArray[np.float64]) -> NDArray[Any]:
        """Values at points ``u`` of shape (count, n-3)."""
        self.count += len(u)
        if time.perf_counter() > self.deadline:
            raise OutOfTimeError
        z = np.ones((len(u), self.n - 1))
        z[:, 0] = 0.0
        jacobian = np.ones(len(u))
        for k in range(self.n - 3, 0, -1):
            z[:, k] = z[:, k + 1] * u[:, k - 1]
            jacobian *= z[:, k + 1]
        with np.errstate(all="ignore"):
            logs = np.array([np.log(z[:, j - 1] - z[:, i - 1]) for i, j in self.pairs])
            total = sum(c * np.exp(a @ logs) for c, a in self.parts) * jacobian
        return np.where(np.isfinite(total), total, 0.0)

    def at(self, *u: float) -> Any:
        """One point."""
        return self(np.array([u]))[0]


def nested_adaptive(integrand: CubeIntegrand, levels: Sequence[float]) -> Iterator[PeerResult]:
    """scipy.integrate.nquad at increasing accuracy."""
    from scipy.integrate import nquad

    for epsilon in levels:
        before, start = integrand.count, time.perf_counter()
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            bounds = [(0.0, 1.0)] * integrand.dimension
            options = {"epsrel": epsilon, "epsabs": 0.0, "limit": 60}
            value, claimed = nquad(lambda *u: float(integrand.at(*u).real), bounds, opts=options)
            if integrand.is_complex:
                imaginary, more = nquad(lambda *u: float(integrand.at(*u).imag), bounds, opts=options)
                value, claimed = complex(value, imaginary), claimed + more
        yield PeerResult(integrand.count - before, time.perf_counter() - start, value, claimed, f"epsrel {epsilon:g}")


def quasi_monte_carlo(integrand: CubeIntegrand, levels: Sequence[int]) -> Iterator[PeerResult]:
    """Scrambled Sobol points, 8 independent scramblings for the error bar."""
    from scipy.stats import qmc

    for power in levels:
        before, start = integrand.count, time.perf_counter()
        means = []
        for replica in range(8):
            points = qmc.Sobol(integrand.dimension, rng=np.random.default_rng(replica)).random_base2(power)
            means.append(integrand(points).mean())
        spread = float(np.std(means, ddof=1)) / np.sqrt(8)
        value = complex(np.mean(means))
        yield PeerResult(integrand.count - before, time.perf_counter() - start, value, spread, f"8 x 2^{power} points")


def nested_tanh_sinh(integrand: CubeIntegrand, levels: Sequence[int]) -> Iterator[PeerResult]:
    """mpmath.quad over the cube at increasing degree, in double precision arithmetic of the integrand."""
    import mpmath

    ctx = mpmath.MPContext()
    for degree in levels:
        before, start = integrand.count, time.perf_counter()
        value = ctx.quad(
            lambda *u: ctx.mpc(integrand.at(*(float(x) for x in u))),
            *[[0, 1]] * integrand.dimension,
            maxdegree=degree,
        )
        seconds = time.perf_counter() - start
        yield PeerResult(integrand.count - before, seconds, complex(value), None, f"degree {degree}")


def run_peer(name: str, n: int, terms: Sequence[Term], cap: float) -> tuple[list[PeerResult], str]:
    """All settings of a peer that finish within ``cap`` seconds, and a remark."""
    ladder: dict[str, tuple[Callable[..., Iterator[PeerResult]], Sequence[Any]]] = {
        "nested adaptive": (nested_adaptive, (1e-3, 1e-5, 1e-7, 1e-9, 1e-11)),
        "quasi-Monte Carlo": (quasi_monte_carlo, range(8, 20, 2)),
        "nested tanh-sinh": (nested_tanh_sinh, (3, 4, 5, 6)),
    }
    function, levels = ladder[name]
    if not converges(n, terms):
        return [], "not applicable: the integral diverges here and is defined by continuation"
    integrand = CubeIntegrand(n, terms, time.perf_counter() + cap)
    found: list[PeerResult] = []
    try:
        for result in function(integrand, levels):
            found.append(result)
    except OutOfTimeError:
        return found, f"stopped after {cap:g} s"
    return found, ""
