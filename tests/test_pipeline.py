"""The whole data path as a function: what one satellite does to the others, what the horizon decides, same bytes."""

from __future__ import annotations

import json
import math
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import app.pipeline
from app.catalogue_file import load_catalogue
from app.core.orbit.elements import MeanElements
from app.core.sky.times import parse_utc
from app.core.spacecraft.model import Criterion, CriterionKind, Policy
from app.core.streams.model import Component, Stream
from app.pipeline import Registered, RunInputs, SatelliteResult, compute_satellites
from tests.core.advice.samples import (
    AS_OF_UNIX_S,
    CAPRICORNIDS,
    CHARGE,
    DAY_S,
    LOW,
    PERSEIDS,
    QUADRANTIDS,
    RING,
    SPRING,
    TALL,
    WALL,
    box,
    catalogue,
    inputs,
    plate,
)

DECAYED = replace(LOW, mean_motion_rev_per_day=16.2, bstar_per_earth_radius=3e-3)
IN_THE_AIR = replace(LOW, mean_motion_rev_per_day=15.0, eccentricity=0.07)
TOO_FAST = replace(LOW, mean_motion_rev_per_day=19.9)


def sat(name: str, elements: MeanElements | None) -> Registered:
    return Registered(plate(satellite_id=name), elements)


FLEET = [sat("low", LOW), sat("ring", RING), sat("tall", TALL)]


def numbers(value: Any) -> Iterator[float]:
    if isinstance(value, dict | list | tuple):
        for each in value.values() if isinstance(value, dict) else value:
            yield from numbers(each)
    elif isinstance(value, float | int):
        yield float(value)


def as_bytes(results: list[SatelliteResult]) -> bytes:
    return json.dumps([vars(r) for r in results], allow_nan=False).encode()


def streams_by_depth(result: SatelliteResult, depth: str) -> set[str]:
    return {a["stream"] for a in result.advisories if a["depth"] == depth}


def test_it_is_read_in_under_sixty_lines():
    assert app.pipeline.__file__ is not None
    assert len(Path(app.pipeline.__file__).read_text("utf-8").splitlines()) < 60


def test_same_inputs_give_the_same_bytes():
    run = inputs(PERSEIDS, CAPRICORNIDS)
    assert as_bytes(compute_satellites(run, FLEET)) == as_bytes(compute_satellites(run, FLEET))


def test_a_satellite_gets_the_same_bytes_in_any_company():
    run = inputs(PERSEIDS, CAPRICORNIDS)
    together = compute_satellites(run, FLEET)
    assert as_bytes(together) == as_bytes([compute_satellites(run, [one])[0] for one in FLEET])
    assert as_bytes(together) == as_bytes(compute_satellites(run, FLEET[::-1])[::-1])


def test_order_is_kept():
    names = ["c", "a", "b"]
    results = compute_satellites(inputs(), [sat(name, LOW) for name in names])
    assert [r.satellite_id for r in results] == names


def test_no_satellites_have_no_results():
    assert compute_satellites(inputs(), []) == []


@pytest.mark.parametrize(
    ("elements", "reason"),
    [
        (None, "no orbit is registered; give it an OMM or TLE"),
        (DECAYED, "decay"),
        (IN_THE_AIR, "inside the air"),
        (TOO_FAST, "SGP4 refuses the elements at their epoch"),
    ],
    ids=["no orbit", "decayed", "perigee in the air", "inside the Earth"],
)
def test_one_bad_satellite_is_a_marked_row_and_leaves_the_others_alone(
    elements: MeanElements | None, reason: str
):
    good = compute_satellites(inputs(), FLEET)
    results = compute_satellites(inputs(), [FLEET[0], sat("bad", elements), *FLEET[1:]])
    bad = results.pop(1)
    assert (bad.satellite_id, bad.state, bad.advisories) == ("bad", "failed", ())
    assert bad.reason is not None
    assert reason in bad.reason
    assert as_bytes(results) == as_bytes(good)


def test_a_wall_of_unknown_material_fails_its_own_satellite_only():
    wall = Criterion(CriterionKind.PENETRATION, 1.0, "paper")
    bad, good = compute_satellites(inputs(), [Registered(plate(wall), LOW), FLEET[0]])
    assert bad.reason == "criteria.material: 'paper' is not known; choose one of al-6061-t6, al-2024-t3"
    assert good.state == "computed"


