"""The everyday hazard on each face: the isotropic sporadic flux as a moving, partly shielded face sees it.

At a place r the isotropic flux of one free-space speed stays uniform over the directions that are not
blocked (Liouville), with local speed v^2 = v_inf^2 + 2 mu/r and flux G = v^2/v_inf^2 times that of free space
(Opik 1951). Blocked are velocities within alpha of the local vertical, upward, with
sin(alpha) = R/r sqrt((1 + 2a/R)/(1 + 2a/r)), a = mu/v_inf^2: bent rays, not straight ones.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np
import numpy.typing as npt

from app.core.constants import BLOCKING_RADIUS_KM, MU_EARTH_KM3_S2
from app.core.exposure.damage import CriticalMass, critical_mass
from app.core.exposure.faces import Places, criterion_rows
from app.core.orbit.averaging import Ellipse
from app.core.spacecraft.attitude import body_axes, body_normals
from app.core.spacecraft.model import AttitudeLawKind, Spacecraft
from app.core.streams.sporadic import SPORADIC_DENSITY_KG_M3, SpeedDistribution, gruen_flux_per_m2_s

Floats = npt.NDArray[np.float64]
Nodes = tuple[int, int]  # polar, azimuth
FINE: Nodes = (
    16,
    32,
)  # 0.1 % of the free-space flux: 0.2 % on a face at the horizon of a low orbit, 1 % on one below
COARSE: Nodes = (8, 16)  # where a dozen phases are averaged: up to 3 % on a face that looks at the Earth
SAME_SKY_ECCENTRICITY = 0.003  # below it the places at the mean distance stand for the whole orbit
PHASES, ECCENTRIC_PHASES = 12, 24
ECCENTRIC = 0.1
SPEED_STEP_KM_S = 0.01
FASTEST_KM_S = 200.0  # sporadics and satellite together stay well below
HEAVIEST_G = 1e12  # keeps the flux of the slowest above zero in floating point


def follows_orbit(spacecraft: Spacecraft) -> bool:
    """Whether the faces keep their place in the orbit's own axes, so that the date does not matter."""
    jointed = any(face.joint for face in spacecraft.faces)
    return spacecraft.attitude.kind is AttitudeLawKind.NADIR and not jointed


def orbit_background(
    spacecraft: Spacecraft, ellipse: Ellipse, sun_km: Floats, speeds: SpeedDistribution
) -> Floats:
    """Background hazard rate of each row, (C,), averaged over one orbit in the nominal attitude.

    ``ellipse``: one orbit, vectors (3,); ``sun_km`` (3,) at its date.
    """
    if follows_orbit(spacecraft) and ellipse.eccentricity < SAME_SKY_ECCENTRICITY:
        count, nodes = 2, FINE  # the two places at the mean distance
    else:
        count, nodes = (ECCENTRIC_PHASES if ellipse.eccentricity > ECCENTRIC else PHASES), COARSE
    r_km, v_km_s, shares = ellipse.points(count)
    sun = np.repeat(sun_km[:, None], count, axis=1)
    return background_rates(spacecraft, Places(r_km, v_km_s, sun), shares, speeds, nodes)


def background_rates(
    spacecraft: Spacecraft,
    places: Places,
    weights: Floats,
    speeds: SpeedDistribution,
    nodes: Nodes = FINE,
) -> Floats:
    """Background hazard rate of each (face, criterion) row, (C,), per m2 and second.

    ``places``: P orbit phases, arrays (3, P); ``weights``: (P,), share of time of each, sum 1.
    Source: Gruen et al. 1985 flux; ``speeds`` says how it is shared among speeds.
    """
    axes = body_axes(spacecraft.attitude, places.r_km, places.v_km_s, places.sun_km)
    normals = body_normals(spacecraft, axes, places.r_km, places.sun_km)
    total = np.zeros(len(criterion_rows(spacecraft)))
    for phase, weight in enumerate(weights):
        r_km, v_km_s = places.r_km[:, phase], places.v_km_s[:, phase]
        velocity, density = relative_sky(r_km, v_km_s, speeds, nodes)
        here = np.array([n if n.ndim == 1 else n[:, phase] for n in normals])
        total += weight * _on_faces(spacecraft, axes[:, :, phase] @ velocity, density, here)
    return total


def relative_sky(
    r_km: Floats, v_km_s: Floats, speeds: SpeedDistribution, nodes: Nodes = FINE
) -> tuple[Floats, Floats]:
    """The sporadic sky as a quadrature at one place: relative velocities (3, N), km/s, and densities (N,).

    A density is the number per volume, per unit of Gruen flux, that moves so: s/km.
    """
    distance = float(np.linalg.norm(r_km))
    v_inf = speeds.v_inf_km_s
    local = np.sqrt(np.square(v_inf) + 2.0 * MU_EARTH_KM3_S2 / distance)
    direction, solid_angle = _open_sky(_blocked_cosine(distance, v_inf), nodes)
    density = (speeds.free_space_share * local / np.square(v_inf) / np.pi)[:, None] * solid_angle
    vertical = _vertical_frame(r_km)
    velocity = np.einsum("ik,knd->ind", vertical, local[:, None] * direction) - v_km_s[:, None, None]
    return velocity.reshape(3, -1), density.ravel()


