"""What an advisory says: its fields, in words and numbers that follow from the finding."""

from __future__ import annotations

import json
import re
from dataclasses import replace
from functools import cache
from typing import Any

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.advice.advisory import CAUTION, band, lee_window
from app.core.orbit.elements import MeanElements
from app.core.sky.times import TimeGrid, parse_utc
from app.core.spacecraft.model import AttitudeLaw, AttitudeLawKind, Criterion, CriterionKind, Spacecraft
from app.core.streams.model import Component, Stream
from app.pipeline import compute_satellites
from tests.core.advice.samples import (
    AS_OF_UNIX_S,
    CAPRICORNIDS,
    CHARGE,
    DAY_S,
    LOW,
    MASS,
    PERSEIDS,
    RING,
    box,
    inputs,
    plate,
    registered,
)

FIELDS = {
    *(
        "id",
        "satellite",
        "stream",
        "stream_name",
        "passage",
        "level",
        "depth",
        "issued_at",
        "onset",
        "peak_at",
        "end",
    ),
    *("peak_solar_longitude_deg", "peak_zhr", "radiant_ra_deg", "radiant_dec_deg", "v_geocentric_km_s"),
    *("satellite_enhancement_peak", "enhancement_peak", "expected_impacts", "background_impacts"),
    *("lee_windows", "lee_windows_from", "lee_windows_until", "safe_attitude_windows", "plan_until"),
    *("actions", "provenance", "caution"),
}
SHELTER = {"ready_at": 1.01, "shelter_at": 1.02, "min_expected_impacts": 0.0}
READY = {"ready_at": 1.01, "shelter_at": 1e6, "min_expected_impacts": 0.0}
STEADY = {"ready_at": 1e5, "shelter_at": 1e6}


def advise(
    spacecraft: Spacecraft | None = None,
    elements: MeanElements = LOW,
    streams: tuple[Stream, ...] = (PERSEIDS,),
    **more: Any,
) -> dict[str, Any]:
    """The advisory of the first stream named."""
    (result,) = compute_satellites(inputs(*streams, **more), [registered(spacecraft, elements)])
    assert result.state == "computed", result.reason
    return next(a for a in result.advisories if a["stream"] == streams[0].code)


@cache
def planned() -> dict[str, Any]:
    return advise(plate(**SHELTER))


@cache
def looked_out() -> dict[str, Any]:
    return advise(plate(**SHELTER), as_of_unix_s=AS_OF_UNIX_S - 20 * DAY_S)


@pytest.mark.parametrize("body", [planned, looked_out])
def test_it_has_the_fields_of_the_contract(body: Any):
    assert set(body()) == FIELDS
    assert body()["caution"] == CAUTION
    assert body()["safe_attitude_windows"] == []


@pytest.mark.parametrize("body", [planned, looked_out])
def test_it_is_json_and_nothing_else(body: Any):
    text = json.dumps(body(), allow_nan=False)
    assert json.loads(text) == body()


def test_it_names_satellite_stream_and_year():
    body = planned()
    assert (body["id"], body["passage"]) == ("PER-2026.wren", "PER-2026")
    assert (body["satellite"], body["stream"], body["stream_name"]) == ("wren", "PER", "Perseids")
    assert body["issued_at"] == "2026-08-10T00:00:00Z"


@pytest.mark.parametrize("body", [planned, looked_out])
def test_times_come_in_order_and_in_whole_seconds_utc(body: Any):
    times = [body()[name] for name in ("onset", "peak_at", "end")]
    assert all(re.fullmatch(r"2026-08-\d\dT\d\d:\d\d:\d\dZ", t) for t in times)
    assert times == sorted(times)


def test_the_peak_of_the_outlook_is_that_of_the_stream():
    body = looked_out()
    assert body["peak_solar_longitude_deg"] == 140.0
    assert body["peak_zhr"] == 100.0
    assert (body["radiant_ra_deg"], body["radiant_dec_deg"]) == (48.0, 58.0)
    assert body["v_geocentric_km_s"] == 59.1


def test_rate_and_radiant_belong_to_the_peak_that_is_told():
    body = planned()
    longitude = TimeGrid(np.array([parse_utc(body["peak_at"])])).solar_longitude_deg[0]
    assert_allclose(body["peak_solar_longitude_deg"], longitude, atol=1e-4)
    assert_allclose(body["peak_zhr"], 100.0 * 10.0 ** (-0.2 * abs(longitude - 140.0)), atol=0.006)
    assert_allclose(body["radiant_ra_deg"], 48.0 + 1.4 * (longitude - 140.0), atol=0.006)
    assert_allclose(body["radiant_dec_deg"], 58.0 + 0.3 * (longitude - 140.0), atol=0.006)


