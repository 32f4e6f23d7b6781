"""An isotropic flux near the Earth: focusing, shielding, and a moving face.

Focusing factor: Opik 1951, Kessler 1972, as restated by Matney 2002 (read). Shielding angle with 100 km of air and
the speed ratio K: ECSS-E-ST-10-04C annex C.1 (structure read; equations restored from their definitions).
Bent shielding, oriented and moving faces: derived from Liouville's theorem, checked by sampling.
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.constants import EARTH_RADIUS_KM, MU_EARTH_KM3_S2
from app.core.exposure.background import FINE, background_rates, relative_sky, shielded_share
from app.core.exposure.faces import Places
from app.core.spacecraft.model import Criterion, CriterionKind
from app.core.streams.sporadic import SpeedDistribution, analytic_speeds, gruen_flux_per_m2_s
from tests.published.probes import one_speed, plates, solve
from tests.published.tables import column

MASS_G = 1e-6
DENSE = (64, 128)  # quadrature of the sky: polar, azimuth
STRAIGHT_KM_S = 1e6  # so fast that the Earth does not bend it
FAR_KM = 1e10  # so far that the Earth does not hide anything
UP_DOWN_LEVEL = [(1.0, 0.0, 0.0), (-1.0, 0.0, 0.0), (0.0, 1.0, 0.0)]  # at a place on the x axis
one_permille = 1e-3
numerical = 1e-4
last_digit = 1.2e-5  # a table printed to five figures


def place(altitude_km: float) -> np.ndarray:
    return np.array([EARTH_RADIUS_KM + altitude_km, 0.0, 0.0])


def flux_on_plate(
    r_km: np.ndarray, speeds: SpeedDistribution, v_km_s: tuple[float, ...] = (0, 0, 0)
) -> float:
    """Flux on a tumbling plate over that in free space: a quarter of density times speed."""
    velocity, density = relative_sky(r_km, np.array(v_km_s, dtype=float), speeds)
    return float(np.sum(density * np.linalg.norm(velocity, axis=0)) / 4.0)


def face_rates(
    r_km: np.ndarray,
    speeds: SpeedDistribution,
    normals: list,
    v_km_s: tuple[float, ...] = (0, 0, 0),
    nodes: tuple[int, int] = DENSE,
) -> np.ndarray:
    """Rates on fixed faces above a mass, over the free-space flux above it."""
    places = Places(r_km[:, None], np.array(v_km_s, dtype=float)[:, None], np.array([[0.0], [1.5e8], [0.0]]))
    spacecraft = plates(normals, Criterion(CriterionKind.MASS, MASS_G))
    return background_rates(spacecraft, places, np.ones(1), speeds, nodes) / gruen_flux_per_m2_s(MASS_G)


@pytest.mark.case(7)
def test_focusing_of_one_speed_at_400_km():
    r_km, speeds = place(400.0), one_speed(20.0)
    focusing = flux_on_plate(r_km, speeds) / shielded_share(r_km[0], np.array([20.0]))
    assert_allclose(focusing, 1.29404, rtol=numerical)
    velocity, _ = relative_sky(r_km, np.zeros(3), speeds)
    escape_km_s = np.sqrt(np.sum(np.square(velocity), axis=0) - 20.0**2)
    assert_allclose(escape_km_s, 10.8451, rtol=numerical)


@pytest.mark.case(8)
@pytest.mark.parametrize(("altitude_km", "share"), [(400.0, 0.64711), (800.0, 0.71537), (35786.0, 0.99406)])
def test_shielding_along_straight_lines(altitude_km: float, share: float):
    fast = np.array([STRAIGHT_KM_S])
    assert_allclose(shielded_share(EARTH_RADIUS_KM + altitude_km, fast), share, rtol=numerical)


@pytest.mark.case(9)
def test_speed_ratio_of_a_satellite_at_400_km():
    # K = mean of v_rel/v = 1 + (V/v)^2/3; the local speed stands for v, the Earth taken out of the sky
    local_km_s, orbital_km_s = np.hypot(20.0, 10.8451), np.sqrt(MU_EARTH_KM3_S2 / 6778.0)
    sky, speeds = np.array([FAR_KM, 0.0, 0.0]), one_speed(local_km_s)
    ratio = flux_on_plate(sky, speeds, (0.0, orbital_km_s, 0.0)) / flux_on_plate(sky, speeds)
    assert_allclose(ratio, 1.03787, rtol=numerical)


@pytest.mark.case(10)
@pytest.mark.parametrize(("altitude_km", "product"), [(400.0, 0.82650), (800.0, 0.89941), (35786.0, 1.03949)])
def test_the_sporadic_sky_equals_streams_averaged_over_all_radiants(altitude_km: float, product: float):
    count = 40_000  # evenly in the cosine: the shadow's edge costs one part in as many
    cosine = (np.arange(count) + 0.5) * (2.0 / count) - 1.0
    solved = solve(EARTH_RADIUS_KM + altitude_km, np.degrees(np.arccos(cosine)), 20.0)
    assert_allclose(solved.flux_ratio.mean(), product, rtol=one_permille)
    assert_allclose(flux_on_plate(place(altitude_km), one_speed(20.0)), product, atol=last_digit)


@pytest.mark.case(11)
@pytest.mark.parametrize(
    ("altitude_km", "zenith", "nadir", "horizon"),
    [(400.0, 1.0, 0.08656, 0.68456), (800.0, 1.0, 0.18553, 0.76548)],
)
def test_fixed_faces_along_straight_lines(altitude_km: float, zenith: float, nadir: float, horizon: float):
    velocity, density = relative_sky(place(altitude_km), np.zeros(3), one_speed(STRAIGHT_KM_S), DENSE)
    rates = np.maximum(-np.array(UP_DOWN_LEVEL) @ velocity, 0.0) @ density
    assert_allclose(rates, [zenith, nadir, horizon], rtol=one_permille)


@pytest.mark.case(11)
@pytest.mark.parametrize(
    ("altitude_km", "share", "focusing"), [(400.0, 0.63870, 1.29404), (800.0, 0.70396, 1.27765)]
)
def test_fixed_faces_along_bent_lines(altitude_km: float, share: float, focusing: float):
    # the same formulas with the half-angle that bent rays leave open: share = (1 + cos eta)/2 at 20 km/s
    eta = np.arccos(2.0 * share - 1.0)
    faces = np.array([1.0, np.cos(eta) ** 2, 1.0 - (eta - np.sin(eta) * np.cos(eta)) / np.pi])
    rates = face_rates(place(altitude_km), one_speed(20.0), UP_DOWN_LEVEL)
    assert_allclose(rates, focusing * faces, rtol=one_permille)
    # The program's own quadrature is coarser: small against a background known to 30 %.
    of_the_free_flux = 2e-3
    rates = face_rates(place(altitude_km), one_speed(20.0), UP_DOWN_LEVEL, nodes=FINE)
    assert_allclose(rates, focusing * faces, atol=of_the_free_flux)


@pytest.mark.case(12)
def test_moving_faces():
    # x = V/v = 0.33707: (1 + x)^2 ahead, (1 - x)^2 behind, 1 at the side; nothing is hidden
    v_km_s = 20.0
    rates = face_rates(
        np.array([FAR_KM, 0.0, 0.0]),
        one_speed(v_km_s),
        [(0.0, 1.0, 0.0), (0.0, -1.0, 0.0), (0.0, 0.0, 1.0)],
        (0.0, 0.33707 * v_km_s, 0.0),
    )
    assert_allclose(rates, [1.7877, 0.4395, 1.0], rtol=one_permille)


ORBITS = range(len(column("isotropic_orbit_factors", "altitude_km")))


@pytest.mark.parametrize("row", ORBITS)
def test_every_orbit_of_the_table(row: int):
    altitude, straight, exact, single, analytic = (
        column("isotropic_orbit_factors", name)[row]
        for name in (
            "altitude_km",
            "sf_straight_line",
            "sf_exact_for_20_km_s",
            "G_single_speed_20",
            "G_analytic_distribution",
        )
    )
    distance = EARTH_RADIUS_KM + altitude
    assert_allclose(
        shielded_share(distance, np.array([STRAIGHT_KM_S, 20.0])), [straight, exact], atol=last_digit
    )
    assert_allclose(flux_on_plate(place(altitude), one_speed(20.0)) / exact, single, rtol=numerical)
    speeds = analytic_speeds()
    open_sky = shielded_share(distance, speeds.v_inf_km_s)
    velocity, density = relative_sky(place(altitude), np.zeros(3), speeds)
    by_speed = (density * np.linalg.norm(velocity, axis=0)).reshape(len(open_sky), -1).sum(axis=1) / 4.0
    assert_allclose(np.sum(by_speed / open_sky), analytic, rtol=numerical)
