"""An integral that does not change when the order of the punctures is reversed needs one sector of each pair."""

from __future__ import annotations

import numpy as np
import pytest

import kn_integrate.disk.run as disk_run
from kn_integrate.closed_forms import Selberg
from kn_integrate.disk.chords import chord_data
from kn_integrate.disk.evaluate import integrate
from kn_integrate.disk.plan import initial_choices, layout_of
from kn_integrate.disk.sectors import mirror, sector_table


def selberg(n, a, b):
    form = Selberg(n - 3, a, b, "0.23")
    return chord_data(n, tuple(form.pairs().flat)), float(form.value(25))


@pytest.mark.parametrize("n", [4, 5, 6, 7, 8])
def test_mirror_is_an_involution_that_keeps_chords(n):
    partner, place = mirror(n)
    table = sector_table(n)
    assert (partner[partner] == np.arange(table.count)).all()
    back = np.take_along_axis(place[partner], place, axis=1)
    assert (back == np.arange(n - 3)).all()
    sizes = table.sizes()
    mirrored = np.take_along_axis(table.variables[partner], place, axis=1)
    assert (sizes[mirrored] == sizes[table.variables]).all()


@pytest.mark.parametrize(("a", "families"), [("0.37", {"radau"}), ("-0.63", None)])
def test_half_of_the_points_give_the_same(a, families, monkeypatch):
    data, truth = selberg(8, a, a)
    assert data.is_symmetric
    layout = layout_of(8, initial_choices(data, 9.0, budget_digits=12.0))
    half = disk_run.run(data, layout)
    assert half.value == disk_run.run(data, layout, threads=2).value
    monkeypatch.setattr(disk_run, "_images", lambda *_: None)
    whole = disk_run.run(data, layout)
    assert 2 * half.points == whole.points
    rounding = 2.0**-52 * (8 * whole.absolute + whole.weight_noise_sum)
    assert abs(half.value - whole.value) <= rounding < 1e-7 * abs(whole.value)
    assert half.absolute == pytest.approx(whole.absolute, rel=1e-8)
    assert half.truncation == pytest.approx(whole.truncation, rel=0.1)
    assert half.square >= whole.square  # twins make the same errors
    if families is not None:
        assert {choice.family for choice in initial_choices(data, 9.0)} == families
    monkeypatch.undo()
    result = integrate(data, 1e-7, 0.0)
    assert abs(result.value - truth) <= result.error <= 1e-7 * abs(truth)


def test_no_symmetry_no_twins():
    data, _ = selberg(8, "0.37", "0.41")
    assert not data.is_symmetric
    layout = layout_of(8, initial_choices(data, 4.0))
    assert disk_run._images(data, layout, layout.sectors) is None