def test_the_radiant_drifts_in_both_coordinates():
    # two days past the maximum the passage is judged from now on, with the radiant of now
    drifting = replace(PERSEIDS, drift_ra_deg_per_deg=1.4, drift_dec_deg_per_deg=-3.0)
    body = advise(plate(**STEADY), streams=(drifting,), as_of_unix_s=AS_OF_UNIX_S + 5 * DAY_S)
    away = body["peak_solar_longitude_deg"] - 140.0
    assert 1.0 < away < 3.0
    assert_allclose(body["radiant_ra_deg"], 48.0 + 1.4 * away, atol=0.006)
    assert_allclose(body["radiant_dec_deg"], 58.0 - 3.0 * away, atol=0.006)


def test_every_face_and_criterion_has_its_factor():
    body = advise(box(MASS, CHARGE))
    rows = [(row["face"], row["criterion"]) for row in body["enhancement_peak"]]
    assert rows == [(f, c) for f in ("px", "nx", "py", "ny", "pz", "nz") for c in ("mass", "charge")]
    assert [row["criterion"] for row in body["satellite_enhancement_peak"]] == ["mass", "charge"]
    assert not any(row["sensitive"] for row in body["enhancement_peak"])
    assert all(row["mid"] >= 1.0 for row in body["enhancement_peak"])


def test_bands_stay_open_until_they_can_be_computed():
    names = ("satellite_enhancement_peak", "enhancement_peak", "expected_impacts", "background_impacts")
    bands = [row for name in names for row in planned()[name]]
    assert all((row["low"], row["high"]) == (None, None) for row in bands)
    assert band(1.23456789) == {"low": None, "mid": 1.23457, "high": None}


def test_fast_streams_are_worse_electrically_than_mechanically():
    # charge grows as the 3.4th power of speed at the same hazard
    body = advise(box(CHARGE, Criterion(CriterionKind.PENETRATION, 1.0, "al-6061-t6")))
    charge, wall = (row["mid"] for row in body["satellite_enhancement_peak"])
    assert charge > wall > 1.0


@pytest.mark.parametrize("elements", [LOW, RING], ids=lambda e: e.object_name)
def test_twice_the_area_meets_twice_the_impacts_at_the_same_factor(elements: MeanElements):
    small, large = (
        advise(box(MASS, **dict.fromkeys(("px", "nx", "py", "ny", "pz", "nz"), area)), elements)
        for area in (1.0, 2.0)
    )
    assert small["satellite_enhancement_peak"] == large["satellite_enhancement_peak"]
    for name in ("expected_impacts", "background_impacts"):
        assert_allclose(large[name][0]["mid"], 2.0 * small[name][0]["mid"], rtol=1e-5)


@pytest.mark.parametrize(("policy", "level"), [(STEADY, "steady"), (READY, "ready"), (SHELTER, "shelter")])
def test_the_level_is_the_operators(policy: dict[str, float], level: str):
    assert advise(plate(**policy))["level"] == level


@pytest.mark.parametrize("policy", [STEADY, READY, SHELTER])
@pytest.mark.parametrize("days_before", [0, 20])
def test_actions_are_plain_sentences(policy: dict[str, float], days_before: int):
    body = advise(plate(**policy), as_of_unix_s=AS_OF_UNIX_S - days_before * DAY_S)
    assert body["actions"]
    for sentence in body["actions"]:
        assert re.fullmatch(r"[A-Z].*\.", sentence, re.DOTALL)
        assert not re.search(r"None|nan|\{|\}|_", sentence)


def test_nothing_to_do_is_said_in_one_sentence():
    assert advise(plate(**STEADY))["actions"] == [
        "Nothing beyond routine operations is advised for this passage."
    ]


def test_actions_carry_the_times_and_the_radiant():
    body = planned()
    text = " ".join(body["actions"])
    for expected in (body["onset"], body["end"], body["peak_at"], f"{body['radiant_ra_deg']:.1f}"):
        assert expected in text
    longest = max(body["lee_windows"], key=lambda w: w["duration_s"])
    assert f"from {longest['start']} to {longest['end']}" in text


def test_ready_does_not_ask_for_an_attitude():
    assert not any("attitude" in sentence for sentence in advise(plate(**READY))["actions"])
    assert any("attitude" in sentence for sentence in planned()["actions"])


def test_an_outlook_asks_for_a_fresh_orbit_and_offers_no_windows():
    body = looked_out()
    assert body["depth"] == "outlook"
    assert (body["lee_windows"], body["lee_windows_from"], body["lee_windows_until"]) == ([], None, None)
    assert any("fresh orbit" in sentence for sentence in body["actions"])


def test_lee_windows_lie_where_they_were_looked_for():
    body = planned()
    assert body["depth"] == "plan"
    assert len(body["lee_windows"]) > 40  # one each revolution
    for window in body["lee_windows"]:
        assert set(window) == {"start", "end", "duration_s", "streams"}
        assert window["streams"] == ["PER"]
        start, end = parse_utc(window["start"]), parse_utc(window["end"])
        assert end - start == window["duration_s"] >= 60
        assert start < parse_utc(body["lee_windows_until"])
        assert end > parse_utc(body["lee_windows_from"])


