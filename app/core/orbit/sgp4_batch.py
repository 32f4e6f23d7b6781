"""SGP4 for many satellites on one time grid, through the compiled array propagator."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from sgp4.api import SGP4_ERRORS, SatrecArray

from app.core.constants import BLOCKING_RADIUS_KM
from app.core.orbit.elements import MeanElements
from app.core.orbit.sgp4_records import satrec
from app.core.sky.frames import rotate
from app.core.sky.times import TimeGrid, format_utc

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True)
class Ephemeris:
    """States of N satellites at T instants: ``r_km``, ``v_km_s`` (N, T, 3) GCRF; ``error`` (N, T) SGP4 codes."""

    r_km: Floats
    v_km_s: Floats
    error: npt.NDArray[np.uint8]


def propagate(elements: Sequence[MeanElements], grid: TimeGrid, count: int | None = None) -> Ephemeris:
    """Propagate N element sets to the grid's first ``count`` instants, T of them (all when None).

    TEME is turned into GCRF with the grid's own matrices, computed once for all satellites.
    A satellite that SGP4 refuses at an instant has NaN there and a code in ``error``; nothing is raised.
    """
    array = SatrecArray([satrec(one) for one in elements])
    day, fraction = grid.utc
    error, r_teme, v_teme = array.sgp4(day[:count], fraction[:count])
    turn = grid.teme_to_gcrf[:count]
    return Ephemeris(rotate(turn, r_teme), rotate(turn, v_teme), error)


def first_failure(ephemeris: Ephemeris, satellite: int, unix_s: Floats) -> str | None:
    """Say in words why and when a satellite cannot be used at the first ``len(unix_s)`` instants, else None."""
    error = ephemeris.error[satellite, : len(unix_s)]
    distance_km = np.linalg.norm(ephemeris.r_km[satellite, : len(unix_s)], axis=-1)
    unusable = (error != 0) | ~(distance_km >= BLOCKING_RADIUS_KM)  # a NaN counts too
    if not unusable.any():
        return None
    first = int(np.argmax(unusable))
    when = format_utc(unix_s[first])
    if error[first]:
        code = int(error[first])
        return f"SGP4 error {code} at {when}: {SGP4_ERRORS.get(code, 'unknown error')}"
    return f"below {BLOCKING_RADIUS_KM:.0f} km (100 km of air) at {when}: decaying"
