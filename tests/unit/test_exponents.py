from __future__ import annotations

import random
from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kn_integrate import DiskExponents, InputError, SphereExponents
from kn_integrate.channels import pair_order
from kn_integrate.exact import Exact


def random_chords(n: int, rng: random.Random) -> dict[tuple[int, int], Exact]:
    chords = [(i, j) for i in range(1, n) for j in range(i + 2, n + 1) if (i, j) != (1, n)]
    return {chord: Exact(Fraction(rng.randint(-30, 30), rng.randint(1, 9))) for chord in chords}


def row(a: DiskExponents | SphereExponents, i: int) -> Exact:
    return sum((a.pair(i, j) for j in range(1, a.n + 1) if j != i), Exact(0))


@settings(deadline=None, max_examples=60)
@given(st.integers(4, 9), st.integers(0, 10**6))
def test_chords_and_pairs_are_inverse_to_each_other(n, seed):
    chords = random_chords(n, random.Random(seed))
    a = DiskExponents.from_chords(n, chords)
    assert a.chord_exponents() == chords
    assert all(row(a, i) == -2 for i in range(1, n + 1))
    assert DiskExponents.from_pairs(n, dict(zip(pair_order(n), a.pairs, strict=True))) == a


@settings(deadline=None, max_examples=60)
@given(st.integers(4, 8), st.integers(0, 10**6))
def test_enough_pairs_in_any_label_order_fix_the_rest(n, seed):
    rng = random.Random(seed)
    a = DiskExponents.from_chords(n, random_chords(n, rng))
    among = [pair for pair in pair_order(n) if pair[1] < n]
    dropped = rng.choice(among)
    given_pairs = {pair if rng.random() < 0.5 else pair[::-1]: a.pair(*pair) for pair in among if pair != dropped}
    assert DiskExponents.from_pairs(n, given_pairs) == a
    assert hash(DiskExponents.from_pairs(n, given_pairs)) == hash(a)


def test_divisor_exponents_by_hand():
    # z_1 < z_2 < z_3 colliding at rate t: t^(A12+A13+A23) t dt = t^(Y - 1) dt
    a = DiskExponents.from_pairs(
        6, {(1, 2): 1, (1, 3): "1/2", (2, 3): 0, (1, 4): 0, (2, 4): 0, (3, 4): 0, (4, 5): 0, (1, 5): 0, (2, 5): 0}
    )
    y = a.chord_exponents()
    assert y[1, 4] == Exact("7/2")
    assert y[1, 3] == 2
    assert len(y) == 9


def test_floats_are_moved_onto_the_row_sums_and_the_move_is_reported():
    exact = DiskExponents.from_chords(5, {c: y / 7 for c, y in random_chords(5, random.Random(1)).items()})
    floats = {pair: float(a) for pair, a in zip(pair_order(5), exact.pairs, strict=True)}
    a = DiskExponents.from_pairs(5, floats)
    assert all(row(a, i) == -2 for i in range(1, 6))
    assert 0 < a.shift < 1e-13
    assert exact.shift == 0
    with pytest.raises(InputError, match="row"):
        DiskExponents.from_pairs(5, {**floats, (1, 2): floats[1, 2] + 1e-3})


def test_to_dict_is_plain():
    a = DiskExponents.from_pairs(4, {(1, 2): "-1/2", (2, 3): "-1/2"})
    assert a.to_dict() == {
        "n": 4,
        "exponents": {"1.2": "-1/2", "1.3": "-1", "1.4": "-1/2", "2.3": "-1/2", "2.4": "-1", "3.4": "-1/2"},
    }


PT = {(1, 2): -1, (2, 3): -1, (3, 4): -1, (1, 4): -1}


def test_sphere_exponents_complete_and_keep_their_powers():
    a = SphereExponents.from_pairs(4, {(2, 1): "1/3", (2, 3): "1/5"}, left=PT, right={(1, 2): -2, (3, 4): -2})
    assert a.left == (-1, 0, -1, -1, 0, -1)
    assert a.right == (-2, 0, 0, 0, 0, -2)
    assert all(row(a, i) == 0 for i in range(1, 5))
    assert a.to_dict()["right"] == {"1.2": -2, "3.4": -2}
    tachyons = SphereExponents.from_pairs(4, {(1, 2): "-1/3", (2, 3): "-1/5"})
    assert tachyons.left == tachyons.right == (0,) * 6
    assert row(tachyons, 3) == -2


@pytest.mark.parametrize(
    ("bad", "match"),
    [
        (lambda: DiskExponents.from_pairs(3, {}), "n"),
        (lambda: DiskExponents.from_pairs(True, {}), "n"),
        (lambda: DiskExponents.from_pairs(4, {(1, 2): 1}), "pair"),
        (lambda: DiskExponents.from_pairs(4, {(1, 2): 1, (3, 4): 1}), "pair"),
        (lambda: DiskExponents.from_pairs(4, {(1, 2): 1, (3, 4): 2, (1, 3): 0}), "exponents"),
        (lambda: DiskExponents.from_pairs(4, {(1, 2): 1, (2, 1): 2}), "1 and 2"),
        (lambda: DiskExponents.from_pairs(4, {(1, 5): 1}), "1 to 4"),
        (lambda: DiskExponents.from_pairs(4, {(1, 1): 1}), "different labels"),
        (lambda: DiskExponents.from_pairs(4, {(1, 2, 3): 1}), "two labels"),
        (lambda: DiskExponents.from_pairs(4, {"12": 1}), "labels"),  # type: ignore[dict-item]
        (lambda: DiskExponents.from_pairs(4, {(1, 2): "x"}), "1.2"),
        (lambda: DiskExponents.from_pairs(4, {(1, 2): float("nan")}), "finite"),
        (lambda: DiskExponents.from_pairs(4, [1]), "mapping"),  # type: ignore[arg-type]
        (lambda: DiskExponents.from_chords(4, {(1, 3): 1}), "nothing for \\(2, 4\\)"),
        (lambda: DiskExponents.from_chords(4, {(1, 3): 1, (2, 4): 1, (1, 2): 1}), "chords of the 4-gon"),
        (lambda: DiskExponents.from_chords(4, {(1, 3): 1, (2, 4): 1, (1, 4): 1}), "chords of the 4-gon"),
        (lambda: DiskExponents(4, (Exact(0),) * 6), "row sum -2"),
        (lambda: DiskExponents(4, (0.5,) * 6), "Exact"),  # type: ignore[arg-type]
        (lambda: SphereExponents.from_pairs(4, {(1, 2): 0, (2, 3): 0}, left=PT), "label 1"),
        (lambda: SphereExponents.from_pairs(4, {(1, 2): 0, (2, 3): 0}, left={(2, 1): 1}, right=PT), "i < j"),
        (lambda: SphereExponents.from_pairs(4, {(1, 2): 0}, left={(1, 2): "1"}), "integer"),  # type: ignore[dict-item]
        (lambda: SphereExponents.from_pairs(4, {(1, 2): 0}, left=PT, right=PT), "pair"),
        (lambda: SphereExponents.from_pairs(4, {(1, 2): 0}, left=3), "mapping"),  # type: ignore[arg-type]
        (lambda: SphereExponents(4, (Exact(0),) * 6, (0,) * 6, (0,) * 6), "row sum -2"),
        (lambda: SphereExponents(4, (Exact(0),) * 6, (0,) * 5, (0,) * 6), "left"),
    ],
)
def test_bad_input_names_what_is_wrong(bad, match):
    with pytest.raises(InputError, match=match):
        bad()
