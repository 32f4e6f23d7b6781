"""What goes into a run and what comes out of it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Literal

from app.core.orbit.elements import MeanElements
from app.core.spacecraft.model import Spacecraft
from app.core.streams.model import Catalogue


@dataclass(frozen=True)
class RunInputs:
    """Everything a run depends on besides its satellites. ``mass_law`` is a name of ``MASS_LAWS``."""

    as_of_unix_s: float
    horizon_low_days: float
    horizon_high_days: float
    outlook_days: float
    mass_law: str
    run_id: str
    software: str
    catalogue: Catalogue

    @property
    def plan_days(self) -> float:
        """Length of the longest plan."""
        return max(self.horizon_low_days, self.horizon_high_days)

    def horizon_days(self, elements: MeanElements) -> float:
        """How long an orbit of this regime is trusted after (and before) its epoch."""
        return self.horizon_low_days if elements.is_low_orbit else self.horizon_high_days


@dataclass(frozen=True)
class Registered:
    """A satellite with the orbit in use, or None while it has none."""

    spacecraft: Spacecraft
    elements: MeanElements | None


@dataclass(frozen=True)
class SatelliteResult:
    """What became of one satellite: its advisories, or why there are none.

    ``reason`` also says of a computed one what its advisories lack.
    """

    satellite_id: str
    state: Literal["computed", "failed"]
    reason: str | None
    advisories: tuple[dict[str, Any], ...]