def test_lee_windows_of_a_steady_passage_stay_near_its_peak():
    body = advise(plate(**STEADY))
    reach = [
        abs(parse_utc(body[n]) - parse_utc(body["peak_at"]))
        for n in ("lee_windows_from", "lee_windows_until")
    ]
    assert max(reach) <= 0.5 * DAY_S
    assert 12 <= len(body["lee_windows"]) <= 17


def test_short_lee_windows_are_left_out():
    lengths = [w["duration_s"] for w in planned()["lee_windows"]]
    least = float(np.median(lengths))
    kept = advise(plate(**SHELTER, min_lee_s=least))["lee_windows"]
    assert [w["duration_s"] for w in kept] == [length for length in lengths if length >= least]


def test_lee_windows_hide_what_else_matters_too():
    strong = replace(CAPRICORNIDS, components=(Component("main", 140.0, 80.0, 0.1, 0.1),))
    alone = planned()["lee_windows"]
    both = advise(plate(**SHELTER), streams=(PERSEIDS, strong))["lee_windows"]
    assert both[0]["streams"] == ["PER", "CAP"]
    assert sum(w["duration_s"] for w in both) < sum(w["duration_s"] for w in alone)


def test_windows_are_rounded_inward():
    window = lee_window(AS_OF_UNIX_S + 0.2, AS_OF_UNIX_S + 100.9, ["PER"])
    assert (window["start"], window["end"]) == ("2026-08-10T00:00:01Z", "2026-08-10T00:01:40Z")
    assert window["duration_s"] == 99


def test_provenance_says_where_every_number_is_from():
    told = planned()["provenance"]
    assert told["catalogue_digest"] == "c" * 64
    assert (told["run"], told["software"], told["as_of"]) == ("run-1", "stonechat 0", "2026-08-10T00:00:00Z")
    assert told["orbit_epoch"] == "2026-08-10T06:00:00Z"
    assert told["orbit_age_days"] == -0.25
    assert told["mass_law"] == "jvb"
    assert all(told[n] for n in ("mass_law_source", "background_source", "background_speeds_source"))


def notes(**more: Any) -> str:
    return " ".join(advise(**more)["provenance"]["notes"])


def test_an_outlook_says_how_it_was_averaged():
    assert "Averaged over orbit phase" in " ".join(looked_out()["provenance"]["notes"])
    assert "Averaged over orbit phase" not in " ".join(planned()["provenance"]["notes"])


@pytest.mark.parametrize(("mass_g", "stretched"), [(1e-9, True), (1e-3, False)])
def test_a_mass_law_stretched_over_three_decades_is_marked(mass_g: float, stretched: bool):
    # JVB at magnitude 6.5 and 60.1 km/s: 2.2e-5 g, so 1e-9 g lies 4.3 decades below the visual range
    text = notes(spacecraft=plate(Criterion(CriterionKind.MASS, mass_g)))
    assert ("mass: the mass law is stretched 4.3 decades" in text) is stretched


def test_the_other_mass_law_gives_other_numbers_and_says_so():
    other = advise(plate(**SHELTER), mass_law="verniani")
    assert other["provenance"]["mass_law"] == "verniani"
    assert other["satellite_enhancement_peak"][0]["mid"] > planned()["satellite_enhancement_peak"][0]["mid"]


@pytest.mark.parametrize(("r", "marked"), [(1.5, True), (2.2, False), (4.0, True)])
def test_a_population_index_outside_its_range_is_marked(r: float, marked: bool):
    assert ("Population index" in notes(streams=(replace(PERSEIDS, population_index_r=r),))) is marked


def test_a_capped_lens_is_marked():
    slow = replace(PERSEIDS, v_geocentric_km_s=15.0, radiant_dec_deg=0.0, radiant_spread_deg=3.0)
    assert "anti-radiant axis" in notes(elements=RING, streams=(slow,))
    assert "anti-radiant axis" not in notes(elements=LOW, streams=(slow,))


def test_faces_fixed_in_space_have_a_background_of_the_date():
    law = AttitudeLaw(AttitudeLawKind.INERTIAL, (0.0, 0.0, 0.0, 1.0))
    body = advise(plate(MASS, attitude=law, normal=(0.4, 0.4, 0.8)))
    assert body["enhancement_peak"][0]["mid"] > 1.0


def notes_at(as_of_unix_s: float) -> str:
    (result,) = compute_satellites(inputs(as_of_unix_s=as_of_unix_s), [registered(box(CHARGE), LOW)])
    return " ".join(result.advisories[0]["provenance"]["notes"])


def test_a_stale_orbit_is_said_to_be_stale() -> None:
    assert "not now" in notes_at(AS_OF_UNIX_S + 8.0 * DAY_S)
    assert "not now" not in notes_at(AS_OF_UNIX_S)


def test_it_is_said_when_a_stream_is_past_its_own_maximum() -> None:
    assert "past its own maximum" in notes_at(AS_OF_UNIX_S + 4.0 * DAY_S)
    assert "past its own maximum" not in notes_at(AS_OF_UNIX_S)