@pytest.mark.parametrize(
    ("days_before_peak", "horizon", "depth"),
    [(5, 7.0, "plan"), (9, 7.0, "outlook"), (9, 14.0, "plan"), (3, 2.0, "outlook")],
)
def test_the_horizon_decides_between_plan_and_outlook(days_before_peak: int, horizon: float, depth: str):
    as_of = parse_utc("2026-08-13T02:00:00Z") - days_before_peak * DAY_S
    fresh = replace(LOW, epoch_jd=math.floor(as_of / DAY_S) + 2440587.5)
    run = inputs(as_of_unix_s=as_of, horizon_low_days=horizon, horizon_high_days=horizon)
    (result,) = compute_satellites(run, [sat("low", fresh)])
    assert [a["depth"] for a in result.advisories] == [depth]


def test_low_and_high_orbits_have_horizons_of_their_own():
    # on 4 August the peak is nine days ahead: beyond 7 days for the low one, within 14 for the others
    earlier = [Registered(s.spacecraft, replace(s.elements, epoch_jd=2461256.5)) for s in FLEET if s.elements]
    results = compute_satellites(inputs(as_of_unix_s=AS_OF_UNIX_S - 6 * DAY_S), earlier)
    assert [a["depth"] for r in results for a in r.advisories] == ["outlook", "plan", "plan"]


def test_a_stale_orbit_gives_the_outlook_only():
    stale = replace(LOW, epoch_jd=LOW.epoch_jd - 30.0)
    (result,) = compute_satellites(inputs(PERSEIDS, CAPRICORNIDS), [sat("low", stale)])
    assert result.state == "computed"
    assert {a["depth"] for a in result.advisories} == {"outlook"}
    assert {a["plan_until"] for a in result.advisories} == {None}


def test_the_plan_ends_with_the_horizon_of_the_orbit():
    old = replace(LOW, epoch_jd=LOW.epoch_jd - 3.0)
    (result,) = compute_satellites(inputs(), [sat("low", old)])
    assert result.advisories[0]["plan_until"] == "2026-08-14T06:00:00Z"


def test_a_plan_is_not_brought_down_by_a_decay_beyond_it():
    # it comes down in the fortnight after its plan; the outlook holds the semi-major axis
    sinking = replace(LOW, mean_motion_rev_per_day=15.9, bstar_per_earth_radius=2e-3)
    short = inputs(PERSEIDS, QUADRANTIDS, horizon_low_days=0.5, horizon_high_days=0.5, outlook_days=200.0)
    (result,) = compute_satellites(short, [sat("low", sinking)])
    assert result.state == "computed"
    assert {a["stream"] for a in result.advisories} == {"PER", "QUA"}


def test_a_passage_that_began_earlier_is_judged_from_now_on():
    (result,) = compute_satellites(inputs(CAPRICORNIDS), [FLEET[0]])
    assert all(parse_utc(a["onset"]) >= AS_OF_UNIX_S for a in result.advisories)
    assert all(parse_utc(a["peak_at"]) >= AS_OF_UNIX_S for a in result.advisories)


def test_passages_come_by_peak_within_the_outlook():
    run = inputs(QUADRANTIDS, PERSEIDS, SPRING, outlook_days=400.0)
    (result,) = compute_satellites(run, [FLEET[0]])
    assert [a["passage"] for a in result.advisories] == ["PER-2026", "QUA-2027", "SPR-2027", "PER-2027"]
    (near,) = compute_satellites(replace(run, outlook_days=30.0), [FLEET[0]])
    assert [a["passage"] for a in near.advisories] == ["PER-2026"]


@pytest.mark.parametrize("streams", [(), (SPRING,)], ids=["no streams at all", "none in these weeks"])
def test_a_quiet_time_is_no_failure(streams: tuple[Stream, ...]):
    run = replace(inputs(), catalogue=catalogue(*streams))
    results = compute_satellites(run, FLEET)
    assert [(r.state, r.advisories) for r in results] == [("computed", ())] * 3


def test_a_stream_that_stops_at_its_peak_has_finite_numbers():
    cut = replace(PERSEIDS, start_solar_longitude_deg=130.0, end_solar_longitude_deg=140.0)
    for horizon in (7.0, 1.0):
        (result,) = compute_satellites(
            inputs(cut, horizon_low_days=horizon, horizon_high_days=14.0), [FLEET[0]]
        )
        assert all(math.isfinite(x) for x in numbers(result.advisories))


def shipped(**more: Any) -> RunInputs:
    return replace(inputs(), catalogue=load_catalogue(), **more)


