"""Analytic speed distribution of sporadic meteoroids at 100 km (Zook; NASA TM-4527, memory).

Check on the memory: it integrates to 1.0037 and its mean is 16.86 km/s where the source says about 17.
"""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import quad

from app.core.streams.sporadic import analytic_density, analytic_speeds

LIMITS_KM_S = (11.1, 16.3, 55.0, 72.2)
one_permille = 1e-3


def moment(power: int) -> float:
    pieces = pairwise(LIMITS_KM_S)
    return sum(quad(lambda v: float(analytic_density(v)) * v**power, *piece)[0] for piece in pieces)


@pytest.mark.case(13)
def test_integral_and_mean():
    assert_allclose(moment(0), 1.0037, rtol=one_permille)
    assert_allclose(moment(1) / moment(0), 16.86, rtol=one_permille)


@pytest.mark.case(13)
def test_the_quadrature_used_by_the_background_has_the_same_mean():
    speeds = analytic_speeds()
    assert_allclose(speeds.share.sum(), 1.0, rtol=1e-12)
    assert_allclose(speeds.share @ speeds.v_entry_km_s, moment(1) / moment(0), rtol=1e-6)


def test_mean_speed_in_free_space():
    # derived: weight v_inf^2 / v^2; 14.96 km/s, from bins 1 km/s wide
    speeds = analytic_speeds()
    mean_of_bins = 0.01
    assert_allclose(speeds.free_space_share @ speeds.v_inf_km_s, 14.96, rtol=mean_of_bins)


def test_no_speed_outside_the_limits():
    assert_allclose(analytic_density(np.array([11.0, 72.3, 5.0])), 0.0, atol=0.0)
