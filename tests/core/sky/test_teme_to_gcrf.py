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
# astropy adds the turn of the frame itself (precession, 8e-12 rad/s): a millimetre a second at 130 000 km.
two_millimetres_per_s_km_s = 2e-6
SETS = resources.files("sgp4").joinpath("SGP4-VER.TLE").read_text("ascii")


def elements() -> list[MeanElements]:
    """Low, medium, geosynchronous and highly elliptical orbits, epochs from 1980 to 2006."""
    results = read_tle(SETS, "SGP4-VER.TLE", text_after_column_69=True)
    return [r for r in results if isinstance(r, MeanElements)]


@cache
def ours(one: MeanElements) -> tuple[TimeGrid, Ephemeris]:
    # Dense enough that the slow part of the rotation is taken between nodes half an hour apart.
    grid = TimeGrid(one.epoch_unix_s + np.arange(0.0, 43_200.0, 900.0))
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
    assert v_off.max() < two_millimetres_per_s_km_s


def test_against_skyfield_beyond_the_published_earth_orientation(timescale):
    # 2027 and 2028: no measured UT1 exists; it cancels, so nothing is lost
    grid = TimeGrid(np.array([1_800_000_000.0, 1_830_000_000.0]))
    one = MeanElements("AHEAD", "2026-001A", 2461600.5, 0.0, 1.0027, 1e-4, 5.0, 10.0, 20.0, 30.0)
    moments = timescale.from_datetimes([datetime.fromtimestamp(t, UTC) for t in grid.unix_s])
    theirs = EarthSatellite.from_satrec(satrec(one), timescale).at(moments)
    r_km = propagate([one], grid).r_km[0]
    assert np.linalg.norm(theirs.position.km.T - r_km, axis=1).max() < one_metre_km


def test_a_dense_grid_differs_from_single_instants_by_a_centimetre():
    unix_s = 1_786_320_000.0 + np.arange(0.0, 10 * 86_400.0, 600.0)
    dense, sparse = TimeGrid(unix_s), TimeGrid(unix_s[::300])
    centimetre_at_geo_rad = 3e-10
    assert np.abs(dense.teme_to_gcrf[::300] - sparse.teme_to_gcrf).max() < centimetre_at_geo_rad
    assert np.abs(dense.sun_km[::300] - sparse.sun_km).max() < 3.0


@pytest.mark.parametrize("step_s", [600.0, 5e6])
def test_the_matrices_are_rotations(step_s: float):
    turn = TimeGrid(1e9 + step_s * np.arange(200)).teme_to_gcrf
    between_nodes = (
        1e-12  # a straight line between two rotations is short by half the square of their difference
    )
    assert np.abs(turn @ np.swapaxes(turn, 1, 2) - np.eye(3)).max() < between_nodes
    assert np.abs(np.linalg.det(turn) - 1.0).max() < between_nodes
