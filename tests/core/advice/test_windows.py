"""Lee windows on real SGP4 tracks: against a tenth-of-a-second search and the closed form of a circular orbit."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.advice.events import Interval
from app.core.advice.plan import PlanExposure, between
from app.core.advice.run_sky import PlanSky, plan_sky
from app.core.advice.windows import lee_intervals, track_of
from app.core.exposure.faces import StreamSet, stream_focusing
from app.core.orbit.elements import MeanElements
from app.core.sky.times import TimeGrid, regular_grid
from app.core.streams.activity import downstream_direction
from app.core.streams.flux import MASS_LAWS
from app.core.streams.model import Stream
from app.errors import OrbitError
from tests.core.advice.samples import (
    CAPRICORNIDS,
    DAY_S,
    LOW,
    MASS,
    PEAK_2026_UNIX_S,
    PERSEIDS,
    RING,
    TALL,
    judged_by,
    plate,
)

LAW = MASS_LAWS["jvb"]
tenth_of_a_second = 0.1
NINE_MINUTES_S = 540.0


def sky(
    *streams: Stream, start: float = PEAK_2026_UNIX_S, days: float = 1.0, step_s: float = 60.0
) -> PlanSky:
    return plan_sky(StreamSet(streams, LAW), start, start + days * DAY_S, step_s)


def exposure(elements: MeanElements, plan: PlanSky) -> PlanExposure:
    return PlanExposure(plan, plate(MASS), track_of(elements, plan.grid, len(plan.grid)))


def windows(elements: MeanElements, plan: PlanSky, members: tuple[int, ...] = (0,)) -> list[Interval]:
    return exposure(elements, plan).lee(members)


def hidden(elements: MeanElements, streams: tuple[Stream, ...], unix_s: np.ndarray) -> np.ndarray:
    """Whether all streams are hidden at each instant, without any interpolation."""
    grid = TimeGrid(unix_s)
    flow = np.stack([downstream_direction(s, grid.solar_longitude_deg) for s in streams], axis=1)
    margin = stream_focusing(StreamSet(streams, LAW), flow, track_of(elements, grid, len(grid)).r_km).margin
    return np.all(margin > 0.0, axis=0)


@pytest.mark.parametrize(
    ("elements", "streams"),
    [(LOW, (PERSEIDS,)), (LOW, (PERSEIDS, CAPRICORNIDS)), (LOW, (CAPRICORNIDS,)), (TALL, (PERSEIDS,))],
    ids=["low", "low, two streams", "low, slow stream", "eccentric"],
)
def test_edges_agree_with_a_search_every_tenth_of_a_second(
    elements: MeanElements, streams: tuple[Stream, ...]
):
    plan = sky(*streams)
    found = [
        w for w in windows(elements, plan, tuple(range(len(streams)))) if w.start_unix_s > PEAK_2026_UNIX_S
    ]
    assert found
    for window in found[:3]:
        for edge, opens in ((window.start_unix_s, True), (window.end_unix_s, False)):
            near = edge + np.arange(-NINE_MINUTES_S / 4.0, NINE_MINUTES_S / 4.0, tenth_of_a_second)
            inside = hidden(elements, streams, near)
            change = np.flatnonzero(inside[1:] != inside[:-1])
            assert len(change) == 1
            assert inside[-1] == opens
            assert near[change[0]] - 1e-3 <= edge <= near[change[0] + 1] + 1e-3


def test_edges_follow_a_radiant_that_drifts_between_samples():
    # twenty degrees of drift a degree of the Sun move an edge by 0.2 s within a minute
    five_milliseconds = 5e-3
    drifting = replace(PERSEIDS, drift_ra_deg_per_deg=20.0, drift_dec_deg_per_deg=-10.0)
    found = windows(LOW, sky(drifting, days=0.5))[1:-1]
    starts, ends = (np.array([getattr(w, f"{edge}_unix_s") for w in found]) for edge in ("start", "end"))
    assert len(found) >= 5
    for edges, opens in ((starts, True), (ends, False)):
        assert np.all(hidden(LOW, (drifting,), edges + five_milliseconds) == opens)
        assert np.all(hidden(LOW, (drifting,), edges - five_milliseconds) != opens)


def test_every_hidden_minute_lies_in_a_window_and_no_other():
    plan = sky(PERSEIDS, CAPRICORNIDS)
    found = windows(LOW, plan, (0, 1))
    inside = np.zeros(len(plan.grid), dtype=bool)
    for window in found:
        inside |= (plan.grid.unix_s > window.start_unix_s) & (plan.grid.unix_s < window.end_unix_s)
    assert np.array_equal(inside, hidden(LOW, (PERSEIDS, CAPRICORNIDS), plan.grid.unix_s))
    assert 14 <= len(found) <= 17  # one each revolution of 94.7 minutes


def test_edges_hardly_depend_on_the_step():
    a_hundredth_of_a_second = 0.01
    coarse, fine = (windows(LOW, sky(PERSEIDS, days=0.5, step_s=step)) for step in (60.0, 20.0))
    edges = [[(w.start_unix_s, w.end_unix_s) for w in found] for found in (coarse, fine)]
    assert_allclose(edges[0], edges[1], rtol=0, atol=a_hundredth_of_a_second)


@pytest.mark.parametrize(("v_inf_km_s", "half_angle_deg"), [(59.1, 71.749), (33.8, 69.525), (20.4, 64.411)])
def test_length_on_a_circular_orbit_is_that_of_the_closed_form(v_inf_km_s: float, half_angle_deg: float):
    """Derived: cos(psi) = cos(theta_s)/cos(beta), sheltered share psi/pi; theta_s of the bent shadow at 6778 km."""
    six_seconds = 6.0
    stream = replace(CAPRICORNIDS, v_geocentric_km_s=v_inf_km_s)
    circle = replace(LOW, mean_motion_rev_per_day=15.5567, eccentricity=1e-4)  # 6778 km
    plan = sky(stream, days=0.5)
    seen = exposure(circle, plan)
    normal = np.cross(seen.track.r_km, seen.track.v_km_s, axis=0)
    sine = np.einsum("kt,kt->t", plan.state.downstream[:, 0], normal / np.linalg.norm(normal, axis=0))
    for window in seen.lee((0,))[1:-1]:
        beta_cosine = np.sqrt(1.0 - np.interp(window.start_unix_s, plan.grid.unix_s, sine) ** 2)
        share = np.arccos(np.cos(np.radians(half_angle_deg)) / beta_cosine) / np.pi
        assert_allclose(window.duration_s, share * DAY_S / 15.5567, atol=six_seconds)


def test_the_geostationary_ring_is_sheltered_an_hour_a_day_at_most():
    """eta Aquariids: 58.1 minutes at the anti-radiant, derived for declination -0.9; the ring's tilt is 0.05."""
    one_minute = 60.0
    eta = replace(PERSEIDS, v_geocentric_km_s=65.5, radiant_ra_deg=338.0, radiant_dec_deg=-0.9)
    start = plan_start = PEAK_2026_UNIX_S
    found = windows(RING, sky(eta, start=plan_start, days=2.0))
    inner = [w for w in found if start < w.start_unix_s and w.end_unix_s < start + 2.0 * DAY_S]
    assert inner
    assert_allclose([w.duration_s for w in inner], 58.1 * 60.0, atol=one_minute)


