"""The outlook's orbit average against the mean of the time-resolved rates over whole revolutions of SGP4."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.advice.outlook import outlook_rates
from app.core.advice.run_sky import RunSky, run_sky
from app.core.advice.windows import track_of
from app.core.exposure.faces import Places, StreamSet, hazard_rates
from app.core.orbit.averaging import SecularOrbit, secular_orbit
from app.core.orbit.elements import MeanElements
from app.core.sky.times import regular_grid
from app.core.spacecraft.model import AttitudeLaw, AttitudeLawKind, Joint, Spacecraft
from app.core.streams.flux import MASS_LAWS
from app.core.streams.model import Component, Stream
from tests.core.advice.samples import (
    AS_OF_UNIX_S,
    CAPRICORNIDS,
    CHARGE,
    DAY_S,
    LOW,
    MASS,
    PERSEIDS,
    RING,
    TALL,
    WALL,
    box,
)

LAW = MASS_LAWS["jvb"]
SUN = AttitudeLaw(AttitudeLawKind.SUN)
FIXED = AttitudeLaw(AttitudeLawKind.INERTIAL, (0.1, 0.2, 0.3, 0.9273618495495703))
two_percent = 0.02
# 96 phases place the edge of the shadow to 1/96 of a revolution; 960 agree ten times better.
sampling_of_the_edge = 0.015


def steady(stream: Stream, peak_deg: float = 140.0) -> Stream:
    """The same radiant and speed; the rate does not change with time and the radiant stays."""
    component = Component("main", peak_deg, 100.0, 0.0, 0.0)
    return replace(stream, components=(component,), drift_ra_deg_per_deg=0.0, drift_dec_deg_per_deg=0.0)


def outlook_at_peak(
    spacecraft: Spacecraft, orbit: SecularOrbit, stream: Stream, as_of_unix_s: float = AS_OF_UNIX_S
) -> tuple[np.ndarray, float]:
    """Orbit-averaged rates of all rows at the peak, and when that is."""
    sky = run_sky([stream], LAW, as_of_unix_s, 1.0, 100.0)
    rates, _ = outlook_rates(sky, spacecraft, orbit)
    middle = sky.outlook.fine_unix_s.shape[1] // 2
    return rates[:, 0, middle], float(sky.outlook.fine_unix_s[0, middle])


def mean_of_revolutions(
    spacecraft: Spacecraft, elements: MeanElements, stream: Stream, unix_s: float
) -> np.ndarray:
    """Mean of the rates over whole revolutions about an instant, a day's worth, every 20 seconds."""
    revolutions = max(round(elements.mean_motion_rev_per_day), 1)
    length = revolutions / elements.mean_motion_rev_per_day * DAY_S
    count = round(length / 20.0)
    grid = regular_grid(unix_s - length / 2.0, unix_s + length / 2.0 - 1.0, length / count)
    assert len(grid) == count
    track = track_of(elements, grid, count)
    flow = np.repeat(-radiant(stream)[:, None, None], count, axis=2)
    places = Places(track.r_km, track.v_km_s, grid.sun_km.T)
    rates = hazard_rates(spacecraft, StreamSet((stream,), LAW), flow, places, np.full((1, count), 100.0))
    return rates[:, 0].mean(axis=1)


def radiant(stream: Stream) -> np.ndarray:
    ra, dec = np.radians([stream.radiant_ra_deg, stream.radiant_dec_deg])
    return np.array([np.cos(dec) * np.cos(ra), np.cos(dec) * np.sin(ra), np.sin(dec)])


def compare(spacecraft: Spacecraft, elements: MeanElements, stream: Stream, of_largest: float) -> None:
    """Each face to ``two_percent`` or, where little reaches it, to a share of the largest."""
    averaged, peak = outlook_at_peak(spacecraft, secular_orbit(elements), stream)
    expected = mean_of_revolutions(spacecraft, elements, stream, peak)
    by_criterion = np.ptp(expected.reshape(len(spacecraft.faces), -1), axis=0)
    scale = np.tile(by_criterion, len(spacecraft.faces))
    assert np.all(np.abs(averaged - expected) <= two_percent * expected + of_largest * scale)
    assert_allclose(averaged.sum(), expected.sum(), rtol=sampling_of_the_edge)


@pytest.mark.parametrize("elements", [LOW, RING, TALL], ids=lambda e: e.object_name)
@pytest.mark.parametrize("attitude", [AttitudeLaw(), SUN, FIXED], ids=["nadir", "sun", "inertial"])
def test_it_is_the_mean_over_whole_revolutions(elements: MeanElements, attitude: AttitudeLaw):
    spacecraft = box(MASS, WALL, CHARGE, attitude=attitude)
    compare(spacecraft, elements, steady(PERSEIDS), of_largest=sampling_of_the_edge)


def test_it_holds_for_a_slow_stream_in_a_low_orbit():
    compare(box(MASS, WALL), LOW, steady(CAPRICORNIDS), of_largest=sampling_of_the_edge)


def test_it_holds_for_an_array_that_follows_the_sun():
    joint = Joint("drive", (0.0, 1.0, 0.0), (0.0, 0.0, 1.0))
    still = box(MASS)
    faces = (*still.faces, replace(still.faces[4], name="array", joint="drive"))
    compare(
        replace(still, faces=faces, joints=(joint,)), LOW, steady(PERSEIDS), of_largest=sampling_of_the_edge
    )


