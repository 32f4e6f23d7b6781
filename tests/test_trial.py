"""A trial end to end: the standing example field by field, what is refused, and any JSON at all."""

from __future__ import annotations

import copy
import json
import math
from collections.abc import Iterator
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app.core.advice.advisory import CAUTION
from app.errors import FieldError
from app.formats.trial import parse_trial
from app.trial import run_trial
from tests.core.advice.samples import PERSEIDS, SPRING, catalogue
from tests.trials import CATALOGUE, EXAMPLE, MISSING, by_orbit, only, request, run


def refusal(document: object) -> FieldError:
    with pytest.raises(FieldError) as error:
        run(document)
    return error.value


def test_the_example_answers_field_by_field():
    answer = run(EXAMPLE)
    (state,) = answer["states"]
    assert list(state) == ["t", "streams", "faces"]
    assert state["t"] == "2026-08-13T02:00:00Z"
    (stream,) = state["streams"]
    assert list(stream) == [
        *("code", "zhr", "flux_at_infinity_per_m2_s", "min_mass_g", "sheltered", "density_ratio"),
        *("speed_km_s", "from_direction"),
    ]
    (face,) = state["faces"]
    assert list(face) == ["name", "criteria"]
    assert face["name"] == "aperture"
    for criterion in face["criteria"]:
        assert set(criterion) >= {"kind", "stream_flux_per_m2_s", "background_flux_per_m2_s", "enhancement"}
        assert list(criterion["stream_flux_per_m2_s"]) == ["XXX"]
        assert list(criterion["enhancement"]) == ["low", "mid", "high"]
    assert [c["kind"] for c in face["criteria"]] == ["mass", "penetration", "charge", "energy"]


def test_it_carries_the_caution_and_the_mass_law():
    answer = run(EXAMPLE)
    assert answer["caution"] == CAUTION
    assert answer["mass_law"] == "jvb"
    assert answer["notes"] == []


def test_the_order_of_the_request_is_kept():
    document = copy.deepcopy(EXAMPLE)
    times = [f"2026-08-13T{hour:02d}:00:00Z" for hour in (5, 2, 9)]
    document["states"] = [{**document["states"][0], "t": t} for t in times]
    document["faces"] = [{**document["faces"][0], "name": name} for name in ("zeta", "alpha", "mid")]
    document["faces"][1] = {**document["faces"][1], "criteria": document["faces"][1]["criteria"][::-1]}
    document["streams"] = [{**document["streams"][0], "code": code} for code in ("ZZZ", "AAA", "MMM")]
    answer = run(document)
    assert [state["t"] for state in answer["states"]] == times
    for state in answer["states"]:
        assert [s["code"] for s in state["streams"]] == ["ZZZ", "AAA", "MMM"]
        assert [f["name"] for f in state["faces"]] == ["zeta", "alpha", "mid"]
        assert [c["kind"] for c in state["faces"][1]["criteria"]] == [
            "energy",
            "charge",
            "penetration",
            "mass",
        ]


def test_each_state_is_assessed_for_itself():
    document = copy.deepcopy(EXAMPLE)
    other = {"t": "2026-08-13T08:00:00Z", "r_km": [0.0, 0.0, 9000.0], "v_km_s": [0.0, 6.6, 0.0]}
    document["states"].append(other)
    first, second = run(document)["states"]
    assert first == run(EXAMPLE)["states"][0]
    alone = run(request(states=[other]))["states"][0]
    assert second["streams"] == alone["streams"]


