"""Reasons to believe a number or a formula, and reasons not to: evidence from independent routes, never a proof."""
