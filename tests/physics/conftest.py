"""Hypothesis without a deadline (a deadline is a timed test) and with the same examples on every run."""

from __future__ import annotations

from hypothesis import settings

settings.register_profile("exceed-physics", deadline=None, max_examples=60, derandomize=True)
settings.load_profile("exceed-physics")
