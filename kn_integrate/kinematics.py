"""Kinematic points: the invariants of n legs, exact, conserved, and with their row sums declared.

Everything is dimensionless: ``s_ij = 2 alpha' k_i.k_j`` for open strings and ``(alpha'/2) k_i.k_j`` for closed ones,
metric mostly plus.  Row sums ``R_i = sum_j s_ij`` are 0 for massless legs and -2 for tachyons; in general
``2 alpha' m_i^2`` (open) or ``(alpha'/2) m_i^2`` (closed).
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any

from .channels import (
    Channel,
    Pair,
    canonical,
    dotted,
    pair_index,
    pair_order,
    planar_channels,
    read_count,
    read_labels,
    read_ordering,
    read_pair,
)
from .conservation import SLACK, completed
from .errors import InputError
from .exact import ZERO, Exact, read, read_integer
from .momenta import momentum_products
from .planar import pairs_of_planar, planar_key, row_difference

STRINGS = ("open", "closed")


@dataclass(frozen=True)
class Mandelstams:
    """The invariants ``s_ij`` of n legs.

    Build one with ``from_planar``, ``from_chords``, ``from_pairs``, ``from_squares``, ``from_momenta`` or ``random``.

    Attributes
    ----------
    n : int
    pairs : tuple of Exact
        ``s_ij`` in the order (1,2), (1,3), ..., (n-1,n).
    row_sums : tuple of Exact
        ``R_i = sum_j s_ij``.
    string : str | None
        ``"open"``, ``"closed"``, or None when the caller did not say.
    shift : float
        The largest change that floating-point input needed to conserve exactly (0 for exact input).

    Examples
    --------
    >>> kin = Mandelstams.from_planar(5, {(1,2): "3/10", (2,3): "2/5", (3,4): "1/2", (4,5): "7/20", (5,1): "9/20"})
    >>> kin.pair(1, 3), kin.channel((1, 2, 3))
    (Exact('-7/20'), Exact('7/20'))
    """

    n: int
    pairs: tuple[Exact, ...]
    row_sums: tuple[Exact, ...]
    string: str | None = None
    shift: float = field(default=0.0, compare=False)

    # --- constructors -----------------------------------------------------------------------------------------------

    @classmethod
    def from_pairs(cls, n: int, pairs: Mapping[Any, Any], row_sums: Any = 0, string: str | None = None) -> Mandelstams:
        """From ``{(i, j): s_ij}``: all pairs, or enough of them to fix the rest by conservation.

        Parameters
        ----------
        n
            Number of legs, at least 4.
        pairs
            Labels in any order; a pair given twice must agree.
        row_sums
            R_i: one value, or n of them.
        string
            ``"open"``, ``"closed"`` or None.

        Raises
        ------
        InputError
            For labels, values, missing pairs, or values that do not conserve.  Floating-point input may miss
            conservation by 1e-10 of the largest value; it is then projected (least squares) and ``shift`` reports it.
        """
        n = read_count(n)
        rows = _row_sums(row_sums, n)
        given: dict[Pair, tuple[Exact, bool]] = {}
        for labels, raw in _items(pairs, "pairs"):
            pair = read_pair(labels, n, f"pairs, key {labels!r}")
            value = read(raw, f"s_{dotted(pair)}")
            if pair in given and given[pair][0] != value[0]:
                raise InputError(f"s_{dotted(pair)}", f"{given[pair][0]} and {value[0]}", "one value")
            given[pair] = value
        values, shift = completed(n, given, rows)
        return cls(n, values, rows, _string(string), shift)

    @classmethod
    def from_planar(
        cls,
        n: int,
        channels: Mapping[Any, Any],
        ordering: Sequence[int] | None = None,
        row_sums: Any = 0,
        string: str | None = None,
    ) -> Mandelstams:
        """From ``{labels: X}``, the n(n-3)/2 planar invariants ``X = sum of s over the pairs inside``.

        Parameters
        ----------
        n
            Number of legs.
        channels
            The key is the tuple of *all* labels of the channel.  With massless legs the complement (the side with
            more labels) may be given instead; a channel given twice must agree.
        ordering
            The ordering in which the channels are planar; 1..n when None.
        row_sums, string
            As for :meth:`from_pairs`.

        Raises
        ------
        InputError
            For a key that is no planar channel, a missing one, or contradictory values.
        """
        n = read_count(n)
        order = read_ordering(ordering, n)
        rows = _row_sums(row_sums, n)
        massless = not any(rows)
        found: dict[Channel, tuple[Exact, bool]] = {}
        for labels, raw in _items(channels, "channels"):
            name = planar_key(labels, n, order)
            proper = canonical(name, order)
            if proper != name and not massless and 2 * len(name) != n:
                raise InputError(
                    f"channel {dotted(name)}",
                    "the complement of a channel, with legs that are not massless",
                    f"{dotted(proper)} (X of a channel and of its complement differ by row sums)",
                )
            value, rounded = read(raw, f"X_{dotted(name)}")
            if proper != name and not massless:  # half of the legs: neither side is the complement of the other
                value = value - row_difference(name, proper, rows)
            if proper in found:
                other, other_rounded = found[proper]
                slack = SLACK * max(abs(value), abs(other)) if rounded or other_rounded else 0.0
                if other != value and not abs(other - value) <= slack:
                    raise InputError(f"channel {dotted(proper)}", f"{other} and {value}", "one value")
                continue
            found[proper] = (value, rounded)
        missing = [c for c in planar_channels(order) if c not in found]
        if missing:
            raise InputError(
                "channels",
                f"no value for {', '.join(map(dotted, missing))}",
                f"all n(n-3)/2 = {n * (n - 3) // 2} planar channels of {dotted(order)}",
            )
        return cls(n, pairs_of_planar(n, order, {c: v for c, (v, _) in found.items()}, rows), rows, _string(string))

    @classmethod
    def from_chords(
        cls, n: int, chords: Mapping[Any, Any], row_sums: Any = 0, string: str | None = None
    ) -> Mandelstams:
        """From ``{(i, j): X}``, chords of the n-gon: (i, j) separates the labels i..j-1 from the rest.

        >>> Mandelstams.from_chords(4, {(1, 3): "1/2", (2, 4): "1/3"}).pair(1, 2)
        Exact('1/2')
        """
        n = read_count(n)
        rows = _row_sums(row_sums, n)
        channels: dict[Channel, Any] = {}
        order = tuple(range(1, n + 1))
        for labels, raw in _items(chords, "chords"):
            i, j = read_pair(labels, n, f"chords, key {labels!r}")
            if j - i in (1, n - 1):
                raise InputError(f"chord {labels!r}", "a side of the polygon", "two corners that are not neighbours")
            inside = tuple(range(i, j))
            proper = canonical(inside, order)
            value = read(raw, f"chord {labels!r}")[0]
            if proper != inside:
                value = value - row_difference(inside, proper, rows)
            if channels.setdefault(proper, value) != value:
                raise InputError(f"chord {labels!r}", f"{channels[proper]} and {value}", "one value")
        return cls.from_planar(n, channels, None, rows, string)

    @classmethod
    def from_squares(
        cls,
        n: int,
        squares: Mapping[Any, Any],
        alpha_prime: Any = 1,
        masses: Any = 0,
        string: str = "open",
        ordering: Sequence[int] | None = None,
        squared_masses: Any = None,
    ) -> Mandelstams:
        """From ``{labels: (sum of k)^2}`` in planar channels, metric mostly plus.

        Parameters
        ----------
        n, squares, ordering
            As for :meth:`from_planar`, with ``(sum k)^2 = -(invariant mass)^2`` in place of X.  Either of a channel
            and its complement may be given, they have the same square.
        alpha_prime
            The inverse string tension, in units that make ``alpha' (sum k)^2`` a number.
        masses
            m_i, one or n of them (``"1j"`` is a tachyon with ``m^2 = -1``).
        string
            ``"open"``: ``s_ij = 2 alpha' k_i.k_j``; ``"closed"``: ``s_ij = (alpha'/2) k_i.k_j``.
        squared_masses
            m_i^2 instead of ``masses``, for masses that are no exact numbers.
        """
        n = read_count(n)
        order = read_ordering(ordering, n)
        factor = _coupling(alpha_prime, string) / 2  # 2 k.k times this
        if squared_masses is not None:
            mass_squares = _values(squared_masses, n, "squared_masses")
        else:
            mass_squares = tuple(m * m for m in _values(masses, n, "masses"))
        rows = tuple(2 * factor * m for m in mass_squares)
        channels: dict[Channel, Any] = {}
        for labels, raw in _items(squares, "squares"):
            name = canonical(planar_key(labels, n, order), order)
            inside = sum((mass_squares[label - 1] for label in name), ZERO)
            value = factor * (read(raw, f"square of {dotted(name)}")[0] + inside)
            if channels.setdefault(name, value) != value:
                raise InputError(f"square of {dotted(name)}", f"{channels[name]} and {value}", "one value")
        return cls.from_planar(n, channels, order, rows, string)

    @classmethod
    def from_momenta(cls, momenta: Any, alpha_prime: Any = 1, string: str = "open", masses: Any = None) -> Mandelstams:
        """From an (n, D) array of momenta, all incoming, energy first, metric mostly plus.

        Parameters
        ----------
        momenta
            Exact numbers or floats.  They must add up to zero: exactly, or within 1e-10 for floats.
        alpha_prime, string
            See :meth:`from_squares`.
        masses
            m_i that the momenta must have (within 1e-10 for floats); None takes them from the momenta, and rounds
            floating-point row sums to the integer next to them (no integrand is covariant at any other).
        """
        coupling = _coupling(alpha_prime, string)
        products, rounded = momentum_products(momenta)
        n = read_count(len(products))
        scale = max(abs(value) for row in products for value in row)
        rows = []
        declared = None if masses is None else [m * m for m in _values(masses, n, "masses")]
        for i in range(n):
            row = -(coupling * products[i][i])
            if declared is not None:
                wanted = coupling * declared[i]
                if row != wanted and not (rounded and abs(row - wanted) <= SLACK * abs(coupling) * max(scale, 1e-300)):
                    raise InputError(f"momenta, row {i + 1}", f"mass squared {-products[i][i]}", f"{declared[i]}")
                row = wanted
            elif rounded and row.is_real:
                nearest = round(row.re)
                if abs(row - nearest) <= SLACK * max(abs(coupling) * scale, 1.0):
                    row = Exact(nearest)
            rows.append(row)
        given = {(i + 1, j + 1): (coupling * products[i][j], rounded) for i in range(n) for j in range(i + 1, n)}
        values, shift = completed(n, given, rows, "momenta")
        return cls(n, values, tuple(rows), _string(string), shift)

    @classmethod
    def random(
        cls,
        n: int,
        rng: Any = None,
        low: Any = -1,
        high: Any = 1,
        row_sums: Any = 0,
        ordering: Sequence[int] | None = None,
        denominator: int = 1000,
        string: str | None = None,
    ) -> Mandelstams:
        """A generic point: every planar invariant an exact multiple of ``1/denominator`` between low and high.

        Parameters
        ----------
        rng
            ``numpy.random.Generator``, or a seed for one.
        """
        n = read_count(n)
        generator = _generator(rng)
        ends = [read(value, name)[0] for value, name in ((low, "low"), (high, "high"))]
        if not all(end.is_real for end in ends) or not ends[0] < ends[1]:
            raise InputError("low, high", f"{low}, {high}", "two real numbers, low < high")
        first, last = (int(end.re * denominator) for end in ends)
        order = read_ordering(ordering, n)
        channels = {
            c: Fraction(int(generator.integers(first + 1, max(last, first + 2))), denominator)
            for c in planar_channels(order)
        }
        return cls.from_planar(n, channels, order, row_sums, string)

    # --- questions --------------------------------------------------------------------------------------------------

    def pair(self, i: int, j: int) -> Exact:
        """``s_ij``, labels in either order; 0 for i = j."""
        try:
            return self.pairs[pair_index(self.n)[i, j]]
        except (KeyError, TypeError):
            if isinstance(i, int) and i == j and 1 <= i <= self.n:
                return ZERO
            raise InputError("pair", f"({i}, {j})", f"two labels from 1 to {self.n}") from None

    def channel(self, labels: Iterable[int]) -> Exact:
        """``X = sum of s_ab over the pairs a < b inside`` a set of labels."""
        inside = sorted(read_labels(labels, self.n, "channel"))
        index = pair_index(self.n)
        total = ZERO
        for k, a in enumerate(inside):
            for b in inside[k + 1 :]:
                total = total + self.pairs[index[a, b]]
        return total

    def planar(self, ordering: Sequence[int] | None = None) -> dict[Channel, Exact]:
        """The n(n-3)/2 planar invariants of an ordering, by the labels of their channels."""
        return {c: self.channel(c) for c in planar_channels(read_ordering(ordering, self.n))}

    @property
    def is_massless(self) -> bool:
        """True when all row sums are zero."""
        return not any(self.row_sums)

    @property
    def is_real(self) -> bool:
        """True when all invariants are real."""
        return all(value.is_real for value in self.pairs)

    # --- other points -----------------------------------------------------------------------------------------------

    def scaled(self, x: Any) -> Mandelstams:
        """All invariants times x; massless legs only (masses do not scale).

        >>> Mandelstams.from_planar(4, {(1, 2): 1, (2, 3): 2}).scaled("1/10").pair(1, 2)
        Exact('1/10')
        """
        factor = read(x, "x")[0]
        if not self.is_massless:
            raise InputError("row_sums", self._rows_text(), "zero: only massless kinematics can be scaled")
        return Mandelstams(self.n, tuple(factor * value for value in self.pairs), self.row_sums, self.string)

    def as_closed(self) -> Mandelstams:
        """The same momenta and alpha' for a closed string: every invariant and row sum divided by 4."""
        if self.string == "closed":
            raise InputError("string", "closed", "open-string kinematics")
        quarter = Fraction(1, 4)
        return Mandelstams(
            self.n,
            tuple(quarter * value for value in self.pairs),
            tuple(quarter * row for row in self.row_sums),
            "closed",
        )

    def relabelled(self, new_labels: Sequence[int]) -> Mandelstams:
        """The same point with leg i called ``new_labels[i-1]``."""
        names = read_ordering(new_labels, self.n, "new_labels")
        index = pair_index(self.n)
        values = [ZERO] * len(self.pairs)
        for (i, j), value in zip(pair_order(self.n), self.pairs, strict=True):
            values[index[names[i - 1], names[j - 1]]] = value
        rows = [ZERO] * self.n
        for i, row in enumerate(self.row_sums):
            rows[names[i] - 1] = row
        return Mandelstams(self.n, tuple(values), tuple(rows), self.string, self.shift)

    def with_pairs(self, pairs: Mapping[Pair, Exact]) -> Mandelstams:
        """The same legs with other pair values (all of them, conserving exactly)."""
        return Mandelstams.from_pairs(self.n, pairs, self.row_sums, self.string)

    def moved(self, direction: Mandelstams, by: Any) -> Mandelstams:
        """The point ``self + by * direction``: pair by pair, row sums included."""
        if not isinstance(direction, Mandelstams) or direction.n != self.n:
            raise InputError("direction", repr(direction), f"kinematics of {self.n} legs")
        h = read(by, "by")[0]
        return Mandelstams(
            self.n,
            tuple(a + h * b for a, b in zip(self.pairs, direction.pairs, strict=True)),
            tuple(a + h * b for a, b in zip(self.row_sums, direction.row_sums, strict=True)),
            self.string,
        )

    def _rows_text(self) -> str:
        return "(" + ", ".join(map(str, self.row_sums)) + ")"

    def to_dict(self) -> dict[str, Any]:
        """Plain values: ``{"n", "pairs": {"1.2": text}, "row_sums": [text], "string", "shift"}``."""
        return {
            "n": self.n,
            "pairs": {dotted(p): str(v) for p, v in zip(pair_order(self.n), self.pairs, strict=True)},
            "row_sums": [str(row) for row in self.row_sums],
            "string": self.string,
            "shift": self.shift,
        }

    def __repr__(self) -> str:
        inside = ", ".join(f"({i}, {j}): '{v}'" for (i, j), v in zip(pair_order(self.n), self.pairs, strict=True))
        rows = "" if self.is_massless else ", row_sums=[" + ", ".join(f"'{r}'" for r in self.row_sums) + "]"
        tag = "" if self.string is None else f", string={self.string!r}"
        return f"Mandelstams.from_pairs({self.n}, {{{inside}}}{rows}{tag})"


