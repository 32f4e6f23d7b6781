"""Streams for which both a rate and a flux, or a number of impacts, were published."""

from __future__ import annotations

import math

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.streams.flux import MASS_LAWS, flux_per_m2_s_at_air, power_law
from tests.published.probes import PER_KM2_H, flux_at_air_per_m2_s, geocentric, stream

JVB = MASS_LAWS["jvb"]
HOUR_S = 3600.0


@pytest.mark.case(18)
@pytest.mark.parametrize(("r", "computed"), [(2.0, 0.00251), (2.1, 0.00272), (2.2, 0.00289)])
def test_perseids_2015_by_video(r: float, computed: float):
    # Blaauw, Campbell-Brown & Kingery 2016, MNRAS 463, 441 (read): 0.002989 per km2 and hour above 5.1e-4 g
    # goes with ZHR 100.7. The computed column takes 59.1 km/s for the entry speed; it is a geocentric speed.
    published, twenty_percent, three_digits = 0.002989, 0.20, 2.5e-3
    as_computed = flux_at_air_per_m2_s(100.7, stream(r, geocentric(59.1)), 5.1e-4) * PER_KM2_H
    assert_allclose(as_computed, computed, rtol=three_digits)
    assert_allclose(as_computed, published, rtol=twenty_percent)
    assert_allclose(
        flux_at_air_per_m2_s(100.7, stream(r, 59.1), 5.1e-4) * PER_KM2_H, published, rtol=twenty_percent
    )


@pytest.mark.case(19)
def test_leonids_1999_by_video():
    # Brown et al. 2000 (read): 1.6 +- 0.1 per km2 and hour at magnitude 6.5; ZHR 3700 (Arlt et al. 1999, memory)
    flux = flux_per_m2_s_at_air(3700.0, 2.2) * PER_KM2_H
    assert_allclose(flux, 1.13, rtol=5e-3)
    factor = 2.0
    assert 1.6 / factor < flux < 1.6 * factor


@pytest.mark.case(20)
def test_leonids_1966_by_radar():
    # Brown, Simek & Jones 1997, A&A 322, 687 (read): at least 39 +- 2 per km2 and hour at magnitude 6.8, s 2.0,
    # visual peak ZHR about 150 000. r = 10^((s - 1)/2.5).
    one = stream(10.0 ** (1.0 / 2.5), geocentric(71.0), 150_000.0)
    mass_g = JVB.mass_g(6.8, one.v_entry_km_s)
    flux = flux_at_air_per_m2_s(150_000.0, one, float(mass_g)) * PER_KM2_H
    assert 39.0 < flux < 150.0
    assert_allclose(flux, 101.0, rtol=5e-3)


@pytest.mark.case(21)
@pytest.mark.parametrize("hours", [0.5, 1.0])
def test_the_1966_storm_on_a_satellite(hours: float):
    # Beech et al. 1999, Acta Astronautica 44, 281 (read): "of order 1 %" for 2 m2, above 1e-7 g, s = 2.0
    r = 10.0 ** (1.0 / JVB.mass)  # s = 2.0 under the law in use
    one = stream(r, geocentric(71.0))
    assert_allclose(1.0 + JVB.exponent(r), 2.0, rtol=1e-12)
    impacts = flux_at_air_per_m2_s(150_000.0, one, 1e-7) * 2.0 * hours * HOUR_S
    probability = -math.expm1(-impacts)
    assert 0.005 < probability < 0.03


def test_the_flux_at_infinity_is_below_that_at_the_air():
    # derived (case 38): a slow stream gains 14 % on its way to the air, a fast one hardly anything
    slow, fast = stream(2.5, 20.4), stream(2.5, 70.2)
    at_air = flux_per_m2_s_at_air(100.0, 2.5)
    visual = JVB.mass_g(6.5, np.array([slow.v_entry_km_s, fast.v_entry_km_s]))
    at_infinity = power_law([slow, fast], JVB).flux_per_m2_s(100.0, visual)
    assert_allclose(at_air / at_infinity, [1.1431, 1.0124], atol=1e-4)
