"""Lee windows: when the Earth hides every stream that matters."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from app.core.advice.events import Interval, hermite_position, positive_intervals
from app.core.exposure.faces import StreamSet, stream_focusing
from app.core.orbit.elements import MeanElements
from app.core.orbit.sgp4_batch import first_failure, propagate
from app.core.sky.times import TimeGrid
from app.core.spacecraft.attitude import unit
from app.errors import OrbitError

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.intp]


@dataclass(frozen=True)
class Track:
    """One satellite's way through the plan: ``unix_s`` (T,), ``r_km``, ``v_km_s`` (3, T) GCRF."""

    unix_s: Floats
    r_km: Floats
    v_km_s: Floats


def lee_intervals(
    track: Track, streams: StreamSet, downstream: Floats, margin: Floats, members: Sequence[int]
) -> list[Interval]:
    """Intervals in which all ``members`` (indices into S) are sheltered, edges to a millisecond.

    ``downstream`` (3, S, T); ``margin`` (S, T), positive where sheltered, as ``stream_focusing`` gives it.
    """
    chosen = streams.subset(members)
    directions = downstream[:, list(members)]

    def refine(wanted_unix_s: Floats, left: Ints) -> Floats:
        position = hermite_position(track.unix_s, track.r_km, track.v_km_s, wanted_unix_s, left)
        between = _direction_between(track.unix_s, directions, wanted_unix_s, left)
        worst: Floats = stream_focusing(chosen, between, position).margin.min(axis=0)
        return worst

    return positive_intervals(track.unix_s, margin[list(members)].min(axis=0), refine)


def _direction_between(unix_s: Floats, directions: Floats, wanted_unix_s: Floats, left: Ints) -> Floats:
    # A radiant drifts by a degree a day; between samples a minute apart the chord is as good as the arc.
    share = (wanted_unix_s - unix_s[left]) / (unix_s[left + 1] - unix_s[left])
    mixed: Floats = directions[..., left] * (1.0 - share) + directions[..., left + 1] * share
    return unit(mixed)


def track_of(elements: MeanElements, grid: TimeGrid, count: int) -> Track:
    """States of one satellite at the grid's first ``count`` instants. ``OrbitError`` when SGP4 fails there."""
    unix_s = grid.unix_s[:count]
    if count == 0:
        return Track(unix_s, np.empty((3, 0)), np.empty((3, 0)))
    ephemeris = propagate([elements], grid, count)
    failure = first_failure(ephemeris, 0, unix_s)
    if failure:
        raise OrbitError(failure)
    r_km, v_km_s = (np.ascontiguousarray(states[0].T) for states in (ephemeris.r_km, ephemeris.v_km_s))
    return Track(unix_s, r_km, v_km_s)