def _items(mapping: Any, name: str) -> Iterable[tuple[Any, Any]]:
    if not isinstance(mapping, Mapping):
        raise InputError(name, type(mapping).__name__, "a mapping from labels to values")
    return mapping.items()


def _values(raw: Any, n: int, name: str) -> tuple[Exact, ...]:
    """One value for all legs, or n of them."""
    is_one = isinstance(raw, (str, bytes)) or not hasattr(raw, "__iter__")
    if is_one:
        return (read(raw, name)[0],) * n
    items = list(raw)
    if len(items) != n:
        raise InputError(name, f"{len(items)} values", f"one value, or {n}")
    return tuple(read(item, f"{name}, entry {k}")[0] for k, item in enumerate(items, start=1))


def _row_sums(raw: Any, n: int) -> tuple[Exact, ...]:
    return _values(raw, n, "row_sums")


def _string(string: Any) -> str | None:
    if string is not None and string not in STRINGS:
        raise InputError("string", repr(string), "'open', 'closed' or None")
    return None if string is None else str(string)


def _coupling(alpha_prime: Any, string: Any) -> Exact:
    """``s_ij / (k_i.k_j)``: 2 alpha' or alpha'/2."""
    value = read(alpha_prime, "alpha_prime")[0]
    if not value.is_real or not value > 0:
        raise InputError("alpha_prime", str(alpha_prime), "a positive number")
    if string not in STRINGS:
        raise InputError("string", repr(string), "'open' or 'closed'")
    scaled: Exact = 2 * value if string == "open" else value / 2
    return scaled


def _generator(rng: Any) -> Any:
    if hasattr(rng, "integers"):
        return rng
    import numpy as np

    if rng is not None:
        rng = read_integer(rng, "rng", "a numpy random Generator, a seed, or None")
    return np.random.default_rng(rng)
