"""``app.on_demand``: series and windows when asked for are the numbers of the scheduled run."""

from __future__ import annotations

from dataclasses import replace
from functools import cache
from typing import Any

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.advice.passages import find_passages
from app.core.orbit.elements import MeanElements
from app.core.sky.times import format_utc, parse_utc
from app.core.spacecraft.model import AttitudeLaw, AttitudeLawKind
from app.core.streams.model import Component
from app.errors import FieldError, OrbitError
from app.on_demand import Series, lee_windows, satellite_series
from app.pipeline import Registered, RunInputs, compute_satellites
from tests.core.advice.samples import (
    AS_OF_UNIX_S,
    CAPRICORNIDS,
    CHARGE,
    DAY_S,
    LOW,
    MASS,
    PERSEIDS,
    QUADRANTIDS,
    RING,
    TALL,
    WALL,
    box,
    inputs,
    plate,
    registered,
)

RUN = inputs(PERSEIDS, CAPRICORNIDS)
BOX = box(MASS, CHARGE)
SUN = AttitudeLaw(AttitudeLawKind.SUN)
FIXED = AttitudeLaw(AttitudeLawKind.INERTIAL, (0.1, 0.2, 0.3, 0.9273618495495703))
six_digits = 1e-5
HOUR_S = 3600.0
EPOCH = LOW.epoch_unix_s


@cache
def advised(elements: MeanElements) -> dict[str, Any]:
    (result,) = compute_satellites(RUN, [registered(BOX, elements)])
    return next(a for a in result.advisories if a["stream"] == "PER")


def series(
    start: float = AS_OF_UNIX_S,
    length_s: float = HOUR_S,
    step_s: float = 60.0,
    run: RunInputs = RUN,
    satellite: Registered | None = None,
) -> Series:
    return satellite_series(run, satellite or registered(BOX), start, start + length_s, step_s)


@pytest.mark.parametrize("elements", [LOW, RING, TALL], ids=lambda e: e.object_name)
def test_the_peak_of_the_series_is_the_peak_of_the_advisory(elements: MeanElements):
    body = advised(elements)
    peak = parse_utc(body["peak_at"])
    found = series(peak - 12.0 * HOUR_S, 24.0 * HOUR_S, satellite=registered(BOX, elements))
    excess = found.satellite_by_stream[:, found.stream_codes.index("PER")]
    largest = excess.max(axis=1)
    assert_allclose(
        1.0 + largest, [row["mid"] for row in body["satellite_enhancement_peak"]], rtol=six_digits
    )
    assert excess[1, found.unix_s == peak] >= 0.99 * largest[1]


@pytest.mark.parametrize("law", [SUN, FIXED], ids=["sun", "inertial"])
def test_faces_that_leave_the_orbits_axes_have_the_background_of_the_peaks_date(law: AttitudeLaw):
    """A series takes that of its middle; about the stream's own peak it is the advisory's."""
    satellite, run = registered(box(CHARGE, attitude=law), TALL), inputs(PERSEIDS)
    (body,) = compute_satellites(run, [satellite])[0].advisories
    (passage,) = find_passages([PERSEIDS], AS_OF_UNIX_S, AS_OF_UNIX_S + DAY_S)
    half = 0.5 * DAY_S
    start = AS_OF_UNIX_S + 60.0 * round((passage.peak_unix_s - half - AS_OF_UNIX_S) / 60.0)
    found = series(start, 2.0 * (passage.peak_unix_s - start), run=run, satellite=satellite)
    expected = [row["mid"] for row in body["satellite_enhancement_peak"]]
    assert_allclose(1.0 + found.satellite_by_stream[:, 0].max(axis=1), expected, rtol=six_digits)


def test_each_face_peaks_as_in_the_advisory():
    body = advised(LOW)
    start, end = AS_OF_UNIX_S, AS_OF_UNIX_S + 5.0 * DAY_S
    found = series(start, end - start, run=inputs(PERSEIDS, CAPRICORNIDS))
    per = found.stream_codes.index("PER")
    faces = [(row["face"], row["criterion"]) for row in body["enhancement_peak"]]
    assert list(found.rows) == faces
    expected = [row["mid"] for row in body["enhancement_peak"]]
    assert_allclose(1.0 + found.by_stream[:, per].max(axis=1), expected, rtol=six_digits)


