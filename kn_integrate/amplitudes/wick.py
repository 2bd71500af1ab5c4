r"""From vertex operators to integrands, by Wick contraction.

Vertex operators of one chiral half, with ``a = 2 alpha'`` (open string) or ``alpha'/2`` (closed string):

    tachyon ``exp(i k.X)``,   massless ``-(i/sqrt(a)) e.dX exp(i k.X)``,   ``<X(z) X(w)> = -a log(z - w)``

(Polchinski, String Theory I, chapters 2 and 6).  Contractions of exponentials make the Koba-Nielsen factor
``prod z_ij^(a k_i.k_j)``; the rest, linear in every polarisation, is

    ``a^(m/2) exp( sum_{i<j} e_i.e_j/(a z_ij^2) - sum_{i != j} e_i.k_j/z_ij )``.

The integrand is this without ``a^(m/2)`` (m massless states), so that it has exact coefficients.  A single term
``e_i.k_j/z_ij`` is not Moebius covariant; the sum over j is, since ``sum_j e_i.k_j = 0``:

    ``sum_j e_i.k_j/z_ij = sum_{j != r} e_i.k_j z_jr/(z_ij z_ir)``   for any r,

and this is the form used: every monomial has degree -2 in a massless puncture and 0 in a tachyon.
"""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations

from ..exact import Exact
from ..integrand import Integrand, monomial
from ..momenta import dot
from .states import State, Vector, check_shells, read_alpha_prime, read_states


def vertex_integrand(states: Sequence[State], alpha_prime: object = 1, side: str = "left") -> Integrand:
    """The Wick contraction of vertex operators as an integrand.

    Parameters
    ----------
    states
        States of the open or of the closed string; puncture i is the i-th one.
    alpha_prime
        The inverse string tension.
    side
        The chiral half of closed-string states: ``"left"``, or ``"right"`` (as a function of z; the amplitude has it
        at ``conj(z)``, with the polarisations as they are).

    Returns
    -------
    Integrand
        Without the Koba-Nielsen factor and without ``a^(m/2)``, see the module's text for the normalisation.

    Raises
    ------
    InputError
        For states off the mass shell, momenta that do not add up to zero.

    Examples
    --------
    >>> from kn_integrate.amplitudes import gauge_boson
    >>> k = [(3, 3, 0, 0, 0), (-3, 0, 3, 0, 0), (0, -3, -3, 0, 0)]
    >>> len(vertex_integrand([gauge_boson((0, 0, 0, 0, 0), (0, 0, 0, 1, 0))] * 3).terms)
    0
    """
    first = list(states)
    string = "open" if first and isinstance(first[0], State) and first[0].is_open else "closed"
    found = read_states(first, string)
    alpha = read_alpha_prime(alpha_prime)
    check_shells(found, alpha)
    return contraction(found, chiral_coupling(string, alpha), side)


def chiral_coupling(string: str, alpha_prime: Exact) -> Exact:
    """The number ``a`` of the module's text: ``2 alpha'`` or ``alpha'/2``."""
    coupling: Exact = 2 * alpha_prime if string == "open" else alpha_prime / 2
    return coupling


def polarisation(state: State, side: str) -> Vector | None:
    """The polarisation of one chiral half; open states have one half only."""
    return state.right if side == "right" else state.left


def contraction(states: Sequence[State], a: Exact, side: str = "left") -> Integrand:
    """:func:`vertex_integrand` without the checks."""
    n = len(states)
    vectors = {i: e for i, state in enumerate(states, start=1) if (e := polarisation(state, side)) is not None}
    single = {i: _single(i, e, states, n) for i, e in vectors.items()}
    double = {
        (i, j): (dot(vectors[i], vectors[j]) / a) * monomial({(i, j): -2}) for i, j in combinations(sorted(vectors), 2)
    }
    known: dict[tuple[int, ...], Integrand] = {(): monomial({})}

    def product(labels: tuple[int, ...]) -> Integrand:
        # the first label stands alone or is contracted with one of the others
        if labels not in known:
            i, rest = labels[0], labels[1:]
            total = single[i] * product(rest)
            for j in rest:
                if double[i, j]:
                    total = total + double[i, j] * product(tuple(label for label in rest if label != j))
            known[labels] = total
        return known[labels]

    return product(tuple(sorted(vectors)))


def _single(i: int, e: Vector, states: Sequence[State], n: int) -> Integrand:
    """``-sum_j e.k_j z_jr/(z_ij z_ir)``."""
    r = n if i != n else n - 1
    total = Integrand()
    for j in range(1, n + 1):
        if j not in (i, r) and (c := dot(e, states[j - 1].momentum)):
            total = total - c * monomial({(j, r): 1}) * monomial({(i, j): -1}) * monomial({(i, r): -1})
    return total


__all__ = ["chiral_coupling", "contraction", "polarisation", "vertex_integrand"]
