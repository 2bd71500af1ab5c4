"""A seeded sample of the gradient campaign; ``gradient_campaign.py`` beside this file runs all of it."""

from __future__ import annotations

import pytest
from gradient_campaign import GROUPS, one, summary

pytestmark = pytest.mark.calibration


@pytest.mark.parametrize("group", [g for g in GROUPS if g.name != "selberg7"], ids=lambda g: f"{g.name}-{g.regime}")
def test_no_claimed_error_of_a_derivative_is_too_small(group):
    count = max(2, group.count // 20)
    figures = summary([one(group, 2_000_000 + seed) for seed in range(count)])
    assert figures["ok but wrong"] == 0
    assert figures["too small"] == 0
    # bounds, not wild guesses; large exponents and complex ones are often too much for double precision
    assert figures["ok"] >= {"complex": 0.25, "large": 0.0}.get(group.regime, 0.6) * count