def shielded_share(distance_km: float, v_inf_km_s: Floats) -> Floats:
    """Share of the sky that is open, (1 + cos alpha)/2, for each speed."""
    share: Floats = 0.5 * (1.0 + _blocked_cosine(distance_km, v_inf_km_s))
    return share


def _blocked_cosine(distance_km: float, v_inf_km_s: Floats) -> Floats:
    pull = MU_EARTH_KM3_S2 / np.square(v_inf_km_s)
    bent = (1.0 + 2.0 * pull / BLOCKING_RADIUS_KM) / (1.0 + 2.0 * pull / distance_km)
    sine2 = (BLOCKING_RADIUS_KM / distance_km) ** 2 * bent
    cosine: Floats = np.sqrt(np.maximum(1.0 - sine2, 0.0))
    return cosine


def _open_sky(blocked_cosine: Floats, nodes: Nodes) -> tuple[Floats, Floats]:
    """Directions of motion (3, K, D), z up, and solid angles (K, D), from straight down to the blocked cone."""
    polar, around = nodes
    x, weight = _gauss(polar)
    half = 0.5 * (blocked_cosine + 1.0)[:, None]
    up = half * (x + 1.0) - 1.0
    azimuth = (np.arange(around) + 0.5) * (2.0 * np.pi / around)
    level = np.sqrt(1.0 - np.square(up))[:, :, None]
    shape = (len(blocked_cosine), polar, around)
    direction = np.stack(
        [level * np.cos(azimuth), level * np.sin(azimuth), np.broadcast_to(up[:, :, None], shape)]
    )
    solid_angle = np.broadcast_to((half * weight)[:, :, None] * (2.0 * np.pi / around), shape)
    return direction.reshape(3, shape[0], -1), solid_angle.reshape(shape[0], -1)


def _vertical_frame(r_km: Floats) -> Floats:
    """Matrix (3, 3) whose columns are two level directions and the vertical, GCRF."""
    up = r_km / np.linalg.norm(r_km)
    helper = np.eye(3)[np.argmin(np.abs(up))]
    level = np.cross(up, helper)
    level /= np.linalg.norm(level)
    return np.column_stack([level, np.cross(up, level), up])


def _on_faces(spacecraft: Spacecraft, velocity: Floats, density: Floats, normals: Floats) -> Floats:
    """Hazard of each row, (C,), for a quadrature of the sky; ``velocity`` (3, N), ``normals`` (F, 3) in body axes."""
    inward = np.maximum(-(normals @ velocity), 0.0)
    speed = np.sqrt(np.einsum("kn,kn->n", velocity, velocity))
    shared: dict[CriticalMass, Floats] = {}
    rates = []
    for row in criterion_rows(spacecraft):
        limit = critical_mass(row.criterion, SPORADIC_DENSITY_KG_M3)
        on_face = inward[row.face]
        if limit.normal_speed:
            above = _gruen_above(limit, on_face)
            rates.append(np.dot(on_face * density, above))
            continue
        if limit not in shared:
            shared[limit] = density * _gruen_above(limit, speed)
        rates.append(np.dot(on_face, shared[limit]))
    return np.array(rates)


def _gruen_above(limit: CriticalMass, speed_km_s: Floats) -> Floats:
    """Gruen flux above the critical mass at these speeds, linear between tabulated ones (1e-4 above 1 km/s)."""
    table = _gruen_by_speed(limit)
    place = speed_km_s * (1.0 / SPEED_STEP_KM_S)
    left = place.astype(np.intp)
    below = table[left]
    flux: Floats = below + (place - left) * (table[left + 1] - below)
    return flux


@lru_cache(maxsize=256)
def _gruen_by_speed(limit: CriticalMass) -> Floats:
    # The slowest particles only skim a face and weigh nothing; they are kept finite.
    speed = np.maximum(np.arange(0.0, FASTEST_KM_S, SPEED_STEP_KM_S), SPEED_STEP_KM_S / 10.0)
    mass_g = limit.at_1_km_s_g * speed**-limit.speed_exponent
    return gruen_flux_per_m2_s(np.minimum(mass_g, HEAVIEST_G))


@lru_cache(maxsize=8)
def _gauss(count: int) -> tuple[Floats, Floats]:
    nodes, weights = np.polynomial.legendre.leggauss(count)
    return nodes, weights
