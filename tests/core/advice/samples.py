"""Streams, orbits and spacecraft for the tests of the middle. Stream values are rounded published ones; the
satellites are invented."""

from __future__ import annotations

from typing import Any

import numpy as np

from app.core.advice.factors import Baseline, baseline
from app.core.orbit.elements import MeanElements
from app.core.spacecraft.model import AttitudeLaw, Criterion, CriterionKind, Face, Policy, Spacecraft
from app.core.streams.model import Catalogue, CatalogueEntry, Component, Stream
from app.pipeline import Registered, RunInputs
from tests.samples import AS_OF_UNIX_S, DAY_S

MASS = Criterion(CriterionKind.MASS, 1e-6)
CHARGE = Criterion(CriterionKind.CHARGE, 1e-9)
WALL = Criterion(CriterionKind.PENETRATION, 1.0, "al-6061-t6")
ENERGY = Criterion(CriterionKind.ENERGY, 1.0)
PEAK_2026_UNIX_S = 1_786_585_000.0  # near solar longitude 140.0

PERSEIDS = Stream(
    "PER", "Perseids", (Component("main", 140.0, 100.0, 0.2, 0.2),), 2.2, 59.1, 48.0, 58.0, 1.4, 0.3
)
CAPRICORNIDS = Stream(
    "CAP", "alpha Capricornids", (Component("main", 127.0, 5.0, 0.04, 0.06),), 2.5, 23.0, 307.0, -10.0
)
QUADRANTIDS = Stream(
    "QUA",
    "Quadrantids",
    (Component("main", 283.15, 100.0, 2.5, 2.5),),
    2.1,
    40.7,
    230.0,
    49.0,
    start_solar_longitude_deg=276.4,
    end_solar_longitude_deg=292.0,
)
SPRING = Stream(
    "SPR",
    "invented, of April only",
    (Component("main", 20.0, 10.0, 1.0, 1.0),),
    2.5,
    30.0,
    200.0,
    10.0,
    start_solar_longitude_deg=15.0,
    end_solar_longitude_deg=25.0,
)

# name, designator, epoch (2026-08-10T06:00Z), revolutions a day, eccentricity, inclination, node, perigee, anomaly
LOW = MeanElements("LOW", "2026-001A", 2461262.5, 0.25, 15.2, 0.001, 51.6, 10.0, 20.0, 30.0)
RING = MeanElements("RING", "2026-001B", 2461262.5, 0.25, 1.00270, 0.0003, 0.05, 80.0, 10.0, 200.0)
TALL = MeanElements("TALL", "2026-001C", 2461262.5, 0.25, 2.00610, 0.72, 63.4, 300.0, 270.0, 15.0)


def catalogue(*streams: Stream) -> Catalogue:
    """All of them switched on."""
    entries = (CatalogueEntry(s.code, s.name, "A", True, None, s, ()) for s in streams)
    return Catalogue(tuple(entries), "c" * 64)


def inputs(*streams: Stream, **more: Any) -> RunInputs:
    """A run on 2026-08-10 with horizons of 7 and 14 days; the Perseids when no stream is named."""
    given = {
        "as_of_unix_s": AS_OF_UNIX_S,
        "horizon_low_days": 7.0,
        "horizon_high_days": 14.0,
        "outlook_days": 60.0,
        "mass_law": "jvb",
        "run_id": "run-1",
        "software": "stonechat 0",
        "catalogue": catalogue(*(streams or (PERSEIDS,))),
    }
    return RunInputs(**{**given, **more})


def box(
    *criteria: Criterion, attitude: AttitudeLaw | None = None, policy: Policy | None = None, **areas: float
) -> Spacecraft:
    """Six faces by the names of their normals; one criterion or more; areas of 1 m2 unless given."""
    faces = []
    for name, axis, sign in (
        ("px", 0, 1),
        ("nx", 0, -1),
        ("py", 1, 1),
        ("ny", 1, -1),
        ("pz", 2, 1),
        ("nz", 2, -1),
    ):
        normal = [0.0, 0.0, 0.0]
        normal[axis] = float(sign)
        faces.append(Face(name, tuple(normal), areas.get(name, 1.0), criteria or (MASS,)))
    return Spacecraft("wren", "Wren", tuple(faces), attitude or AttitudeLaw(), policy=policy or Policy())


def plate(
    *criteria: Criterion,
    satellite_id: str = "wren",
    normal: tuple[float, float, float] = (0.0, 0.0, -1.0),
    attitude: AttitudeLaw | None = None,
    **policy: float,
) -> Spacecraft:
    """One sensitive face of 2 m2, looking away from the Earth unless told otherwise."""
    face = Face("plate", normal, 2.0, criteria or (MASS, CHARGE), sensitive=True)
    return Spacecraft(satellite_id, "Wren", (face,), attitude or AttitudeLaw(), policy=Policy(**policy))


def registered(spacecraft: Spacecraft | None = None, elements: MeanElements | None = LOW) -> Registered:
    return Registered(spacecraft or plate(), elements)


def judged_by(background: list[float], faces: tuple[Face, ...] | None = None, **policy: float) -> Baseline:
    """A baseline with backgrounds made up for the purpose, one for each (face, criterion)."""
    one = (Face("plate", (0.0, 0.0, 1.0), 2.0, (MASS,), sensitive=True),)
    spacecraft = Spacecraft("wren", "Wren", faces or one, policy=Policy(**policy))
    return baseline(spacecraft, np.array(background))


__all__ = ["AS_OF_UNIX_S", "DAY_S"]
