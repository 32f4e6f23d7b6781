"""Series and windows for one satellite when asked for, through the same functions as a run."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from app.core.advice.advisory import lee_window
from app.core.advice.baselines import Baselines
from app.core.advice.factors import Baseline
from app.core.advice.plan import PlanExposure
from app.core.advice.run_sky import PLAN_STEP_S, plan_sky
from app.core.advice.windows import track_of
from app.core.exposure.faces import StreamSet, criterion_rows
from app.core.orbit.averaging import secular_orbit
from app.core.orbit.elements import SECONDS_PER_DAY, MeanElements
from app.core.run import Registered, RunInputs
from app.core.sky.times import format_utc
from app.core.streams.flux import mass_law
from app.core.streams.sporadic import analytic_speeds
from app.errors import FieldError, OrbitError

Floats = npt.NDArray[np.float64]
MOST_SAMPLES = 20_000
MOST_VALUES = 5_000_000  # rows x streams x samples: 40 MB
LONGEST_WINDOW_S = 7_200.0  # looked beyond either end, so that a window at the edge is given whole


@dataclass(frozen=True)
class Series:
    """Factors of one satellite at T instants, for S streams, C rows (face, criterion label), L labels.

    ``factor`` (C, T) = 1 + sum over S of ``by_stream`` (C, S, T); the satellite's likewise, (L, T), (L, S, T).
    ``background_per_m2_s`` (C,); ``zhr`` (S, T); ``sheltered`` (S, T): nothing of the stream arrives.
    """

    unix_s: Floats
    stream_codes: tuple[str, ...]
    rows: tuple[tuple[str, str], ...]
    factor: Floats
    by_stream: Floats
    satellite_labels: tuple[str, ...]
    satellite_factor: Floats
    satellite_by_stream: Floats
    background_per_m2_s: Floats
    zhr: Floats
    sheltered: npt.NDArray[np.bool_]


def satellite_series(
    inputs: RunInputs, satellite: Registered, from_unix_s: float, to_unix_s: float, step_s: float
) -> Series:
    """Enhancement factors from one instant to another.

    The background is that of the middle of the interval. Raises ``OrbitError`` when the orbit is missing or
    fails, ``FieldError`` when the interval is empty, too long, or reaches beyond the orbit's trusted horizon.
    """
    elements = _orbit(satellite)
    _check_span(inputs, elements, from_unix_s, to_unix_s)
    _check_size(from_unix_s, to_unix_s, step_s)
    plan = _plan(inputs, satellite, elements, from_unix_s, to_unix_s, step_s)
    rows = criterion_rows(satellite.spacecraft)
    if len(rows) * len(plan.plan.indices) * len(plan.track.unix_s) > MOST_VALUES:
        raise FieldError("step_s", "the answer would be too large; ask for fewer samples")
    base = _baseline(satellite, elements, 0.5 * (from_unix_s + to_unix_s))
    by_stream, whole = base.row_excess(plan.rates), base.satellite_excess(plan.rates)
    return Series(
        plan.track.unix_s,
        tuple(stream.code for stream in plan.plan.streams.streams),
        tuple((satellite.spacecraft.faces[row.face].name, row.criterion.label) for row in rows),
        1.0 + by_stream.sum(axis=1),
        by_stream,
        base.labels,
        1.0 + whole.sum(axis=1),
        whole,
        base.background_per_m2_s,
        plan.plan.state.zhr,
        plan.margin_and_cap[0] > 0.0,
    )


def lee_windows(
    inputs: RunInputs, satellite: Registered, from_unix_s: float, to_unix_s: float
) -> list[dict[str, Any]]:
    """Lee windows that overlap an interval, whole, with the streams they hide.

    The streams that matter are those that ``PlanExposure.mattering`` finds; when none does, the strongest one.
    Errors as for ``satellite_series``.
    """
    elements = _orbit(satellite)
    _check_span(inputs, elements, from_unix_s, to_unix_s)
    _check_size(from_unix_s, to_unix_s, PLAN_STEP_S)
    earliest, latest = _trusted(inputs, elements)
    start, end = max(earliest, from_unix_s - LONGEST_WINDOW_S), min(latest, to_unix_s + LONGEST_WINDOW_S)
    plan = _plan(inputs, satellite, elements, start, end, PLAN_STEP_S)
    base = _baseline(satellite, elements, 0.5 * (from_unix_s + to_unix_s))
    members = plan.mattering(base, from_unix_s, to_unix_s) or plan.strongest(base, from_unix_s, to_unix_s)
    if not members:
        return []
    codes = [plan.plan.streams.streams[i].code for i in members]
    least_s = satellite.spacecraft.policy.min_lee_s
    return [
        lee_window(window.start_unix_s, window.end_unix_s, codes)
        for window in plan.lee(members)
        if window.overlaps(from_unix_s, to_unix_s) and window.is_worth_offering(least_s)
    ]


def _orbit(satellite: Registered) -> MeanElements:
    if satellite.elements is None:
        raise OrbitError("no orbit is registered; give it an OMM or TLE")
    return satellite.elements


def _plan(
    inputs: RunInputs,
    satellite: Registered,
    elements: MeanElements,
    from_unix_s: float,
    to_unix_s: float,
    step_s: float,
) -> PlanExposure:
    streams = StreamSet(inputs.catalogue.streams, mass_law(inputs.mass_law))
    plan = plan_sky(streams, from_unix_s, to_unix_s, step_s)
    return PlanExposure(plan, satellite.spacecraft, track_of(elements, plan.grid, len(plan.grid)))


def _baseline(satellite: Registered, elements: MeanElements, unix_s: float) -> Baseline:
    return Baselines(satellite.spacecraft, secular_orbit(elements), analytic_speeds()).at(unix_s)


def _trusted(inputs: RunInputs, elements: MeanElements) -> tuple[float, float]:
    reach_s = inputs.horizon_days(elements) * SECONDS_PER_DAY
    return elements.epoch_unix_s - reach_s, elements.epoch_unix_s + reach_s


def _check_span(inputs: RunInputs, elements: MeanElements, from_unix_s: float, to_unix_s: float) -> None:
    if to_unix_s <= from_unix_s:
        raise FieldError("to", "must be later than 'from'")
    earliest, latest = _trusted(inputs, elements)
    span = f"the orbit is trusted from {format_utc(earliest)} to {format_utc(latest)}; send a fresh one"
    if from_unix_s < earliest or from_unix_s > latest:
        raise FieldError("from", span)
    if to_unix_s > latest:
        raise FieldError("to", span)


def _check_size(from_unix_s: float, to_unix_s: float, step_s: float) -> None:
    if not step_s >= 1.0:
        raise FieldError("step_s", "must be 1 or more")
    count = (to_unix_s - from_unix_s) / step_s
    if count > MOST_SAMPLES:
        raise FieldError("step_s", f"asks for {count:.0f} samples; the most is {MOST_SAMPLES}")
