"""Short ways to put one question to the program: one stream, one place, one face."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from app.core.constants import BLOCKING_RADIUS_KM, ESCAPE_SPEED2_KM2_S2, MU_EARTH_KM3_S2
from app.core.exposure.focusing import Focusing, focus, relative_velocity
from app.core.spacecraft.model import AttitudeLaw, AttitudeLawKind, Criterion, Face, Spacecraft
from app.core.streams.flux import MASS_LAWS, power_law, zenith_focusing
from app.core.streams.model import Component, Stream
from app.core.streams.sporadic import SpeedDistribution

POINT_MASS_KM = 1e-6  # a blocking radius that blocks nothing
PER_KM2_H = 3.6e9  # of one per m2 and second
FREE = (0.0, 0.0, 0.0, 1.0)  # body axes along GCRF


def stream(r: float, v_geocentric_km_s: float, zhr: float = 100.0, **more: float) -> Stream:
    """A stream that peaks at solar longitude 140 with its radiant on the GCRF x axis."""
    component = Component("main", 140.0, zhr, 1.0, 1.0)
    return Stream("XXX", "invented", (component,), r, v_geocentric_km_s, 0.0, 0.0, **more)


def geocentric(v_entry_km_s: float) -> float:
    """Speed before the Earth's pull of a stream listed by entry speed."""
    return float(np.sqrt(v_entry_km_s**2 - ESCAPE_SPEED2_KM2_S2))


def flux_at_air_per_m2_s(zhr: float, one: Stream, mass_g: float, law: str = "jvb") -> float:
    """Flux above a mass at the top of the air, radiant in the zenith."""
    at_infinity = power_law([one], MASS_LAWS[law]).flux_per_m2_s(zhr, mass_g)
    return float(at_infinity[0] * zenith_focusing(one.v_geocentric_km_s))


@dataclass(frozen=True)
class Solved:
    """Both branches at N places: density ratios, velocities (3, N) km/s in (radial, transverse, 0) axes."""

    focusing: Focusing
    n_plus: np.ndarray
    n_minus: np.ndarray
    v_plus: np.ndarray
    v_minus: np.ndarray
    r_km: np.ndarray
    v_inf_km_s: np.ndarray

    @property
    def flux_ratio(self) -> np.ndarray:
        """Flux through a plate square to each branch over that at infinity, branches added."""
        branches = ((self.n_plus, self.v_plus), (self.n_minus, self.v_minus))
        return sum(n * np.linalg.norm(v, axis=0) for n, v in branches) / self.v_inf_km_s

    def impact_km(self, velocity: np.ndarray) -> np.ndarray:
        """Signed impact parameter from the angular momentum; negative passes round the far side."""
        return self.r_km * velocity[1] / self.v_inf_km_s


def solve(
    r_km: object,
    theta_deg: object,
    v_inf_km_s: object,
    radius_km: float = BLOCKING_RADIUS_KM,
    mu_km3_s2: float = MU_EARTH_KM3_S2,
    spread_deg: float = 0.0,
) -> Solved:
    """Focus a stream at places ``theta_deg`` from the anti-radiant; arguments broadcast to (N,)."""
    r, theta, v = (np.atleast_1d(x) for x in np.broadcast_arrays(r_km, np.radians(theta_deg), v_inf_km_s))
    each = {"r_km": r[:, None], "v_inf_km_s": v[:, None], "spread_deg": np.full((len(r), 1), spread_deg)}
    found = focus(np.cos(theta)[:, None], **each, mu_km3_s2=mu_km3_s2, radius_km=radius_km)
    zero = np.zeros(len(r))
    outward = np.array([zero + 1.0, zero, zero])[..., None]
    # The radial direction is the first axis; flow at theta from it, transverse part away from the axis.
    flow = np.array([np.cos(theta), -np.sin(theta), zero])[..., None]
    density, velocity = {1.0: zero, -1.0: zero}, {1.0: np.zeros((3, len(r))), -1.0: np.zeros((3, len(r)))}
    for branch in found.branches:
        moved = relative_velocity(branch, found.q, v[:, None], flow, outward, np.zeros(3))[..., 0]
        moved[1] *= -1.0
        density[branch.sign], velocity[branch.sign] = branch.density_ratio[:, 0], moved
    return Solved(found, density[1.0], density[-1.0], velocity[1.0], velocity[-1.0], r, v)


def point(r_km: object, theta_deg: object, v_inf_km_s: object) -> Solved:
    """The same without a body in the way: a point mass."""
    return solve(r_km, theta_deg, v_inf_km_s, radius_km=POINT_MASS_KM)


def one_speed(v_inf_km_s: float) -> SpeedDistribution:
    """Sporadic particles that all have one speed in free space."""
    entry = np.array([np.sqrt(v_inf_km_s**2 + ESCAPE_SPEED2_KM2_S2)])
    return SpeedDistribution("one speed", entry, np.ones(1))


def plates(normals: list[tuple[float, float, float]], *criteria: Criterion) -> Spacecraft:
    """Faces of 1 m2 fixed in GCRF."""
    faces = tuple(Face(f"face {i}", n, 1.0, criteria) for i, n in enumerate(normals))
    return Spacecraft("probe", "Probe", faces, AttitudeLaw(AttitudeLawKind.INERTIAL, FREE))
