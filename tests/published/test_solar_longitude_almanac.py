"""A worked example of the Sun's longitude.

Meeus 1998, Astronomical Algorithms, example 25.b (memory): 1992 October 13.0 TD, geometric longitude of the Sun
199.907347 degrees, mean equinox of date. The series behind it is good to an arc second.
"""

from __future__ import annotations

import numpy as np
from numpy.testing import assert_allclose

from app.core.sky.bodies import ecliptic_longitude_deg, sun_km

MEEUS_TT_JD, MEEUS_DEG = 2448908.5, 199.907347
J2000_JD, CENTURY_DAYS = 2451545.0, 36525.0


def test_worked_example():
    # General precession in longitude, IAU 2006 (memory): 5028.796195 T + 1.1054348 T^2 arc seconds
    century = (MEEUS_TT_JD - J2000_JD) / CENTURY_DAYS
    precession_deg = (5028.796195 * century + 1.1054348 * century**2) / 3600.0
    ours = ecliptic_longitude_deg(sun_km((np.array([MEEUS_TT_JD]), np.zeros(1))))
    ten_thousandth_of_a_degree = 1e-4
    assert_allclose(ours, MEEUS_DEG - precession_deg, rtol=0.0, atol=ten_thousandth_of_a_degree)
