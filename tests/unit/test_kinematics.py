from __future__ import annotations

import pickle
from decimal import Decimal
from fractions import Fraction
from itertools import permutations

import flint
import mpmath
import numpy as np
import pytest

import kn_integrate as kn
from kn_integrate.channels import is_consecutive, pair_order, planar_channels, read_ordering
from kn_integrate.exact import Exact

FIVE = {(1, 2): "3/10", (2, 3): "2/5", (3, 4): "1/2", (4, 5): "7/20", (5, 1): "9/20"}
POINT = kn.Mandelstams.from_planar(5, FIVE)
ROWS = {
    "massless": 0,
    "tachyons": -2,
    "mixed": [-2, 0, "1/3", 0, -2, "5/7"],
    "massive": ["1/2", 2, 3, "4/5", 5, "1/7"],
}


def rows_of(name, n):
    return ROWS[name][:n] if isinstance(ROWS[name], list) else ROWS[name]


def conserves(kin):
    return all(
        sum((kin.pair(i, j) for j in range(1, kin.n + 1)), Exact(0)) == kin.row_sums[i - 1] for i in range(1, kin.n + 1)
    )


# --- conversions ----------------------------------------------------------------------------------------------------


def test_planar_five_points():
    """s13 = X45 - X12 - X23 and its rotations."""
    x = {key: Fraction(value) for key, value in FIVE.items()}
    assert POINT.pair(1, 3) == x[4, 5] - x[1, 2] - x[2, 3]
    assert POINT.pair(3, 1) == POINT.pair(1, 3)
    assert POINT.pair(2, 5) == x[3, 4] - x[1, 2] - x[5, 1]
    assert POINT.pair(2, 2) == 0
    assert conserves(POINT)


