"""Epochs of CCSDS 502.0-B-3 section 7.5.10 and of TLE columns; expected days by datetime's own calendar."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.formats.epoch import format_ccsds, parse_ccsds, parse_year_and_day

J2000_JD = 2451545.0  # 2000-01-01 12:00, by definition


@pytest.mark.parametrize(
    "text",
    [
        "2000-01-01T12:00:00",
        "2000-01-01T12:00:00Z",
        "2000-01-01T12:00:00.",
        "2000-01-01T12:00:00.000000000000Z",
        "2000-001T12:00:00Z",
        " 2000-001T12:00:00.0 ",
    ],
)
def test_every_form_of_the_same_instant(text: str):
    assert parse_ccsds(text) == (J2000_JD - 0.5, 0.5)


def test_decimals_beyond_microseconds_count():
    # 1 ns is 1.157e-14 day; a float near 0.5 resolves 1.1e-16.
    _, fraction = parse_ccsds("2000-01-01T12:00:00.000000001")
    assert fraction - 0.5 == pytest.approx(1e-9 / 86400.0, rel=0.01)


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("2026-02-29T00:00:00", "no calendar date"),
        ("2026-366T00:00:00", "days run from 1 to 365"),
        ("2024-000T00:00:00", "days run from 1 to 366"),
        ("2026-01-01T24:00:00", "no time of day"),
        ("2026-12-31T23:59:60", "no leap second"),
        ("2026-01-01T00:00:00+02:00", "no other offset"),
        ("2026-01-01 00:00:00", "write it like"),
        ("2026-01-01", "write it like"),
        ("٢٠٢٦-01-01T00:00:00", "write it like"),
        ("1926-01-01T00:00:00", "outside 1957 to 2199"),
    ],
)
def test_impossible_times_are_refused(text: str, says: str):
    with pytest.raises(ValueError, match=says):
        parse_ccsds(text)


def test_tle_years_turn_at_57_and_day_366_needs_a_leap_year():
    assert parse_year_and_day(0, "001.50000000") == (J2000_JD - 0.5, 0.5)
    assert parse_year_and_day(24, "366.00000000") == parse_ccsds("2024-12-31T00:00:00")
    assert parse_year_and_day(57, "001.00000000") == parse_ccsds("1957-01-01T00:00:00")
    with pytest.raises(ValueError, match="day 366 of 2023"):
        parse_year_and_day(23, "366.00000000")


@given(day=st.integers(0, 80_000), fraction=st.floats(1e-3, 1.0, exclude_max=True))
def test_written_epochs_read_back_bit_for_bit(day: int, fraction: float):
    epoch_jd = 2435839.5 + day  # 1957-01-01 on
    assert parse_ccsds(format_ccsds(epoch_jd, fraction)) == (epoch_jd, fraction)


def test_a_tle_epoch_is_written_in_microseconds():
    # 0.78495062 day is 67819.733568 s exactly.
    assert format_ccsds(2451722.5, 0.78495062) == "2000-06-27T18:50:19.733568Z"