def test_the_factor_is_one_plus_what_the_streams_add():
    found = series()
    assert found.stream_codes == ("PER", "CAP")
    assert_allclose(found.factor, 1.0 + found.by_stream.sum(axis=1), rtol=1e-15)
    assert_allclose(found.satellite_factor, 1.0 + found.satellite_by_stream.sum(axis=1), rtol=1e-15)
    assert np.all(found.by_stream >= 0.0)


def test_shapes_follow_rows_labels_streams_and_instants():
    found = series(length_s=HOUR_S, step_s=30.0)
    assert found.unix_s.tolist() == [AS_OF_UNIX_S + 30.0 * i for i in range(121)]
    assert found.by_stream.shape == (12, 2, 121)
    assert found.satellite_by_stream.shape == (2, 2, 121)
    assert found.satellite_labels == ("mass", "charge")
    assert found.background_per_m2_s.shape == (12,)
    assert found.zhr.shape == found.sheltered.shape == (2, 121)


def test_where_a_stream_is_sheltered_it_adds_nothing():
    found = series(length_s=6.0 * HOUR_S)
    dark = found.sheltered
    assert dark.any()
    assert not dark.all()
    assert np.all(found.by_stream[:, dark] == 0.0)
    assert np.all(found.satellite_by_stream[:, dark] == 0.0)
    assert np.all(found.satellite_by_stream[:, ~dark] > 0.0)
    both = dark.all(axis=0)
    assert both.any()
    assert np.all(found.factor[:, both] == 1.0)


def test_the_rate_is_that_of_the_stream():
    # 0.2 decades a degree on either side of solar longitude 140.0
    body = advised(LOW)
    found = series(parse_utc(body["peak_at"]), 60.0)
    assert_allclose(found.zhr[0, 0], body["peak_zhr"], atol=0.006)


def test_a_coarser_step_gives_the_same_numbers():
    fine, coarse = series(length_s=2.0 * HOUR_S), series(length_s=2.0 * HOUR_S, step_s=600.0)
    assert_allclose(coarse.factor, fine.factor[:, ::10], rtol=1e-9)


def test_a_stream_that_rests_is_left_out():
    assert series(run=inputs(PERSEIDS, QUADRANTIDS)).stream_codes == ("PER",)


def test_without_any_active_stream_the_factor_is_one():
    found = series(run=inputs(QUADRANTIDS))
    assert found.stream_codes == ()
    assert np.all(found.factor == 1.0)
    assert np.all(found.satellite_factor == 1.0)
    assert found.sheltered.shape == (0, 61)
    assert lee_windows(inputs(QUADRANTIDS), registered(BOX), AS_OF_UNIX_S, AS_OF_UNIX_S + HOUR_S) == []


def test_lee_windows_are_those_of_the_advisory():
    satellite = registered(plate(ready_at=1.01, shelter_at=1.02, min_expected_impacts=0.0))
    run = inputs(PERSEIDS)
    (result,) = compute_satellites(run, [satellite])
    body = result.advisories[0]
    span = parse_utc(body["lee_windows_from"]), parse_utc(body["lee_windows_until"])
    assert len(body["lee_windows"]) > 40
    assert lee_windows(run, satellite, *span) == body["lee_windows"]


def test_a_window_at_the_edge_is_given_whole():
    satellite, run = registered(plate(MASS)), inputs(PERSEIDS)
    first, *_ = lee_windows(run, satellite, AS_OF_UNIX_S + DAY_S, AS_OF_UNIX_S + DAY_S + 3.0 * HOUR_S)
    middle = 0.5 * (parse_utc(first["start"]) + parse_utc(first["end"]))
    assert lee_windows(run, satellite, middle, middle + 1.0) == [first]


