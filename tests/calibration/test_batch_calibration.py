"""A seeded sample of the batch campaign; ``batch_campaign.py`` beside this file runs all of it."""

from __future__ import annotations

import pytest
from batch_campaign import campaign

pytestmark = pytest.mark.calibration


def test_no_claimed_error_is_too_small():
    totals = campaign(0.01, 1_000_000)
    assert totals["cases"] > 400
    assert totals["compiled"] > 0.7 * totals["cases"]
    assert totals["too small"] == totals["ok but wrong"] == 0
