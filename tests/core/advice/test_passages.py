"""Which stream, which year, from when to when. Streams are rounded published ones or invented for an edge."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from app.core.advice.passages import (
    LONGEST_SIDE_DEG,
    RATE_FLOOR_ZHR,
    SHORTEST_SIDE_DEG,
    activity_sides_deg,
    find_passages,
    outlook_grid,
)
from app.core.sky.times import TimeGrid, parse_utc
from app.core.streams.activity import downstream_direction, stream_zhr
from app.core.streams.model import Component, Stream
from tests.core.advice.samples import DAY_S, PERSEIDS, QUADRANTIDS, SPRING

JANUARY_2026, JANUARY_2027 = parse_utc("2026-01-01T00:00:00Z"), parse_utc("2027-01-01T00:00:00Z")
a_second_of_the_sun_deg = 1.2e-5
one_hour_s = 3600.0


def peaking(peak_deg: float, zhr: float = 20.0, b_per_deg: float = 0.5, **limits: float) -> Stream:
    component = Component("main", peak_deg, zhr, b_per_deg, b_per_deg)
    return Stream("XYZ", "invented", (component,), 2.5, 40.0, 10.0, 10.0, **limits)


def longitude_deg(unix_s: float) -> float:
    return float(TimeGrid(np.array([unix_s])).solar_longitude_deg[0])


@pytest.mark.parametrize(
    ("stream", "year", "peak"),
    [
        # International Meteor Organization, Meteor Shower Calendar 2016 (memory)
        (replace(PERSEIDS, code="PER"), 2016, "2016-08-12T13:00:00Z"),  # solar longitude 140.0
        (peaking(283.16), 2016, "2016-01-04T08:00:00Z"),  # Quadrantids
        (peaking(235.27), 2016, "2016-11-17T10:30:00Z"),  # Leonids
        (peaking(270.7), 2016, "2016-12-22T09:00:00Z"),  # Ursids
    ],
    ids=["Perseids", "Quadrantids", "Leonids", "Ursids"],
)
def test_peaks_fall_where_the_calendar_of_2016_put_them(stream: Stream, year: int, peak: str):
    start = parse_utc(f"{year}-01-01T00:00:00Z")
    (found,) = find_passages([stream], start + 2 * DAY_S, start + 364 * DAY_S)[-1:]
    assert abs(found.peak_unix_s - parse_utc(peak)) < one_hour_s
    assert found.name == f"{stream.code}-{year}"


def test_limits_are_the_solar_longitudes_given():
    (found,) = find_passages([QUADRANTIDS], JANUARY_2027 + DAY_S, JANUARY_2027 + 2 * DAY_S)
    times = (found.start_unix_s, found.peak_unix_s, found.end_unix_s)
    assert_allclose([longitude_deg(t) for t in times], [276.4, 283.15, 292.0], atol=a_second_of_the_sun_deg)


def test_a_passage_over_new_year_has_the_year_of_its_peak():
    (found,) = find_passages([QUADRANTIDS], JANUARY_2027 - 3 * DAY_S, JANUARY_2027 - 2 * DAY_S)
    assert found.name == "QUA-2027"
    assert found.start_unix_s < JANUARY_2027 < found.peak_unix_s < found.end_unix_s


@pytest.mark.parametrize("peak_deg", [359.0, 0.0, 360.0, 1.0])
def test_a_passage_runs_on_through_zero_degrees(peak_deg: float):
    (found,) = find_passages([peaking(peak_deg)], JANUARY_2026, JANUARY_2027)
    side = np.log10(20.0 / RATE_FLOOR_ZHR) / 0.5
    assert_allclose((found.peak_unix_s - found.start_unix_s) / DAY_S, side, rtol=0.03)
    assert_allclose((found.end_unix_s - found.peak_unix_s) / DAY_S, side, rtol=0.03)
    assert_allclose((longitude_deg(found.peak_unix_s) - peak_deg + 180.0) % 360.0, 180.0, atol=1e-5)


def test_limits_on_either_side_of_zero_degrees():
    stream = peaking(359.0, start_solar_longitude_deg=350.0, end_solar_longitude_deg=8.0)
    assert activity_sides_deg(stream) == (9.0, 9.0)
    (found,) = find_passages([stream], JANUARY_2026, JANUARY_2027)
    ends = [longitude_deg(found.start_unix_s), longitude_deg(found.end_unix_s)]
    assert_allclose(ends, [350.0, 8.0], atol=a_second_of_the_sun_deg)


def test_without_limits_a_stream_is_followed_down_to_half_a_meteor_an_hour():
    # Jenniskens' profile falls to RATE_FLOOR_ZHR log10(zhr / floor)/B degrees from the peak
    sides = activity_sides_deg(peaking(100.0, zhr=50.0, b_per_deg=0.4))
    assert_allclose(sides, np.log10(50.0 / 0.5) / 0.4, atol=SHORTEST_SIDE_DEG)


def test_a_stream_that_never_ends_is_followed_for_45_degrees():
    assert_allclose(activity_sides_deg(peaking(100.0, b_per_deg=0.0)), LONGEST_SIDE_DEG)


@pytest.mark.parametrize(("zhr", "b"), [(0.0, 0.5), (0.2, 0.5), (100.0, 1000.0)])
def test_a_faint_or_sudden_stream_still_has_a_passage(zhr: float, b: float):
    assert activity_sides_deg(peaking(100.0, zhr, b)) == (SHORTEST_SIDE_DEG, SHORTEST_SIDE_DEG)


@pytest.mark.parametrize(("start", "end"), [(100.0, 110.0), (90.0, 100.0), (100.0, 100.0)])
def test_a_peak_on_a_limit_leaves_a_short_side_and_no_empty_one(start: float, end: float):
    stream = peaking(100.0, start_solar_longitude_deg=start, end_solar_longitude_deg=end)
    before, after = activity_sides_deg(stream)
    assert_allclose([before, after], [max(100.0 - start, 0.01), max(end - 100.0, 0.01)])
    grid = outlook_grid([stream], find_passages([stream], JANUARY_2026, JANUARY_2027))
    assert np.all(np.diff(grid.fine_unix_s) > 0.0)
    assert np.all(np.diff(grid.knot_unix_s) > 0.0)


def test_the_strongest_component_gives_the_peak():
    parts = (Component("early", 130.0, 10.0, 0.2, 0.2), Component("late", 140.0, 90.0, 0.2, 0.2))
    stream = replace(PERSEIDS, components=parts)
    (found,) = find_passages([stream], JANUARY_2026, JANUARY_2027)
    assert_allclose(longitude_deg(found.peak_unix_s), 140.0, atol=a_second_of_the_sun_deg)


def test_only_passages_that_touch_the_interval_are_found():
    (whole,) = find_passages([SPRING], JANUARY_2026, JANUARY_2027)
    assert find_passages([SPRING], JANUARY_2026, whole.start_unix_s) == []
    assert find_passages([SPRING], whole.end_unix_s, JANUARY_2027) == []
    assert find_passages([SPRING], whole.end_unix_s - 1.0, JANUARY_2027) == [whole]
    assert find_passages([SPRING], JANUARY_2026, whole.start_unix_s + 1.0) == [whole]


def test_passages_come_by_peak_and_every_year():
    streams = [QUADRANTIDS, PERSEIDS, SPRING]
    found = find_passages(streams, JANUARY_2026, JANUARY_2027 + 365 * DAY_S)
    names = [p.name for p in found]
    assert names == ["QUA-2026", "SPR-2026", "PER-2026", "QUA-2027", "SPR-2027", "PER-2027", "QUA-2028"]
    assert [streams[p.stream].code for p in found] == [p.code for p in found]


def test_no_streams_have_no_passages():
    assert find_passages([], JANUARY_2026, JANUARY_2027) == []


@given(st.floats(0.0, 360.0), st.integers(1990, 2060))
@settings(derandomize=True, deadline=None, max_examples=25)
def test_no_two_passages_share_a_name_and_no_year_is_left_out(peak_deg: float, year: int):
    start = parse_utc(f"{year}-06-01T00:00:00Z")
    found = find_passages([peaking(peak_deg)], start, start + 5 * 365.25 * DAY_S)
    years = [int(p.name.removeprefix("XYZ-")) for p in found]
    assert np.all(np.diff(years) == 1)
    assert 5 <= len(years) <= 6
    assert_allclose(np.diff([p.peak_unix_s for p in found]) / DAY_S, 365.256, atol=0.02)


@pytest.mark.parametrize("peak_deg", [279.7, 280.1, 280.3])
def test_two_peaks_in_one_calendar_year_keep_names_apart(peak_deg: float):
    # A sidereal year of 365.256 days fits twice into the leap year 2028.
    found = find_passages([peaking(peak_deg)], JANUARY_2026, parse_utc("2031-01-01T00:00:00Z"))
    assert len({p.name for p in found}) == len(found)
    nearest = [parse_utc(f"{p.name[-4:]}-07-02T00:00:00Z") for p in found]
    assert all(abs(p.peak_unix_s - middle) < 184.5 * DAY_S for p, middle in zip(found, nearest, strict=True))


def test_the_outlook_crowds_its_instants_at_the_peak():
    streams = [QUADRANTIDS, PERSEIDS]
    passages = find_passages(streams, JANUARY_2026, JANUARY_2026 + 300 * DAY_S)
    grid = outlook_grid(streams, passages)
    for i, passage in enumerate(passages):
        fine = grid.fine_unix_s[i]
        assert [fine[0], fine[-1]] == [passage.start_unix_s, passage.end_unix_s]
        assert passage.peak_unix_s in fine
        assert np.all(np.diff(fine) > 0.0)
        # at the peak a sample for every hundredth of a degree of the steepest stream, and finer
        assert np.diff(fine)[398:402].max() < 120.0


def test_the_outlook_follows_the_rate_of_the_stream():
    streams = [QUADRANTIDS, PERSEIDS]
    grid = outlook_grid(streams, find_passages(streams, JANUARY_2026, JANUARY_2026 + 300 * DAY_S))
    for i, stream in enumerate(streams):
        rate = stream_zhr(stream, TimeGrid(grid.fine_unix_s[i]).solar_longitude_deg)
        # The last instants may fall on either side of the activity limit.
        assert_allclose(grid.fine_zhr[i, 1:-1], rate[1:-1], rtol=1e-4)
        assert_allclose(grid.fine_zhr[i].max(), 100.0, rtol=1e-4)


def test_knots_carry_the_drifting_radiant():
    grid = outlook_grid([PERSEIDS], find_passages([PERSEIDS], JANUARY_2026, JANUARY_2027))
    longitude = TimeGrid(grid.knot_unix_s[0]).solar_longitude_deg
    assert_allclose(grid.downstream[:, 0], downstream_direction(PERSEIDS, longitude), atol=1e-12)
    assert grid.knots.unix_s.tolist() == grid.knot_unix_s[0].tolist()


def test_an_outlook_without_passages_is_empty():
    grid = outlook_grid([PERSEIDS], [])
    assert grid.passages == ()
    assert grid.downstream.shape == (3, 0, 0)
