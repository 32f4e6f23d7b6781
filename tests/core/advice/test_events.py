"""The event searcher against functions whose roots are known, and Hermite interpolation against Kepler's equation."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose
from scipy.optimize import brentq

from app.core.advice.events import EDGE_TOLERANCE_S, Interval, hermite_position, positive_intervals
from app.core.constants import MU_EARTH_KM3_S2

START = 1_786_320_000.0
STEP_S = 60.0
GRID = START + STEP_S * np.arange(200)
one_metre_km = 1e-3


def edges_of(function, unix_s: np.ndarray = GRID) -> np.ndarray:
    """Edges (N, 2) the searcher finds, in seconds from the start."""
    found = positive_intervals(unix_s, function(unix_s), lambda wanted, left: function(wanted))
    return np.array([[i.start_unix_s - START, i.end_unix_s - START] for i in found]).reshape(-1, 2)


def test_edges_of_a_sine_lie_on_its_roots():
    period, phase = 5400.0, 700.0
    found = edges_of(lambda t: np.sin(2.0 * np.pi * (t - START - phase) / period))
    roots = phase + period / 2.0 * np.arange(4)
    assert_allclose(found[:2], [[roots[0], roots[1]], [roots[2], roots[3]]], atol=EDGE_TOLERANCE_S)


@given(st.floats(600.0, 9000.0), st.floats(-0.8, 0.8), st.floats(0.0, 1.0))
@settings(derandomize=True, deadline=None, max_examples=60)
def test_edges_of_any_raised_sine_lie_on_its_roots(period: float, height: float, phase: float):
    # sin(x) > height between arcsin(height) and pi - arcsin(height)
    found = edges_of(lambda t: np.sin(2.0 * np.pi * ((t - START) / period - phase)) - height)
    low = np.arcsin(height)
    inner = [found[found[:, 0] > 0.0, 0], found[found[:, 1] < GRID[-1] - START, 1]]
    for edges, root in zip(inner, (low, np.pi - low), strict=True):
        turns = edges / period - phase - root / (2.0 * np.pi)
        assert_allclose(turns, np.round(turns), atol=EDGE_TOLERANCE_S / period)
    assert abs(len(found) - (GRID[-1] - START) / period) < 2.0


def test_an_interval_open_at_the_samples_ends_there():
    found = edges_of(lambda t: np.abs(t - START - 6000.0) - 1000.5)
    assert_allclose(found, [[0.0, 4999.5], [7000.5, GRID[-1] - START]], atol=EDGE_TOLERANCE_S)


def test_positive_throughout_is_one_interval():
    assert edges_of(lambda t: np.ones(t.shape)).tolist() == [[0.0, GRID[-1] - START]]


@pytest.mark.parametrize("unix_s", [GRID, GRID[:1], GRID[:0]], ids=["many", "one", "none"])
def test_never_positive_is_no_interval(unix_s: np.ndarray):
    assert edges_of(lambda t: -np.ones(t.shape), unix_s).shape == (0, 2)


def test_zero_is_not_positive():
    assert edges_of(lambda t: np.zeros(t.shape)).shape == (0, 2)


def test_every_bracket_is_refined_at_once_with_its_own_left_sample():
    calls = []

    def refine(wanted: np.ndarray, left: np.ndarray) -> np.ndarray:
        calls.append((wanted, left))
        return np.sin(2.0 * np.pi * (wanted - START - 1.0) / 1800.0)

    found = positive_intervals(GRID, np.sin(2.0 * np.pi * (GRID - START - 1.0) / 1800.0), refine)
    assert len(found) == 7
    assert len(calls) == np.ceil(np.log2(STEP_S / EDGE_TOLERANCE_S))
    for wanted, left in calls:
        assert np.all((wanted > GRID[left]) & (wanted < GRID[left + 1]))


def test_whole_seconds_lie_inside():
    assert Interval(10.2, 20.9).whole_seconds == (11, 20)
    assert Interval(10.0, 20.0).whole_seconds == (10, 20)


@pytest.mark.parametrize(
    ("start", "end", "least_s", "offered"),
    [
        (0.0, 60.0, 60.0, True),
        (0.2, 61.4, 60.0, True),
        (0.2, 60.9, 60.0, False),
        (0.2, 2.1, 0.0, True),
        (0.2, 1.9, 0.0, False),
        (0.2, 0.9, 0.0, False),
    ],
)
def test_what_is_worth_offering_is_counted_in_whole_seconds(
    start: float, end: float, least_s: float, offered: bool
):
    assert Interval(start, end).is_worth_offering(least_s) is offered


def test_overlap_needs_more_than_an_instant():
    assert Interval(0.0, 10.0).overlaps(9.0, 20.0)
    assert not Interval(0.0, 10.0).overlaps(10.0, 20.0)


def kepler(a_km: float, e: float, unix_s: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Positions and velocities (3, T) by Kepler's equation (textbook), perigee at the start."""
    n = np.sqrt(MU_EARTH_KM3_S2 / a_km**3)
    mean = (n * (unix_s - START)) % (2.0 * np.pi)
    anomaly = np.array(
        [brentq(lambda x, m=m: x - e * np.sin(x) - m, 0.0, 2.0 * np.pi, xtol=1e-14) for m in mean]
    )
    b = np.sqrt(1.0 - e * e)
    rate = n / (1.0 - e * np.cos(anomaly))
    r = a_km * np.array([np.cos(anomaly) - e, b * np.sin(anomaly), 0.0 * anomaly])
    v = a_km * rate * np.array([-np.sin(anomaly), b * np.cos(anomaly), 0.0 * anomaly])
    return r, v


@pytest.mark.parametrize(
    ("a_km", "e", "bound_km"),
    [(6778.0, 0.0, 0.45e-3), (7178.0, 0.02, 0.5e-3), (42164.0, 0.0, 1e-6), (26560.0, 0.74, 2e-3)],
)
def test_positions_between_samples_follow_kepler(a_km: float, e: float, bound_km: float):
    # Error of cubic Hermite interpolation: h^4/384 of the fourth derivative, here n^4 r (textbook).
    left = np.repeat(np.arange(len(GRID) - 1), 3)
    wanted = GRID[left] + STEP_S * np.tile([0.25, 0.5, 0.75], len(GRID) - 1)
    error = hermite_position(GRID, *kepler(a_km, e, GRID), wanted, left) - kepler(a_km, e, wanted)[0]
    assert np.linalg.norm(error, axis=0).max() < bound_km


def test_hermite_keeps_the_samples():
    r, v = kepler(6778.0, 0.01, GRID)
    left = np.arange(len(GRID) - 1)
    assert_allclose(hermite_position(GRID, r, v, GRID[left], left), r[:, :-1], atol=1e-9)
    assert_allclose(hermite_position(GRID, r, v, GRID[left + 1], left), r[:, 1:], atol=1e-9)