def test_the_share_of_time_in_shelter_lowers_the_average():
    """Closed form (derived): the Earth hides a share psi/pi, cos(psi) = cos(71.749)/cos(beta)."""
    face = (box(MASS, attitude=AttitudeLaw(AttitudeLawKind.INERTIAL, (0.0, 0.0, 0.0, 1.0))).faces)[0]
    toward = replace(face, normal=tuple(radiant(PERSEIDS)))
    aimed = Spacecraft("wren", "Wren", (toward,), AttitudeLaw(AttitudeLawKind.INERTIAL, (0.0, 0.0, 0.0, 1.0)))
    circle = replace(secular_orbit(LOW), a_km=6778.0, eccentricity=0.0, inclination=0.0, raan_rate=0.0)
    averaged, _ = outlook_at_peak(aimed, circle, steady(PERSEIDS))
    # the equator's plane lies 58 degrees from the radiant, near enough in any year
    share = np.arccos(np.cos(np.radians(71.749)) / np.cos(np.radians(58.0))) / np.pi
    far = StreamSet((steady(PERSEIDS),), LAW).flux_law.flux_per_m2_s(100.0, 1e-6)[0]
    focusing_and_motion = 0.02
    assert_allclose(averaged[0] / far, 1.0 - share, rtol=focusing_and_motion)


TWO_MONTHS_ON = steady(PERSEIDS, peak_deg=195.0)


def test_the_plane_is_carried_by_its_secular_drift():
    # -5 degrees a day: the plane turns most of the way round before the peak, as SGP4's own does
    spacecraft, stream = box(MASS), TWO_MONTHS_ON
    orbit = secular_orbit(LOW)
    carried, peak = outlook_at_peak(spacecraft, orbit, stream)
    expected = mean_of_revolutions(spacecraft, LOW, stream, peak)
    assert peak - LOW.epoch_unix_s > 50.0 * DAY_S
    assert_allclose(carried, expected, rtol=two_percent, atol=sampling_of_the_edge * expected.max())
    held, _ = outlook_at_peak(spacecraft, replace(orbit, raan_rate=0.0), stream)
    assert np.abs(held - expected).max() > 0.2 * expected.max()


def test_the_perigee_is_carried_too():
    spacecraft, stream = box(MASS), TWO_MONTHS_ON
    turning = replace(TALL, inclination_deg=20.0)  # 63.4 degrees would hold it
    orbit = secular_orbit(turning)
    carried, peak = outlook_at_peak(spacecraft, orbit, stream)
    expected = mean_of_revolutions(spacecraft, turning, stream, peak)
    assert_allclose(carried, expected, rtol=two_percent, atol=sampling_of_the_edge * expected.max())


def test_drag_cannot_bring_the_satellite_down_in_the_outlook():
    dragged = replace(LOW, bstar_per_earth_radius=0.02)
    spacecraft, stream = box(MASS), TWO_MONTHS_ON
    free, _ = outlook_at_peak(spacecraft, secular_orbit(LOW), stream)
    held, _ = outlook_at_peak(spacecraft, secular_orbit(dragged), stream)
    assert held.max() > 0.0
    assert_allclose(held, free, rtol=two_percent, atol=sampling_of_the_edge * free.max())


@pytest.mark.parametrize("knots_before_the_peak", [0.5, 2.5, -1.5])
def test_between_knots_the_geometry_is_carried_on(knots_before_the_peak: float):
    # two days between knots, in which the plane turns by ten degrees
    limits = {"start_solar_longitude_deg": 116.0, "end_solar_longitude_deg": 164.0}
    stream = replace(steady(PERSEIDS), **limits)
    sky = run_sky([stream], LAW, AS_OF_UNIX_S, 1.0, 60.0)
    rates, _ = outlook_rates(sky, box(MASS), secular_orbit(LOW))
    knot = sky.outlook.knot_unix_s[0]
    wanted = knot[12] - knots_before_the_peak * (knot[13] - knot[12])
    nearest = int(np.argmin(np.abs(sky.outlook.fine_unix_s[0] - wanted)))
    expected = mean_of_revolutions(box(MASS), LOW, stream, float(sky.outlook.fine_unix_s[0, nearest]))
    assert_allclose(rates[:, 0, nearest], expected, rtol=0, atol=sampling_of_the_edge * expected.max())


def test_rates_between_knots_follow_the_rate_of_the_stream():
    sky = run_sky([PERSEIDS], LAW, AS_OF_UNIX_S, 1.0, 30.0)
    spherical = secular_orbit(replace(LOW, inclination_deg=90.0))  # a polar plane does not drift
    rates, _ = outlook_rates(sky, box(MASS), spherical)
    ratio = rates[:, 0].sum(axis=0) / sky.outlook.fine_zhr[0]
    assert rates.shape == (6, 1, sky.outlook.fine_zhr.shape[1])
    assert np.ptp(ratio) / ratio.mean() < 0.25  # what is left is the drift of the radiant
    assert np.argmax(rates[:, 0].sum(axis=0)) == sky.outlook.fine_zhr.shape[1] // 2


def sky_of(stream: Stream) -> RunSky:
    return run_sky([stream], LAW, AS_OF_UNIX_S, 1.0, 30.0)


@pytest.mark.parametrize(("elements", "capped"), [(RING, True), (LOW, False)], ids=["ring", "low"])
def test_only_high_orbits_can_be_near_a_lit_axis(elements: MeanElements, capped: bool):
    # a slow stream whose anti-radiant lies in the equator, of a spread that no phase can step over
    stream = replace(
        steady(CAPRICORNIDS), radiant_dec_deg=0.0, v_geocentric_km_s=15.0, radiant_spread_deg=3.0
    )
    rates, marks = outlook_rates(sky_of(stream), box(MASS), secular_orbit(elements))
    assert marks == [capped]
    assert np.all(np.isfinite(rates))
