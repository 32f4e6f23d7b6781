"""What every satellite of a run shares: streams, passages, and the instants of plan and outlook."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
import numpy.typing as npt

from app.core.advice.passages import DAY_S, OutlookGrid, Passage, find_passages, outlook_grid
from app.core.exposure.faces import StreamSet
from app.core.sky.times import TimeGrid, regular_grid
from app.core.streams.activity import StreamState, stream_state
from app.core.streams.flux import MassLaw
from app.core.streams.model import Stream

Floats = npt.NDArray[np.float64]
PLAN_STEP_S = 60.0  # a third of the shortest lee window worth offering; edges are refined afterwards


@dataclass(frozen=True)
class PlanSky:
    """The time-resolved part of a run: a grid and the state of the streams active somewhere on it.

    ``indices``: of those streams in the run's list; ``state`` has them in that order, (S, T).
    """

    grid: TimeGrid
    indices: tuple[int, ...]
    streams: StreamSet
    state: StreamState


@dataclass(frozen=True)
class RunSky:
    """Everything a run computes once. ``streams``: all streams; ``passages``: of the outlook, by peak time.

    ``outlook`` lays out their instants; its stream axis is the passage.
    """

    as_of_unix_s: float
    streams: StreamSet
    plan: PlanSky
    outlook: OutlookGrid

    @property
    def passages(self) -> tuple[Passage, ...]:
        """Passages in the order of their peaks."""
        return self.outlook.passages


def run_sky(
    streams: Sequence[Stream], law: MassLaw, as_of_unix_s: float, plan_days: float, outlook_days: float
) -> RunSky:
    """Lay out a run that starts at ``as_of_unix_s``."""
    every = StreamSet(tuple(streams), law)
    passages = find_passages(streams, as_of_unix_s, as_of_unix_s + outlook_days * DAY_S)
    plan = plan_sky(every, as_of_unix_s, as_of_unix_s + plan_days * DAY_S, passages=passages)
    return RunSky(as_of_unix_s, every, plan, outlook_grid(streams, passages))


def plan_sky(
    streams: StreamSet,
    start_unix_s: float,
    stop_unix_s: float,
    step_s: float = PLAN_STEP_S,
    passages: Sequence[Passage] | None = None,
) -> PlanSky:
    """State of the streams that are active between two instants, on a grid shared by all satellites.

    ``passages``: where they are known already; those outside the interval do not matter.
    """
    grid = _shared_grid(start_unix_s, stop_unix_s, step_s)
    if passages is None:
        passages = find_passages(streams.streams, start_unix_s, stop_unix_s)
    touched = {p.stream for p in passages if p.end_unix_s > start_unix_s and p.start_unix_s < stop_unix_s}
    indices = tuple(sorted(touched))
    active = streams.subset(indices)
    return PlanSky(grid, indices, active, _state(active.streams, grid))


def _state(streams: Sequence[Stream], grid: TimeGrid) -> StreamState:
    if not streams:  # a quiet week
        return StreamState(np.empty((0, len(grid))), np.empty((3, 0, len(grid))))
    return stream_state(streams, grid.solar_longitude_deg)


@lru_cache(maxsize=2)
def _shared_grid(start_unix_s: float, stop_unix_s: float, step_s: float) -> TimeGrid:
    # A worker computes many chunks of one run; the frame rotations of their common grid take a second.
    return regular_grid(start_unix_s, stop_unix_s, step_s)
