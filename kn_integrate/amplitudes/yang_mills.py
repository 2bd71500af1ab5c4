r"""Colour-ordered tree amplitudes of Yang-Mills theory from momenta and polarisations.

The currents of a word P of labels (Berends and Giele 1988, in the form of Mafra and Schlotterer 2015,
arXiv:1510.08846) are the solution of ``D_m F^{mn} = 0``, ``d_m A^m = 0`` in plane waves, letter by letter:

    ``k_P^2 A_P^m = - sum_{P=XY} [ A_X^m (k_X.A_Y) + (A_X)_n F_Y^{mn} - (X <-> Y) ]``,
    ``F_P^{mn} = k_P^m A_P^n - k_P^n A_P^m - sum_{P=XY} (A_X^m A_Y^n - A_X^n A_Y^m)``,

with ``A_i = e_i``; the amplitude is ``(k_P^2/2) A_P.e_n`` for P = 12..n-1, without the division.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, TypeAlias

from ..channels import read_ordering
from ..errors import InputError, PoleError
from ..exact import ZERO, Exact
from ..momenta import dot
from .states import State, Vector, check_shells, read_states
from .wick import polarisation

Word: TypeAlias = tuple[int, ...]
Tensor: TypeAlias = tuple[Vector, ...]


def yang_mills_amplitude(states: Sequence[State], ordering: Sequence[int] | None = None) -> Exact:
    """The colour-ordered tree amplitude of gauge bosons, exactly.

    Parameters
    ----------
    states
        ``gauge_boson(k, e)``, at least three.
    ordering
        Labels in colour order; 1..n when None.

    Returns
    -------
    Exact
        Without coupling, normalised by three legs: ``(e1.e2)(k1.e3) + (e2.e3)(k2.e1) + (e3.e1)(k3.e2)``; propagators
        are ``2/k^2``, so that ``2 g^(n-2)`` times it factorises as ``A_left A_right/k^2``.

    Raises
    ------
    InputError
        For states that are no gauge bosons, and as :func:`kn_integrate.open_amplitude`.
    PoleError
        On a massless pole.

    Examples
    --------
    >>> from kn_integrate.amplitudes import gauge_boson
    >>> k = [(1, 1, 0, 0, 0), (0, 0, 1, "1j", 0), (-1, -1, -1, "-1j", 0)]
    >>> e = [(0, 0, 1, 0, 1), (1, 1, 0, 0, 2), (0, 0, 0, 0, 3)]
    >>> print(yang_mills_amplitude([gauge_boson(*pair) for pair in zip(k, e)]))
    6
    """
    found = read_states(states, "open")
    for place, state in enumerate(found, start=1):
        if state.is_tachyon:
            raise InputError(f"states, entry {place}", state.kind, "a gauge boson")
    check_shells(found, Exact(1))
    return Currents(found, "left").amplitude(read_ordering(ordering, len(found)))


class Currents:
    """The currents of one set of massless states, each word computed once.

    Parameters
    ----------
    states
        Massless.
    side
        Which polarisation: ``"left"`` or ``"right"``.
    """

    def __init__(self, states: Sequence[State], side: str) -> None:
        self.momenta: dict[Word, Vector] = {}
        self.known: dict[Word, tuple[Vector, Tensor]] = {}
        self.labels = dict(enumerate(states, start=1))
        for i, state in self.labels.items():
            e = polarisation(state, side)
            assert e is not None
            k = state.momentum
            self.momenta[(i,)] = k
            self.known[(i,)] = (e, _wedge(k, e))

    def amplitude(self, ordering: Word) -> Exact:
        """The amplitude in colour order.

        Raises
        ------
        PoleError
        """
        word, last = ordering[:-1], ordering[-1]
        return dot(self.numerator(word), self.known[(last,)][0])

    def momentum(self, word: Word) -> Vector:
        """``k_P``."""
        key = tuple(sorted(word))
        if key not in self.momenta:
            parts = zip(self.momentum(key[:1]), self.momentum(key[1:]), strict=True)
            self.momenta[key] = tuple(a + b for a, b in parts)
        return self.momenta[key]

    def numerator(self, word: Word) -> Vector:
        """``(k_P^2/2) A_P``, half of minus the sum above."""
        total: list[Exact] = [ZERO] * len(self.momentum(word))
        for cut in range(1, len(word)):
            x, y = word[:cut], word[cut:]
            for left, right, sign in ((x, y, 1), (y, x, -1)):
                (a, _), (b, f) = self.current(left), self.current(right)
                weight = dot(self.momentum(left), b)
                for m in range(len(total)):
                    value = a[m] * weight + _contract(f[m], a)
                    total[m] = total[m] - value if sign > 0 else total[m] + value
        return tuple(value / 2 for value in total)

    def current(self, word: Word) -> tuple[Vector, Tensor]:
        """``A_P`` and ``F_P``."""
        if word not in self.known:
            k = self.momentum(word)
            half: Exact = dot(k, k) / 2
            if not half:
                raise PoleError(tuple(sorted(word)), 0, ZERO)
            a = tuple(value / half for value in self.numerator(word))
            f = _wedge(k, a)
            for cut in range(1, len(word)):
                x, y = self.current(word[:cut])[0], self.current(word[cut:])[0]
                f = tuple(
                    tuple(p - q for p, q in zip(row, other, strict=True))
                    for row, other in zip(f, _wedge(x, y), strict=True)
                )
            self.known[word] = (a, f)
        return self.known[word]


def _wedge(a: Vector, b: Vector) -> Tensor:
    return tuple(tuple(x * v - y * u for u, v in zip(a, b, strict=True)) for x, y in zip(a, b, strict=True))


def _contract(row: Vector, vector: Vector) -> Any:
    """``F^{mn} A_n``, the first component with the sign of the metric."""
    return dot(row, vector)