@pytest.mark.parametrize(
    ("change", "field", "problem"),
    [
        ({"r_km": [6477.0, 0.0, 0.0]}, "states.1.r_km", "lies inside 6478 km"),
        ({"r_km": [0.0, 0.0, 0.0]}, "states.1.r_km", "lies inside 6478 km"),
        ({"r_km": [3e6, 0.0, 0.0]}, "states.1.r_km", "lies beyond 2000000 km"),
        ({"r_km": [1e300, 0.0, 0.0]}, "states.1.r_km", "lies beyond 2000000 km"),
        ({"v_km_s": [0.0, 7500.0, 0.0]}, "states.1.v_km_s", "is it in m/s?"),
        ({"v_km_s": [1e200, 1e200, 0.0]}, "states.1.v_km_s", "is it in m/s?"),
        ({"r_km": [7e6, 0.0, 0.0]}, "states.1.r_km", "lies beyond"),
    ],
)
def test_an_impossible_state_is_named(change: dict[str, Any], field: str, problem: str):
    document = request(states=[EXAMPLE["states"][0], {**EXAMPLE["states"][0], **change}])
    error = refusal(document)
    assert error.field == field
    assert problem in error.problem


@pytest.mark.parametrize("law", ["nadir", "sun"])
def test_a_state_without_an_orbit_plane_needs_an_inertial_attitude(law: str):
    falling = request(attitude={"law": law}, states__0__v_km_s=[7.0, 0.0, 0.0])
    error = refusal(falling)
    assert error.field == "states.0.v_km_s"
    assert "use 'inertial'" in error.problem
    assert run(request(states__0__v_km_s=[7.0, 0.0, 0.0]))["states"]


def test_given_streams_replace_the_catalogue():
    assert [s["code"] for s in run(EXAMPLE)["states"][0]["streams"]] == ["XXX"]


def test_without_streams_the_active_ones_of_the_catalogue_are_met():
    state = run(request(streams=MISSING))["states"][0]
    rates = {s["code"]: s["zhr"] for s in state["streams"]}
    assert max(rates, key=lambda code: rates[code]) == "PER"
    assert "GEM" not in rates
    assert all(rate > 0.0 for rate in rates.values())


def test_in_a_quiet_time_the_catalogue_is_listed_with_rates_of_zero():
    answer = run_trial(request(streams=MISSING), catalogue(SPRING), "jvb")
    stream, criterion = only(answer)
    assert (stream["code"], stream["zhr"]) == ("SPR", 0.0)
    assert criterion["enhancement"]["mid"] == 1.0


def test_an_empty_catalogue_asks_for_streams():
    with pytest.raises(FieldError, match="give streams of your own"):
        run_trial(request(streams=MISSING), catalogue(), "jvb")


def test_the_catalogue_and_the_same_stream_given_agree():
    given = request(
        streams__0__code="PER",
        streams__0__drift_ra_deg_per_deg=1.4,
        streams__0__drift_dec_deg_per_deg=0.3,
        streams__0__radiant_spread_deg=0.6,
    )
    known = run_trial(request(streams=MISSING), catalogue(PERSEIDS), "jvb")
    assert known["states"] == run(given)["states"]


def test_an_orbit_is_as_good_as_its_states():
    trial = parse_trial(by_orbit(), CATALOGUE)
    times = [f"2026-08-13T02:{minute:02d}:00Z" for minute in range(0, 11, 2)]
    columns = zip(times, trial.r_km.T.tolist(), trial.v_km_s.T.tolist(), strict=True)
    states = [{"t": t, "r_km": r, "v_km_s": v} for t, r, v in columns]
    assert run(by_orbit()) == run(request(states=states))


def test_instants_between_seconds_keep_their_fraction():
    answer = run(request(states__0__t="2026-08-13T02:00:00.250Z"))
    assert answer["states"][0]["t"] == "2026-08-13T02:00:00.250000Z"


def test_an_answer_that_would_be_too_large_is_refused():
    faces = [{**EXAMPLE["faces"][0], "name": f"face {i}"} for i in range(16)]
    error = refusal(by_orbit(to="2026-08-14T02:00:00Z", step_s=10, faces=faces))
    assert error.field == "states"
    assert "too large" in error.problem


def test_an_unknown_mass_law_lists_the_known_ones():
    with pytest.raises(FieldError, match="choose one of jvb, verniani"):
        run(EXAMPLE, "guess")


def numbers(value: Any) -> Iterator[float]:
    if isinstance(value, dict | list):
        for each in value.values() if isinstance(value, dict) else value:
            yield from numbers(each)
    elif isinstance(value, float | int):
        yield float(value)


