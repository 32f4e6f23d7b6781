"""A collimated stream near the Earth, both branches.

Geometry equivalent to Opik 1951, Kessler 1972, Matney 2002 and Jones & Poole 2007 (their texts: abstracts read).
Expected values: derived from the two-body orbit equation, b^2 - b r sin(theta) - a r (1 + cos(theta)) = 0, and
proven by direct integration (``focusing_montecarlo.csv``: 160 000 trajectories per speed).
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.optimize import brentq

from app.core.constants import BLOCKING_RADIUS_KM, MU_EARTH_KM3_S2
from tests.published.probes import point, solve
from tests.published.tables import column

hundred_metres_km = 0.1
one_metre_km = 1e-3
numerical = 1e-5
six_decimals = 1e-6


@pytest.mark.case(26)
@pytest.mark.parametrize(
    ("v_inf_km_s", "b_km"), [(11.0, 9200.2), (20.0, 7407.8), (35.0, 6795.6), (60.0, 6587.8), (71.0, 6556.6)]
)
def test_grazing_impact_parameter(v_inf_km_s: float, b_km: float):
    # the particle on the edge of the shadow is the one that grazes the air
    r_km = 1.2 * BLOCKING_RADIUS_KM
    edge_deg = brentq(
        lambda theta: solve(r_km, theta, v_inf_km_s).focusing.margin[0, 0], 1.0, 120.0, xtol=1e-10
    )
    there = point(r_km, edge_deg, v_inf_km_s)
    assert_allclose(there.impact_km(there.v_plus), b_km, atol=hundred_metres_km)


@pytest.mark.case(27)
@pytest.mark.parametrize(
    ("v_inf_km_s", "r_focus_km"), [(20.4, 28385.0), (35.0, 70962.0), (59.0, 189717.0), (15.0, 18322.0)]
)
def test_the_axis_lights_up_beyond_the_focus(v_inf_km_s: float, r_focus_km: float):
    five_kilometres = 5.0
    start = brentq(lambda r: solve(r, 0.0, v_inf_km_s).focusing.margin[0, 0], 7000.0, 1e6, xtol=1e-3)
    assert_allclose(start, r_focus_km, atol=five_kilometres)


POINTS = [
    # r, theta, v_inf, b+, n+, flux+, v_r, v_t, b-, n-
    (6778, 90, 20, 7659.785, 1.013430, 1.152837, -2.60190, 22.60190, -881.785, 0.013430),
    (6778, 120, 20, 6397.782, 1.006854, 1.145356, -12.69780, 18.87808, -527.861, 0.006854),
    (6778, 66, 20, 7464.844, 1.029944, 1.171622, 5.69570, 22.02669, -1272.833, 0.029944),
    (6778, 90, 59.1, 6890.261, 1.000266, 1.016967, -0.97885, 60.07885, -112.261, 0.000266),
    (42164, 10, 20.4, 13333.396, 1.255159, 1.283355, 19.83561, 6.45103, -6011.695, 0.255159),
    (42164, 10, 35, 10035.231, 1.078884, 1.087178, 34.27120, 8.33017, -2713.530, 0.078884),
    (26560, 5.5, 20, 8650.663, 1.992228, 2.065623, 19.68711, 6.51405, -6104.999, 0.992228),
]


@pytest.mark.case(28, 29)
@pytest.mark.parametrize("row", POINTS, ids=[f"r{r}-theta{t}-v{v}" for r, t, v, *_ in POINTS])
def test_point_values(row: tuple[float, ...]):
    r, theta, v_inf, b_plus, n_plus, flux_plus, v_r, v_t, b_minus, n_minus = row
    bare, seen = point(r, theta, v_inf), solve(r, theta, v_inf)
    assert_allclose([bare.n_plus[0], bare.n_minus[0]], [n_plus, n_minus], atol=six_decimals)
    assert_allclose(bare.impact_km(bare.v_plus)[0], b_plus, atol=one_metre_km)
    assert_allclose(bare.impact_km(bare.v_minus)[0], b_minus, atol=one_metre_km)
    assert_allclose(bare.v_plus[:2, 0], [v_r, v_t], atol=numerical)
    assert_allclose(
        seen.flux_ratio[0], flux_plus, rtol=numerical
    )  # the minus branch is blocked in all of them
    assert seen.n_minus[0] == 0.0


@pytest.mark.case(29)
def test_bending_by_the_lens():
    # 8.016 degrees between the arriving particle and its way at infinity
    there, theta = point(42164.0, 10.0, 20.4), np.radians(10.0)
    along = there.v_plus[0] * np.cos(theta) + there.v_plus[1] * np.sin(theta)
    bend_deg = np.degrees(np.arccos(along / np.linalg.norm(there.v_plus, axis=0)))
    assert_allclose(bend_deg, 8.016, atol=1e-3)


@pytest.mark.case(30)
def test_the_branches_differ_by_the_stream_itself():
    rng = np.random.default_rng(30)
    r, v = rng.uniform(6500.0, 4e5, 500), rng.uniform(11.0, 72.0, 500)
    bare = point(r, rng.uniform(0.5, 179.5, 500), v)
    assert_allclose(bare.n_plus - bare.n_minus, 1.0, rtol=1e-9)


@pytest.mark.case(31)
@pytest.mark.parametrize(("r_km", "v_inf_km_s"), [(6778.0, 20.0), (26560.0, 15.0), (42164.0, 11.2)])
def test_mean_over_the_sky_of_a_point_mass(r_km: float, v_inf_km_s: float):
    # Opik, Kessler: mean density sqrt(1 + 2a/r), so the mean flux is 1 + v_esc^2/v_inf^2
    count, one_permille = 200_000, 1e-3
    cosine = (np.arange(count) + 0.5) * (2.0 / count) - 1.0
    bare = point(r_km, np.degrees(np.arccos(cosine)), v_inf_km_s)
    speed_ratio = np.sqrt(1.0 + 2.0 * MU_EARTH_KM3_S2 / v_inf_km_s**2 / r_km)
    assert_allclose((bare.n_plus + bare.n_minus).mean(), speed_ratio, rtol=one_permille)
    assert_allclose(bare.flux_ratio.mean(), speed_ratio**2, rtol=one_permille)


def test_every_row_of_the_table():
    r, v, theta = (
        column("focusing_collimated", n) for n in ("r_km", "v_inf_km_s", "theta_from_antiradiant_deg")
    )
    bare, seen = point(r, theta, v), solve(r, theta, v)
    for found, title in ((bare.n_plus, "n_plus"), (bare.n_minus, "n_minus")):
        assert_allclose(found, column("focusing_collimated", title), rtol=2e-6, atol=six_decimals)
    for velocity, title in ((bare.v_plus, "b_plus_km"), (bare.v_minus, "b_minus_km")):
        assert_allclose(bare.impact_km(velocity), column("focusing_collimated", title), atol=one_metre_km)
    assert_allclose(seen.n_plus > 0.0, column("focusing_collimated", "plus_visible") == 1.0)
    assert_allclose(seen.n_minus > 0.0, column("focusing_collimated", "minus_visible") == 1.0)
    density = column("focusing_collimated", "density_factor_with_shielding")
    assert_allclose(seen.n_plus + seen.n_minus, density, rtol=2e-6, atol=six_decimals)
    flux = column("focusing_collimated", "flux_factor_with_shielding")
    assert_allclose(seen.flux_ratio, flux, rtol=2e-6, atol=six_decimals)


def bin_means() -> np.ndarray:
    """Our density averaged over the volume of each bin of the direct integration."""
    low_r, high_r, low, high, v = (
        column("focusing_montecarlo", n)[:, None]
        for n in ("r_lo_km", "r_hi_km", "theta_lo_deg", "theta_hi_deg", "v_inf_km_s")
    )
    share = (np.arange(400) + 0.5) / 400.0
    first, last = np.cos(np.radians(low)), np.cos(np.radians(high))
    # Quadratic crowding at the axis, where the density goes as one over the angle.
    cosine = first + (last - first) * share**2
    weight = 2.0 * share / share.sum() / 2.0
    total = np.zeros(len(v))
    radii = 7
    for x in (np.arange(radii) + 0.5) / radii:
        r = np.cbrt(low_r**3 + (high_r**3 - low_r**3) * x)
        shape = np.broadcast(cosine, r, v).shape
        places = (np.broadcast_to(one, shape).ravel() for one in (r, np.degrees(np.arccos(cosine)), v))
        solved = solve(*places)
        total += ((solved.n_plus + solved.n_minus).reshape(shape) @ weight) / radii
    return total


@pytest.mark.case(32)
def test_every_bin_of_a_direct_integration():
    ours, numbers = bin_means(), column("focusing_montecarlo", "density_factor_numerical")
    lit = numbers > 0.05
    off_axis = lit & (column("focusing_montecarlo", "theta_lo_deg") >= 3.0)
    error = ours[lit] / numbers[lit] - 1.0
    assert np.abs(error).max() < 0.015
    assert np.sqrt(np.mean(np.square(error))) < 0.002
    assert np.abs(ours[off_axis] / numbers[off_axis] - 1.0).max() < 0.006
    assert numbers[ours == 0.0].max() < 0.006  # what we call dark stays dark
    assert lit.sum() == 236


@pytest.mark.case(32)
def test_the_bin_means_of_the_formula():
    # The innermost degree holds the spike, which the table sampled more coarsely than we do here.
    three_permille, one_percent, two_thousandths = 3e-3, 1e-2, 2e-3
    ours, expected = bin_means(), column("focusing_montecarlo", "density_factor_formula_bin_mean")
    spike = column("focusing_montecarlo", "theta_lo_deg") == 0.0
    assert_allclose(ours[~spike], expected[~spike], rtol=three_permille, atol=two_thousandths)
    assert_allclose(ours[spike], expected[spike], rtol=one_percent, atol=two_thousandths)
