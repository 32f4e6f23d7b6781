"""One event searcher: sample, bracket, refine all brackets at once."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.intp]
EDGE_TOLERANCE_S = 1e-3

# Value at instants (B,) of which the b-th lies between samples left[b] and left[b] + 1.
Refiner = Callable[[Floats, Ints], Floats]


@dataclass(frozen=True)
class Interval:
    """A stretch of time in UTC POSIX seconds."""

    start_unix_s: float
    end_unix_s: float

    @property
    def duration_s(self) -> float:
        """Length in seconds."""
        return self.end_unix_s - self.start_unix_s

    @property
    def whole_seconds(self) -> tuple[int, int]:
        """First and last whole second inside: what an operator is told."""
        return math.ceil(self.start_unix_s), math.floor(self.end_unix_s)

    def is_worth_offering(self, least_s: float) -> bool:
        """Whether it is of some length, and of ``least_s``, in whole seconds."""
        first, last = self.whole_seconds
        return last > first and last - first >= least_s

    def overlaps(self, start_unix_s: float, end_unix_s: float) -> bool:
        """Whether the two share more than an instant."""
        return self.start_unix_s < end_unix_s and self.end_unix_s > start_unix_s


def positive_intervals(unix_s: Floats, values: Floats, refine: Refiner) -> list[Interval]:
    """Intervals in which a sampled function is positive, edges to ``EDGE_TOLERANCE_S``.

    ``unix_s``, ``values``: (T,). Intervals open at either end of the samples end there. One that falls
    wholly between two samples is not seen: choose the step below the shortest interval of interest.
    """
    positive = values > 0.0
    if len(unix_s) == 0:
        return []
    change = np.flatnonzero(positive[1:] != positive[:-1])
    edges = _bisect(unix_s, positive, change, refine)
    starts, ends = edges[~positive[change]], edges[positive[change]]
    if positive[0]:
        starts = np.concatenate([unix_s[:1], starts])
    if positive[-1]:
        ends = np.concatenate([ends, unix_s[-1:]])
    return [Interval(float(a), float(b)) for a, b in zip(starts, ends, strict=True)]


def _bisect(unix_s: Floats, positive: npt.NDArray[np.bool_], left: Ints, refine: Refiner) -> Floats:
    if len(left) == 0:
        return np.empty(0)
    low, high = unix_s[left].copy(), unix_s[left + 1].copy()
    for _ in range(int(np.ceil(np.log2(np.max(high - low) / EDGE_TOLERANCE_S)))):
        middle = 0.5 * (low + high)
        same = (refine(middle, left) > 0.0) == positive[left]
        low, high = np.where(same, middle, low), np.where(same, high, middle)
    edge: Floats = 0.5 * (low + high)
    return edge


def hermite_position(
    unix_s: Floats, r_km: Floats, v_km_s: Floats, wanted_unix_s: Floats, left: Ints
) -> Floats:
    """Positions (3, B) between samples by cubic Hermite interpolation of r (3, T) and v (3, T).

    At a step of 60 s in a low orbit it is good to 0.4 m (h^4 n^4 r / 384).
    """
    step = unix_s[left + 1] - unix_s[left]
    x = (wanted_unix_s - unix_s[left]) / step
    r0, r1, v0, v1 = r_km[:, left], r_km[:, left + 1], v_km_s[:, left] * step, v_km_s[:, left + 1] * step
    position: Floats = (
        (1.0 + 2.0 * x) * (1.0 - x) ** 2 * r0
        + x * (1.0 - x) ** 2 * v0
        + x**2 * (3.0 - 2.0 * x) * r1
        + x**2 * (x - 1.0) * v1
    )
    return position
