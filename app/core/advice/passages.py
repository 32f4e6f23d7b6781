"""Passages: which stream, which year, from when to when; and the shared instants of the outlook."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime

import numpy as np
import numpy.typing as npt

from app.core.sky.longitude import MEAN_SOLAR_MOTION_DEG_PER_S, time_of_solar_longitude
from app.core.sky.times import TimeGrid
from app.core.streams.activity import downstream_direction, stream_zhr
from app.core.streams.model import Stream

Floats = npt.NDArray[np.float64]
DAY_S = 86400.0
RATE_FLOOR_ZHR = 0.5  # a stream without published limits is followed until its rate falls below this
LONGEST_SIDE_DEG, SHORTEST_SIDE_DEG = 45.0, 0.01
FINE_SIDE, KNOT_SIDE = 400, 12  # samples on either side of the peak
NOTHING: Floats = np.empty((0, 0))
CROWDING = 7.0  # how strongly fine samples crowd at the peak: 1/1500 of the mean spacing there


@dataclass(frozen=True)
class Passage:
    """One stream in one year; ``stream`` is its index in the run's list. Times are UTC POSIX seconds."""

    stream: int
    code: str
    name: str
    start_unix_s: float
    peak_unix_s: float
    end_unix_s: float


def find_passages(streams: Sequence[Stream], from_unix_s: float, to_unix_s: float) -> list[Passage]:
    """Passages that touch an interval, by peak time.

    The year in the name is that of the peak. Within a day of New Year sidereal years are counted instead: two
    passages may then fall into one calendar year, and no two may share a name.
    """
    if not streams:
        return []
    first = datetime.fromtimestamp(from_unix_s, UTC).year - 1
    years = range(first, datetime.fromtimestamp(to_unix_s, UTC).year + 2)
    found = [p for year in years for p in _passages(streams, year)]
    kept = [p for p in found if p.end_unix_s > from_unix_s and p.start_unix_s < to_unix_s]
    return sorted(kept, key=lambda p: (p.peak_unix_s, p.code))


def _passages(streams: Sequence[Stream], year: int) -> Iterator[Passage]:
    """One passage of each stream, its peak within a year of the given one's first of January."""
    new_year = datetime(year, 1, 1, tzinfo=UTC).timestamp()
    peak_deg = np.array([s.peak_deg for s in streams])
    rise_deg, fall_deg = np.array([activity_sides_deg(s) for s in streams]).T
    # On 1 January the Sun stands near 280 degrees (J2000).
    guess = new_year + ((peak_deg - 280.0) % 360.0) / MEAN_SOLAR_MOTION_DEG_PER_S
    peak = time_of_solar_longitude(peak_deg, guess)
    start = time_of_solar_longitude(peak_deg - rise_deg, peak - rise_deg * DAY_S)
    end = time_of_solar_longitude(peak_deg + fall_deg, peak + fall_deg * DAY_S)
    for index, stream in enumerate(streams):
        times = float(start[index]), float(peak[index]), float(end[index])
        yield Passage(index, stream.code, f"{stream.code}-{year}", *times)


def activity_sides_deg(stream: Stream) -> tuple[float, float]:
    """Degrees of solar longitude, above zero, before and after the peak during which a stream is followed."""
    if stream.start_solar_longitude_deg is not None and stream.end_solar_longitude_deg is not None:
        before = (stream.peak_deg - stream.start_solar_longitude_deg) % 360.0
        after = (stream.end_solar_longitude_deg - stream.peak_deg) % 360.0
        return max(before, SHORTEST_SIDE_DEG), max(after, SHORTEST_SIDE_DEG)
    side = np.arange(0.0, LONGEST_SIDE_DEG + SHORTEST_SIDE_DEG / 2.0, SHORTEST_SIDE_DEG)
    before_zhr = stream_zhr(stream, stream.peak_deg - side)
    after_zhr = stream_zhr(stream, stream.peak_deg + side)
    return _reach(side, before_zhr), _reach(side, after_zhr)


def _reach(side: Floats, zhr: Floats) -> float:
    above = np.flatnonzero(zhr >= RATE_FLOOR_ZHR)
    return max(float(side[above[-1]]), SHORTEST_SIDE_DEG) if len(above) else SHORTEST_SIDE_DEG


@dataclass(frozen=True)
class OutlookGrid:
    """Shared instants of P passages.

    ``fine_unix_s``, ``fine_zhr`` (P, N): the rate, crowded at the peak. ``knots`` (P * K instants): where the
    orbit-averaged geometry is evaluated; ``downstream`` (3, P, K). ``knot_unix_s`` (P, K).
    """

    passages: tuple[Passage, ...]
    fine_unix_s: Floats
    fine_zhr: Floats
    knots: TimeGrid
    knot_unix_s: Floats
    downstream: Floats


def outlook_grid(streams: Sequence[Stream], passages: Sequence[Passage]) -> OutlookGrid:
    """Lay out the instants of an outlook, once for all satellites."""
    if not passages:
        return OutlookGrid((), NOTHING, NOTHING, TimeGrid(np.empty(0)), NOTHING, np.empty((3, 0, 0)))
    fine = _spread(passages, np.sinh(CROWDING * np.linspace(0.0, 1.0, FINE_SIDE + 1)) / np.sinh(CROWDING))
    knot = _spread(passages, np.linspace(0.0, 1.0, KNOT_SIDE + 1))
    longitude = _interpolated_longitude(fine)
    knots = TimeGrid(knot.ravel())
    knot_longitude = knots.solar_longitude_deg.reshape(knot.shape)
    zhr = [stream_zhr(streams[p.stream], longitude[i]) for i, p in enumerate(passages)]
    downstream = [downstream_direction(streams[p.stream], knot_longitude[i]) for i, p in enumerate(passages)]
    return OutlookGrid(tuple(passages), fine, np.stack(zhr), knots, knot, np.stack(downstream, axis=1))


def _spread(passages: Sequence[Passage], offsets: Floats) -> Floats:
    """Instants (P, 2n+1): ``offsets`` (0..1) stretched over either side of each peak."""
    sides = np.array([[p.peak_unix_s - p.start_unix_s, p.end_unix_s - p.peak_unix_s] for p in passages])
    peak = np.array([[p.peak_unix_s] for p in passages])
    before = peak - sides[:, :1] * offsets[:0:-1]
    after = peak + sides[:, 1:] * offsets
    return np.concatenate([before, after], axis=1)


def _interpolated_longitude(unix_s: Floats) -> Floats:
    """Solar longitude of many instants from one table every six hours (good to 5e-6 degrees)."""
    table = np.arange(unix_s.min() - DAY_S, unix_s.max() + DAY_S, DAY_S / 4.0)
    unwrapped = np.unwrap(TimeGrid(table).solar_longitude_deg, period=360.0)
    longitude: Floats = np.interp(unix_s, table, unwrapped) % 360.0
    return longitude
