"""Width of an activity profile (Jenniskens 1994, A&A 287, 990; 1995, A&A 295, 206; read)."""

from __future__ import annotations

import pytest
from numpy.testing import assert_allclose
from scipy.optimize import brentq

from app.core.sky.longitude import MEAN_SOLAR_MOTION_DEG_PER_S
from app.core.streams.activity import component_zhr
from app.core.streams.model import Component

PEAK_DEG = 235.29
one_percent = 0.01


def fwhm_minutes(b_per_deg: float) -> float:
    """Full width at half of the peak of our profile, in minutes of time at the mean solar motion."""
    component = Component("outburst", PEAK_DEG, 4000.0, b_per_deg, b_per_deg)

    def above_half(longitude: float) -> float:
        return float(component_zhr(component, longitude)) - 2000.0

    fall = brentq(above_half, PEAK_DEG, PEAK_DEG + 20.0, xtol=1e-9)
    rise = brentq(above_half, PEAK_DEG - 20.0, PEAK_DEG, xtol=1e-9)
    return (fall - rise) / MEAN_SOLAR_MOTION_DEG_PER_S / 60.0


@pytest.mark.case(46)
@pytest.mark.parametrize(
    ("b_per_deg", "minutes"),
    # typical outburst; the ends of the range read; and the width the 2011 Draconids had (derived)
    [(30.0, 29.3), (7.0, 2.09 * 60.0), (220.0, 4.0), (8.80, 100.0)],
)
def test_width_at_half_of_the_peak(b_per_deg: float, minutes: float):
    assert_allclose(fwhm_minutes(b_per_deg), minutes, rtol=one_percent)


def test_mean_solar_motion():
    # 0.041069 degrees an hour in a tropical year (textbook); a fixed equinox takes the sidereal year, 4e-5 longer.
    tropical_or_sidereal = 1e-4
    assert_allclose(MEAN_SOLAR_MOTION_DEG_PER_S * 3600.0, 0.041069, rtol=tropical_or_sidereal)
