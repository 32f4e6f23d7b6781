"""The background of one satellite at a date."""

from __future__ import annotations

import numpy as np

from app.core.advice.factors import Baseline, baseline
from app.core.exposure.background import follows_orbit, orbit_background
from app.core.orbit.averaging import SecularOrbit
from app.core.sky.times import TimeGrid
from app.core.spacecraft.model import Spacecraft
from app.core.streams.sporadic import SpeedDistribution


class Baselines:
    """Background averaged over the orbit. The date matters only where faces do not follow the orbit's axes.

    Where it does not, that of the orbit's epoch serves every date, so that a run and a series agree to the bit.
    """

    def __init__(self, spacecraft: Spacecraft, orbit: SecularOrbit, speeds: SpeedDistribution) -> None:
        self.spacecraft, self.orbit, self.speeds = spacecraft, orbit, speeds
        self._timeless = self._of(orbit.epoch_unix_s) if follows_orbit(spacecraft) else None

    def at(self, unix_s: float) -> Baseline:
        """Return the baseline at a date; ``OrbitError`` when a face has no background."""
        return self._timeless or self._of(unix_s)

    def _of(self, unix_s: float) -> Baseline:
        grid = TimeGrid(np.array([unix_s]))
        ellipse = self.orbit.ellipse(np.array(unix_s), grid.teme_to_gcrf[0])
        rates = orbit_background(self.spacecraft, ellipse, grid.sun_km[0], self.speeds)
        return baseline(self.spacecraft, rates)
