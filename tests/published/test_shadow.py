"""Where and how long the Earth shelters.

Derived: two-body orbits that graze 6478 km; cos(psi) = cos(theta_s)/cos(beta) for a circular orbit whose plane lies
beta from the radiant, sheltered share psi/pi.
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.optimize import brentq

from app.core.advice.windows import Track, lee_intervals
from app.core.constants import MU_EARTH_KM3_S2
from app.core.exposure.faces import StreamSet, stream_focusing
from app.core.streams.flux import MASS_LAWS
from tests.published.probes import point, solve, stream
from tests.published.tables import column

LEO_KM, GEO_KM = 6778.0, 42164.0
STEP_S = 60.0


def edge_deg(r_km: float, v_inf_km_s: float) -> float:
    """Angle from the anti-radiant at which shelter ends."""
    return float(
        brentq(lambda theta: solve(r_km, theta, v_inf_km_s).focusing.margin[0, 0], 1e-3, 120.0, xtol=1e-9)
    )


@pytest.mark.case(33)
@pytest.mark.parametrize(
    ("v_inf_km_s", "half_angle_deg"), [(20.0, 64.114), (35.0, 69.741), (59.0, 71.745), (70.0, 72.072)]
)
def test_half_angle_of_the_shadow_at_400_km(v_inf_km_s: float, half_angle_deg: float):
    assert_allclose(edge_deg(LEO_KM, v_inf_km_s), half_angle_deg, atol=0.005)


@pytest.mark.parametrize("row", range(len(column("shadow_and_focus_limits", "r_km"))))
def test_every_row_of_the_table(row: int):
    r, v, local, half_angle, density, flux = (
        column("shadow_and_focus_limits", name)[row]
        for name in (
            "r_km",
            "v_inf_km_s",
            "v_local_km_s",
            "shadow_half_angle_bent_deg",
            "density_factor_just_outside_shadow",
            "flux_factor_just_outside_shadow",
        )
    )
    three_decimals, four_digits = 6e-4, 2e-4
    there = point(r, 90.0, v)
    assert_allclose(np.linalg.norm(there.v_plus, axis=0), local, atol=three_decimals)
    if half_angle == 0.0:  # both branches reach the axis
        assert solve(r, 0.0, v).n_minus[0] > 0.0
        return
    edge = edge_deg(r, v)
    assert_allclose(edge, half_angle, atol=three_decimals)
    outside = solve(r, edge + 1e-6, v)
    assert_allclose([outside.n_plus[0], outside.flux_ratio[0]], [density, flux], rtol=four_digits)


def circular(r_km: float, inclination_deg: float, revolutions: float, lead_km: float = 0.0) -> Track:
    """A circular orbit whose plane is tilted against the x axis (the radiant's), ``lead_km`` ahead of time."""
    rate = np.sqrt(MU_EARTH_KM3_S2 / r_km**3)
    unix_s = np.arange(0.0, revolutions * 2.0 * np.pi / rate, STEP_S)
    phase = rate * unix_s + lead_km / r_km
    tilt = np.radians(inclination_deg)
    radial = np.array([-np.cos(tilt), 0.0, np.sin(tilt)])  # the point of the orbit deepest in the shadow
    ahead = np.array([0.0, 1.0, 0.0])
    middle = phase - np.pi * revolutions
    r = np.outer(radial, np.cos(middle)) + np.outer(ahead, np.sin(middle))
    v = -np.outer(radial, np.sin(middle)) + np.outer(ahead, np.cos(middle))
    return Track(unix_s, r_km * r, r_km * rate * v)


def shelter_edges_s(
    track: Track, v_inf_km_s: float, declination_deg: float = 0.0
) -> list[tuple[float, float]]:
    """Our lee windows of one stream on a track."""
    streams = StreamSet((stream(2.0, v_inf_km_s, radiant_spread_deg=0.0),), MASS_LAWS["jvb"])
    lean = np.radians(declination_deg)
    flow = -np.array([np.cos(lean), 0.0, np.sin(lean)])
    downstream = np.broadcast_to(flow[:, None, None], (3, 1, len(track.unix_s)))
    margin = stream_focusing(streams, downstream, track.r_km).margin
    return [(i.start_unix_s, i.end_unix_s) for i in lee_intervals(track, streams, downstream, margin, [0])]


@pytest.mark.case(47)
@pytest.mark.parametrize(
    ("r_km", "v_inf_km_s", "beta_deg", "minutes"),
    [
        (6778.0, 59.1, 0.0, 36.89),
        (6778.0, 59.1, 30.0, 35.38),
        (6778.0, 59.1, 60.0, 26.34),
        (6778.0, 59.1, 70.0, 12.19),
        (6778.0, 33.8, 60.0, 23.45),
        (6778.0, 20.4, 0.0, 33.12),
        (7178.0, 70.2, 60.0, 15.30),
    ],
)
def test_minutes_of_shelter_each_orbit(r_km: float, v_inf_km_s: float, beta_deg: float, minutes: float):
    ((start, end),) = shelter_edges_s(circular(r_km, beta_deg, 1.0), v_inf_km_s)
    assert_allclose((end - start) / 60.0, minutes, atol=0.05)


@pytest.mark.parametrize("v_inf_km_s", [33.8, 20.4])
def test_no_shelter_when_the_orbit_stays_clear_of_the_shadow(v_inf_km_s: float):
    assert shelter_edges_s(circular(6778.0, 70.0, 1.0), v_inf_km_s) == []


@pytest.mark.case(48)
def test_geostationary_shelter_from_the_eta_aquariids():
    # v 65.5 km/s, declination -0.9 degrees: 58.1 minutes a day
    ((start, end),) = shelter_edges_s(circular(GEO_KM, 0.0, 1.0), 65.5, declination_deg=-0.9)
    assert_allclose((end - start) / 60.0, 58.1, atol=0.3)


@pytest.mark.case(49)
@pytest.mark.parametrize(("r_km", "seconds"), [(LEO_KM, 1.30), (GEO_KM, 3.25)])
def test_ten_kilometres_along_track_shift_both_edges(r_km: float, seconds: float):
    one_percent = 0.01
    ((start, end),) = shelter_edges_s(circular(r_km, 0.0, 1.0), 65.5)
    ((early_start, early_end),) = shelter_edges_s(circular(r_km, 0.0, 1.0, lead_km=10.0), 65.5)
    assert_allclose([start - early_start, end - early_end], seconds, rtol=one_percent)
