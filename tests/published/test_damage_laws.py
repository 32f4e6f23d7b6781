"""Harm criteria: impact charge, single wall, energy.

Charge: McBride & McDonnell 1999, Planet. Space Sci. 47, 1005 (memory; m in grams). Wall: Cour-Palais in the form of
the IADC Protection Manual (memory). Thick target of NASA SP-8042 (1970, memory). Energy: textbook.
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.exposure.damage import MATERIALS, CriticalMass, crater_depth_cm, critical_mass, impact_charge_c
from app.core.spacecraft.model import Criterion, CriterionKind

ALUMINIUM = MATERIALS["al-6061-t6"]  # 2.7 g/cm3, 5.1 km/s, Brinell 95
WATER_KG_M3 = 1000.0
one_permille = 1e-3
half_a_percent = 5e-3


def mass_at(limit: CriticalMass, speed_km_s: float) -> float:
    return limit.at_1_km_s_g * speed_km_s**-limit.speed_exponent


def criterion(kind: CriterionKind, threshold: float) -> Criterion:
    return Criterion(kind, threshold, "al-6061-t6" if kind is CriterionKind.PENETRATION else None)


@pytest.mark.case(39)
@pytest.mark.parametrize(
    ("mass_g", "speed_km_s", "charge_c"),
    [
        (1e-11, 5.0, 1.000e-12),
        (1e-6, 59.0, 6.763e-4),
        (1e-4, 71.0, 0.1412),
        (1e-9, 20.0, 1.365e-8),
        (1e-3, 35.0, 0.1262),
    ],
)
def test_impact_charge(mass_g: float, speed_km_s: float, charge_c: float):
    assert_allclose(impact_charge_c(mass_g, speed_km_s), charge_c, rtol=half_a_percent)
    limit = critical_mass(Criterion(CriterionKind.CHARGE, charge_c), WATER_KG_M3)
    assert_allclose(mass_at(limit, speed_km_s), mass_g, rtol=half_a_percent)


@pytest.mark.case(40)
def test_the_charge_law_takes_grams():
    # Accelerator fit 0.7 m^1.02 v^3.48 with m in kg (memory): the same to 0.57 %; mistaking the unit costs 1150.
    for mass_g in (1e-12, 1e-6, 1e-2):
        for speed in (5.0, 20.0, 71.0):
            in_kg = 0.7 * (mass_g / 1000.0) ** 1.02 * speed**3.48
            assert_allclose(impact_charge_c(mass_g, speed) / in_kg, 1.0057, rtol=one_permille)


@pytest.mark.case(41)
@pytest.mark.parametrize(
    ("diameter_cm", "density_g_cm3", "speed_km_s", "depth_cm", "wall_cm"),
    [
        (0.1, 1.0, 20.0, 0.22351, 0.40232),
        (0.1, 2.5, 20.0, 0.35341, 0.63613),
        (0.1, 1.0, 59.0, 0.45975, 0.82754),
        (0.1, 1.0, 70.0, 0.51525, 0.92744),
        (0.05, 1.0, 35.0, 0.15616, 0.28109),
    ],
)
def test_crater_depth_and_wall(
    diameter_cm: float, density_g_cm3: float, speed_km_s: float, depth_cm: float, wall_cm: float
):
    assert_allclose(
        crater_depth_cm(diameter_cm, density_g_cm3, speed_km_s, ALUMINIUM), depth_cm, rtol=one_permille
    )
    limit = critical_mass(criterion(CriterionKind.PENETRATION, 10.0 * wall_cm), 1000.0 * density_g_cm3)
    assert_allclose(mass_at(limit, speed_km_s), np.pi / 6 * density_g_cm3 * diameter_cm**3, rtol=one_permille)
    assert limit.normal_speed


@pytest.mark.case(42)
@pytest.mark.parametrize(
    ("density_g_cm3", "speed_km_s", "diameter_cm", "mass_g"),
    [(1.0, 59.0, 0.01351, 1.290e-6), (1.0, 20.0, 0.02675, 1.002e-5), (2.5, 20.0, 0.01733, 6.811e-6)],
)
def test_perforation_of_one_millimetre(
    density_g_cm3: float, speed_km_s: float, diameter_cm: float, mass_g: float
):
    limit = critical_mass(criterion(CriterionKind.PENETRATION, 1.0), 1000.0 * density_g_cm3)
    found_g = mass_at(limit, speed_km_s)
    assert_allclose(found_g, mass_g, rtol=half_a_percent)
    assert_allclose((6.0 / np.pi * found_g / density_g_cm3) ** (1 / 3), diameter_cm, rtol=half_a_percent)


@pytest.mark.case(43)
def test_a_second_handbook_agrees_on_the_crater():
    # SP-8042 thick target: 0.42 m^0.352 rho^(1/6) v^(2/3) cm, m in g
    sp8042_cm = 0.42 * 5.236e-4**0.352 * 1.0 ** (1 / 6) * 20.0 ** (2 / 3)
    assert_allclose(sp8042_cm, 0.2166, rtol=one_permille)
    five_percent = 0.05
    assert_allclose(crater_depth_cm(0.1, 1.0, 20.0, ALUMINIUM), sp8042_cm, rtol=five_percent)


@pytest.mark.case(44)
@pytest.mark.parametrize(
    ("energy_j", "speed_km_s", "mass_g"),
    [(200.0, 20.0, 1e-3), (104.7, 20.0, 5.236e-4), (2.45, 70.0, 1e-6), (61.25, 35.0, 1e-4)],
)
def test_kinetic_energy(energy_j: float, speed_km_s: float, mass_g: float):
    limit = critical_mass(criterion(CriterionKind.ENERGY, energy_j), WATER_KG_M3)
    assert_allclose(mass_at(limit, speed_km_s), mass_g, rtol=one_permille)


@pytest.mark.case(45)
@pytest.mark.parametrize(
    ("kind", "threshold", "at_59", "at_70", "at_35"),
    [
        (CriterionKind.CHARGE, 1e-9, 15.93, 46.84, 6.748),
        (CriterionKind.ENERGY, 1.0, 5.067, 9.535, 3.063),
        (CriterionKind.PENETRATION, 1.0, 4.652, 8.468, 2.887),
        (CriterionKind.MASS, 1e-6, 1.0, 1.0, 1.0),
    ],
)
def test_what_speed_does_to_the_flux_above_a_criterion(
    kind: CriterionKind, threshold: float, at_59: float, at_70: float, at_35: float
):
    # derived: flux above m_crit(v) grows as (v/20)^(g (s - 1))
    limit = critical_mass(criterion(kind, threshold), WATER_KG_M3)
    for speed, s, expected in ((59.0, 1.75, at_59), (70.0, 1.9, at_70), (35.0, 2.0, at_35)):
        more = (mass_at(limit, 20.0) / mass_at(limit, speed)) ** (s - 1.0)
        assert_allclose(more, expected, rtol=one_permille)


@pytest.mark.case(51)
def test_speed_makes_charge_matter_more_than_energy():
    # both scaled so that the same mass is critical at 20 km/s
    charge = critical_mass(Criterion(CriterionKind.CHARGE, impact_charge_c(1e-6, 20.0)), WATER_KG_M3)
    energy = critical_mass(Criterion(CriterionKind.ENERGY, 500.0 * 1e-6 * 20.0**2), WATER_KG_M3)
    assert_allclose([mass_at(charge, 20.0), mass_at(energy, 20.0)], 1e-6, rtol=1e-12)
    exponent = 0.8  # s = 1.8
    for speed in (11.2, 15.0, 25.0, 41.0, 71.0):
        by_charge, by_energy = ((1e-6 / mass_at(limit, speed)) ** exponent for limit in (charge, energy))
        assert (by_charge > by_energy > 1.0) if speed > 20.0 else (by_charge < by_energy < 1.0)
