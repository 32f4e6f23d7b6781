"""Time grids: UTC in, ERFA's dates out; against astropy's leap seconds."""

from __future__ import annotations

import numpy as np
import pytest
from astropy.time import Time
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from app.core.sky.bodies import wrap_deg
from app.core.sky.times import TimeGrid, format_utc, parse_utc, regular_grid
from app.errors import FieldError

microsecond_s = 1e-6
DAY_S = 86400.0


@pytest.mark.parametrize(
    "text", ["1999-01-01T00:00:00", "2016-12-31T00:00:00", "2017-01-01T00:00:00", "2024-02-29T12:30:15"]
)
def test_dates_equal_astropy(text: str):
    grid, theirs = TimeGrid(np.array([parse_utc(f"{text}Z")])), Time(text, scale="utc")
    for ours, scale in ((grid.utc, theirs.utc), (grid.tt, theirs.tt)):
        off_days = (ours[0][0] - scale.jd1) + (ours[1][0] - scale.jd2)
        assert abs(off_days) * DAY_S < microsecond_s


def test_the_leap_second_of_2016():
    # IERS Bulletin C 52: TAI - UTC went from 36 to 37 s at the end of 2016, so TT - UTC from 68.184 to 69.184 s
    grid = TimeGrid(np.array([parse_utc("2016-12-31T00:00:00Z"), parse_utc("2017-01-01T00:00:00Z")]))
    ahead = ((grid.tt[0] - grid.utc[0]) + (grid.tt[1] - grid.utc[1])) * DAY_S
    assert_allclose(ahead, [68.184, 69.184], atol=microsecond_s)


def test_a_day_with_a_leap_second_is_stretched_by_at_most_that_second():
    # POSIX time has no room for the second, so on such a day TT drifts to 1 s off: 1e-5 degrees of the Sun
    text = "2016-12-31T23:59:59"
    grid, theirs = TimeGrid(np.array([parse_utc(f"{text}Z")])), Time(text, scale="utc").tt
    off_s = ((grid.tt[0][0] - theirs.jd1) + (grid.tt[1][0] - theirs.jd2)) * DAY_S
    assert abs(off_s) < 1.0


def test_the_first_part_of_a_date_is_a_midnight():
    day, fraction = TimeGrid(np.array([-1.0, 0.0, 86399.9, 1.7e9])).utc
    assert_allclose(day % 1.0, 0.5, atol=0.0)
    assert ((fraction >= 0.0) & (fraction < 1.0)).all()


@settings(derandomize=True, deadline=None, max_examples=200)
@given(st.integers(-315_000_000, 4_100_000_000))
def test_text_and_seconds_are_inverse(unix_s: int):
    assert parse_utc(format_utc(unix_s)) == unix_s


@pytest.mark.parametrize(
    ("text", "word"),
    [
        ("2026-08-13", "end in Z"),
        ("2026-08-13T02:00:00", "end in Z"),
        ("2026-08-13T02:00:00+02:00", "end in Z"),
        ("yesterday", "ISO 8601"),
        ("2026-13-01T00:00:00Z", "ISO 8601"),
        ("1066-10-14T09:00:00Z", "1960 to 2099"),
    ],
)
def test_times_that_are_refused(text: str, word: str):
    with pytest.raises(FieldError, match=word) as caught:
        parse_utc(text, "from")
    assert caught.value.field == "from"


def test_a_regular_grid_stops_at_or_before_its_end():
    assert_allclose(regular_grid(0.0, 120.0, 60.0).unix_s, [0.0, 60.0, 120.0])
    assert_allclose(regular_grid(0.0, 119.0, 60.0).unix_s, [0.0, 60.0])
    assert len(regular_grid(0.0, -61.0, 60.0)) == 0
    assert_allclose(regular_grid(0.0, 0.3, 0.1).unix_s, [0.0, 0.1, 0.2, 0.3])  # 0.3/0.1 is just below 3


@settings(derandomize=True, max_examples=200)
@given(st.floats(-1e4, 1e4))
def test_wrapped_angles_differ_by_whole_turns(angle_deg: float):
    wrapped = float(wrap_deg(angle_deg))
    assert -180.0 <= wrapped < 180.0
    assert_allclose((angle_deg - wrapped) / 360.0, round((angle_deg - wrapped) / 360.0), atol=1e-9)
