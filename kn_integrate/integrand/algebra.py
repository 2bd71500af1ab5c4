"""Integrands: finite sums of an exact coefficient times a monomial in the differences ``z_ij = z_i - z_j``.

Every integrand this package knows is kept expanded and in one form: powers of ``z_ij`` with ``i < j`` only (the sign of
``z_ji = -z_ij`` goes into the coefficient), terms collected and sorted.  Two integrands that are equal as such sums
are therefore equal objects; relations among the ``z_ij`` themselves (``z_12 + z_23 = z_13``) are not applied.
"""

from __future__ import annotations

import numbers
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any, TypeAlias

from ..errors import InputError
from ..exact import ONE, ZERO, Exact, read, read_integer
from ..ratios import shown

Pair: TypeAlias = tuple[int, int]
Powers: TypeAlias = tuple[tuple[Pair, int], ...]

# Beyond these an input is a slip; without a limit a short text such as "(z12+z13)^99^99" could fill the memory.
MAX_TERMS = 100_000
MAX_POWER = 1000
MAX_LABEL = 9999
MAX_BITS = 200_000


@dataclass(frozen=True, slots=True)
class Term:
    """One term: ``coefficient * prod z_ij^{n_ij}``; ``powers`` is sorted, with i < j and no zero exponent."""

    coefficient: Exact
    powers: Powers


