"""The lens near the anti-radiant axis: capped by the radiant's spread, and said so."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from app.core.exposure.focusing import half_sine_cap
from tests.core.exposure.strategies import FIXED
from tests.published.probes import POINT_MASS_KM, solve

GEO_KM = 42164.0


def cap_deg(spread_deg: float) -> float:
    """Angle from the axis at which the cap begins."""
    return float(np.degrees(2.0 * np.arcsin(half_sine_cap(spread_deg))))


def density(theta_deg: object, spread_deg: float) -> np.ndarray:
    found = solve(GEO_KM, theta_deg, 20.0, POINT_MASS_KM, spread_deg=spread_deg)
    return found.n_plus + found.n_minus


@FIXED
@given(st.floats(0.01, 3.0))
def test_inside_the_cap_the_density_is_that_of_its_edge(spread_deg: float):
    edge = cap_deg(spread_deg)
    inside = density(edge * np.array([0.0, 0.3, 0.99]), spread_deg)
    cosine_rounding = 1e-6  # of an angle of 1e-4, seen through its cosine
    assert_allclose(inside, density(edge, 0.0)[0], rtol=cosine_rounding)


@FIXED
@given(st.floats(0.01, 3.0), st.floats(1.001, 20.0))
def test_outside_the_cap_the_spread_does_nothing(spread_deg: float, times: float):
    theta = times * cap_deg(spread_deg)
    assert_allclose(density(theta, spread_deg), density(theta, 0.0), rtol=1e-12)


@pytest.mark.parametrize("spread_deg", [0.1, 0.6, 1.2])
def test_only_what_lies_inside_is_flagged(spread_deg: float):
    edge = cap_deg(spread_deg)
    found = solve(GEO_KM, edge * np.array([0.0, 0.99, 1.01, 30.0]), 20.0, spread_deg=spread_deg)
    assert found.focusing.capped[:, 0].tolist() == [True, True, False, False]


def test_without_spread_the_axis_is_finite():
    assert np.isfinite(density([0.0, 1e-12, 1e-6], 0.0)).all()


def test_a_wider_radiant_makes_a_weaker_lens():
    weaker = [density(0.0, spread)[0] for spread in (0.1, 0.3, 0.6, 1.2)]
    assert weaker == sorted(weaker, reverse=True)