def test_with_nothing_that_matters_the_strongest_stream_is_hidden_from():
    faint = replace(PERSEIDS, components=(Component("main", 140.0, 1.0, 0.01, 0.01),))
    found = lee_windows(
        inputs(faint, CAPRICORNIDS), registered(plate(MASS)), AS_OF_UNIX_S, AS_OF_UNIX_S + DAY_S
    )
    assert found
    assert len({tuple(w["streams"]) for w in found}) == 1
    assert len(found[0]["streams"]) == 1


def test_windows_shorter_than_the_policy_asks_are_left_out():
    long = registered(plate(MASS, min_lee_s=7200.0))
    assert lee_windows(RUN, long, AS_OF_UNIX_S, AS_OF_UNIX_S + DAY_S) == []


@pytest.mark.parametrize("ask", [satellite_series, lee_windows])
def test_without_an_orbit_there_is_nothing_to_tell(ask: Any):
    step = (60.0,) if ask is satellite_series else ()
    with pytest.raises(OrbitError, match="no orbit is registered; give it an OMM or TLE"):
        ask(RUN, registered(BOX, None), AS_OF_UNIX_S, AS_OF_UNIX_S + HOUR_S, *step)


@pytest.mark.parametrize("ask", [satellite_series, lee_windows])
def test_an_orbit_in_the_air_is_refused(ask: Any):
    step = (60.0,) if ask is satellite_series else ()
    low = replace(LOW, mean_motion_rev_per_day=15.0, eccentricity=0.07, mean_anomaly_deg=180.0)
    with pytest.raises(OrbitError, match="air"):
        ask(RUN, registered(BOX, low), EPOCH, EPOCH + 60.0, *step)


HORIZON_S = 7.0 * DAY_S


@pytest.mark.parametrize("ask", [satellite_series, lee_windows])
@pytest.mark.parametrize(
    ("start", "end", "field"),
    [
        (EPOCH, EPOCH, "to"),
        (EPOCH + 60.0, EPOCH, "to"),
        (EPOCH - HORIZON_S - 1.0, EPOCH, "from"),
        (EPOCH + HORIZON_S + 1.0, EPOCH + HORIZON_S + 60.0, "from"),
        (EPOCH, EPOCH + HORIZON_S + 1.0, "to"),
    ],
)
def test_what_lies_outside_the_trusted_horizon_is_refused(ask: Any, start: float, end: float, field: str):
    step = (600.0,) if ask is satellite_series else ()
    with pytest.raises(FieldError) as refusal:
        ask(RUN, registered(BOX), start, end, *step)
    assert refusal.value.field == field
    if end > start:
        assert (
            f"from {format_utc(EPOCH - HORIZON_S)} to {format_utc(EPOCH + HORIZON_S)}"
            in refusal.value.problem
        )


def test_the_horizon_itself_is_within():
    early = series(EPOCH - HORIZON_S, 60.0)
    late = series(EPOCH + HORIZON_S - 60.0, 60.0)
    assert len(early.unix_s) == len(late.unix_s) == 2


def test_a_high_orbit_is_trusted_longer():
    assert len(series(EPOCH + 10.0 * DAY_S, 60.0, satellite=registered(BOX, RING)).unix_s) == 2


@pytest.mark.parametrize(
    ("length_s", "step_s", "problem"),
    [
        (20_001.0, 1.0, "asks for 20001 samples; the most is 20000"),
        (60.0, 0.5, "must be 1 or more"),
        (60.0, 0.0, "must be 1 or more"),
        (60.0, -60.0, "must be 1 or more"),
        (60.0, float("nan"), "must be 1 or more"),
    ],
)
def test_too_many_samples_are_refused(length_s: float, step_s: float, problem: str):
    with pytest.raises(FieldError) as refusal:
        series(length_s=length_s, step_s=step_s)
    assert (refusal.value.field, refusal.value.problem) == ("step_s", problem)


def test_too_many_values_are_refused():
    many = box(*(replace(WALL, label=f"wall {i}", threshold=1.0 + 0.01 * i) for i in range(22)))
    with pytest.raises(FieldError, match="too large; ask for fewer samples"):
        series(length_s=20_000.0, step_s=1.0, satellite=registered(many))
