"""Stream state at a time: rate and direction, for all streams and instants at once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from app.core.sky.bodies import wrap_deg
from app.core.streams.model import Component, Stream

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True)
class StreamState:
    """``zhr`` (S, T); ``downstream`` (3, S, T) unit vectors of motion far from the Earth, GCRF."""

    zhr: Floats
    downstream: Floats


def component_zhr(component: Component, solar_longitude_deg: npt.ArrayLike) -> Floats:
    """ZHR of one component, same shape as the longitudes (Jenniskens 1994, A&A 287, 990)."""
    away = wrap_deg(np.asarray(solar_longitude_deg) - component.solar_longitude_peak_deg)
    slope = np.where(away < 0.0, component.b_rise_per_deg, component.b_fall_per_deg)
    rate: Floats = component.zhr_peak * 10.0 ** (-slope * np.abs(away))
    return rate


def stream_zhr(stream: Stream, solar_longitude_deg: npt.ArrayLike) -> Floats:
    """ZHR of a stream: its components added, zero outside its activity limits."""
    longitude = np.asarray(solar_longitude_deg, dtype=float)
    total = sum((component_zhr(c, longitude) for c in stream.components), np.zeros(longitude.shape))
    if stream.start_solar_longitude_deg is None or stream.end_solar_longitude_deg is None:
        return total
    span = (stream.end_solar_longitude_deg - stream.start_solar_longitude_deg) % 360.0
    inside = (longitude - stream.start_solar_longitude_deg) % 360.0 <= span
    return np.where(inside, total, 0.0)


def downstream_direction(stream: Stream, solar_longitude_deg: npt.ArrayLike) -> Floats:
    """Unit vector (3, ...) in GCRF along which the particles move; the radiant drifts linearly."""
    longitude = np.asarray(solar_longitude_deg, dtype=float)
    away = wrap_deg(longitude - stream.components[0].solar_longitude_peak_deg)
    ra = np.radians(stream.radiant_ra_deg + stream.drift_ra_deg_per_deg * away)
    dec = np.radians(stream.radiant_dec_deg + stream.drift_dec_deg_per_deg * away)
    return -np.stack([np.cos(dec) * np.cos(ra), np.cos(dec) * np.sin(ra), np.sin(dec)])


def stream_state(streams: Sequence[Stream], solar_longitude_deg: Floats) -> StreamState:
    """State of S streams at T solar longitudes (degrees); the result is (S, T)."""
    zhr = np.stack([stream_zhr(stream, solar_longitude_deg) for stream in streams])
    downstream = np.stack([downstream_direction(stream, solar_longitude_deg) for stream in streams], axis=1)
    return StreamState(zhr, downstream)
