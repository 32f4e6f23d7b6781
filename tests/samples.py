"""Invented satellites, orbits and advisories, and computations that stand in for the physics."""

from __future__ import annotations

import os
import time
from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from app.core.orbit.elements import MeanElements
from app.core.spacecraft.model import Criterion, CriterionKind, Face, Policy, Spacecraft
from app.core.streams.model import Catalogue, CatalogueEntry, Component, Stream
from app.pipeline import Registered, RunInputs, SatelliteResult

AS_OF_UNIX_S = 1_786_320_000.0  # 2026-08-10T00:00:00Z
DAY_S = 86_400.0
STREAM = Stream("PER", "Perseids", (Component("main", 140.0, 100.0, 0.2, 0.2),), 2.2, 59.1, 48.0, 58.0)
CATALOGUE = Catalogue((CatalogueEntry("PER", "Perseids", "A", True, None, STREAM, ()),), "d" * 64)


def spacecraft(satellite_id: str = "kestrel-1", name: str = "Kestrel", ready_at: float = 1.5) -> Spacecraft:
    criterion = Criterion(CriterionKind.MASS, 1e-6)
    face = Face("aperture", (0.0, 0.0, 1.0), 0.3, (criterion,), sensitive=True)
    return Spacecraft(satellite_id, name, (face,), policy=Policy(ready_at=ready_at))


def elements(mean_anomaly_deg: float = 10.0) -> MeanElements:
    return MeanElements(
        "KESTREL", "2026-012B", 2461262.5, 0.25, 15.2, 0.001, 51.6, 10.0, 20.0, mean_anomaly_deg
    )


def band(mid: float) -> dict[str, float | None]:
    return {"low": None, "mid": mid, "high": None}


def body(satellite: str, passage: str = "PER-2026", level: str = "ready", **more: Any) -> dict[str, Any]:
    """An advisory as the pipeline makes it, without revision, status and changes."""
    times = {
        "onset": "2026-08-11T00:00:00Z",
        "peak_at": "2026-08-13T02:00:00Z",
        "end": "2026-08-15T00:00:00Z",
    }
    return {
        "id": f"{passage}.{satellite}",
        "satellite": satellite,
        "stream": passage.split("-")[0],
        "stream_name": "Perseids",
        "passage": passage,
        "level": level,
        "depth": "plan",
        "issued_at": "2026-08-10T00:00:00Z",
        **times,
        "satellite_enhancement_peak": [{"criterion": "mass", **band(1.9)}],
        "enhancement_peak": [{"criterion": "mass", "face": "aperture", "sensitive": True, **band(1.9)}],
        "expected_impacts": [{"criterion": "mass", **band(1e-4)}],
        "background_impacts": [{"criterion": "mass", **band(1e-4)}],
        "lee_windows": [],
        "lee_windows_from": None,
        "lee_windows_until": None,
        "safe_attitude_windows": [],
        "actions": ["Prepare."],
        "plan_until": "2026-08-17T00:00:00Z",
        "provenance": {"software": "stonechat"},
        "caution": "Advice only.",
        **more,
    }


@dataclass(frozen=True)
class FakeCompute:
    """Gives each satellite the same advisories; satellites named here misbehave instead."""

    level: str = "ready"
    passages: tuple[str, ...] = ("PER-2026",)
    more: dict[str, Any] = field(default_factory=dict)
    failing: tuple[str, ...] = ()  # come back as failed
    raising: tuple[str, ...] = ()  # raise out of the batch
    killing: tuple[str, ...] = ()  # take the worker process with them
    seconds: float = 0.0
    trace: Path | None = None  # a line per call: process id and OPENBLAS_NUM_THREADS

    def __call__(self, inputs: RunInputs, satellites: Sequence[Registered]) -> list[SatelliteResult]:
        if self.trace is not None:
            with self.trace.open("a") as file:
                file.write(f"{os.getpid()} {os.environ.get('OPENBLAS_NUM_THREADS')}\n")
        time.sleep(self.seconds)
        return [self.one(inputs, each.spacecraft.id) for each in satellites]

    def one(self, inputs: RunInputs, satellite: str) -> SatelliteResult:
        if satellite in self.killing:
            os._exit(9)
        if satellite in self.raising:
            raise ZeroDivisionError(f"no number for {satellite}")
        if satellite in self.failing:
            return SatelliteResult(satellite, "failed", "its orbit has decayed", ())
        bodies = tuple(body(satellite, passage, self.level, **self.more) for passage in self.passages)
        return SatelliteResult(satellite, "computed", None, bodies)
