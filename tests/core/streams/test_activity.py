"""Activity of a stream against its law (Jenniskens 1994, A&A 287, 990), and the drift of its radiant."""

from __future__ import annotations

import math
from dataclasses import replace

import astropy.units as u
import numpy as np
import pytest
from astropy.coordinates import SkyCoord
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from app.core.streams.activity import component_zhr, downstream_direction, stream_state, stream_zhr
from app.core.streams.model import Component, Stream

MAIN = Component("main", 140.0, 80.0, 0.3, 0.5)
BROAD = Component("background", 141.0, 20.0, 0.05, 0.1)
STREAM = Stream("ABC", "alpha Examplids", (MAIN,), 2.5, 40.0, 48.0, 58.0, 1.4, 0.26)
longitudes = st.floats(0.0, 360.0)


@pytest.mark.parametrize("peak", [0.0, 0.3, 140.0, 359.9, 360.0])
def test_the_rate_halves_at_log_2_over_b_on_either_side(peak: float):
    # Case 46: B = 30 per degree has a full width at half rate of 2 log10(2)/30 degrees (Jenniskens 1995, read).
    outburst = Component("outburst", peak, 1000.0, 30.0, 30.0)
    half_deg = math.log10(2.0) / 30.0
    assert_allclose(component_zhr(outburst, [peak - half_deg, peak, peak + half_deg]), [500.0, 1000.0, 500.0])
    assert 29.0 < 2.0 * half_deg / 0.041069 * 60.0 < 29.6  # minutes; 0.041069 degrees an hour is the mean Sun


def test_the_rise_comes_before_the_peak_and_the_fall_after_it():
    assert_allclose(component_zhr(MAIN, [138.0, 142.0]), [80.0 * 10**-0.6, 80.0 * 10**-1.0])


@given(longitudes, st.floats(-170.0, 170.0), st.integers(-2, 2))
def test_only_the_distance_from_the_peak_counts_also_across_zero(peak: float, away: float, turns: int):
    there = replace(MAIN, solar_longitude_peak_deg=peak)
    longitude = (peak + away) % 360.0 + 360.0 * turns
    assert_allclose(component_zhr(there, longitude), component_zhr(MAIN, 140.0 + away), rtol=1e-9, atol=1e-12)


def test_components_add():
    both = replace(STREAM, components=(MAIN, BROAD))
    longitude = np.linspace(100.0, 180.0, 81)
    expected = component_zhr(MAIN, longitude) + component_zhr(BROAD, longitude)
    assert_allclose(stream_zhr(both, longitude), expected)
    # By hand, at 141: 80 * 10^-0.5 + 20.
    assert_allclose(stream_zhr(both, 141.0), 45.2982, atol=1e-4)


def test_outside_its_limits_a_stream_is_silent():
    limited = replace(STREAM, start_solar_longitude_deg=135.0, end_solar_longitude_deg=143.0)
    rate = stream_zhr(limited, [134.9, 135.0, 143.0, 143.1, 320.0])
    assert list(rate > 0.0) == [False, True, True, False, False]


def test_limits_on_both_sides_of_zero():
    # The gamma Normids of the IMO 2018 working list: 336.6 to 7.5, peak 354.
    near = replace(STREAM, components=(Component("main", 354.0, 6.0, 0.19, 0.19),))
    limited = replace(near, start_solar_longitude_deg=336.6, end_solar_longitude_deg=7.5)
    longitude = np.array([336.5, 336.7, 354.0, 359.9, 0.0, 360.0, 7.4, 7.6, 180.0])
    inside = np.array([False, True, True, True, True, True, True, False, False])
    assert_allclose(stream_zhr(limited, longitude), np.where(inside, stream_zhr(near, longitude), 0.0))
    assert (stream_zhr(limited, longitude)[inside] > 0.0).all()


@pytest.mark.parametrize("longitude", [130.0, 140.0, 149.5])
def test_particles_come_from_the_drifted_radiant(longitude: float):
    # Against astropy: 1.4 degrees of right ascension and 0.26 of declination for each degree past the peak.
    away = longitude - 140.0
    radiant = SkyCoord((48.0 + 1.4 * away) * u.deg, (58.0 + 0.26 * away) * u.deg)
    expected = -radiant.cartesian.xyz.to_value()
    assert_allclose(downstream_direction(STREAM, longitude), expected, atol=1e-14)


def test_the_drift_goes_on_across_zero():
    near = replace(STREAM, components=(replace(MAIN, solar_longitude_peak_deg=359.0),), radiant_ra_deg=359.5)
    radiant = SkyCoord((359.5 + 2.8 - 360.0) * u.deg, (58.0 + 0.52) * u.deg)
    assert_allclose(downstream_direction(near, 1.0), -radiant.cartesian.xyz.to_value(), atol=1e-14)


@given(st.floats(0.0, 360.0, exclude_max=True))
def test_directions_are_unit_vectors(longitude: float):
    assert_allclose(np.linalg.norm(downstream_direction(STREAM, longitude)), 1.0, rtol=1e-12)


def test_the_state_of_several_streams_is_that_of_each():
    other = replace(STREAM, code="XYZ", components=(MAIN, BROAD), radiant_ra_deg=200.0)
    longitude = np.array([139.0, 140.0, 145.0])
    state = stream_state((STREAM, other), longitude)
    assert_allclose(state.zhr, [stream_zhr(STREAM, longitude), stream_zhr(other, longitude)])
    assert state.downstream.shape == (3, 2, 3)
    assert_allclose(state.downstream[:, 1], downstream_direction(other, longitude))
