"""Killed at any moment, a run loses at most the levels being computed, and ends in the same tables."""

from __future__ import annotations

from pathlib import Path

import pytest
from killing import RADICALS, kill_and_compare


@pytest.mark.slow
def test_twenty_kills_change_no_digit_and_repeat_no_point(tmp_path: Path) -> None:
    outcome = kill_and_compare(tmp_path, kills=20, seed=2)
    assert outcome.differing_tables == ()
    assert outcome.computed_again == 0
    assert outcome.points_at_end == 2 * len(RADICALS)
    assert outcome.kills_that_hit >= 10
