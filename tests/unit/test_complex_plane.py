"""The figure of a sphere integrand: values at single points, bad input, files."""

from __future__ import annotations

import cmath
import json
import math

import pytest

import kn_integrate as kn

KIN = kn.Mandelstams.from_planar(4, {(1, 2): "1/3", (2, 3): "1/5"})


def test_four_point_values():
    figure = kn.complex_plane(
        KIN, kn.parke_taylor(1, 2, 3, 4), kn.parke_taylor(1, 2, 4, 3), window=(-1, 2, "-1/2", 1), side=7
    )
    for row, y in enumerate(figure.y):
        for column, x in enumerate(figure.x):
            z = complex(x, y)
            if abs(z) < 1e-9 or abs(z - 1) < 1e-9:
                continue
            # PT(1,2,3,4) = -1/(z12 z23 z34 z41), PT(1,2,4,3) = -1/(z12 z24 z43 z31); factors at infinity dropped with
            # z34 z41 -> -(..) and z24 z43 -> -(..), their signs are in z_ij with i < j
            f = 1 / ((0 - z) * (z - 1))
            g = 1 / ((0 - z) * (0 - 1))
            value = abs(z) ** (2 / 3) * abs(z - 1) ** (2 / 5) * f * g.conjugate()
            assert figure.modulus[row][column] == pytest.approx(math.log10(abs(value)), abs=1e-12)
            # the phase is known up to the overall sign of the dropped factors, the same everywhere
            difference = figure.phase[row][column] - cmath.phase(value) / math.pi
            assert abs(math.sin(math.pi * difference)) < 1e-9


def test_punctures_are_left_out_and_files_are_written(tmp_path):
    figure = kn.complex_plane(KIN, kn.parke_taylor(1, 2, 3, 4), window=(0, 1, -1, 1), side=3)
    assert figure.modulus[1][0] is None
    json.dumps(figure.to_dict(), allow_nan=False)
    pytest.importorskip("matplotlib")
    for suffix in (".png", ".svg", ".pdf"):
        path = tmp_path / f"plane{suffix}"
        figure.draw(path)
        assert path.stat().st_size > 1000


def test_five_points_need_a_place_for_the_other_puncture():
    kin = kn.Mandelstams.random(5, 3)
    f = kn.parke_taylor(1, 2, 3, 4, 5)
    assert kn.complex_plane(kin, f, held=["0.3+0.5j"], side=4).held[3] == 0.3 + 0.5j
    for options in (
        {},
        {"held": [1, 2]},
        {"held": ["x"]},
        {"held": [0], "side": 1},
        {"held": [0], "window": (1, 0, 0, 1)},
    ):
        with pytest.raises(kn.InputError):
            kn.complex_plane(kin, f, **options)