def test_the_shipped_catalogue_makes_sense_in_august():
    """Perseids near solar longitude 140.0 (International Meteor Organization calendars), the strongest in weeks."""
    # 1e-3 C and 1 mm of wall: particles of some micrograms, within three decades of the visual range
    optics = plate(WALL, Criterion(CriterionKind.CHARGE, 1e-3))
    (result,) = compute_satellites(shipped(outlook_days=30.0), [Registered(optics, LOW)])
    by_stream = {a["stream"]: a for a in result.advisories}
    half_a_degree = 0.5
    perseids = by_stream["PER"]
    assert abs(perseids["peak_solar_longitude_deg"] - 140.0) < half_a_degree
    charge = {code: a["satellite_enhancement_peak"][1]["mid"] for code, a in by_stream.items()}
    assert max(charge, key=lambda code: charge[code]) == "PER"
    mechanical, electrical = (row["mid"] for row in perseids["satellite_enhancement_peak"])
    assert electrical > mechanical > 1.0


def test_the_shipped_catalogue_is_finite_over_a_year_everywhere():
    results = compute_satellites(shipped(outlook_days=400.0), FLEET)
    assert all(r.state == "computed" and len(r.advisories) > 30 for r in results)
    found = np.array([x for r in results for x in numbers(r.advisories)])
    assert np.all(np.isfinite(found))
    assert len({a["id"] for r in results for a in r.advisories}) == sum(len(r.advisories) for r in results)


@st.composite
def any_elements(draw: st.DrawFn) -> MeanElements:
    return MeanElements(
        "ANY",
        "2026-001A",
        2461262.5 + draw(st.integers(-40, 40)),
        draw(st.floats(0.0, 0.999)),
        draw(st.floats(0.001, 20.0)),
        draw(st.floats(0.0, 0.9999999)),
        draw(st.floats(0.0, 180.0)),
        draw(st.floats(-400.0, 400.0)),
        draw(st.floats(-400.0, 400.0)),
        draw(st.floats(-400.0, 400.0)),
        draw(st.floats(-10.0, 10.0)),
        draw(st.floats(-1e6, 1e6)),
        draw(st.floats(-1e6, 1e6)),
    )


@given(any_elements())
@settings(derandomize=True, deadline=None, max_examples=30)
def test_any_elements_end_in_advisories_or_in_a_reason(elements: MeanElements):
    (result,) = compute_satellites(
        inputs(horizon_low_days=1.0, horizon_high_days=1.0), [sat("any", elements)]
    )
    assert result.reason or result.state == "computed"
    assert all(math.isfinite(x) for x in numbers(result.advisories))


@given(
    st.floats(0.0, 360.0),
    st.floats(0.0, 1e7),
    st.floats(0.0, 1e4),
    st.floats(0.0, 1e4),
    st.floats(1.31, 6.0),
    st.floats(1.0, 80.0),
    st.floats(-90.0, 90.0),
    st.floats(0.0, 10.0),
)
@settings(derandomize=True, deadline=None, max_examples=25)
def test_any_stream_gives_finite_numbers(
    peak: float, zhr: float, rise: float, fall: float, r: float, speed: float, dec: float, spread: float
):
    parts = (Component("main", peak, zhr, rise, fall),)
    stream = replace(
        PERSEIDS,
        components=parts,
        population_index_r=r,
        v_geocentric_km_s=speed,
        radiant_dec_deg=dec,
        radiant_spread_deg=spread,
    )
    (result,) = compute_satellites(inputs(stream, horizon_low_days=1.0, outlook_days=400.0), [FLEET[0]])
    assert result.state == "computed"
    assert result.advisories
    assert all(math.isfinite(x) for x in numbers(result.advisories))


def test_a_satellite_without_a_plan_says_why():
    (stale,) = compute_satellites(inputs(as_of_unix_s=AS_OF_UNIX_S + 20.0 * DAY_S), [sat("stale", LOW)])
    assert stale.state == "computed"
    assert stale.reason is not None
    assert "only the outlook" in stale.reason
    (fresh,) = compute_satellites(inputs(), [sat("fresh", LOW)])
    assert fresh.reason is None


def test_a_level_does_not_fall_while_the_peak_still_lies_ahead():
    """The floor is of the whole passage, not of what is left of it."""
    craft = box(CHARGE, policy=Policy(ready_at=1.01, shelter_at=1.02, min_expected_impacts=0.0))
    (early,) = compute_satellites(inputs(), [Registered(craft, LOW)])
    whole = next(a for a in early.advisories if a["stream"] == "PER")
    floor = 0.9 * whole["expected_impacts"][0]["mid"]
    strict = replace(craft, policy=replace(craft.policy, min_expected_impacts=floor))
    levels = set()
    for days in (0.0, 1.0, 2.0, 2.5):
        moment = inputs(as_of_unix_s=AS_OF_UNIX_S + days * DAY_S)
        (result,) = compute_satellites(moment, [Registered(strict, LOW)])
        levels.add(next(a for a in result.advisories if a["stream"] == "PER")["level"])
    assert levels == {whole["level"]}
    assert whole["level"] != "steady"
