"""From where a passage is judged."""

from __future__ import annotations

import numpy as np
import pytest

from app.core.advice.satellite import from_instant

INSTANTS = np.array([0.0, 10.0, 30.0])
RATES = np.array([[1.0, 2.0, 6.0]])


def test_the_part_ahead_begins_at_the_instant_itself() -> None:
    unix_s, rates = from_instant(INSTANTS, RATES, 15.0)
    assert unix_s.tolist() == [15.0, 30.0]
    assert rates.tolist() == [[3.0, 6.0]]  # a quarter of the way from 2 to 6


@pytest.mark.parametrize(("start", "kept"), [(-5.0, 3), (30.0, 0), (31.0, 0)])
def test_before_the_first_sample_all_is_ahead_and_after_the_last_nothing(start: float, kept: int) -> None:
    unix_s, rates = from_instant(INSTANTS, RATES, start)
    assert len(unix_s) == rates.shape[1] == kept
