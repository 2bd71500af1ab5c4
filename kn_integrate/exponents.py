"""The absolute-value form: integrals given by a matrix of exponents instead of kinematics and an integrand.

Disk: ``int prod |z_ij|^{A_ij}`` over ``z_1 < ... < z_n`` modulo SL(2,R), row sums of A equal to -2.  Sphere:
``int prod |z_ij|^{2 s_ij} z_ij^{p_ij} conj(z_ij)^{q_ij}`` with integers p, q, row sums of s + p and of s + q equal to
-2.  The row sums are what Moebius invariance of the measure asks for.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import cache
from typing import Any

from .channels import Pair, dotted, pair_index, pair_order, read_count, read_pair
from .conservation import completed
from .errors import InputError
from .exact import ZERO, Exact, Number, read, read_integer
from .ratios import shown


def _read_pairs(n: int, given: Any, field: str) -> dict[Pair, tuple[Exact, bool]]:
    """Values by ordered pair, each with whether it came as a float."""
    if not isinstance(given, Mapping):
        raise InputError(field, shown(given), "a mapping {(i, j): number}")
    found: dict[Pair, tuple[Exact, bool]] = {}
    for key, raw in given.items():
        pair = read_pair(key, n, field)
        value = read(raw, f"{field} {dotted(pair)}")
        if found.setdefault(pair, value)[0] != value[0]:
            expected = "one value, or the same one again"
            raise InputError(f"{field} {dotted(pair)}", f"{found[pair][0]} and {value[0]}", expected)
    return found


@dataclass(frozen=True)
class DiskExponents:
    """Exponents A of ``int prod |z_ij|^{A_ij}`` over ``z_1 < ... < z_n``; made by its class methods.

    Attributes
    ----------
    n : int
        Number of punctures.
    pairs : tuple[Exact, ...]
        In the order (1,2), (1,3), ..., (1,n), (2,3), ..., (n-1,n); every row sums to -2.
    shift : float
        The largest change that floating-point input needed to meet the row sums exactly (0 for exact input).
    """

    n: int
    pairs: tuple[Exact, ...]
    shift: float = field(default=0.0, compare=False)

    def __post_init__(self) -> None:
        n = read_count(self.n)
        if len(self.pairs) != len(pair_order(n)) or not all(isinstance(a, Exact) for a in self.pairs):
            raise InputError("pairs", shown(self.pairs), f"{len(pair_order(n))} Exact numbers; or use from_pairs")
        for i in range(1, n + 1):
            total = sum((self.pair(i, j) for j in range(1, n + 1) if j != i), ZERO)
            if total != -2:
                raise InputError(f"exponents, label {i}", f"a sum of {total}", "the row sum -2")

    @classmethod
    def from_pairs(cls, n: int, exponents: Mapping[tuple[int, int], Number]) -> DiskExponents:
        """From exponents of pairs in any label order: all of them, or enough to fix the rest by the row sums -2.

        Raises
        ------
        InputError
            For bad labels or numbers, pairs that are not fixed, and rows that do not sum to -2.

        Examples
        --------
        >>> a = DiskExponents.from_pairs(4, {(1, 2): "-1/2", (2, 3): "-1/2"})  # int_0^1 dz (z (1-z))^(-1/2) = pi
        >>> [str(x) for x in a.pairs]
        ['-1/2', '-1', '-1/2', '-1/2', '-1', '-1/2']
        """
        points = read_count(n)
        given = _read_pairs(points, exponents, "exponents")
        pairs, shift = completed(points, given, [Exact(-2)] * points, "exponents")
        return cls(points, pairs, shift)

    @classmethod
    def from_chords(cls, n: int, exponents: Mapping[tuple[int, int], Number]) -> DiskExponents:
        """From the exponents Y at the boundary divisors.

        Parameters
        ----------
        exponents
            ``{(i, j): Y}`` for every chord of the n-gon, n(n-3)/2 of them: chord (i, j) separates the labels i..j-1
            from the rest, and near its divisor the integrand is ``t^{Y - 1} dt``.

        Raises
        ------
        InputError
            For keys that are no chords, chords that are missing, and bad numbers.

        Examples
        --------
        >>> a = DiskExponents.from_chords(4, {(1, 3): "1/2", (2, 4): "1/3"})
        >>> {c: str(y) for c, y in a.chord_exponents().items()}
        {(1, 3): '1/2', (2, 4): '1/3'}
        """
        points = read_count(n)
        given = {chord: value for chord, (value, _) in _read_pairs(points, exponents, "chords").items()}
        chords = _chords(points)
        for chord in given:
            if chord not in chords:
                raise InputError("chords", f"the key {chord}", f"chords of the {points}-gon, such as {chords[:2]}")
        absent = [chord for chord in chords if chord not in given]
        if absent:
            raise InputError("chords", f"nothing for {absent[0]}", f"all {len(chords)} chords of the {points}-gon")
        # sum of the exponents inside the cluster of labels i..j-1; the whole side (1, n) has Y = 0
        inside: dict[Pair, Exact] = {chord: given[chord] - (chord[1] - chord[0] - 1) for chord in chords}
        inside[1, points] = Exact(2 - points)

        def cluster(i: int, j: int) -> Exact:
            return inside.get((i, j), ZERO)

        pairs = {}
        for i in range(1, points - 1):
            for j in range(i + 1, points):
                pairs[i, j] = cluster(i, j + 1) - cluster(i + 1, j + 1) - cluster(i, j) + cluster(i + 1, j)
        marked = {pair: (value, False) for pair, value in pairs.items()}
        return cls(points, completed(points, marked, [Exact(-2)] * points, "chords")[0])

    def pair(self, i: int, j: int) -> Exact:
        """The exponent of ``|z_ij|``."""
        return self.pairs[pair_index(self.n)[i, j]]

    def chord_exponents(self) -> dict[tuple[int, int], Exact]:
        """The divisor exponent ``Y = sum of exponents inside + size - 1`` of every chord (i, j): labels i..j-1."""
        found = {}
        for i, j in _chords(self.n):
            inside = (self.pair(a, b) for a in range(i, j - 1) for b in range(a + 1, j))
            found[i, j] = sum(inside, ZERO) + (j - i - 1)
        return found

    def to_dict(self) -> dict[str, Any]:
        """Plain data: ``{"n": 4, "exponents": {"1.2": "-1/2", ...}}``."""
        values = {f"{i}.{j}": str(a) for (i, j), a in zip(pair_order(self.n), self.pairs, strict=True)}
        return {"n": self.n, "exponents": values}


@cache
def _chords(n: int) -> tuple[Pair, ...]:
    return tuple((i, j) for i in range(1, n) for j in range(i + 2, n + 1) if (i, j) != (1, n))


@dataclass(frozen=True)
class SphereExponents:
    """Exponents of ``int prod |z_ij|^{2 s_ij} z_ij^{left} conj(z_ij)^{right}``; made by :meth:`from_pairs`.

    Attributes
    ----------
    n : int
        Number of punctures.
    pairs : tuple[Exact, ...]
        s in the order (1,2), (1,3), ..., (n-1,n).
    left, right : tuple[int, ...]
        Powers of ``z_ij`` and of its conjugate, i < j, same order.  Rows of s + left and of s + right are -2.
    shift : float
        The largest change that floating-point input needed to meet the row sums exactly (0 for exact input).
    """

    n: int
    pairs: tuple[Exact, ...]
    left: tuple[int, ...]
    right: tuple[int, ...]
    shift: float = field(default=0.0, compare=False)

    def __post_init__(self) -> None:
        n = read_count(self.n)
        size = len(pair_order(n))
        if len(self.pairs) != size or not all(isinstance(s, Exact) for s in self.pairs):
            raise InputError("pairs", shown(self.pairs), f"{size} Exact numbers; or use from_pairs")
        for name, powers in (("left", self.left), ("right", self.right)):
            if len(powers) != size or not all(type(k) is int for k in powers):
                raise InputError(name, shown(powers), f"{size} integers; or use from_pairs")
            for i, total in enumerate(_rows(n, powers), start=1):
                row = sum((self.pairs[pair_index(n)[i, j]] for j in range(1, n + 1) if j != i), ZERO) + total
                if row != -2:
                    raise InputError(f"exponents + {name}, label {i}", f"a sum of {row}", "the row sum -2")

    @classmethod
    def from_pairs(
        cls,
        n: int,
        exponents: Mapping[tuple[int, int], Number],
        left: Mapping[tuple[int, int], int] | None = None,
        right: Mapping[tuple[int, int], int] | None = None,
    ) -> SphereExponents:
        """From exponents s of pairs (all, or enough to fix the rest) and integer powers, zero where not given.

        The pairs of ``left`` and ``right`` have i < j, because ``z_ji = -z_ij`` would hide a sign in the order.

        Raises
        ------
        InputError
            For bad labels or numbers, pairs that are not fixed, rows that do not sum to -2.

        Examples
        --------
        >>> PT = {(1, 2): -1, (2, 3): -1, (3, 4): -1, (1, 4): -1}
        >>> a = SphereExponents.from_pairs(4, {(1, 2): "1/3", (2, 3): "1/5", (3, 4): "1/3"}, left=PT, right=PT)
        >>> str(a.pairs[1])
        '-8/15'
        """
        points = read_count(n)
        powers = [_read_powers(points, given, name) for given, name in ((left, "left"), (right, "right"))]
        rows = [_rows(points, each) for each in powers]
        for i, (a, b) in enumerate(zip(*rows, strict=True), start=1):
            if a != b:
                found = f"left powers of label {i} that sum to {a}, right ones to {b}"
                raise InputError(f"left, right, label {i}", found, "equal sums, since exponents + each have row sum -2")
        given = _read_pairs(points, exponents, "exponents")
        pairs, shift = completed(points, given, [Exact(-2 - k) for k in rows[0]], "exponents")
        return cls(points, pairs, powers[0], powers[1], shift)

    def pair(self, i: int, j: int) -> Exact:
        """The exponent s_ij."""
        return self.pairs[pair_index(self.n)[i, j]]

    def to_dict(self) -> dict[str, Any]:
        """Plain data: exponents as texts, non-zero powers as integers, by pairs such as ``"1.2"``."""
        order = pair_order(self.n)
        named: dict[str, Any] = {"n": self.n}
        named["exponents"] = {f"{i}.{j}": str(a) for (i, j), a in zip(order, self.pairs, strict=True)}
        for name, powers in (("left", self.left), ("right", self.right)):
            named[name] = {f"{i}.{j}": k for (i, j), k in zip(order, powers, strict=True) if k}
        return named


def _rows(n: int, powers: Sequence[int]) -> list[int]:
    index = pair_index(n)
    return [sum(powers[index[i, j]] for j in range(1, n + 1) if j != i) for i in range(1, n + 1)]


def _read_powers(n: int, given: Any, field: str) -> tuple[int, ...]:
    powers = [0] * len(pair_order(n))
    if given is None:
        return tuple(powers)
    if not isinstance(given, Mapping):
        raise InputError(field, shown(given), "a mapping {(i, j): integer}")
    for key, raw in given.items():
        pair = read_pair(key, n, field)
        if tuple(key) != pair:
            raise InputError(field, f"the key {shown(key)}", "labels i < j")
        powers[pair_index(n)[pair]] = read_integer(raw, f"{field} {dotted(pair)}")
    return tuple(powers)
