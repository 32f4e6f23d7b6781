"""SGP4 for many satellites at once: one that fails is marked, and touches no other."""

from __future__ import annotations

import dataclasses

import numpy as np
from numpy.testing import assert_allclose

from app.core.orbit.elements import MeanElements
from app.core.orbit.sgp4_batch import Ephemeris, first_failure, propagate
from app.core.orbit.sgp4_records import satrec
from app.core.sky.times import TimeGrid, format_utc

DAY_S = 86400.0
GOOD = MeanElements("GOOD", "2026-001A", 2461262.5, 0.25, 15.2, 0.001, 51.6, 10.0, 20.0, 30.0)
OTHER = dataclasses.replace(GOOD, object_name="OTHER", mean_motion_rev_per_day=2.0, eccentricity=0.3)
DECAYING = dataclasses.replace(
    GOOD, object_name="DECAYING", mean_motion_rev_per_day=16.0, bstar_per_earth_radius=0.003
)
IMPOSSIBLE = dataclasses.replace(GOOD, object_name="IMPOSSIBLE", eccentricity=0.9)
GRID = TimeGrid(GOOD.epoch_unix_s + np.arange(0.0, 10.0, 0.5) * DAY_S)


def test_a_failing_satellite_is_marked_and_touches_no_other():
    together = propagate([GOOD, DECAYING, IMPOSSIBLE, OTHER], GRID)
    assert (together.error[[0, 3]] == 0).all()
    assert together.error[1].any()
    assert together.error[2].any()
    for index, one in ((0, GOOD), (3, OTHER)):
        alone = propagate([one], GRID)
        assert_allclose(together.r_km[index], alone.r_km[0], rtol=0.0, atol=0.0)
        assert np.isfinite(together.v_km_s[index]).all()


def test_shapes_and_the_first_instants_only():
    few = propagate([GOOD, OTHER], GRID, count=3)
    assert few.r_km.shape == few.v_km_s.shape == (2, 3, 3)
    assert few.error.shape == (2, 3)
    assert_allclose(few.r_km, propagate([GOOD, OTHER], GRID).r_km[:, :3], rtol=0.0, atol=0.0)


def test_rotating_to_gcrf_keeps_lengths_and_angles():
    states = propagate([GOOD], GRID)
    _, r_teme, v_teme = satrec(GOOD).sgp4_array(*GRID.utc)
    one_micrometre_km = 1e-9
    assert_allclose(
        np.linalg.norm(states.r_km[0], axis=1), np.linalg.norm(r_teme, axis=1), atol=one_micrometre_km
    )
    assert_allclose(
        np.sum(states.r_km[0] * states.v_km_s[0], axis=1), np.sum(r_teme * v_teme, axis=1), atol=1e-7
    )


def test_failures_are_said_in_words_with_their_time():
    together = propagate([GOOD, DECAYING, IMPOSSIBLE], GRID)
    assert first_failure(together, 0, GRID.unix_s) is None
    refused = first_failure(together, 2, GRID.unix_s)
    assert refused is not None
    assert refused.startswith("SGP4 error 6 at 2026-08-10T06:00:00Z: ")


def test_the_earliest_reason_counts():
    # it dips below 100 km before SGP4 itself gives up
    states = propagate([DECAYING], GRID)
    low, bad = (
        int(np.argmax(flags))
        for flags in (np.linalg.norm(states.r_km[0], axis=1) < 6478.0, states.error[0] != 0)
    )
    assert 0 < low < bad
    expected = f"below 6478 km (100 km of air) at {format_utc(GRID.unix_s[low])}: decaying"
    assert first_failure(states, 0, GRID.unix_s) == expected
    assert first_failure(states, 0, GRID.unix_s[:low]) is None
    after = Ephemeris(states.r_km[:, bad:], states.v_km_s[:, bad:], states.error[:, bad:])
    said = first_failure(after, 0, GRID.unix_s[bad:])
    assert said is not None
    assert said.startswith(f"SGP4 error {states.error[0, bad]} at {format_utc(GRID.unix_s[bad])}")
