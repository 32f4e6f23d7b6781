"""NASA SP-8013 (1969), total meteoroid flux near the Earth (memory), against our background flux.

SP-8013 holds the Earth's focusing (about 1.3 to 2), Gruen 1985 does not: a factor of 0.9 to 2.5 is agreement.
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.streams.sporadic import gruen_flux_per_m2_s
from tests.published.tables import column


def sp8013_per_m2_s(mass_g: np.ndarray) -> np.ndarray:
    log_mass = np.log10(mass_g)
    small = -14.339 - 1.584 * log_mass - 0.063 * log_mass**2
    return 10.0 ** np.where(log_mass < -6.0, small, -14.37 - 1.213 * log_mass)


@pytest.mark.case(6)
def test_the_ratio_stays_within_its_band_from_a_picogram_to_a_gram():
    mass_g = np.logspace(-12, 0, 121)
    ratio = sp8013_per_m2_s(mass_g) / gruen_flux_per_m2_s(mass_g)
    assert ratio.min() > 0.9
    assert ratio.max() < 2.5


def test_the_ratio_by_decades():
    quoted = [1.15, 1.94, 2.49, 2.16, 1.69, 1.52, 1.72, 1.07, 0.93, 0.98, 1.17, 1.47, 1.92]
    mass_g = np.logspace(-12, 0, 13)
    ratio = sp8013_per_m2_s(mass_g) / gruen_flux_per_m2_s(mass_g)
    # At 1e-6 g the two pieces of SP-8013 meet to 2.5 %; the quoted value is the small-particle piece's.
    two_digits, pieces_meet = 0.006, 0.03
    assert_allclose(ratio, quoted, atol=two_digits, rtol=pieces_meet)


def test_the_table_column():
    known = np.isfinite(column("gruen_flux", "sp8013_total_near_earth_m-2_s-1"))
    mass_g = column("gruen_flux", "mass_g")[known]
    ratio = column("gruen_flux", "sp8013_total_near_earth_m-2_s-1")[known] / gruen_flux_per_m2_s(mass_g)
    three_digits = 5e-3
    assert_allclose(ratio, column("gruen_flux", "ratio_sp8013_to_gruen")[known], rtol=three_digits)
