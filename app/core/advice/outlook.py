"""The outlook: hazard rates averaged over orbit phase, months ahead."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from app.core.advice.run_sky import RunSky
from app.core.exposure.faces import Places, StreamSet, hazard_rates, stream_focusing
from app.core.orbit.averaging import SecularOrbit
from app.core.spacecraft.model import Spacecraft

Floats = npt.NDArray[np.float64]
# A low orbit's lee windows are a third of them; where the shadow's edge falls between two costs up to 1 % of the
# rate on the most exposed face.
PHASES = 96
AXIS_IN_VIEW_KM = 13_000.0  # nearer, the anti-radiant axis lies in the shadow of even the slowest stream


def outlook_rates(sky: RunSky, spacecraft: Spacecraft, orbit: SecularOrbit) -> tuple[Floats, list[bool]]:
    """Orbit-averaged hazard rates (C, P, N), per m2 and second, of all passages at the run's fine instants.

    The geometry is evaluated at a few knots of each passage, the plane carried by its secular drift, and
    interpolated between them; the stream's rate is followed finely. Also says for each passage whether the
    collimated solution had to be capped near the anti-radiant axis.
    """
    grid = sky.outlook
    passages, knots = grid.knot_unix_s.shape
    streams = StreamSet(tuple(sky.streams.streams[p.stream] for p in grid.passages), sky.streams.law)
    places, shares = _places(sky, orbit)
    downstream = np.repeat(grid.downstream, PHASES, axis=2)
    rates = hazard_rates(spacecraft, streams, downstream, places)
    averaged = rates.reshape(len(rates), passages, knots, PHASES) @ shares
    return _to_fine(averaged, grid.knot_unix_s, grid.fine_unix_s) * grid.fine_zhr, _capped(
        streams, downstream, places.r_km
    )


def _places(sky: RunSky, orbit: SecularOrbit) -> tuple[Places, Floats]:
    knot = sky.outlook.knot_unix_s
    turn = sky.outlook.knots.teme_to_gcrf.reshape(*knot.shape, 3, 3)
    r_km, v_km_s, shares = orbit.ellipse(knot, turn).points(PHASES)
    sun = sky.outlook.knots.sun_km.T.reshape(3, *knot.shape)
    flat = (3, len(knot), -1)
    return Places(r_km.reshape(flat), v_km_s.reshape(flat), np.repeat(sun, PHASES, axis=2)), shares


def _to_fine(values: Floats, knot_unix_s: Floats, fine_unix_s: Floats) -> Floats:
    """Linear interpolation along the last axis: (C, P, K) at (P, K) -> (C, P, N) at (P, N)."""
    left = np.stack(
        [np.searchsorted(k, f, side="right") - 1 for k, f in zip(knot_unix_s, fine_unix_s, strict=True)]
    )
    left = np.clip(left, 0, knot_unix_s.shape[1] - 2)
    start = np.take_along_axis(knot_unix_s, left, axis=1)
    share = (fine_unix_s - start) / (np.take_along_axis(knot_unix_s, left + 1, axis=1) - start)
    at_left = np.take_along_axis(values, left[None], axis=2)
    at_right = np.take_along_axis(values, left[None] + 1, axis=2)
    fine: Floats = at_left + share * (at_right - at_left)
    return fine


def _capped(streams: StreamSet, downstream: Floats, r_km: Floats) -> list[bool]:
    if np.sqrt(np.einsum("kpt,kpt->pt", r_km, r_km).max()) < AXIS_IN_VIEW_KM:
        return [False] * len(streams.streams)
    capped = stream_focusing(streams, downstream, r_km).capped
    return [bool(each.any()) for each in capped]
