"""READ FIRST: the whole data path as one function of explicit inputs."""

from __future__ import annotations

from collections.abc import Sequence
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


@dataclass(frozen=True)
class Registered:
    """A satellite with the orbit in use, or None while it has none."""

    spacecraft: Spacecraft
    elements: MeanElements | None


@dataclass(frozen=True)
class SatelliteResult:
    """What became of one satellite: its advisories, or why there are none."""

    satellite_id: str
    state: Literal["computed", "failed"]
    reason: str | None
    advisories: tuple[dict[str, Any], ...]


def compute_satellites(inputs: RunInputs, satellites: Sequence[Registered]) -> list[SatelliteResult]:
    """Compute."""
    raise NotImplementedError
