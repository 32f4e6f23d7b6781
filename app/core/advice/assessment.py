"""One passage of one satellite, judged against the operator's policy."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

import numpy as np
import numpy.typing as npt

from app.core.advice.factors import Baseline
from app.core.spacecraft.model import Policy

Floats = npt.NDArray[np.float64]
SAME_PEAK = 0.99  # what a minute's grid and the models cannot tell apart


class Level(StrEnum):
    """What an operator is advised to do."""

    STEADY = "steady"  # nothing to do
    READY = "ready"  # prepare: staff, freeze manoeuvres
    SHELTER = "shelter"  # hold a safe attitude


@dataclass(frozen=True)
class Assessment:
    """Result for one passage; times in UTC POSIX seconds; impacts over onset to end.

    ``row_peak`` (C,), ``satellite_peak`` (L,): largest factors over the whole series.
    ``impacts``, ``background_impacts`` (L,): stream and background, on the whole satellite.
    """

    level: Level
    onset_unix_s: float
    peak_unix_s: float
    end_unix_s: float
    governing_peak: float
    row_peak: Floats
    satellite_peak: Floats
    impacts: Floats
    background_impacts: Floats


def assess(
    base: Baseline, unix_s: Floats, rates: Floats, maximum_unix_s: float, added: Floats | None = None
) -> Assessment:
    """Judge the hazard rates (C, T) of one stream at instants (T,), T of at least 2.

    The peak is told at the instant nearest to the stream's own maximum at which the largest excess is reached
    within a hundredth: on a face that looks along the edge of the shadow, many orbits come that close, and the
    very largest sample would only say where the grid fell.

    A trigger counts when it reaches ``ready_at`` and the whole passage adds at least the policy's floor of
    expected impacts to it: ``added`` (K,), so that a level does not fall as a passage goes by; without it these
    instants are taken for the whole. The passage lasts from the first to the last instant at which a counting
    trigger stands at ``ready_at``; when none does, while the largest trigger stands above half of its peak excess.
    """
    if added is None:
        added = trigger_impacts(base, unix_s, rates)
    policy = base.spacecraft.policy
    excess = base.trigger_excess(rates)
    counts = (excess.max(axis=-1) >= policy.ready_at - 1.0) & (added >= policy.min_expected_impacts)
    governing = excess[counts].max(axis=0) if counts.any() else excess.max(axis=0)
    top = _top(governing, unix_s, maximum_unix_s)
    largest = float(governing.max())
    threshold = policy.ready_at - 1.0 if counts.any() else 0.5 * largest
    onset, end = crossing_span(unix_s, governing, threshold)
    impacts_per_s = np.tensordot(base.label_weights, rates, axes=1)
    return Assessment(
        _level(largest, policy) if counts.any() else Level.STEADY,
        onset,
        float(unix_s[top]),
        end,
        1.0 + largest,
        1.0 + base.row_excess(rates).max(axis=-1),
        1.0 + base.satellite_excess(rates).max(axis=-1),
        integral(unix_s, impacts_per_s, onset, end),
        base.label_background_per_s * (end - onset),
    )


def _top(governing: Floats, unix_s: Floats, maximum_unix_s: float) -> int:
    near_top = np.flatnonzero(governing >= SAME_PEAK * governing.max())
    return int(near_top[np.argmin(np.abs(unix_s[near_top] - maximum_unix_s))])


def trigger_impacts(base: Baseline, unix_s: Floats, rates: Floats) -> Floats:
    """Expected impacts of the stream behind each trigger, (K,), from the first instant to the last."""
    impacts_per_s = base.trigger_impacts_per_s(rates)
    return integral(unix_s, impacts_per_s, float(unix_s[0]), float(unix_s[-1]))


def _level(excess: float, policy: Policy) -> Level:
    return Level.SHELTER if 1.0 + excess >= policy.shelter_at else Level.READY


def crossing_span(unix_s: Floats, values: Floats, threshold: float) -> tuple[float, float]:
    """First and last instant at which sampled values reach a threshold, interpolated linearly.

    Some sample must reach it. A span that would be a single instant keeps the samples beside it.
    """
    above = np.flatnonzero(values >= threshold)
    first, last = int(above[0]), int(above[-1])
    start = _crossing(unix_s, values, threshold, first - 1, first) if first > 0 else unix_s[0]
    end = _crossing(unix_s, values, threshold, last + 1, last) if last + 1 < len(values) else unix_s[-1]
    if not end > start:
        start, end = unix_s[max(first - 1, 0)], unix_s[min(last + 1, len(unix_s) - 1)]
    return float(start), float(end)


def _crossing(unix_s: Floats, values: Floats, threshold: float, outside: int, inside: int) -> float:
    share = (threshold - values[outside]) / (values[inside] - values[outside])
    return float(unix_s[outside] + share * (unix_s[inside] - unix_s[outside]))


def integral(unix_s: Floats, values: Floats, start_unix_s: float, end_unix_s: float) -> Floats:
    """Trapezoidal integral over time of values (K, T) between two instants: (K,)."""
    running = np.zeros(values.shape)
    steps = 0.5 * (values[:, 1:] + values[:, :-1]) * np.diff(unix_s)
    np.cumsum(steps, axis=1, out=running[:, 1:])
    at_end = np.array([np.interp([start_unix_s, end_unix_s], unix_s, row) for row in running])
    total: Floats = at_end[:, 1] - at_end[:, 0]
    return total
