"""SGP4 mean elements as one frozen record, whatever file they came from."""

from __future__ import annotations

import math
from dataclasses import dataclass

from app.errors import FieldError

SECONDS_PER_DAY = 86400.0
EARTH_RADIUS_KM = 6378.135  # WGS-72, the radius SGP4 elements are defined with (Vallado et al. 2006)
MU_WGS72_KM3_S2 = 398600.8  # WGS-72
J2_WGS72 = 0.001082616  # WGS-72
FINITE = (
    *("epoch_jd", "epoch_fraction", "raan_deg", "arg_perigee_deg", "mean_anomaly_deg"),
    *("mean_motion_dot_rev_per_day2", "mean_motion_ddot_rev_per_day3"),
)


@dataclass(frozen=True)
class MeanElements:
    """SGP4 mean elements (TEME of date, UTC), Kozai mean motion as in a TLE or OMM.

    ``epoch_jd`` + ``epoch_fraction``: UTC Julian date, the first part ending in .5 (a midnight).
    ``bstar_per_earth_radius``: drag term. ``object_id``: international designator.
    """

    object_name: str
    object_id: str
    epoch_jd: float
    epoch_fraction: float
    mean_motion_rev_per_day: float
    eccentricity: float
    inclination_deg: float
    raan_deg: float
    arg_perigee_deg: float
    mean_anomaly_deg: float
    bstar_per_earth_radius: float = 0.0
    mean_motion_dot_rev_per_day2: float = 0.0
    mean_motion_ddot_rev_per_day3: float = 0.0

    def __post_init__(self) -> None:
        limits: dict[str, tuple[float, float]] = {
            "mean_motion_rev_per_day": (0.001, 20.0),
            "eccentricity": (0.0, 0.9999999),
            "inclination_deg": (0.0, 180.0),
            "bstar_per_earth_radius": (-10.0, 10.0),
        }
        for name, (low, high) in limits.items():
            value = getattr(self, name)
            if not low <= value <= high:
                raise FieldError(name, f"is {value!r}; it must lie between {low} and {high}")
        for name in FINITE:
            if not math.isfinite(getattr(self, name)):
                raise FieldError(name, "must be a finite number")

    @property
    def epoch_unix_s(self) -> float:
        """Epoch in UTC POSIX seconds."""
        return ((self.epoch_jd - 2440587.5) + self.epoch_fraction) * SECONDS_PER_DAY

    @property
    def is_low_orbit(self) -> bool:
        """Period below 225 minutes (the SGP4 near-Earth regime)."""
        return self.mean_motion_rev_per_day > 6.4
