"""The everyday background against a plain double integral over the sky by scipy."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad, quad_vec

from app.core.constants import BLOCKING_RADIUS_KM, MU_EARTH_KM3_S2
from app.core.exposure.background import FINE, background_rates, orbit_background
from app.core.exposure.damage import critical_mass
from app.core.exposure.faces import Places, criterion_rows
from app.core.orbit.averaging import Ellipse, osculating_ellipse
from app.core.spacecraft.model import AttitudeLawKind, Criterion, CriterionKind, Spacecraft
from app.core.streams.sporadic import (
    SPORADIC_DENSITY_KG_M3,
    SpeedDistribution,
    analytic_speeds,
    gruen_flux_per_m2_s,
)
from tests.core.exposure.strategies import BOX, CRITERIA, attitude, box, winged
from tests.published.probes import one_speed

DENSE = (64, 128)
R_KM, V_KM_S = np.array([6878.0, 0.0, 0.0]), np.array([0.0, 7.0, 2.9])
SUN_KM = np.array([1e8, 1.1e8, 0.2e8])
two_permille, one_percent = 2e-3, 1e-2


def place() -> Places:
    return Places(R_KM[:, None], V_KM_S[:, None], SUN_KM[:, None])


def rates(spacecraft: Spacecraft, speeds: SpeedDistribution, nodes: tuple[int, int] = DENSE) -> np.ndarray:
    return background_rates(spacecraft, place(), np.ones(1), speeds, nodes)


def by_scipy(normal: tuple[float, ...], criterion: Criterion, v_inf_km_s: float) -> float:
    """Flux above the critical mass on a face at R_KM, +X up, from an isotropic flux of one speed at infinity."""
    limit = critical_mass(criterion, SPORADIC_DENSITY_KG_M3)
    local = np.sqrt(v_inf_km_s**2 + 2.0 * MU_EARTH_KM3_S2 / R_KM[0])
    azimuth = np.arange(2000) * (2.0 * np.pi / 2000)

    def ring(up: float) -> float:
        level = np.sqrt(1.0 - up**2)
        moving = local * np.array(
            [np.full_like(azimuth, up), level * np.cos(azimuth), level * np.sin(azimuth)]
        )
        relative = moving - V_KM_S[:, None]
        inward = np.maximum(-np.array(normal) @ relative, 0.0)
        counted = inward if limit.normal_speed else np.linalg.norm(relative, axis=0)
        mass_g = limit.at_1_km_s_g * np.maximum(counted, 1e-6) ** -limit.speed_exponent
        return float(np.mean(inward * gruen_flux_per_m2_s(mass_g)))

    # Liouville: (v/v_inf)^2 more flux in every open direction; a plate in free space sees F = pi times intensity.
    total = quad(ring, -1.0, highest_up(v_inf_km_s), epsrel=1e-6, limit=200)[0]
    return float(2.0 * np.pi * total * local / v_inf_km_s**2 / np.pi)


def highest_up(v_inf_km_s: float) -> float:
    """Steepest way up, as a cosine from the vertical, that does not come out of the Earth.

    By conservation of energy and angular momentum of the particle that grazes it.
    """
    squared = v_inf_km_s**2 + 2.0 * MU_EARTH_KM3_S2 / R_KM[0]
    grazing_speed2 = v_inf_km_s**2 + 2.0 * MU_EARTH_KM3_S2 / BLOCKING_RADIUS_KM
    sine2 = (BLOCKING_RADIUS_KM / R_KM[0]) ** 2 * grazing_speed2 / squared
    return float(np.sqrt(1.0 - sine2))


@pytest.mark.parametrize("criterion", CRITERIA, ids=lambda c: c.kind.value)
def test_every_face_of_a_moving_box(criterion: Criterion):
    spacecraft = box(attitude(AttitudeLawKind.INERTIAL), criteria=(criterion,))
    expected = [by_scipy(normal, criterion, 20.0) for normal in BOX]
    assert_allclose(rates(spacecraft, one_speed(20.0)), expected, rtol=two_permille)


def test_the_programs_own_quadrature_is_fine_enough():
    spacecraft = box(attitude(AttitudeLawKind.NADIR))
    fine, dense = (rates(spacecraft, analytic_speeds(), nodes) for nodes in (FINE, DENSE))
    assert_allclose(fine, dense, rtol=two_permille * 5, atol=two_permille * dense.min())


def test_speeds_add_up():
    spacecraft, speeds = box(attitude(AttitudeLawKind.NADIR)), analytic_speeds()
    each = [rates(spacecraft, one_speed(float(v)), (8, 16)) for v in speeds.v_inf_km_s]
    assert_allclose(speeds.free_space_share @ np.array(each), rates(spacecraft, speeds, (8, 16)), rtol=1e-9)


HIGH = osculating_ellipse(np.array([7000.0, 0.0, 0.0]), np.array([0.0, 4.5, 9.0]))


@pytest.mark.parametrize("law", list(AttitudeLawKind))
def test_the_average_over_an_eccentric_orbit(law: AttitudeLawKind):
    # time average by scipy over the eccentric anomaly E: dt = (1 - e cos E) dE
    spacecraft = winged(attitude(law))
    ours = orbit_background(spacecraft, HIGH, SUN_KM, analytic_speeds())

    def weighted(anomaly: float) -> np.ndarray:
        r_km, v_km_s, share = on(HIGH, anomaly)
        here = Places(r_km, v_km_s, SUN_KM[:, None])
        return share * background_rates(spacecraft, here, np.ones(1), analytic_speeds(), (8, 16))

    expected = quad_vec(weighted, 0.0, 2.0 * np.pi, epsrel=1e-3, limit=40)[0] / (2.0 * np.pi)
    assert_allclose(ours, expected, rtol=one_percent)
    assert len(ours) == len(criterion_rows(spacecraft))


def on(ellipse: Ellipse, anomaly: float) -> tuple[np.ndarray, np.ndarray, float]:
    """State (3, 1), (3, 1) at an eccentric anomaly, and the relative time spent there."""
    e, a = ellipse.eccentricity, ellipse.a_km
    p, q = ellipse.toward_perigee[:, None], ellipse.ahead[:, None]
    slow, flat = 1.0 - e * np.cos(anomaly), np.sqrt(1.0 - e**2)
    r_km = a * ((np.cos(anomaly) - e) * p + flat * np.sin(anomaly) * q)
    v_km_s = np.sqrt(MU_EARTH_KM3_S2 / a) / slow * (-np.sin(anomaly) * p + flat * np.cos(anomaly) * q)
    return r_km, v_km_s, slow


def test_a_heavier_threshold_is_met_less_often():
    criteria = tuple(Criterion(CriterionKind.MASS, m, label=f"{m}") for m in (1e-9, 1e-6, 1e-3))
    found = rates(box(attitude(AttitudeLawKind.NADIR), criteria=criteria), analytic_speeds(), FINE).reshape(
        6, 3
    )
    assert (np.diff(found, axis=1) < 0.0).all()
    # above a mass the speed does not matter, so all faces keep the proportions of the flux law
    proportion = gruen_flux_per_m2_s(np.array([1e-9, 1e-6, 1e-3]))
    assert_allclose(found / found[:, :1], np.tile(proportion / proportion[0], (6, 1)), rtol=1e-5)
