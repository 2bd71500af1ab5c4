"""A seeded sample of the disk campaign; ``disk_campaign.py`` beside this file runs all of it."""

from __future__ import annotations

import pytest
from disk_campaign import GROUPS, one, summary

pytestmark = pytest.mark.calibration

SAMPLE = {
    "beta": 12,
    "3F2": 12,
    "betas5": 12,
    "betas6": 6,
    "chain6": 6,
    "dixon-anderson6": 6,
    "selberg5": 12,
    "selberg6": 6,
}


@pytest.mark.parametrize("group", GROUPS, ids=lambda g: f"{g.name}-{g.regime}")
def test_no_claimed_error_is_too_small(group):
    small = {4: 10, 5: 10, 6: 4, 7: 0}.get(int(group.name[-1]) if group.name[-1].isdigit() else 4, 0)
    count = SAMPLE.get(group.name, small)
    findings = [one(group, 1_000_000 + seed) for seed in range(count)]
    figures = summary(group, findings)
    assert figures["ok but wrong"] == 0
    assert figures["too small"] == 0
    if count:  # bounds, not wild guesses: most integrals of these classes can be had in double precision
        assert figures["ok"] >= 0.5 * count
