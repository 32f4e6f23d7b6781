"""Magnitude, mass and speed (speed: entry speed; absolute magnitude at 100 km in the zenith).

``jvb``: Jacchia, Verniani & Briggs 1967 with Verniani's luminous efficiency, short form of Peterson 1999 (read as
quoted). ``verniani``: Verniani 1973 (read as quoted).
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.streams.flux import MASS_LAWS, power_law
from tests.published.probes import stream
from tests.published.tables import column

numerical = 1e-4
last_digit = 1e-5
POINTS = [(20.0, 6.5), (35.0, 6.5), (60.0, 0.0), (70.0, 6.5)]


@pytest.mark.case(22, 23)
@pytest.mark.parametrize(
    ("law", "masses_g"),
    [
        ("jvb", [1.5946e-3, 1.8093e-4, 1.7222e-2, 1.2214e-5]),
        ("verniani", [6.7902e-3, 7.2398e-4, 3.3373e-2, 4.5249e-5]),
    ],
)
def test_mass_of_a_magnitude(law: str, masses_g: list[float]):
    speed, magnitude = np.array(POINTS).T
    assert_allclose(MASS_LAWS[law].mass_g(magnitude, speed), masses_g, rtol=numerical)


@pytest.mark.parametrize(("law", "title"), [("jvb", "m_JVB_Peterson_g"), ("verniani", "m_Verniani1973_g")])
def test_every_row_of_the_table_both_ways(law: str, title: str):
    speed, magnitude = (column("mass_magnitude", n) for n in ("entry_speed_km_s", "absolute_magnitude"))
    mass_g = column("mass_magnitude", title)
    assert_allclose(MASS_LAWS[law].mass_g(magnitude, speed), mass_g, rtol=last_digit)
    assert_allclose(MASS_LAWS[law].magnitude(mass_g, speed), magnitude, atol=last_digit)


@pytest.mark.case(24)
@pytest.mark.parametrize(("magnitude", "mass_g"), [(-3.0, 0.1), (5.0, 1e-4)])
def test_leonid_masses_of_the_1999_video(magnitude: float, mass_g: float):
    # Brown et al. 2000, 1999 Leonid video (read): magnitudes -3 to +5 stated as 1e-4 to 1e-7 kg, speed 71 km/s
    ratio = MASS_LAWS["jvb"].mass_g(magnitude, 71.0) / mass_g
    factor = 2.5
    assert 1.0 / factor < ratio < factor


@pytest.mark.case(25)
def test_mass_index_of_a_population_index():
    # s = 1 + 2.5 log10 r (standard); 2.5 is the slope of Verniani's law
    law = MASS_LAWS["verniani"]
    assert_allclose(1.0 + law.exponent(2.5), 1.9949, rtol=numerical)
    assert_allclose(1.0 + law.exponent(2.2491), 1.88, rtol=numerical)
    assert_allclose(1.0 + MASS_LAWS["jvb"].exponent(2.5), 1.0 + 2.25 * np.log10(2.5), rtol=1e-12)


@pytest.mark.parametrize("law", ["jvb", "verniani"])
def test_a_magnitude_fainter_means_r_times_as_many(law: str):
    # definition of the population index
    one, steps = stream(2.3, 41.0), np.array([4.0, 5.0, 6.0])
    masses = MASS_LAWS[law].mass_g(steps, one.v_entry_km_s)
    flux = power_law([one], MASS_LAWS[law]).flux_per_m2_s(100.0, masses)
    assert_allclose(flux[1:] / flux[:-1], 2.3, rtol=1e-12)


def test_the_cautious_law_gives_the_larger_flux():
    # derived: Verniani over JVB 2.7 to 3.0 at s = 1.75, 3.7 to 4.3 at s = 2.0, at the mass of magnitude 6.5
    for s, low, high in ((1.75, 2.7, 3.0), (2.0, 3.7, 4.3)):
        speed = np.array([20.0, 35.0, 60.0, 70.0])
        masses = MASS_LAWS["verniani"].mass_g(6.5, speed) / MASS_LAWS["jvb"].mass_g(6.5, speed)
        more = masses ** (s - 1.0)
        rounding = 0.05
        assert low - rounding < more.min() < more.max() < high + rounding
