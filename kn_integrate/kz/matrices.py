"""Matrices of disk integrals: Z over orderings and integrands, and F of the superstring."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from itertools import permutations
from typing import Any

from ..channels import Channel, dotted, pair_order, read_labels, read_ordering
from ..errors import InputError
from ..exact import read_integer
from ..integrals import DiskIntegral
from ..integrand import Integrand, parke_taylor
from ..kinematics import Mandelstams
from .integral import integrate_terms
from .point import Point
from .vector import Vector, f_values, parke_taylor_values


@dataclass(frozen=True)
class Matrix:
    """A matrix of integrals.

    Attributes
    ----------
    rows, columns : tuple
        What they are: orderings, words or integrands.
    values : tuple of tuples
        Floats, complex numbers, or mpmath numbers with digits.
    errors : tuple of tuples of float
        Bounds on the moduli of the errors.
    """

    rows: tuple[Any, ...]
    columns: tuple[Any, ...]
    values: tuple[tuple[Any, ...], ...]
    errors: tuple[tuple[float, ...], ...]

    def value(self, row: Any, column: Any) -> Any:
        """One entry, by what its row and column are."""
        return self.values[self.rows.index(row)][self.columns.index(column)]

    def error(self, row: Any, column: Any) -> float:
        """The bound on the error of one entry."""
        return self.errors[self.rows.index(row)][self.columns.index(column)]

    def array(self) -> Any:
        """The values as a numpy array (of objects for mpmath numbers)."""
        import numpy as np

        return np.array(self.values)

    def to_dict(self) -> dict[str, Any]:
        """Plain values, numbers as text."""
        return {
            "rows": [_name(row) for row in self.rows],
            "columns": [_name(column) for column in self.columns],
            "values": [[str(value) for value in row] for row in self.values],
            "errors": [[f"{error:.2g}" for error in row] for row in self.errors],
        }


def _name(item: Any) -> str:
    return dotted(item) if isinstance(item, tuple) else str(item)


def _massless(kin: Any) -> Mandelstams:
    if not isinstance(kin, Mandelstams):
        raise InputError("kin", type(kin).__name__, "Mandelstams")
    if kin.string == "closed":
        raise InputError("kin", "closed-string kinematics", "open-string kinematics")
    if not kin.is_massless:
        raise InputError("row_sums", str([str(r) for r in kin.row_sums]), "massless kinematics")
    return kin


def _digits(digits: Any) -> int | None:
    if digits is None:
        return None
    number = read_integer(digits, "digits", "a positive integer or None")
    if number < 1:
        raise InputError("digits", number, "a positive integer or None")
    return number


def point_of(kin: Mandelstams, ordering: Channel) -> Point:
    """The kinematics by positions of an ordering."""
    return Point(kin.n, tuple(kin.pair(ordering[i - 1], ordering[j - 1]) for i, j in pair_order(kin.n)))


def z_matrix(
    kin: Mandelstams,
    orderings: Iterable[Sequence[int]],
    integrands: Iterable[Any],
    digits: int | None = None,
) -> Matrix:
    """``Z_P(f)`` for orderings P (rows) and integrands f (columns), by the KZ engine: one run an ordering.

    Parameters
    ----------
    kin
        Massless kinematics, unless every integrand is given as an Integrand (then each entry is its own run).
    orderings
        Permutations of 1..n.
    integrands
        Permutations Q of 1..n for Parke-Taylor factors PT(Q); or Integrands.
    digits
        Decimal digits; None for double precision.

    Raises
    ------
    InputError, PoleError, NotAvailableError

    Examples
    --------
    >>> kin = Mandelstams.from_planar(4, {(1, 2): "1/2", (2, 3): "1/2"})
    >>> z = z_matrix(kin, [(1, 2, 3, 4)], [(1, 2, 3, 4), (1, 3, 2, 4)])
    >>> print(f"{z.values[0][0]:.10f}")
    3.1415926536
    """
    precision = _digits(digits)
    rows = tuple(read_ordering(order, kin.n, "orderings") for order in orderings)
    columns = tuple(f if isinstance(f, Integrand) else read_ordering(f, kin.n, "integrands") for f in integrands)
    cycles = [column for column in columns if not isinstance(column, Integrand)]
    shared = len(cycles) == len(columns)
    if shared:
        _massless(kin)
    values, errors = [], []
    for order in rows:
        if shared:
            place = {label: k for k, label in enumerate(order, start=1)}
            positions = [tuple(place[label] for label in cycle) for cycle in cycles]
            found = parke_taylor_values(point_of(kin, order), positions, precision)
        else:
            found = _one_by_one(kin, order, columns, precision)
        values.append(found.values)
        errors.append(found.errors)
    return Matrix(rows, columns, tuple(values), tuple(errors))


def _one_by_one(kin: Mandelstams, order: Channel, columns: Sequence[Any], digits: int | None) -> Vector:
    values, errors = [], []
    for column in columns:
        f = column if isinstance(column, Integrand) else parke_taylor(*column)
        terms = DiskIntegral(kin.n, f, order).terms(kin)
        rtol = 1e-10 if digits is None else 10.0**-digits
        result = integrate_terms(kin.n, terms, rtol=rtol, digits=digits)
        values.append(result.value)
        errors.append(result.error)
    return Vector(tuple(values), tuple(errors))


def f_matrix(kin: Mandelstams, rows: Iterable[Sequence[int]] | None = None, digits: int | None = None) -> Matrix:
    """The functions F of the open superstring: ``F_{r,w} -> delta_{r,w}`` as all invariants go to zero.

    Row r is the domain ``(1, r, n-1, n)``, column w the integrand ``prod_k sum_j s_{j w_k} / (z_{w_k} - z_j)`` with j
    over 1 and the letters before w_k; words are permutations of 2..n-2.

    Parameters
    ----------
    kin
        Massless kinematics.
    rows
        Some of the words; None for all of them.
    digits
        Decimal digits; None for double precision.

    Source: Mafra, Schlotterer and Stieberger 2011 (arXiv:1106.2645).

    Examples
    --------
    >>> kin = Mandelstams.from_planar(5, {(1, 2): 2, (2, 3): 3, (3, 4): 5, (4, 5): 7, (1, 5): 11}).scaled("1/100")
    >>> f = f_matrix(kin)
    >>> f.rows
    ((2, 3), (3, 2))
    """
    _massless(kin)
    n = kin.n
    precision = _digits(digits)
    words = tuple(permutations(range(2, n - 1)))
    chosen = words if rows is None else tuple(_word(row, n) for row in rows)
    values, errors = [], []
    for row in chosen:
        order = (1, *row, n - 1, n)
        found = f_values(point_of(kin, order), precision)
        # the word in positions of the domain, back to labels
        by_word = {tuple(order[k - 1] for k in word): place for place, word in enumerate(permutations(range(2, n - 1)))}
        values.append(tuple(found.values[by_word[word]] for word in words))
        errors.append(tuple(found.errors[by_word[word]] for word in words))
    return Matrix(chosen, words, tuple(values), tuple(errors))


def _word(row: Any, n: int) -> Channel:
    word = read_labels(row, n, "rows")
    if sorted(word) != list(range(2, n - 1)):
        raise InputError("rows", repr(word), f"permutations of 2..{n - 2}")
    return word
