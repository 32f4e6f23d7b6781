"""The spike on the anti-radiant axis, and its limit by the spread of the radiant.

Derived: a Gaussian radiant of sigma per axis gives sqrt(pi a/r)/sigma on the axis, by two independent routes that
agree to 0.2 %. The Moon as a lens: Gural 2008, Advances in Meteoroid and Meteor Science, 183 (read).
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from tests.published.probes import POINT_MASS_KM, solve

MU_MOON_KM3_S2, MOON_KM, DISTANCE_KM = 4902.8, 1737.4, 384_400.0
GEO_KM = 42164.0
half_a_percent = 5e-3


@pytest.mark.case(34)
@pytest.mark.parametrize(
    ("v_inf_km_s", "sigma_deg", "density"), [(20.4, 0.3, 51.03), (20.4, 1.0, 15.34), (20.0, 0.5, 31.24)]
)
def test_on_the_axis_the_spread_limits_the_lens(v_inf_km_s: float, sigma_deg: float, density: float):
    there = solve(GEO_KM, 0.0, v_inf_km_s, spread_deg=sigma_deg)
    assert_allclose(there.n_plus + there.n_minus, density, rtol=half_a_percent)
    assert there.focusing.capped.all()


@pytest.mark.case(36)
def test_a_faster_stream_leaves_the_axis_dark_in_the_same_orbit():
    there = solve(GEO_KM, 0.0, 35.0, spread_deg=0.5)
    assert there.n_plus[0] + there.n_minus[0] < 1e-3
    assert there.focusing.margin[0, 0] > 0.0  # sheltered


def behind_the_moon(v_inf_km_s: float, disc_deg: float, radius_km: float) -> float:
    """Our density on the axis averaged over radiants spread evenly over a disc ``disc_deg`` across."""
    share = (np.arange(4000) + 0.5) / 4000.0
    theta_deg = 0.5 * disc_deg * share  # the ring at this angle weighs as the angle
    seen = solve(DISTANCE_KM, theta_deg, v_inf_km_s, radius_km, MU_MOON_KM3_S2)
    return float(np.average(seen.n_plus + seen.n_minus, weights=share))


@pytest.mark.case(37)
def test_the_moon_as_a_lens_for_a_narrow_radiant():
    # Gural 2008: radiant 0.1 degrees across, about ten times; the formula takes the Moon for a point
    point = behind_the_moon(35.0, 0.1, POINT_MASS_KM)
    published, half = 10.0, 0.5
    assert_allclose(point, published, rtol=half)
    one_percent = 0.01
    assert_allclose(point, 10.5, rtol=one_percent)
    for v_inf_km_s, expected in ((20.0, 18.3), (25.0, 14.7), (30.0, 12.2), (40.0, 9.2)):
        assert_allclose(behind_the_moon(v_inf_km_s, 0.1, POINT_MASS_KM), expected, rtol=one_percent)


@pytest.mark.case(37)
@pytest.mark.parametrize("v_inf_km_s", [20.0, 25.0, 30.0, 35.0, 40.0, 60.0])
def test_the_moon_as_a_lens_for_a_wide_radiant(v_inf_km_s: float):
    # Gural 2008: radiant one degree across, at most twice (10 %)
    for radius_km in (POINT_MASS_KM, MOON_KM):
        assert behind_the_moon(v_inf_km_s, 1.0, radius_km) <= 2.1
