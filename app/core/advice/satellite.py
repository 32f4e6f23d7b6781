"""All passages of one satellite: outlook, plan where the orbit is trusted, levels and lee windows."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

from app.core.advice.assessment import Assessment, Level, assess
from app.core.advice.events import Interval
from app.core.advice.factors import Baseline, baseline
from app.core.advice.outlook import outlook_rates
from app.core.advice.passages import Passage
from app.core.advice.run_sky import RunSky
from app.core.advice.windows import Track, lee_intervals
from app.core.exposure.background import follows_orbit, orbit_background
from app.core.exposure.faces import Places, hazard_rates, stream_focusing
from app.core.orbit.averaging import SecularOrbit
from app.core.sky.times import TimeGrid
from app.core.spacecraft.model import Spacecraft
from app.core.streams.model import Stream
from app.core.streams.sporadic import SpeedDistribution

Floats = npt.NDArray[np.float64]
MATTERING_SHARE = 0.1  # of the excess at ready_at: a weaker stream need not be sheltered from
STEADY_LEE_S = 43_200.0  # a steady passage lists lee windows only this near to its peak


@dataclass(frozen=True)
class Finding:
    """One passage of one satellite. ``cover``: where lee windows were looked for, None at outlook depth.

    ``lee``: (window, codes of the streams hidden). ``capped``: near the anti-radiant axis (see focusing).
    """

    passage: Passage
    stream: Stream
    depth: str
    base: Baseline
    assessment: Assessment
    cover: Interval | None
    lee: tuple[tuple[Interval, tuple[str, ...]], ...]
    capped: bool


class SatelliteExposure:
    """One satellite in one run. Arrays are worked out when first asked for.

    ``track``: its states on the run's plan grid up to the end of its own plan, possibly empty.
    """

    def __init__(
        self,
        sky: RunSky,
        spacecraft: Spacecraft,
        orbit: SecularOrbit,
        track: Track,
        speeds: SpeedDistribution,
    ) -> None:
        self.sky, self.spacecraft, self.orbit, self.track, self.speeds = sky, spacecraft, orbit, track, speeds
        self._lee: dict[tuple[int, ...], list[Interval]] = {}
        self._steady_baseline: Baseline | None = None

    @property
    def plan_end_unix_s(self) -> float | None:
        """Last instant of the plan, None without one."""
        return float(self.track.unix_s[-1]) if len(self.track.unix_s) > 1 else None

    @cached_property
    def plan_rates(self) -> Floats:
        """Hazard rates (C, S, T) of the plan's streams, per m2 and second."""
        count = len(self.track.unix_s)
        state, sun = self.sky.plan.state, self.sky.plan.grid.sun_km[:count].T
        places = Places(self.track.r_km, self.track.v_km_s, sun)
        rates = hazard_rates(self.spacecraft, self.sky.plan.streams, self._downstream, places)
        rates *= state.zhr[:, :count]
        return rates

    @cached_property
    def margin_and_cap(self) -> tuple[Floats, npt.NDArray[np.bool_]]:
        """Shelter margin and cap mark of the plan's streams, (S, T) each."""
        focused = stream_focusing(self.sky.plan.streams, self._downstream, self.track.r_km)
        return focused.margin, focused.capped

    @property
    def _downstream(self) -> Floats:
        return self.sky.plan.state.downstream[..., : len(self.track.unix_s)]

    def findings(self) -> list[Finding]:
        """Judge every passage that still has two instants ahead of it."""
        rates, capped = outlook_rates(self.sky, self.spacecraft, self.orbit)
        found = []
        for index, passage in enumerate(self.sky.passages):
            base = self.baseline_at(passage.peak_unix_s)
            one = self._plan_finding(passage, base, index, rates)
            found.append(one or self._outlook_finding(passage, base, index, rates, capped[index]))
        return [each for each in found if each is not None]

    def baseline_at(self, unix_s: float) -> Baseline:
        """Background averaged over the orbit at a date; the date matters only to faces that follow the Sun."""
        if self._steady_baseline is None or not follows_orbit(self.spacecraft):
            grid = TimeGrid(np.array([unix_s]))
            ellipse = self.orbit.ellipse(np.array(unix_s), grid.teme_to_gcrf[0])
            rates = orbit_background(self.spacecraft, ellipse, grid.sun_km[0], self.speeds)
            self._steady_baseline = baseline(self.spacecraft, rates)
        return self._steady_baseline

    def _outlook_finding(
        self, passage: Passage, base: Baseline, index: int, rates: Floats, capped: bool
    ) -> Finding | None:
        unix_s = self.sky.outlook.fine_unix_s[index]
        ahead = unix_s >= self.sky.as_of_unix_s
        if np.count_nonzero(ahead) < 2:
            return None
        judged = assess(base, unix_s[ahead], rates[:, index, ahead])
        return Finding(passage, self._stream(passage), "outlook", base, judged, None, (), capped)

    def _plan_finding(self, passage: Passage, base: Baseline, index: int, rates: Floats) -> Finding | None:
        """Time-resolved as far as the plan reaches, orbit-averaged after; None when its peak lies beyond."""
        plan_end = self.plan_end_unix_s
        if plan_end is None or passage.peak_unix_s > plan_end:
            return None
        stream = self.sky.plan.indices.index(passage.stream)
        part = _between(self.track.unix_s, passage.start_unix_s, passage.end_unix_s)
        after = self.sky.outlook.fine_unix_s[index] > plan_end
        unix_s = np.concatenate([self.track.unix_s[part], self.sky.outlook.fine_unix_s[index][after]])
        if len(unix_s) < 2:
            return None
        judged = assess(
            base, unix_s, np.concatenate([self.plan_rates[:, stream, part], rates[:, index, after]], axis=1)
        )
        cover = _cover(judged, plan_end)
        lee = self._lee_windows(stream, base, cover) if cover else ()
        capped = bool(self.margin_and_cap[1][stream, part].any())
        return Finding(passage, self._stream(passage), "plan", base, judged, cover, lee, capped)

    def _stream(self, passage: Passage) -> Stream:
        return self.sky.streams.streams[passage.stream]

    def _lee_windows(
        self, stream: int, base: Baseline, cover: Interval
    ) -> tuple[tuple[Interval, tuple[str, ...]], ...]:
        members = self._mattering(stream, base, cover)
        codes = tuple(self.sky.plan.streams.streams[i].code for i in members)
        policy = self.spacecraft.policy
        return tuple(
            (window, codes)
            for window in self.lee_for(members)
            if window.overlaps(cover.start_unix_s, cover.end_unix_s) and window.duration_s >= policy.min_lee_s
        )

    def lee_for(self, members: tuple[int, ...]) -> list[Interval]:
        """Intervals of the plan in which all these streams (positions in the plan) are hidden."""
        if members not in self._lee:
            margin, _ = self.margin_and_cap
            self._lee[members] = lee_intervals(
                self.track, self.sky.plan.streams, self._downstream, margin, members
            )
        return self._lee[members]

    def _mattering(self, stream: int, base: Baseline, cover: Interval) -> tuple[int, ...]:
        part = _between(self.track.unix_s, cover.start_unix_s, cover.end_unix_s)
        floor = MATTERING_SHARE * (self.spacecraft.policy.ready_at - 1.0)
        excess = base.trigger_excess(self.plan_rates[..., part])
        strongest = excess.max(axis=(0, 2), initial=0.0)
        return tuple(i for i, value in enumerate(strongest) if i == stream or value >= floor)


def _between(unix_s: Floats, start_unix_s: float, end_unix_s: float) -> slice:
    first = int(np.searchsorted(unix_s, start_unix_s, side="left"))
    return slice(first, int(np.searchsorted(unix_s, end_unix_s, side="right")))


def _cover(judged: Assessment, plan_end_unix_s: float) -> Interval | None:
    start, end = judged.onset_unix_s, min(judged.end_unix_s, plan_end_unix_s)
    if judged.level is Level.STEADY:
        start = max(start, judged.peak_unix_s - STEADY_LEE_S)
        end = min(end, judged.peak_unix_s + STEADY_LEE_S)
    return Interval(start, end) if end > start else None
