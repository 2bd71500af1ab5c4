"""A seeded sample of the campaign for direct sphere integrals; the script beside this file runs all of it."""

from __future__ import annotations

import pytest
from sphere_direct_campaign import trials4, trials_generic, trials_selberg

pytestmark = pytest.mark.calibration


@pytest.mark.parametrize(
    ("trials", "least"),
    [
        (lambda: trials4(400, 101), 0.8),
        (lambda: trials_selberg(5, 8, 102), 0.6),
        (lambda: trials_generic(4, 103), 0.5),
    ],
    ids=["beta", "selberg5", "generic5"],
)
def test_no_claimed_error_is_too_small(trials, least):
    found = list(trials())
    assert [t for t in found if t.ratio > 1] == []
    assert sum(t.ok for t in found) >= least * len(found)
