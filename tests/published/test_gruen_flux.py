"""Interplanetary flux of Gruen, Zook, Fechtig & Giese 1985 (Icarus 62, 244).

Terms and the unit of m: read in ECSS-E-ST-10-04C 10.2.4.1. Sum in m^-2 s^-1: read as quoted from Gruen 1985.
Year of 3.15576e7 s: memory (it matters at the 0.07 % level).
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from app.core.constants import JULIAN_YEAR_S
from app.core.streams.sporadic import SPORADIC_DENSITY_KG_M3, gruen_flux_per_m2_s
from tests.published.tables import column

one_permille = 1e-3
printed_digits = 3e-5  # the table prints five or six figures


@pytest.mark.case(1, 2, 3)
@pytest.mark.parametrize(
    ("mass_g", "per_m2_s", "per_m2_yr"),
    [
        (1e-12, 3.4475e-5, 1.0879e3),
        (1e-6, 4.7152e-8, 1.4880),
        (1e-3, 1.8910e-11, 5.9675e-4),
        (1.0, 2.2249e-15, 7.0213e-8),
    ],
)
def test_flux_above_a_mass(mass_g: float, per_m2_s: float, per_m2_yr: float):
    flux = gruen_flux_per_m2_s(mass_g)
    assert_allclose(flux, per_m2_s, rtol=one_permille)
    assert_allclose(flux * JULIAN_YEAR_S, per_m2_yr, rtol=one_permille)


@pytest.mark.case(4)
def test_a_sphere_of_one_millimetre_at_the_sporadic_density():
    # ECSS (density 2.5 g/cm3: memory); 0.1 cm -> 1.3090e-3 g -> 4.238e-4 a year
    mass_g = np.pi / 6.0 * SPORADIC_DENSITY_KG_M3 / 1000.0 * 0.1**3
    assert_allclose(mass_g, 1.3090e-3, rtol=one_permille)
    assert_allclose(gruen_flux_per_m2_s(mass_g) * JULIAN_YEAR_S, 4.238e-4, rtol=one_permille)


@pytest.mark.case(5)
def test_mass_density_of_the_dust_at_one_au():
    # Gruen et al. 1985 quote 9.6e-20 kg/m3 at 20 km/s (memory); number density = 4 F / v.
    # The integral of m dF by parts: the flux once more over mass, plus its lower end.
    low_g, high_g, v_m_s = 1e-18, 1e2, 20e3

    def per_log_mass(log_mass: float) -> float:
        mass = np.exp(log_mass)
        return float(gruen_flux_per_m2_s(mass) * mass)

    ends = low_g * gruen_flux_per_m2_s(low_g) - high_g * gruen_flux_per_m2_s(high_g)
    grams = quad(per_log_mass, np.log(low_g), np.log(high_g), epsrel=1e-8)[0] + ends
    two_percent = 0.02
    assert_allclose(4.0 / v_m_s * grams / 1000.0, 9.6e-20, rtol=two_percent)


def test_every_row_of_the_table():
    assert_allclose(
        gruen_flux_per_m2_s(column("gruen_flux", "mass_g")),
        column("gruen_flux", "flux_m-2_s-1"),
        rtol=printed_digits,
    )
