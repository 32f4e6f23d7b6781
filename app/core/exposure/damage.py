"""Harm criteria as power laws: critical mass = K * speed^-g, with the speed the law asks for."""

from __future__ import annotations

import math
from dataclasses import dataclass

from app.core.spacecraft.model import Criterion, CriterionKind
from app.errors import FieldError

# Impact charge Q[C] = 0.1 m (m/1e-11)^0.02 (v/5)^3.48, m in grams, v in km/s
# (McBride & McDonnell 1999, Planet. Space Sci. 47, 1005; memory, and equal to 0.7 m^1.02 v^3.48 with m in kg).
CHARGE_COEFFICIENT, CHARGE_MASS_G, CHARGE_SPEED_KM_S = 0.1, 1e-11, 5.0
CHARGE_MASS_EXPONENT, CHARGE_SPEED_EXPONENT = 1.02, 3.48

# Cour-Palais crater depth, P[cm] = 5.24 d^(19/18) BHN^-1/4 (rho_p/rho_t)^k (v_n/C)^(2/3); a wall of
# 1.8 P is just not perforated (IADC Protection Manual; memory).
CRATER_COEFFICIENT, CRATER_DIAMETER_EXPONENT, CRATER_SPEED_EXPONENT = 5.24, 19.0 / 18.0, 2.0 / 3.0
PERFORATION_DEPTHS = 1.8


@dataclass(frozen=True)
class Material:
    """Wall material: density, sound speed, Brinell hardness."""

    density_g_cm3: float
    sound_speed_km_s: float
    brinell: float


MATERIALS = {
    # IADC Protection Manual values (memory).
    "al-6061-t6": Material(2.7, 5.1, 95.0),
    "al-2024-t3": Material(2.8, 5.1, 120.0),
}


@dataclass(frozen=True)
class CriticalMass:
    """Smallest harmful mass: ``at_1_km_s_g`` * v^-``speed_exponent`` grams.

    ``v`` is the impact speed, or its component along the face's normal when ``normal_speed`` is set.
    """

    at_1_km_s_g: float
    speed_exponent: float
    normal_speed: bool


def critical_mass(criterion: Criterion, density_kg_m3: float) -> CriticalMass:
    """Critical mass of a particle of ``density_kg_m3`` (which only the wall criterion asks for)."""
    if criterion.kind is CriterionKind.MASS:
        return CriticalMass(criterion.threshold, 0.0, False)
    if criterion.kind is CriterionKind.ENERGY:
        # E[J] = 0.5 m[kg] v[m/s]^2 = 500 m[g] v[km/s]^2
        return CriticalMass(criterion.threshold / 500.0, 2.0, False)
    if criterion.kind is CriterionKind.CHARGE:
        return _charge(criterion.threshold)
    return _penetration(criterion.threshold, criterion.material, density_kg_m3 / 1000.0)


def impact_charge_c(mass_g: float, speed_km_s: float) -> float:
    """Impact plasma charge in coulomb (McBride & McDonnell 1999)."""
    size: float = (mass_g / CHARGE_MASS_G) ** (CHARGE_MASS_EXPONENT - 1.0)
    plasma: float = (speed_km_s / CHARGE_SPEED_KM_S) ** CHARGE_SPEED_EXPONENT
    return CHARGE_COEFFICIENT * mass_g * size * plasma


def crater_depth_cm(diameter_cm: float, density_g_cm3: float, normal_km_s: float, wall: Material) -> float:
    """Crater depth in a thick wall (Cour-Palais, IADC form)."""
    size: float = diameter_cm**CRATER_DIAMETER_EXPONENT
    softness: float = wall.brinell**-0.25
    speed: float = (normal_km_s / wall.sound_speed_km_s) ** CRATER_SPEED_EXPONENT
    return CRATER_COEFFICIENT * size * softness * _density_term(density_g_cm3, wall) * speed


def material(name: str | None) -> Material:
    """Look up a wall material; ``FieldError`` lists the known names."""
    if name not in MATERIALS:
        raise FieldError("criteria.material", f"'{name}' is not known; choose one of {', '.join(MATERIALS)}")
    return MATERIALS[name]


def _charge(charge_c: float) -> CriticalMass:
    at_reference = charge_c / (CHARGE_COEFFICIENT * CHARGE_MASS_G)
    exponent = CHARGE_SPEED_EXPONENT / CHARGE_MASS_EXPONENT
    mass = CHARGE_MASS_G * at_reference ** (1.0 / CHARGE_MASS_EXPONENT) * CHARGE_SPEED_KM_S**exponent
    return CriticalMass(mass, exponent, False)


def _penetration(wall_mm: float, material_name: str | None, density_g_cm3: float) -> CriticalMass:
    wall = material(material_name)
    depth_of_1_cm = crater_depth_cm(1.0, density_g_cm3, 1.0, wall)
    diameter_cm = (wall_mm / 10.0 / PERFORATION_DEPTHS / depth_of_1_cm) ** (1.0 / CRATER_DIAMETER_EXPONENT)
    mass = math.pi / 6.0 * density_g_cm3 * diameter_cm**3
    return CriticalMass(mass, 3.0 * CRATER_SPEED_EXPONENT / CRATER_DIAMETER_EXPONENT, True)


def _density_term(density_g_cm3: float, wall: Material) -> float:
    ratio = density_g_cm3 / wall.density_g_cm3
    exponent: float = 0.5 if ratio < 1.5 else 2.0 / 3.0
    return float(ratio**exponent)