class Integrand:
    """A sum of monomials in ``z_ij`` with exact complex rational coefficients; immutable and hashable.

    Made by :func:`parke_taylor`, :func:`monomial`, ``parse_integrand``, and by ``+ - * / **`` from others.  Numbers
    in any exact notation (``2``, ``Fraction(1, 3)``, ``"1/3"``) may stand on either side of an operation; floats count
    at their binary value.

    Attributes
    ----------
    terms : tuple[Term, ...]
        In lowest form: i < j, no equal monomials, no zero coefficients, sorted.  Empty for the zero integrand.

    Examples
    --------
    >>> f = parke_taylor(1, 2, 3, 4)
    >>> print(2 * f - "1/3" * monomial({(1, 2): -2, (3, 4): -2}))
    -1/3*z12^-2*z34^-2 + 2*z12^-1*z14^-1*z23^-1*z34^-1
    >>> f == parke_taylor(2, 3, 4, 1)
    True
    """

    __slots__ = ("_hash", "terms")
    terms: tuple[Term, ...]

    def __init__(self, terms: Iterable[Term] = ()) -> None:
        collected: dict[Powers, Exact] = {}
        for term in terms:
            if not isinstance(term, Term):
                raise InputError("terms", shown(term), "Term objects")
            sign, powers = _ordered(term.powers)
            coefficient = read(term.coefficient, "coefficient")[0]
            collected[powers] = collected.get(powers, ZERO) + (coefficient if sign > 0 else -coefficient)
        self._set(collected)

    def _set(self, collected: Mapping[Powers, Exact]) -> None:
        if len(collected) > MAX_TERMS:
            raise InputError("integrand", f"{len(collected)} terms", f"at most {MAX_TERMS} terms")
        kept = sorted(item for item in collected.items() if item[1])
        object.__setattr__(self, "terms", tuple(Term(coefficient, powers) for powers, coefficient in kept))
        object.__setattr__(self, "_hash", hash(self.terms))

    def __setattr__(self, name: str, value: object) -> None:
        raise AttributeError(f"an Integrand is immutable; {name} cannot be set")

    def __delattr__(self, name: str) -> None:
        raise AttributeError(f"an Integrand is immutable; {name} cannot be deleted")

    def __reduce__(self) -> tuple[Any, ...]:
        return (Integrand, (self.terms,))

    @property
    def n(self) -> int:
        """The largest label that occurs; 0 for a constant."""
        return max((pair[1] for term in self.terms for pair, _power in term.powers), default=0)

    def relabelled(self, names: Mapping[int, int]) -> Integrand:
        """The integrand with every label i replaced by ``names[i]`` (labels not named stay).

        >>> parke_taylor(1, 2, 3, 4).relabelled({2: 3, 3: 2}) == parke_taylor(1, 3, 2, 4)
        True
        """
        return Integrand(
            Term(term.coefficient, tuple(((names.get(i, i), names.get(j, j)), k) for (i, j), k in term.powers))
            for term in self.terms
        )

    # --- algebra ----------------------------------------------------------------------------------------------------

    def __add__(self, other: Any) -> Integrand:
        right = _as_integrand(other)
        if right is None:
            return NotImplemented
        collected = {term.powers: term.coefficient for term in self.terms}
        for term in right.terms:
            collected[term.powers] = collected.get(term.powers, ZERO) + term.coefficient
        return _from(collected)

    __radd__ = __add__

    def __neg__(self) -> Integrand:
        return _from({term.powers: -term.coefficient for term in self.terms})

    def __pos__(self) -> Integrand:
        return self

    def __sub__(self, other: Any) -> Integrand:
        right = _as_integrand(other)
        return NotImplemented if right is None else self + -right

    def __rsub__(self, other: Any) -> Integrand:
        left = _as_integrand(other)
        return NotImplemented if left is None else left + -self

    def __mul__(self, other: Any) -> Integrand:
        right = _as_integrand(other)
        if right is None:
            return NotImplemented
        if len(self.terms) * len(right.terms) > MAX_TERMS:
            found = f"a product of {len(self.terms)} by {len(right.terms)} terms"
            raise InputError("integrand", found, f"at most {MAX_TERMS} terms")
        collected: dict[Powers, Exact] = {}
        for a in self.terms:
            for b in right.terms:
                powers = _times(a.powers, b.powers)
                collected[powers] = collected.get(powers, ZERO) + a.coefficient * b.coefficient
        return _from(collected)

    __rmul__ = __mul__

    def __truediv__(self, other: Any) -> Integrand:
        right = _as_integrand(other)
        return NotImplemented if right is None else self * right**-1

    def __rtruediv__(self, other: Any) -> Integrand:
        left = _as_integrand(other)
        return NotImplemented if left is None else left * self**-1

    def __pow__(self, exponent: int) -> Integrand:
        """An integer power; a negative one only of a single term, since a sum has no finite inverse."""
        k = read_integer(exponent, "exponent")
        if abs(k) > MAX_POWER:
            raise InputError("exponent", shown(k), f"an exponent within +-{MAX_POWER}")
        if len(self.terms) == 1 or (k >= 0 and not self.terms):
            return self._power_of_term(k)
        if k < 0:
            found = "zero" if not self.terms else f"a sum of {len(self.terms)} terms"
            raise InputError("integrand", f"{found} to the power {k}", "one term, which can be inverted")
        result, square = monomial({}), self
        while k:
            if k & 1:
                result = result * square
            k >>= 1
            square = square * square if k else square
        return result

    def _power_of_term(self, k: int) -> Integrand:
        if not self.terms:
            return self if k else monomial({})
        (term,) = self.terms
        size = max(part.bit_length() for part in term.coefficient.as_ratio())
        if size * abs(k) > MAX_BITS:
            raise InputError("coefficient", f"a number of about {size * abs(k)} bits", f"at most {MAX_BITS} bits")
        return _from({_scaled(term.powers, k): term.coefficient**k})

    # --- comparison and text ----------------------------------------------------------------------------------------

    def __eq__(self, other: object) -> bool:
        if isinstance(other, Integrand):
            return self.terms == other.terms
        return NotImplemented

    def __hash__(self) -> int:
        value: int = self._hash  # type: ignore[attr-defined]
        return value

    def __bool__(self) -> bool:
        return bool(self.terms)

    def __str__(self) -> str:
        """Text that ``parse_integrand`` reads back."""
        if not self.terms:
            return "0"
        text = ""
        for term in self.terms:
            negative = term.coefficient.is_real and term.coefficient < 0
            coefficient = -term.coefficient if negative else term.coefficient
            text += (" - " if negative else " + ") if text else ("-" if negative else "")
            factors = [_variable(pair) + (f"^{k}" if k != 1 else "") for pair, k in term.powers]
            if coefficient != ONE or not factors:
                factors.insert(0, _coefficient_text(coefficient))
            text += "*".join(factors)
        return text

    def __repr__(self) -> str:
        return f"parse_integrand({str(self)!r})"


def _from(collected: Mapping[Powers, Exact]) -> Integrand:
    made = object.__new__(Integrand)
    made._set(collected)
    return made


def _as_integrand(value: Any) -> Integrand | None:
    """An integrand, or a number as a constant integrand; None for anything that is no number."""
    if isinstance(value, Integrand):
        return value
    try:
        number = read(value, "coefficient")[0]
    except InputError:
        if isinstance(value, (str, numbers.Number)):  # meant as a coefficient, and not usable as one
            raise
        return None
    return _from({(): number})


