"""TEME to GCRF against two independent libraries, on the SGP4 verification sets (Vallado et al. 2006)."""

from __future__ import annotations

from datetime import UTC, datetime
from functools import cache
from importlib import resources

import numpy as np
import pytest
from astropy import units as u
from astropy.coordinates import GCRS, TEME, CartesianDifferential, CartesianRepresentation
from astropy.time import Time
from skyfield.api import EarthSatellite, load

from app.core.orbit.elements import MeanElements
from app.core.orbit.sgp4_batch import Ephemeris, propagate
from app.core.orbit.sgp4_records import satrec
from app.core.sky.times import TimeGrid
from app.formats.tle import read_tle

one_metre_km = 1e-3
one_millimetre_per_s_km_s = 1e-6
SETS = resources.files("sgp4").joinpath("SGP4-VER.TLE").read_text("ascii")


def elements() -> list[MeanElements]:
    """Low, medium, geosynchronous and highly elliptical orbits, epochs from 1980 to 2006."""
    results = read_tle(SETS, "SGP4-VER.TLE", text_after_column_69=True)
    return [r for r in results if isinstance(r, MeanElements)]


@cache
def ours(one: MeanElements) -> tuple[TimeGrid, Ephemeris]:
    grid = TimeGrid(one.epoch_unix_s + np.array([0.0, 3600.0, 40_000.0]))
    return grid, propagate([one], grid)


def good(ephemeris: Ephemeris) -> np.ndarray:
    return ephemeris.error[0] == 0


@pytest.fixture(scope="module")
def timescale():
    return load.timescale(builtin=True)


@pytest.mark.parametrize("one", elements(), ids=lambda e: e.object_name)
def test_against_skyfield(one: MeanElements, timescale):
    grid, ephemeris = ours(one)
    moments = timescale.from_datetimes([datetime.fromtimestamp(t, UTC) for t in grid.unix_s])
    theirs = EarthSatellite.from_satrec(satrec(one), timescale).at(moments)
    kept = good(ephemeris)
    assert kept.any()
    r_off = np.linalg.norm(theirs.position.km.T - ephemeris.r_km[0], axis=1)[kept]
    assert r_off.max() < one_metre_km


@pytest.mark.parametrize("one", elements(), ids=lambda e: e.object_name)
def test_against_astropy(one: MeanElements):
    grid, ephemeris = ours(one)
    _, r_teme, v_teme = satrec(one).sgp4_array(*grid.utc)
    moments = Time(*grid.utc, format="jd", scale="utc")
    state = CartesianRepresentation(
        r_teme.T * u.km, differentials=CartesianDifferential(v_teme.T * u.km / u.s)
    )
    theirs = TEME(state, obstime=moments).transform_to(GCRS(obstime=moments)).cartesian
    kept = good(ephemeris)
    r_off = np.linalg.norm(theirs.xyz.to_value(u.km).T - ephemeris.r_km[0], axis=1)[kept]
    assert r_off.max() < one_metre_km
    velocity = theirs.differentials["s"].d_xyz.to_value(u.km / u.s).T
    v_off = np.linalg.norm(velocity - ephemeris.v_km_s[0], axis=1)[kept]
    assert v_off.max() < one_millimetre_per_s_km_s


def test_against_skyfield_beyond_the_published_earth_orientation(timescale):
    # 2027 and 2028: no measured UT1 exists; it cancels, so nothing is lost
    grid = TimeGrid(np.array([1_800_000_000.0, 1_830_000_000.0]))
    one = MeanElements("AHEAD", "2026-001A", 2461600.5, 0.0, 1.0027, 1e-4, 5.0, 10.0, 20.0, 30.0)
    moments = timescale.from_datetimes([datetime.fromtimestamp(t, UTC) for t in grid.unix_s])
    theirs = EarthSatellite.from_satrec(satrec(one), timescale).at(moments)
    r_km = propagate([one], grid).r_km[0]
    assert np.linalg.norm(theirs.position.km.T - r_km, axis=1).max() < one_metre_km


def test_the_matrices_are_rotations():
    grid = TimeGrid(np.linspace(3e8, 2e9, 50))
    turn = grid.teme_to_gcrf
    assert np.abs(turn @ np.swapaxes(turn, 1, 2) - np.eye(3)).max() < 1e-14
    assert np.abs(np.linalg.det(turn) - 1.0).max() < 1e-14
