"""The plan: one satellite's exposure, time-resolved, while its orbit is trusted."""

from __future__ import annotations

from functools import cached_property

import numpy as np
import numpy.typing as npt

from app.core.advice.events import Interval
from app.core.advice.factors import Baseline
from app.core.advice.run_sky import PlanSky
from app.core.advice.windows import Track, lee_intervals
from app.core.exposure.faces import Places, criterion_rows, hazard_rates, stream_focusing
from app.core.spacecraft.model import Spacecraft

Floats = npt.NDArray[np.float64]
UNHIDDEN_SHARE = 0.25  # of the excess at ready_at: what all streams left unhidden may add together


class PlanExposure:
    """One satellite on a plan's grid. Arrays are worked out when first asked for.

    ``track``: its states on the first T instants of the grid, possibly none.
    """

    def __init__(self, plan: PlanSky, spacecraft: Spacecraft, track: Track) -> None:
        self.plan, self.spacecraft, self.track = plan, spacecraft, track
        self._lee: dict[tuple[int, ...], list[Interval]] = {}

    @property
    def end_unix_s(self) -> float | None:
        """Last instant of the plan, None without one."""
        return float(self.track.unix_s[-1]) if len(self.track.unix_s) > 1 else None

    @cached_property
    def rates(self) -> Floats:
        """Hazard rates (C, S, T), per m2 and second."""
        count = len(self.track.unix_s)
        if not self.plan.indices:
            return np.empty((len(criterion_rows(self.spacecraft)), 0, count))
        places = Places(self.track.r_km, self.track.v_km_s, self.plan.grid.sun_km[:count].T)
        zhr = self.plan.state.zhr[:, :count]
        return hazard_rates(self.spacecraft, self.plan.streams, self._downstream, places, zhr)

    @cached_property
    def margin_and_cap(self) -> tuple[Floats, npt.NDArray[np.bool_]]:
        """Shelter margin (positive where hidden) and cap mark, (S, T) each."""
        if not self.plan.indices:
            return np.empty((0, len(self.track.unix_s))), np.empty((0, len(self.track.unix_s)), dtype=bool)
        focused = stream_focusing(self.plan.streams, self._downstream, self.track.r_km)
        return focused.margin, focused.capped

    @property
    def _downstream(self) -> Floats:
        return self.plan.state.downstream[..., : len(self.track.unix_s)]

    def lee(self, members: tuple[int, ...]) -> list[Interval]:
        """Intervals in which all these streams (positions in the plan) are hidden."""
        if members not in self._lee:
            margin, _ = self.margin_and_cap
            self._lee[members] = lee_intervals(
                self.track, self.plan.streams, self._downstream, margin, members
            )
        return self._lee[members]

    def mattering(self, base: Baseline, start_unix_s: float, end_unix_s: float) -> tuple[int, ...]:
        """Streams to be sheltered from between two instants.

        The weakest are left out while their largest excesses, on whichever trigger, together stay below a
        quarter of the excess at ``ready_at``.
        """
        strongest = self._strongest(base, start_unix_s, end_unix_s)
        weakest_first = np.argsort(strongest, kind="stable")
        allowed = UNHIDDEN_SHARE * (self.spacecraft.policy.ready_at - 1.0)
        kept = np.cumsum(strongest[weakest_first]) >= allowed
        return tuple(sorted(int(i) for i in weakest_first[kept]))

    def strongest(self, base: Baseline, start_unix_s: float, end_unix_s: float) -> tuple[int, ...]:
        """The one stream with the largest excess between two instants; none when no stream is active."""
        values = self._strongest(base, start_unix_s, end_unix_s)
        return (int(np.argmax(values)),) if len(values) else ()

    def _strongest(self, base: Baseline, start_unix_s: float, end_unix_s: float) -> Floats:
        part = between(self.track.unix_s, start_unix_s, end_unix_s)
        largest: Floats = base.trigger_excess(self.rates[..., part]).max(axis=(0, 2), initial=0.0)
        return largest


def between(unix_s: Floats, start_unix_s: float, end_unix_s: float) -> slice:
    """The samples from one instant to another, both included."""
    first = int(np.searchsorted(unix_s, start_unix_s, side="left"))
    return slice(first, int(np.searchsorted(unix_s, end_unix_s, side="right")))
