"""Rate to flux: Koschack & Rendtel 1990 (WGN 18, 44 and 119; both forms read as quoted).

Form A: F(M <= 6.5) = ZHR c(r) / 37200 per km2 and hour, c(r) = (13.1 r - 16.5)(r - 1.3)^0.748.
Form B: c(r) = 10.65 r - 12.15 over an area of 178700 r^-1.82 km2; the program uses form A, B is the check.
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.streams.flux import MASS_LAWS, TRUSTED_R, flux_per_m2_s_at_air, zenith_focusing
from tests.published.probes import PER_KM2_H
from tests.published.tables import column

numerical = 1e-4
last_digit = 3e-5  # tables printed to five figures or more


def form_b_per_km2_h(zhr: float, r: np.ndarray) -> np.ndarray:
    return zhr * (10.65 * r - 12.15) / (178700.0 * r**-1.82)


@pytest.mark.case(14)
@pytest.mark.parametrize(
    ("r", "correction"), [(1.8, 4.2156), (2.0, 7.4286), (2.5, 18.6243), (2.6, 21.3675), (3.0, 33.9087)]
)
def test_perception_correction(r: float, correction: float):
    assert_allclose(flux_per_m2_s_at_air(1.0, r) * PER_KM2_H * 37200.0, correction, rtol=numerical)


@pytest.mark.case(15)
def test_a_hundred_meteors_an_hour():
    flux = flux_per_m2_s_at_air(100.0, 2.6)
    assert_allclose(flux, 1.5955e-11, rtol=numerical)
    assert_allclose(flux * PER_KM2_H * 1000.0, 57.44, rtol=numerical)


@pytest.mark.case(16)
def test_printed_spatial_number_density_of_the_leonids_2011():
    # Visual report page of the International Meteor Organization (read): ZHR 2, r 2.5 -> 4 per 1e9 km3, V 71 km/s
    per_km3 = flux_per_m2_s_at_air(2.0, 2.5) * 1e6 / 71.0
    half_of_the_last_digit = 0.5
    assert_allclose(per_km3 * 1e9, 4.0, atol=half_of_the_last_digit)
    assert_allclose(per_km3 * 1e9, 3.92, rtol=2e-3)


@pytest.mark.case(17)
def test_both_forms_agree_over_the_range():
    r = np.linspace(1.7, 3.5, 181)
    ratio = flux_per_m2_s_at_air(1.0, r) * PER_KM2_H / form_b_per_km2_h(1.0, r)
    assert ratio.min() > 0.88
    assert ratio.max() < 1.17
    assert TRUSTED_R == (1.8, 3.5)


def test_every_row_of_the_table():
    r = column("zhr_flux", "r")
    per_hour = flux_per_m2_s_at_air(1.0, r) * PER_KM2_H
    assert_allclose(per_hour, column("zhr_flux", "flux_km-2_h-1_per_unit_ZHR_form_A"), rtol=last_digit)
    assert_allclose(
        flux_per_m2_s_at_air(100.0, r), column("zhr_flux", "form_A_flux_m-2_s-1_at_ZHR_100"), rtol=last_digit
    )
    form_b = column("zhr_flux", "flux_km-2_h-1_per_unit_ZHR_form_B")
    assert_allclose(per_hour / form_b, column("zhr_flux", "ratio_A_over_B"), rtol=2 * numerical)
    jvb = 1.0 + MASS_LAWS["jvb"].exponent(r)
    assert_allclose(jvb, column("zhr_flux", "s_consistent_with_JVB_2.25_log_r"), rtol=last_digit)


@pytest.mark.case(38)
@pytest.mark.parametrize(
    ("v_inf_km_s", "factor"),
    [(11.2, 1.4490), (15.0, 1.2586), (20.0, 1.1487), (35.0, 1.0496), (59.1, 1.0175), (70.2, 1.0124)],
)
def test_the_air_itself_sees_a_focused_stream(v_inf_km_s: float, factor: float):
    # derived: density (1 + q)^2/(4 q) times speed ratio q for a radiant in the zenith, q = v_entry/v_inf
    assert_allclose(zenith_focusing(v_inf_km_s), factor, atol=numerical)
