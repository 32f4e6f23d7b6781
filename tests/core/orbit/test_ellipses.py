"""Ellipses for averages: time shares, states, and the way back from a state (Kepler; textbook)."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose
from scipy.integrate import solve_ivp
from scipy.spatial.transform import Rotation

from app.core.constants import MU_EARTH_KM3_S2
from app.core.orbit.averaging import Ellipse, osculating_ellipse
from app.errors import OrbitError

FIXED = settings(derandomize=True, deadline=None, max_examples=100)


@st.composite
def ellipses(draw: st.DrawFn, most: float = 0.85) -> Ellipse:
    perigee_km, e = draw(st.floats(6600.0, 60_000.0)), draw(st.floats(0.0, most))
    axes = Rotation.from_quat(
        np.random.default_rng(draw(st.integers(0, 2**32 - 1))).normal(size=4)
    ).as_matrix()
    return Ellipse(perigee_km / (1.0 - e), e, axes[0], axes[1])


@FIXED
@given(ellipses(), st.integers(8, 40))
def test_states_keep_energy_and_angular_momentum(ellipse: Ellipse, count: int):
    r_km, v_km_s, _ = ellipse.points(count)
    energy = 0.5 * np.sum(v_km_s**2, axis=0) - MU_EARTH_KM3_S2 / np.linalg.norm(r_km, axis=0)
    assert_allclose(energy, -MU_EARTH_KM3_S2 / (2.0 * ellipse.a_km), rtol=1e-10)
    momentum = np.cross(r_km, v_km_s, axis=0)
    size = np.sqrt(MU_EARTH_KM3_S2 * ellipse.a_km * (1.0 - ellipse.eccentricity**2))
    pole = np.cross(ellipse.toward_perigee, ellipse.ahead)
    assert_allclose(momentum, np.repeat(size * pole[:, None], count, axis=1), atol=1e-9 * size)


@FIXED
@given(ellipses())
def test_averages_over_time_are_those_of_the_textbook(ellipse: Ellipse):
    # mean of 1/r^2 over time is 1/(a^2 sqrt(1 - e^2)); of r, a (1 + e^2/2); of 1/r, 1/a
    r_km, v_km_s, shares = ellipse.points(96)
    distance, e = np.linalg.norm(r_km, axis=0), ellipse.eccentricity
    assert_allclose(shares.sum(), 1.0, rtol=1e-12)
    assert_allclose(shares @ distance, ellipse.a_km * (1.0 + e**2 / 2.0), rtol=1e-10)
    assert_allclose(shares @ distance**-1, 1.0 / ellipse.a_km, rtol=1e-10)
    assert_allclose(shares @ distance**-2, ellipse.a_km**-2 / np.sqrt(1.0 - e**2), rtol=1e-10)
    assert_allclose(v_km_s @ shares, 0.0, atol=1e-10)  # it comes back to where it was


def test_shares_are_the_time_an_integration_spends():
    ellipse = Ellipse(26_560.0, 0.74, np.array([1.0, 0.0, 0.0]), np.array([0.0, 1.0, 0.0]))
    count = 24
    r_km, v_km_s, shares = ellipse.points(count)

    def motion(_: float, y: np.ndarray) -> np.ndarray:
        return np.concatenate([y[3:], -MU_EARTH_KM3_S2 * y[:3] / np.linalg.norm(y[:3]) ** 3])

    for start in (0, 5, 11):
        # A state and the next but one, half a step of anomaly on either side: 2 shares of the period apart.
        period_s = 2.0 * np.pi * np.sqrt(ellipse.a_km**3 / MU_EARTH_KM3_S2)
        first, last = (start + 0.5) * 2 * np.pi / count, (start + 1.5) * 2 * np.pi / count
        elapsed = (
            (last - first - ellipse.eccentricity * (np.sin(last) - np.sin(first))) * period_s / (2 * np.pi)
        )
        state = np.concatenate([r_km[:, start], v_km_s[:, start]])
        end = solve_ivp(motion, (0.0, elapsed), state, method="DOP853", rtol=1e-11, atol=1e-9).y[:, -1]
        one_metre_km, trapezium = 1e-3, 0.02
        assert_allclose(end[:3], r_km[:, start + 1], atol=one_metre_km)
        assert_allclose(elapsed / period_s, (shares[start] + shares[start + 1]) / 2.0, rtol=trapezium)


@FIXED
@given(ellipses(), st.integers(0, 23))
def test_the_ellipse_through_a_state_is_the_one_it_came_from(ellipse: Ellipse, phase: int):
    r_km, v_km_s, _ = ellipse.points(24)
    back = osculating_ellipse(r_km[:, phase], v_km_s[:, phase])
    assert_allclose(back.a_km, ellipse.a_km, rtol=1e-9)
    assert_allclose(back.eccentricity, ellipse.eccentricity, atol=1e-9)
    assert_allclose(back.perigee_km, ellipse.perigee_km, rtol=1e-9)
    turn = np.cross(back.toward_perigee, back.ahead)
    assert_allclose(turn, np.cross(ellipse.toward_perigee, ellipse.ahead), atol=1e-9)
    if ellipse.eccentricity > 1e-3:
        assert_allclose(back.toward_perigee, ellipse.toward_perigee, atol=1e-6)


def test_a_circle_has_some_perigee():
    speed = np.sqrt(MU_EARTH_KM3_S2 / 7000.0)
    found = osculating_ellipse(np.array([7000.0, 0.0, 0.0]), np.array([0.0, speed, 0.0]))
    r_km, _, _ = found.points(7)
    assert_allclose(np.linalg.norm(r_km, axis=0), 7000.0, rtol=1e-9)


@pytest.mark.parametrize(
    ("v_km_s", "why"),
    [
        ([0.0, 11.0, 0.0], "not bound"),
        ([0.0, 20.0, 0.0], "not bound"),
        ([0.0, 5.0, 0.0], "reaches the air"),
        ([7.0, 1.0, 0.0], "reaches the air"),
    ],
)
def test_states_without_a_usable_orbit_are_refused(v_km_s: list[float], why: str):
    with pytest.raises(OrbitError, match=why):
        osculating_ellipse(np.array([7000.0, 0.0, 0.0]), np.array(v_km_s))
