"""Mean orbits carried by their secular rates, against SGP4 itself and against the published J2 rates.

J2 rates: Brouwer 1959, Kozai 1959, first order (textbook).
"""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.orbit.averaging import SecularOrbit, secular_orbit
from app.core.orbit.elements import EARTH_RADIUS_KM, J2_WGS72, MU_WGS72_KM3_S2, MeanElements
from app.core.orbit.sgp4_batch import propagate
from app.core.sky.times import TimeGrid
from app.errors import OrbitError

DAY_S = 86400.0
SUN_SYNCHRONOUS = MeanElements("SSO", "2026-001A", 2461262.5, 0.25, 14.57, 0.0012, 98.2, 120.0, 80.0, 10.0)
STATION_LIKE = MeanElements("LEO", "2026-001B", 2461262.5, 0.5, 15.5, 0.0005, 51.6, 10.0, 20.0, 30.0)
NAVIGATION = MeanElements("MEO", "2026-001C", 2461262.5, 0.0, 2.00565, 0.01, 55.0, 200.0, 50.0, 300.0)
LOW = [SUN_SYNCHRONOUS, STATION_LIKE]


def j2_rates(orbit: SecularOrbit) -> tuple[float, float]:
    """Turn of the node and of the apsides, rad/s."""
    mean_motion = np.sqrt(MU_WGS72_KM3_S2 / orbit.a_km**3)
    scale = mean_motion * J2_WGS72 * (EARTH_RADIUS_KM / (orbit.a_km * (1.0 - orbit.eccentricity**2))) ** 2
    cosine = np.cos(orbit.inclination)
    return -1.5 * scale * cosine, 0.75 * scale * (5.0 * cosine**2 - 1.0)


@pytest.mark.parametrize("elements", [*LOW, NAVIGATION], ids=lambda e: e.object_name)
def test_rates_are_those_of_the_oblate_earth(elements: MeanElements):
    orbit = secular_orbit(elements)
    second_order = 5e-3  # of J2 squared and J4
    # A deep-space set carries the pull of Sun and Moon elsewhere in SGP4, not in these rates.
    assert_allclose([orbit.raan_rate, orbit.arg_perigee_rate], j2_rates(orbit), rtol=second_order)


def test_a_sun_synchronous_plane_follows_the_sun():
    # 360 degrees in a year of 365.2422 days (definition); this inclination is a hundredth off
    orbit = secular_orbit(SUN_SYNCHRONOUS)
    assert_allclose(np.degrees(orbit.raan_rate) * DAY_S, 360.0 / 365.2422, rtol=0.03)


def momentum(elements: MeanElements, unix_s: np.ndarray) -> np.ndarray:
    """Direction of SGP4's own angular momentum, (T, 3) GCRF."""
    states = propagate([elements], TimeGrid(unix_s))
    assert not states.error.any()
    pole = np.cross(states.r_km[0], states.v_km_s[0])
    return pole / np.linalg.norm(pole, axis=1)[:, None]


@pytest.mark.parametrize("elements", LOW, ids=lambda e: e.object_name)
def test_the_plane_stays_with_sgp4_for_three_months(elements: MeanElements):
    unix_s = elements.epoch_unix_s + np.arange(0.0, 90.0, 9.7) * DAY_S
    ellipse = secular_orbit(elements).ellipse(unix_s, TimeGrid(unix_s).teme_to_gcrf)
    ours = np.cross(ellipse.toward_perigee, ellipse.ahead, axis=0).T
    off_deg = np.degrees(np.arccos(np.clip(np.sum(ours * momentum(elements, unix_s), axis=1), -1.0, 1.0)))
    short_periodic_deg = 0.1  # what SGP4 adds within an orbit
    assert off_deg.max() < short_periodic_deg


@pytest.mark.parametrize("elements", [*LOW, NAVIGATION], ids=lambda e: e.object_name)
def test_mean_distance_and_apsides_at_epoch(elements: MeanElements):
    orbit = secular_orbit(elements)
    period_s = DAY_S / elements.mean_motion_rev_per_day
    unix_s = elements.epoch_unix_s + np.arange(96) / 96.0 * period_s
    distance = np.linalg.norm(propagate([elements], TimeGrid(unix_s)).r_km[0], axis=1)
    ellipse = orbit.ellipse(np.array(unix_s[0]), TimeGrid(unix_s[:1]).teme_to_gcrf[0])
    r_km, _, shares = ellipse.points(96)
    ten_km = 10.0  # short-periodic terms of J2
    assert_allclose(distance.mean(), shares @ np.linalg.norm(r_km, axis=0), atol=ten_km)
    assert_allclose(distance.min(), ellipse.perigee_km, atol=ten_km)


def test_an_eccentric_orbit_has_its_perigee_where_sgp4_has_it():
    eccentric = dataclasses.replace(NAVIGATION, eccentricity=0.6, mean_anomaly_deg=0.0)
    here = np.array([eccentric.epoch_unix_s])
    state = propagate([eccentric], TimeGrid(here))
    ellipse = secular_orbit(eccentric).ellipse(here[0], TimeGrid(here).teme_to_gcrf[0])
    direction = state.r_km[0, 0] / np.linalg.norm(state.r_km[0, 0])
    thousandth = 1e-3
    periodic_terms = 3e-3  # rad, of J2, Sun and Moon
    assert_allclose(ellipse.toward_perigee, direction, atol=periodic_terms)
    assert_allclose(ellipse.ahead @ state.v_km_s[0, 0], np.linalg.norm(state.v_km_s[0, 0]), rtol=thousandth)


def test_size_and_shape_are_held_however_long():
    dragged = dataclasses.replace(STATION_LIKE, bstar_per_earth_radius=1e-3)
    later = dragged.epoch_unix_s + np.array([0.0, 400.0]) * DAY_S
    ellipse = secular_orbit(dragged).ellipse(later, TimeGrid(later).teme_to_gcrf)
    assert ellipse.perigee_km == secular_orbit(dragged).a_km * (1.0 - dragged.eccentricity)
    assert propagate([dragged], TimeGrid(later)).error[0, 1] != 0  # SGP4 has brought it down by then


@pytest.mark.parametrize(
    ("change", "why"),
    [
        ({"eccentricity": 0.05}, "inside the air"),
        ({"mean_motion_rev_per_day": 16.8}, "inside the air"),
        ({"eccentricity": 0.9}, "SGP4 refuses"),
        ({"mean_motion_rev_per_day": 17.2}, "SGP4 refuses"),
    ],
)
def test_orbits_that_reach_the_air_are_refused(change: dict[str, float], why: str):
    with pytest.raises(OrbitError, match=why):
        secular_orbit(dataclasses.replace(STATION_LIKE, **change))
