"""Solar longitude against astropy's Sun, and the inverse."""

from __future__ import annotations

import numpy as np
import pytest
from astropy.coordinates import GCRS, GeocentricMeanEcliptic, get_body_barycentric, get_sun
from astropy.time import Time
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from app.core.sky.bodies import wrap_deg
from app.core.sky.longitude import time_of_solar_longitude
from app.core.sky.times import TimeGrid

# astropy says so of years for which leap seconds may yet be announced; both sides take none.
pytestmark = pytest.mark.filterwarnings("ignore:.*dubious year")
ten_thousandth_of_a_degree = 1e-4
DAY_S = 86400.0
YEARS_1970_TO_2050 = np.arange(0.0, 80 * 365.25 * DAY_S, 97.3 * DAY_S)
# Dense enough to be taken between nodes half an hour apart.
A_DAY_IN_2026 = 1_786_320_000.0 + np.arange(0.0, DAY_S, 420.0)


@pytest.fixture(scope="module", params=[YEARS_1970_TO_2050, A_DAY_IN_2026], ids=["80 years", "a day"])
def grid(request: pytest.FixtureRequest) -> TimeGrid:
    return TimeGrid(request.param)


@pytest.fixture(scope="module")
def moments(grid: TimeGrid) -> Time:
    return Time(*grid.tt, format="jd", scale="tt")


def longitude_deg(gcrs: GCRS) -> np.ndarray:
    return gcrs.transform_to(GeocentricMeanEcliptic(equinox="J2000", obstime=gcrs.obstime)).lon.deg


def test_the_geometric_sun_of_astropy(grid: TimeGrid, moments: Time):
    sun = get_body_barycentric("sun", moments) - get_body_barycentric("earth", moments)
    theirs = longitude_deg(GCRS(sun, obstime=moments))
    off = wrap_deg(grid.solar_longitude_deg - theirs)
    assert_allclose(off, 0.0, atol=ten_thousandth_of_a_degree)


def test_the_apparent_sun_runs_eight_minutes_behind(grid: TimeGrid, moments: Time):
    # Constant of aberration 20.4955 arc seconds (IAU): what a geometric longitude leaves out, with 1.7 % for e
    behind = wrap_deg(grid.solar_longitude_deg - longitude_deg(get_sun(moments)))
    assert_allclose(behind, 20.4955 / 3600.0, rtol=0.02)


def test_distance_and_direction_of_the_sun(grid: TimeGrid, moments: Time):
    sun = get_body_barycentric("sun", moments) - get_body_barycentric("earth", moments)
    hundred_km = 100.0  # TDB taken equal to TT: 2 ms of 30 km/s is 60 m
    assert_allclose(grid.sun_km, sun.xyz.to_value("km").T, rtol=0.0, atol=hundred_km)


@settings(derandomize=True, deadline=None, max_examples=50)
@given(st.floats(0.0, 360.0, exclude_max=True), st.floats(0.0, 4e9))
def test_the_time_of_a_longitude_is_the_nearest_one(longitude: float, near: float):
    found = time_of_solar_longitude(longitude, near)
    millisecond_deg = 1.14e-8
    there = TimeGrid(np.atleast_1d(found)).solar_longitude_deg[0]
    assert abs(wrap_deg(there - longitude)) < millisecond_deg
    assert abs(found - near) < 186.0 * DAY_S  # half a year, and the equation of centre


def test_arguments_broadcast_and_are_left_alone():
    near = np.array([[1.7e9], [1.8e9]])
    longitudes = np.array([0.0, 140.0, 359.9])
    before = near.copy()
    found = time_of_solar_longitude(longitudes, near)
    assert found.shape == (2, 3)
    assert_allclose(near, before, atol=0.0)
    there = TimeGrid(found.ravel()).solar_longitude_deg.reshape(2, 3)
    assert_allclose(wrap_deg(there - longitudes), 0.0, atol=1e-7)
