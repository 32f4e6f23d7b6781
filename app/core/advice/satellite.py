"""All passages of one satellite: outlook, plan where the orbit is trusted, levels and lee windows."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from app.core.advice.assessment import Assessment, Level, assess, trigger_impacts
from app.core.advice.baselines import Baselines
from app.core.advice.events import Interval
from app.core.advice.factors import Baseline
from app.core.advice.outlook import outlook_rates
from app.core.advice.passages import Passage
from app.core.advice.plan import PlanExposure, between
from app.core.advice.run_sky import RunSky
from app.core.advice.windows import Track
from app.core.orbit.averaging import SecularOrbit
from app.core.spacecraft.model import Spacecraft
from app.core.streams.model import Stream
from app.core.streams.sporadic import SpeedDistribution

Floats = npt.NDArray[np.float64]
STEADY_LEE_S = 43_200.0  # a steady passage lists lee windows only this near to its peak
LeeWindows = tuple[tuple[Interval, tuple[str, ...]], ...]


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
    lee: LeeWindows
    capped: bool


class SatelliteExposure:
    """One satellite in one run. ``track``: its states up to the end of its own plan, possibly none."""

    def __init__(
        self,
        sky: RunSky,
        spacecraft: Spacecraft,
        orbit: SecularOrbit,
        track: Track,
        speeds: SpeedDistribution,
    ) -> None:
        self.sky, self.spacecraft, self.orbit = sky, spacecraft, orbit
        self.plan = PlanExposure(sky.plan, spacecraft, track)
        self.baselines = Baselines(spacecraft, orbit, speeds)

    def findings(self) -> list[Finding]:
        """Judge every passage that has not ended."""
        if not self.sky.passages:
            return []
        rates, capped = outlook_rates(self.sky, self.spacecraft, self.orbit)
        found = []
        for index, passage in enumerate(self.sky.passages):
            if self._in_plan(passage):
                found.append(self._plan_finding(passage, index, rates[:, index]))
            else:
                found.append(self._outlook_finding(passage, index, rates[:, index], capped[index]))
        return [each for each in found if each is not None]

    def _in_plan(self, passage: Passage) -> bool:
        end = self.plan.end_unix_s
        return end is not None and passage.peak_unix_s <= end

    def _outlook_finding(self, passage: Passage, index: int, rates: Floats, capped: bool) -> Finding | None:
        unix_s, ahead = from_instant(self.sky.outlook.fine_unix_s[index], rates, self.sky.as_of_unix_s)
        if len(unix_s) < 2:
            return None
        base = self.baselines.at(passage.peak_unix_s)
        whole = trigger_impacts(base, self.sky.outlook.fine_unix_s[index], rates)
        judged = assess(base, unix_s, ahead, passage.peak_unix_s, whole)
        return Finding(passage, self._stream(passage), "outlook", base, judged, None, (), capped)

    def _plan_finding(self, passage: Passage, index: int, outlook: Floats) -> Finding | None:
        """Time-resolved as far as the plan reaches, orbit-averaged after."""
        stream = self.sky.plan.indices.index(passage.stream)
        part = between(self.plan.track.unix_s, passage.start_unix_s, passage.end_unix_s)
        fine_unix_s = self.sky.outlook.fine_unix_s[index]
        after = fine_unix_s > self.plan.track.unix_s[-1]
        unix_s = np.concatenate([self.plan.track.unix_s[part], fine_unix_s[after]])
        if len(unix_s) < 2:
            return None
        base = self.baselines.at(passage.peak_unix_s)
        rates = np.concatenate([self.plan.rates[:, stream, part], outlook[:, after]], axis=1)
        whole = trigger_impacts(base, fine_unix_s, outlook)
        judged = assess(base, unix_s, rates, passage.peak_unix_s, whole)
        cover = _cover(judged, float(self.plan.track.unix_s[-1]))
        lee = self._lee_windows(stream, base, cover) if cover else ()
        capped = bool(self.plan.margin_and_cap[1][stream, part].any())
        return Finding(passage, self._stream(passage), "plan", base, judged, cover, lee, capped)

    def _stream(self, passage: Passage) -> Stream:
        return self.sky.streams.streams[passage.stream]

    def _lee_windows(self, stream: int, base: Baseline, cover: Interval) -> LeeWindows:
        mattering = self.plan.mattering(base, cover.start_unix_s, cover.end_unix_s)
        members = tuple(sorted({stream, *mattering}))
        codes = tuple(self.sky.plan.streams.streams[i].code for i in members)
        return tuple(
            (window, codes)
            for window in self.plan.lee(members)
            if window.overlaps(cover.start_unix_s, cover.end_unix_s)
            and window.is_worth_offering(self.spacecraft.policy.min_lee_s)
        )


def from_instant(unix_s: Floats, rates: Floats, start_unix_s: float) -> tuple[Floats, Floats]:
    """The part of rates (C, T) at instants (T,) from ``start_unix_s`` on, begun by the rates at that instant.

    Samples far from a peak are hours apart; without the interpolated one a passage would vanish before its end.
    """
    first = int(np.searchsorted(unix_s, start_unix_s, side="right"))
    if first == 0 or first == len(unix_s):
        return unix_s[first:], rates[:, first:]
    share = (start_unix_s - unix_s[first - 1]) / (unix_s[first] - unix_s[first - 1])
    begun = rates[:, first - 1] * (1.0 - share) + rates[:, first] * share
    return (
        np.concatenate([[start_unix_s], unix_s[first:]]),
        np.concatenate([begun[:, None], rates[:, first:]], axis=1),
    )


def _cover(judged: Assessment, plan_end_unix_s: float) -> Interval | None:
    start, end = judged.onset_unix_s, min(judged.end_unix_s, plan_end_unix_s)
    if judged.level is Level.STEADY:
        start = max(start, judged.peak_unix_s - STEADY_LEE_S)
        end = min(end, judged.peak_unix_s + STEADY_LEE_S)
    return Interval(start, end) if end > start else None