def _ordered(powers: Iterable[tuple[Pair, int]]) -> tuple[int, Powers]:
    """Sign and powers with i < j of a product of ``z_ij^n_ij`` in any label order."""
    total: dict[Pair, int] = {}
    sign = 1
    for (i, j), power in powers:
        if i > j:
            i, j = j, i
            sign = -sign if power % 2 else sign
        total[i, j] = total.get((i, j), 0) + power
    return sign, tuple(sorted((pair, k) for pair, k in total.items() if k))


def _times(a: Powers, b: Powers) -> Powers:
    total = dict(a)
    for pair, k in b:
        total[pair] = total.get(pair, 0) + k
    return _checked(total)


def _scaled(powers: Powers, k: int) -> Powers:
    return _checked({pair: k * power for pair, power in powers})


def _checked(total: Mapping[Pair, int]) -> Powers:
    for (i, j), k in total.items():
        if abs(k) > MAX_POWER:
            raise InputError("exponent", f"z({i},{j})^{k}", f"exponents within +-{MAX_POWER}")
    return tuple(sorted((pair, k) for pair, k in total.items() if k))


def _variable(pair: Pair) -> str:
    i, j = pair
    return f"z{i}{j}" if j < 10 else f"z({i},{j})"


def _coefficient_text(number: Exact) -> str:
    if number.is_real:
        return str(number)
    imag = f"{Exact(number.im)}*1j" if number.im < 0 else f"+{Exact(number.im)}*1j"
    return f"({Exact(number.re)}{imag})"


# --- the two building blocks ----------------------------------------------------------------------------------------


def _label(value: Any, field: str) -> int:
    label = read_integer(value, field, "a label: an integer from 1 on")
    if not 1 <= label <= MAX_LABEL:
        raise InputError(field, shown(value), f"a label from 1 to {MAX_LABEL}")
    return label


def monomial(powers: Mapping[tuple[int, int], int]) -> Integrand:
    """``prod z_ij^{n_ij}`` with ``z_ij = z_i - z_j``; ``monomial({})`` is 1.

    Parameters
    ----------
    powers
        ``{(i, j): n_ij}``, labels in any order: ``z_ji = -z_ij``, so (2, 1) to an odd power carries a sign.  When both
        (i, j) and (j, i) are given, the two factors are multiplied.

    Raises
    ------
    InputError
        For keys that are not pairs of different labels, and exponents that are not integers.

    Examples
    --------
    >>> print(monomial({(2, 1): -1, (3, 4): 2}))
    -z12^-1*z34^2
    """
    if not isinstance(powers, Mapping):
        raise InputError("powers", shown(powers), "a mapping {(i, j): exponent}")
    items = []
    for key, power in powers.items():
        if not isinstance(key, tuple) or len(key) != 2:
            raise InputError("powers", shown(key), "pairs of labels (i, j) as keys")
        i, j = (_label(label, f"powers {key}") for label in key)
        if i == j:
            raise InputError("powers", shown(key), "two different labels")
        k = read_integer(power, f"powers ({i},{j})")
        if abs(k) > MAX_POWER:
            raise InputError(f"powers ({i},{j})", shown(k), f"an exponent within +-{MAX_POWER}")
        items.append(((i, j), k))
    sign, ordered = _ordered(items)
    return _from({_checked(dict(ordered)): ONE if sign > 0 else -ONE})


def parke_taylor(*labels: int) -> Integrand:
    """The Parke-Taylor factor ``(-1)^{k-1} / (z_{q1 q2} z_{q2 q3} ... z_{qk q1})`` of a cycle of k labels.

    The sign makes it positive on its own ordering, ``z_q1 < z_q2 < ... < z_qk``: the k - 1 factors that go up are
    negative there.  (Part of the literature leaves it out.)  Cycles may be shorter than the number of points; products
    of cycles are multi-trace integrands.  Cyclic rotations give the same factor, reversal a factor ``(-1)^k``.

    Raises
    ------
    InputError
        For less than two labels, and for labels that repeat or are no positive integers.

    Examples
    --------
    >>> print(parke_taylor(1, 3, 2))
    z12^-1*z13^-1*z23^-1
    >>> print(parke_taylor(1, 2) * parke_taylor(3, 4))
    z12^-2*z34^-2
    """
    cycle = tuple(_label(label, "labels") for label in labels)
    if len(cycle) < 2 or len(set(cycle)) < len(cycle):
        raise InputError("labels", shown(labels), "at least two labels, all different")
    sign, powers = _ordered(((cycle[k - 1], cycle[k]), -1) for k in range(len(cycle)))
    return _from({powers: ONE if sign == (-1) ** (len(cycle) - 1) else -ONE})