def test_the_ring_sees_a_northern_stream_all_day():
    assert windows(RING, sky(PERSEIDS, days=1.0)) == []


def test_two_streams_are_hidden_together_where_each_is_hidden():
    plan = sky(PERSEIDS, CAPRICORNIDS)
    seen = exposure(LOW, plan)
    both = seen.lee((0, 1))
    expected = [
        (max(a.start_unix_s, b.start_unix_s), min(a.end_unix_s, b.end_unix_s))
        for a in seen.lee((0,))
        for b in seen.lee((1,))
        if a.overlaps(b.start_unix_s, b.end_unix_s)
    ]
    assert_allclose([(w.start_unix_s, w.end_unix_s) for w in both], expected, rtol=0, atol=3e-3)


def test_the_streams_that_matter_are_those_whose_excess_adds_up():
    plan = sky(PERSEIDS, CAPRICORNIDS)
    seen = exposure(LOW, plan)
    span = float(plan.grid.unix_s[0]), float(plan.grid.unix_s[-1])
    largest = np.array([seen.rates[0, s].max() for s in range(2)])
    # the weak stream's excess in units of a quarter of that at ready_at (0.5): just below and just above 1
    for weak, mattering in ((0.9, (0,)), (1.1, (0, 1))):
        base = judged_by([largest[1] / (weak * 0.25 * 0.5)])
        assert seen.mattering(base, *span) == mattering
        assert seen.strongest(base, *span) == (0,)


def test_nothing_matters_when_nothing_is_near_ready():
    plan = sky(PERSEIDS, CAPRICORNIDS, days=0.1)
    seen = exposure(LOW, plan)
    calm = judged_by([1e3 * seen.rates.max()])
    assert seen.mattering(calm, float(plan.grid.unix_s[0]), float(plan.grid.unix_s[-1])) == ()


def test_a_quiet_week_has_no_streams_and_no_windows():
    plan = sky(
        replace(PERSEIDS, start_solar_longitude_deg=130.0, end_solar_longitude_deg=150.0), start=1.77e9
    )
    seen = exposure(LOW, plan)
    assert plan.indices == ()
    assert seen.rates.shape == (1, 0, 1441)
    assert seen.mattering(judged_by([1.0]), 1.77e9, 1.77e9 + DAY_S) == ()
    assert seen.strongest(judged_by([1.0]), 1.77e9, 1.77e9 + DAY_S) == ()


@pytest.mark.parametrize(
    ("start", "end", "kept"),
    [
        (0.0, 30.0, slice(0, 4)),
        (10.0, 20.0, slice(1, 3)),
        (11.0, 19.0, slice(2, 2)),
        (25.0, 99.0, slice(3, 4)),
    ],
)
def test_samples_between_two_instants_include_both(start: float, end: float, kept: slice):
    assert between(np.array([0.0, 10.0, 20.0, 30.0]), start, end) == kept


def test_no_track_has_no_windows():
    plan = sky(PERSEIDS, days=0.1)
    track = track_of(LOW, plan.grid, 0)
    assert track.r_km.shape == (3, 0)
    assert lee_intervals(track, plan.streams, plan.state.downstream[..., :0], np.empty((1, 0)), [0]) == []


def test_a_decaying_orbit_says_when():
    falling = replace(LOW, mean_motion_rev_per_day=16.3, bstar_per_earth_radius=0.1)
    grid = regular_grid(LOW.epoch_unix_s, LOW.epoch_unix_s + 30.0 * DAY_S, 600.0)
    with pytest.raises(OrbitError, match=r"at 2026-\d\d-\d\dT\d\d:\d\d:\d\dZ"):
        track_of(falling, grid, len(grid))
