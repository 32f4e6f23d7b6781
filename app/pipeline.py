"""READ FIRST: the whole data path, from streams and orbits to advisories, as functions of explicit inputs."""

from __future__ import annotations

from collections.abc import Sequence

from app.core.advice.advisory import advisory, untrusted
from app.core.advice.run_sky import RunSky, run_sky
from app.core.advice.satellite import SatelliteExposure
from app.core.advice.windows import track_of
from app.core.orbit.averaging import secular_orbit
from app.core.orbit.trust import trusted_count
from app.core.run import Registered, RunInputs, SatelliteResult
from app.core.streams.flux import mass_law
from app.core.streams.sporadic import analytic_speeds
from app.errors import OrbitError, StonechatError

__all__ = ["Registered", "RunInputs", "SatelliteResult", "compute_satellites", "exposure", "sky_of"]


def compute_satellites(inputs: RunInputs, satellites: Sequence[Registered]) -> list[SatelliteResult]:
    """Advisories of every satellite, in order; one that cannot be computed is marked and says why."""
    sky = sky_of(inputs)
    return [_marked(inputs, sky, satellite) for satellite in satellites]


def sky_of(inputs: RunInputs) -> RunSky:
    """Stream catalogue -> stream states and passages, once for all satellites."""
    law = mass_law(inputs.mass_law)
    return run_sky(inputs.catalogue.streams, law, inputs.as_of_unix_s, inputs.plan_days, inputs.outlook_days)


def exposure(inputs: RunInputs, sky: RunSky, satellite: Registered) -> SatelliteExposure:
    """Orbit -> states -> exposure of each face. ``OrbitError`` when the orbit is missing or cannot be used."""
    if satellite.elements is None:
        raise OrbitError("no orbit is registered; give it an OMM or TLE")
    orbit, grid = secular_orbit(satellite.elements), sky.plan.grid
    count = trusted_count(satellite.elements, inputs.horizon_days(satellite.elements), grid.unix_s)
    track = track_of(satellite.elements, grid, count)
    return SatelliteExposure(sky, satellite.spacecraft, orbit, track, analytic_speeds())


def _marked(inputs: RunInputs, sky: RunSky, satellite: Registered) -> SatelliteResult:
    try:
        found = exposure(inputs, sky, satellite)
        bodies = [advisory(inputs, satellite, found.plan.end_unix_s, each) for each in found.findings()]
    except StonechatError as refusal:
        return SatelliteResult(satellite.spacecraft.id, "failed", refusal.detail, ())
    lacking = None if found.plan.end_unix_s else untrusted(inputs, satellite)
    return SatelliteResult(satellite.spacecraft.id, "computed", lacking, tuple(bodies))