JSON = st.recursive(
    st.none()
    | st.booleans()
    | st.integers(-(10**20), 10**20)
    | st.floats(allow_nan=False, allow_infinity=False)
    | st.text(max_size=12)
    | st.sampled_from(
        ["2026-08-13T02:00:00Z", "1960-01-01T00:00:00Z", "2200-12-31T23:59:59Z", "nadir", "sun", "mass"]
    ),
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(st.text(max_size=8), inner, max_size=4),
    max_leaves=8,
)


def places(document: Any, way: tuple[Any, ...] = ()) -> Iterator[tuple[Any, ...]]:
    """The path of every value in a document."""
    steps = (
        document.items()
        if isinstance(document, dict)
        else enumerate(document)
        if isinstance(document, list)
        else ()
    )
    for step, value in steps:
        yield (*way, step)
        yield from places(value, (*way, step))


def other_value(draw: st.DrawFn, value: Any) -> Any:
    """Mostly a number near or far for a number, and anything for anything."""
    if isinstance(value, int | float) and draw(st.integers(0, 5)):
        scale = draw(st.sampled_from([0.0, -1.0, 0.5, 0.99, 1.01, 1.3, 1e-300, 1e300]))
        return value * scale + draw(st.sampled_from([0.0, 0.0, 0.1, -0.5, 90.0]))
    return draw(JSON)


@st.composite
def disturbed(draw: st.DrawFn) -> Any:
    """A good request with a few values replaced, left out, or added."""
    document = copy.deepcopy(draw(st.sampled_from([EXAMPLE, by_orbit(), request(streams=MISSING)])))
    for _ in range(draw(st.integers(1, 3))):
        *way, last = draw(st.sampled_from(sorted(places(document), key=str)))
        place = document
        for step in way:
            place = place[step]
        action = draw(st.sampled_from(["drop", "add", *["change"] * 6]))
        if action == "drop" and len(document) > 1:
            del place[last]
        elif action == "add" and isinstance(place, dict):
            place[draw(st.text(max_size=8))] = draw(JSON)
        else:
            place[last] = other_value(draw, place[last])
    return document


def answer_of(document: Any) -> dict[str, Any] | FieldError:
    try:
        return run_trial(document, CATALOGUE, "jvb")
    except FieldError as error:
        return error


def answered_or_refused(document: Any) -> None:
    answer = answer_of(document)
    if isinstance(answer, FieldError):
        assert answer.field
        assert answer.problem
        assert "\n" not in str(answer)
        return
    json.dumps(answer, allow_nan=False)
    assert all(math.isfinite(x) for x in numbers(answer))


@given(disturbed())
@settings(derandomize=True, deadline=None, max_examples=300)
def test_any_disturbed_request_gives_finite_numbers_or_names_a_field(document: Any):
    answered_or_refused(document)


@given(JSON)
@settings(derandomize=True, deadline=None, max_examples=80)
def test_any_json_at_all_is_refused_by_a_field(document: Any):
    answered_or_refused(document)


@given(
    st.lists(st.floats(-60_000.0, 60_000.0), min_size=3, max_size=3),
    st.lists(st.floats(-12.0, 12.0), min_size=3, max_size=3),
    st.sampled_from(["nadir", "sun"]),
    st.floats(-90.0, 90.0),
    st.floats(1.0, 80.0),
    st.floats(0.0, 10.0),
)
@settings(derandomize=True, deadline=None, max_examples=60)
def test_any_state_gives_finite_numbers_or_is_named(
    r_km: list[float], v_km_s: list[float], law: str, dec: float, speed: float, spread: float
):
    document = request(
        states__0__r_km=r_km,
        states__0__v_km_s=v_km_s,
        attitude={"law": law},
        streams__0__radiant_dec_deg=dec,
        streams__0__v_geocentric_km_s=speed,
        streams__0__radiant_spread_deg=spread,
    )
    answered_or_refused(document)
