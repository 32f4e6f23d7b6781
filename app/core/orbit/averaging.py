"""Orbits as ellipses sampled evenly in time, for averages over orbit phase."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from sgp4.api import SGP4_ERRORS

from app.core.constants import BLOCKING_RADIUS_KM, MU_EARTH_KM3_S2
from app.core.orbit.elements import EARTH_RADIUS_KM, MeanElements
from app.core.orbit.sgp4_records import satrec
from app.errors import OrbitError

Floats = npt.NDArray[np.float64]
SECONDS_PER_MINUTE = 60.0


@dataclass(frozen=True)
class Ellipse:
    """Kepler ellipses: ``toward_perigee`` and ``ahead`` are unit vectors (3, ...) in one inertial frame."""

    a_km: float
    eccentricity: float
    toward_perigee: Floats
    ahead: Floats

    @property
    def perigee_km(self) -> float:
        """Least geocentric distance."""
        return self.a_km * (1.0 - self.eccentricity)

    def points(self, count: int) -> tuple[Floats, Floats, Floats]:
        """Return r (3, ..., count) km, v (3, ..., count) km/s and time shares (count,), sum 1.

        Even in eccentric anomaly, so that a fast perigee is seen; the shares restore the average over time.
        """
        anomaly = (np.arange(count) + 0.5) * (2.0 * np.pi / count)
        e, b_over_a = self.eccentricity, np.sqrt(1.0 - self.eccentricity**2)
        slow = 1.0 - e * np.cos(anomaly)
        speed = np.sqrt(MU_EARTH_KM3_S2 / self.a_km) / slow
        p, q = self.toward_perigee[..., None], self.ahead[..., None]
        r_km = self.a_km * ((np.cos(anomaly) - e) * p + b_over_a * np.sin(anomaly) * q)
        v_km_s = speed * (-np.sin(anomaly) * p + b_over_a * np.cos(anomaly) * q)
        return r_km, v_km_s, slow / count


def osculating_ellipse(r_km: Floats, v_km_s: Floats) -> Ellipse:
    """Ellipse through one state (3,), (3,). ``OrbitError`` when it is open, or reaches the air at perigee."""
    distance, speed2 = float(np.linalg.norm(r_km)), float(v_km_s @ v_km_s)
    inverse_a = 2.0 / distance - speed2 / MU_EARTH_KM3_S2
    momentum = np.cross(r_km, v_km_s)
    if inverse_a <= 0.0:
        raise OrbitError("the state is not bound to the Earth: it has no orbit to average over")
    lenz = np.cross(v_km_s, momentum) / MU_EARTH_KM3_S2 - r_km / distance
    eccentricity = float(np.linalg.norm(lenz))
    if (1.0 - eccentricity) / inverse_a < BLOCKING_RADIUS_KM:
        raise OrbitError(
            f"the orbit of the state reaches the air (below {BLOCKING_RADIUS_KM:.0f} km) at perigee"
        )
    perigee = lenz / eccentricity if eccentricity > 1e-12 else r_km / distance
    ahead = np.cross(momentum, perigee)
    return Ellipse(1.0 / inverse_a, eccentricity, perigee, ahead / np.linalg.norm(ahead))


@dataclass(frozen=True)
class SecularOrbit:
    """Mean orbit whose plane and apsides turn at their secular (J2, J4) rates; a, e and i are held.

    Holding the semi-major axis keeps drag, extrapolated for months, from bringing the satellite down.
    Angles in radians, rates in rad/s, frame TEME; source: SGP4's own secular rates (Hoots & Roehrich 1980).
    """

    a_km: float
    eccentricity: float
    inclination: float
    raan: float
    arg_perigee: float
    raan_rate: float
    arg_perigee_rate: float
    epoch_unix_s: float

    def ellipse(self, unix_s: Floats, teme_to_gcrf: Floats) -> Ellipse:
        """Ellipses in GCRF at instants (...,), given their rotation matrices (..., 3, 3)."""
        elapsed = unix_s - self.epoch_unix_s
        node, apse = self.raan + self.raan_rate * elapsed, self.arg_perigee + self.arg_perigee_rate * elapsed
        level = np.stack([np.cos(node), np.sin(node), np.zeros_like(node)])
        lean, rise = np.cos(self.inclination), np.sin(self.inclination)
        climb = np.stack([-np.sin(node) * lean, np.cos(node) * lean, np.full_like(node, rise)])
        perigee = np.cos(apse) * level + np.sin(apse) * climb
        ahead = -np.sin(apse) * level + np.cos(apse) * climb
        turn = "...ij,j...->i..."
        return Ellipse(
            self.a_km,
            self.eccentricity,
            np.einsum(turn, teme_to_gcrf, perigee),
            np.einsum(turn, teme_to_gcrf, ahead),
        )


def secular_orbit(elements: MeanElements) -> SecularOrbit:
    """Mean orbit of an SGP4 element set. ``OrbitError`` when its perigee lies in the air."""
    record = satrec(elements)
    if record.error:
        why = SGP4_ERRORS.get(record.error, "unknown error")
        raise OrbitError(f"SGP4 refuses the elements at their epoch, error {record.error}: {why}")
    a_km = record.a * EARTH_RADIUS_KM
    if a_km * (1.0 - record.ecco) < BLOCKING_RADIUS_KM:
        raise OrbitError(
            f"perigee at {a_km * (1.0 - record.ecco):.0f} km from the Earth's centre, inside the air "
            f"(below {BLOCKING_RADIUS_KM:.0f} km)"
        )
    return SecularOrbit(
        a_km,
        record.ecco,
        record.inclo,
        record.nodeo,
        record.argpo,
        record.nodedot / SECONDS_PER_MINUTE,
        record.argpdot / SECONDS_PER_MINUTE,
        elements.epoch_unix_s,
    )