@pytest.mark.parametrize("name", ROWS)
@pytest.mark.parametrize("n", [4, 5, 6])
def test_round_trips_in_every_ordering(n, name):
    rows = rows_of(name, n)
    kin = kn.Mandelstams.random(n, 7, row_sums=rows)
    assert conserves(kin)
    assert kin.is_massless is (name == "massless")
    words = list(permutations(range(2, n + 1)))
    for word in words[:: max(1, len(words) // 12)]:
        order = (*word[:2], 1, *word[2:])
        assert kn.Mandelstams.from_planar(n, kin.planar(order), order, rows) == kin
    pairs = {pair: kin.pair(*pair) for pair in pair_order(n)}
    assert kn.Mandelstams.from_pairs(n, pairs, rows) == kin
    assert kn.Mandelstams.from_pairs(n, {(j, i): v for (i, j), v in pairs.items() if j < n}, rows) == kin
    fewer = [pair for pair in pairs if pair[1] < n][1:]
    assert kn.Mandelstams.from_pairs(n, {pair: pairs[pair] for pair in fewer}, rows) == kin
    chords = {(i, j): kin.channel(range(i, j)) for i in range(1, n) for j in range(i + 2, n + 1) if j - i < n - 1}
    assert kn.Mandelstams.from_chords(n, chords, rows) == kin


@pytest.mark.parametrize("name", ROWS)
def test_channel_and_complement(name):
    kin = kn.Mandelstams.random(6, 3, row_sums=rows_of(name, 6))
    r = kin.row_sums
    assert kin.channel((1, 2)) - kin.channel((3, 4, 5, 6)) == (r[0] + r[1] - r[2] - r[3] - r[4] - r[5]) / 2
    assert kin.channel((2,)) == 0
    assert kin.channel(()) == 0


@pytest.mark.parametrize(
    "value",
    [
        Fraction(3, 8), Decimal("0.375"), "3/8", "0.375", 0.375, 0.375 + 0j, np.float64(0.375), np.float32(0.375),
        mpmath.mpf("0.375"), flint.fmpq(3, 8), Exact(Fraction(3, 8)),
    ],
)  # fmt: skip
def test_every_notation_of_a_number(value):
    kin = kn.Mandelstams.from_planar(4, {(1, 2): value, (2, 3): "1/3"})
    assert kin.pair(1, 2) == Fraction(3, 8)
    assert kin.pair(1, 3) == Fraction(-17, 24)


def test_numpy_labels_and_complex_values():
    labels = np.array([1, 2, 3])
    kin = kn.Mandelstams.from_planar(6, {**POINT6, tuple(labels): "1/7+2j"})
    assert kin.channel(labels) == Exact(Fraction(1, 7), Fraction(2))
    assert not kin.is_real


POINT6 = {c: Fraction(k + 1, 11) for k, c in enumerate(planar_channels((1, 2, 3, 4, 5, 6))) if c != (1, 2, 3)}


# --- floating-point input -------------------------------------------------------------------------------------------


def test_floats_are_projected_once_and_the_shift_is_told():
    rng = np.random.default_rng(5)
    exact = kn.Mandelstams.random(5, rng)
    values = {p: float(exact.pair(*p)) * (1 + 1e-14 * k) for k, p in enumerate(pair_order(5))}
    kin = kn.Mandelstams.from_pairs(5, values)
    assert conserves(kin)
    assert 0 < kin.shift < 1e-12
    assert kin == kn.Mandelstams.from_pairs(5, dict(reversed(values.items())))
    assert all(abs(kin.pair(*p) - values[p]) <= kin.shift for p in values)
    again = kn.Mandelstams.from_pairs(5, {p: kin.pair(*p) for p in values})
    assert again == kin
    assert again.shift == 0


def test_floats_that_miss_by_more_are_refused():
    values = {p: float(POINT.pair(*p)) for p in pair_order(5)}
    values[1, 2] += 1e-6
    with pytest.raises(kn.InputError):
        kn.Mandelstams.from_pairs(5, values)


def test_exact_values_beside_floats_do_not_move():
    values = {p: POINT.pair(*p) for p in pair_order(5)}
    values[1, 2] = float(values[1, 2]) + 1e-13
    kin = kn.Mandelstams.from_pairs(5, values)
    assert kin == POINT


# --- momenta and squares --------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("string", "factor"), [("open", 2), ("closed", Fraction(1, 2))])
def test_momenta(string, factor):
    k = kn.random_momenta(5, 4, 3, masses=[0, 1, "1/2", 0, 0])
    kin = kn.Mandelstams.from_momenta(k, alpha_prime="2/3", string=string, masses=[0, 1, "1/2", 0, 0])
    dot = -k[0][0] * k[1][0] + sum(a * b for a, b in zip(k[0][1:], k[1][1:], strict=True))
    assert kin.pair(1, 2) == factor * Fraction(2, 3) * dot
    assert kin.row_sums == tuple(factor * Fraction(2, 3) * m * m for m in (0, 1, Fraction(1, 2), 0, 0))
    assert kin.string == string
    squares = {}
    for c in planar_channels((1, 2, 3, 4, 5)):
        total = [sum(k[i - 1][m] for i in c) for m in range(4)]
        squares[c] = -(total[0] ** 2) + sum(x * x for x in total[1:])
    again = kn.Mandelstams.from_squares(5, squares, "2/3", [0, 1, "1/2", 0, 0], string)
    assert again == kin
    complement = {tuple({1, 2, 3, 4, 5} - set(c)): v for c, v in squares.items()}
    assert kn.Mandelstams.from_squares(5, complement, "2/3", [0, 1, "1/2", 0, 0], string) == kin


def test_open_and_closed():
    k = kn.random_momenta(4, 5, 2, squared_masses=-1)
    kin = kn.Mandelstams.from_momenta(k, string="open")
    assert kin.row_sums == (-2,) * 4
    assert kin.as_closed() == kn.Mandelstams.from_momenta(k, string="closed")
    assert kin.as_closed().pair(1, 2) == kin.pair(1, 2) / 4
    with pytest.raises(kn.InputError):
        kin.as_closed().as_closed()
    with pytest.raises(kn.InputError) as caught:
        kn.disk_integral(kin.as_closed(), kn.monomial({}))
    assert "as_closed" in str(caught.value)


def test_float_momenta():
    k = kn.random_momenta(5, 4, 9, exact=False)
    kin = kn.Mandelstams.from_momenta(k)
    assert kin.is_massless
    assert conserves(kin)
    with pytest.raises(kn.InputError) as caught:
        kn.Mandelstams.from_momenta(k, masses=1)
    assert "row 1" in caught.value.field
    k[0, 0] += 1
    with pytest.raises(kn.InputError) as caught:
        kn.Mandelstams.from_momenta(k)
    assert caught.value.field == "momenta"


# --- other points ---------------------------------------------------------------------------------------------------


def test_scaled_relabelled_and_value_semantics():
    half = POINT.scaled("1/2")
    assert half.pair(1, 3) == POINT.pair(1, 3) / 2
    with pytest.raises(kn.InputError):
        kn.Mandelstams.random(4, 1, row_sums=-2).scaled(2)
    turned = POINT.relabelled((2, 3, 4, 5, 1))
    assert turned.pair(2, 4) == POINT.pair(1, 3)
    assert turned.relabelled((5, 1, 2, 3, 4)) == POINT
    mixed = kn.Mandelstams.random(4, 1, row_sums=[1, 2, 3, 4]).relabelled((4, 3, 2, 1))
    assert mixed.row_sums == (4, 3, 2, 1)
    assert conserves(mixed)
    assert hash(POINT) == hash(kn.Mandelstams.from_planar(5, FIVE))
    assert half != POINT
    assert pickle.loads(pickle.dumps(POINT)) == POINT
    assert eval(repr(mixed), {"Mandelstams": kn.Mandelstams}) == mixed
    assert mixed.to_dict()["pairs"]["1.2"] == str(mixed.pair(1, 2))
    with pytest.raises(AttributeError):
        POINT.n = 6


def test_random_points_depend_on_the_seed_only():
    assert kn.Mandelstams.random(6, 4) == kn.Mandelstams.random(6, np.random.default_rng(4))
    assert kn.Mandelstams.random(6, 4) != kn.Mandelstams.random(6, 5)
    kin = kn.Mandelstams.random(6, 4, low="1/2", high="3/4")
    assert all(Fraction(1, 2) < x < Fraction(3, 4) for x in kin.planar().values())


# --- bad input ------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("change", "field", "words"),
    [
        ({(1, 3): 1}, "channel 1.3", "s_13"),
        ({(1, 3): 1}, "channel 1.3", "X_1,3"),
        ({(1, 1): 1}, "channel (1, 1)", "different labels"),
        ({(1, 6): 1}, "channel (1, 6)", "from 1 to 5"),
        ({(0, 1): 1}, "channel (0, 1)", "from 1 to 5"),
        ({(1,): 1}, "channel 1", "between 2 and 3"),
        ({(1, 2, 3, 4): 1}, "channel 1.2.3.4", "between 2 and 3"),
        ({"12": 1}, "channel '12'", "different labels"),
        ({(1, 2.5): 1}, "channel (1, 2.5)", "different labels"),
        ({(3, 4, 5): "1/7"}, "channel 1.2", "one value"),
        ({(1, 2): True}, "X_1.2", ""),
        ({(1, 2): float("nan")}, "X_1.2", ""),
        ({(1, 2): float("inf")}, "X_1.2", ""),
        ({(1, 2): "1/0"}, "X_1.2", ""),
        ({(1, 2): "one"}, "X_1.2", ""),
        ({(1, 2): None}, "X_1.2", ""),
        ({(1, 2): "3//4"}, "X_1.2", ""),
    ],
)
def test_bad_channels(change, field, words):
    with pytest.raises(kn.InputError) as caught:
        kn.Mandelstams.from_planar(5, {**FIVE, **change})
    assert caught.value.field == field
    assert words in caught.value.expected


def test_missing_and_repeated_channels():
    fewer = {key: v for key, v in FIVE.items() if key != (3, 4)}
    with pytest.raises(kn.InputError) as caught:
        kn.Mandelstams.from_planar(5, fewer)
    assert "3.4" in caught.value.found
    assert kn.Mandelstams.from_planar(5, {**fewer, (5, 1, 2): "1/2"}) == POINT  # the complement, massless legs
    assert kn.Mandelstams.from_planar(5, {**FIVE, (3, 5, 4): "3/10", (2, 1): 0.3 + 1e-16}) == POINT
    with pytest.raises(kn.InputError) as caught:
        kn.Mandelstams.from_planar(5, {**fewer, (5, 1, 2): "1/2"}, row_sums=-2)
    assert "complement" in caught.value.found


@pytest.mark.parametrize("n", [3, 0, -1, True, 4.5, "5", None])
def test_bad_n(n):
    with pytest.raises(kn.InputError) as caught:
        kn.Mandelstams.from_planar(n, {})
    assert caught.value.field == "n"


@pytest.mark.parametrize("ordering", [(1, 2, 3), (1, 2, 3, 4, 4), (0, 1, 2, 3, 4), "12345", 5, (1, 2, 3, 4, 6)])
def test_bad_orderings(ordering):
    with pytest.raises(kn.InputError) as caught:
        kn.Mandelstams.from_planar(5, FIVE, ordering)
    assert caught.value.field == "ordering"


@pytest.mark.parametrize("row_sums", [(0, 0, 0, 0), True, "zero", [0, 0, 0, 0, float("nan")]])
def test_bad_row_sums(row_sums):
    with pytest.raises(kn.InputError) as caught:
        kn.Mandelstams.from_planar(5, FIVE, row_sums=row_sums)
    assert caught.value.field.startswith("row_sums")


def test_pairs_that_contradict_or_do_not_suffice():
    pairs = {p: POINT.pair(*p) for p in pair_order(5)}
    with pytest.raises(kn.InputError) as caught:
        kn.Mandelstams.from_pairs(5, {**pairs, (1, 2): "1/3"})
    assert caught.value.field == "row_sums"
    assert "row 1" in caught.value.found
    with pytest.raises(kn.InputError) as caught:
        kn.Mandelstams.from_pairs(5, {p: pairs[p] for p in list(pairs)[:4]})
    assert "enough pairs" in caught.value.expected
    with pytest.raises(kn.InputError):
        kn.Mandelstams.from_pairs(5, {**pairs, (2, 1): "1/3"})
    with pytest.raises(kn.InputError):
        kn.Mandelstams.from_pairs(5, {**pairs, (1, 2, 3): "1/3"})
    with pytest.raises(kn.InputError):
        kn.Mandelstams.from_pairs(5, [1, 2])
    with pytest.raises(kn.InputError):
        kn.Mandelstams.from_pairs(5, pairs, string="heterotic")


@pytest.mark.parametrize("call", [lambda: POINT.pair(1, 6), lambda: POINT.pair(0, 0), lambda: POINT.channel((1, 1))])
def test_bad_questions(call):
    with pytest.raises(kn.InputError):
        call()


def test_bad_chords():
    for chord in ((1, 2), (1, 5), (1, 6)):
        with pytest.raises(kn.InputError):
            kn.Mandelstams.from_chords(5, {chord: 1})


def test_orderings_and_channels():
    assert read_ordering(None, 4) == (1, 2, 3, 4)
    for n in (4, 5, 6, 7):
        found = planar_channels(tuple(range(1, n + 1)))
        assert len(found) == len(set(found)) == n * (n - 3) // 2
        assert all(is_consecutive(frozenset(c), tuple(range(1, n + 1))) for c in found)
