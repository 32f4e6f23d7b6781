from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest
from fastapi import FastAPI
from starlette.testclient import TestClient

from app.api import series
from app.core.advice.advisory import CAUTION
from app.pipeline import Registered, RunInputs
from tests.api.harness import AS_OF_UNIX_S, FAKES, SPAN, is_problem, put_orbit, put_satellite

HOME = "/v1/satellites/kestrel-1"


@pytest.fixture
def ready(client: TestClient) -> TestClient:
    put_satellite(client)
    put_orbit(client)
    return client


def test_the_series_shows_faces_streams_and_the_whole(ready: TestClient) -> None:
    found = ready.get(f"{HOME}/enhancement?{SPAN}&step_s=1800").json()
    assert found["times"] == ["2026-08-13T02:00:00Z", "2026-08-13T02:30:00Z", "2026-08-13T03:00:00Z"]
    assert [(row["face"], row["criterion"]) for row in found["faces"]] == [
        ("aperture", "penetration"),
        ("aperture", "charge"),
    ]
    assert found["faces"][0]["mid"] == [2.0, 2.0, 2.0]
    assert found["faces"][0]["by_stream"] == {"PER": [1.0, 1.0, 1.0]}
    assert [row["criterion"] for row in found["whole"]] == ["penetration", "charge"]
    assert found["streams"]["PER"]["sheltered"] == [False, False, False]
    assert found["caution"] == CAUTION
    assert found["provenance"]["orbit_epoch"] == "2026-08-09T18:00:00Z"


def test_a_factor_over_no_background_is_null_and_a_band_not_computed_is_null(ready: TestClient) -> None:
    row = ready.get(f"{HOME}/enhancement?{SPAN}&step_s=3600").json()["faces"][1]
    assert (row["mid"], row["low"], row["high"]) == ([None, None], None, None)


def test_face_and_criterion_choose(ready: TestClient) -> None:
    found = ready.get(f"{HOME}/enhancement?{SPAN}&face=aperture&criterion=charge").json()
    assert [row["criterion"] for row in found["faces"]] == ["charge"]
    assert [row["criterion"] for row in found["whole"]] == ["charge"]


@pytest.mark.parametrize(
    ("query", "field"),
    [
        (SPAN + "&face=tail", "face"),
        (SPAN + "&criterion=rust", "criterion"),
        (SPAN + "&step_s=0", "step_s"),
        (SPAN + "&step_s=nan", "step_s"),
        ("from=2026-08-13T02:00:00Z", "to"),
        ("from=2026-08-13T02:00:00Z&to=2026-08-13T02:00:00Z", "to"),
        ("from=yesterday&to=2026-08-13T02:00:00Z", "from"),
        ("from=2026-08-13T02:00:00&to=2026-08-13T03:00:00Z", "from"),
        ("from=1970-01-01T00:00:00Z&to=2099-01-01T00:00:00Z", "step_s"),
    ],
)
def test_what_is_wrong_with_a_series_is_named(ready: TestClient, query: str, field: str) -> None:
    assert is_problem(ready.get(f"{HOME}/enhancement?{query}"), 422, field=field)


def test_an_answer_too_long_to_send_is_refused(ready: TestClient, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(series, "MOST_NUMBERS", 10)
    assert is_problem(ready.get(f"{HOME}/enhancement?{SPAN}"), 422, field="step_s")


def test_windows_carry_the_caution(ready: TestClient) -> None:
    found = ready.get(f"{HOME}/windows?kind=lee&{SPAN}").json()
    assert [window["streams"] for window in found["windows"]] == [["PER"]]
    assert (found["kind"], found["caution"]) == ("lee", CAUTION)


def test_attitude_windows_are_not_offered_yet_and_other_kinds_unknown(ready: TestClient) -> None:
    answer = ready.get(f"{HOME}/windows?kind=attitude&{SPAN}")
    assert is_problem(answer, 422, type="/problems/not-offered", field="kind")
    assert "not yet offered" in answer.json()["detail"]
    assert is_problem(ready.get(f"{HOME}/windows?kind=moon&{SPAN}"), 422, field="kind")


@pytest.mark.parametrize("call", ["enhancement?", "windows?kind=lee&"])
def test_without_an_orbit_there_is_a_conflict_to_mend(both: TestClient, call: str) -> None:
    assert is_problem(both.get(f"{HOME}/{call}{SPAN}"), 404)
    put_satellite(both)
    assert is_problem(both.get(f"{HOME}/{call}{SPAN}"), 409, type="/problems/orbit")
    assert "give it an OMM or TLE" in both.get(f"{HOME}/{call}{SPAN}").json()["detail"]


def test_the_computation_gets_the_settings_the_orbit_and_the_last_full_hour(
    make: Callable[..., FastAPI],
) -> None:
    seen: list[tuple[RunInputs, Registered, float, float]] = []

    def windows(*given: Any) -> list[dict[str, Any]]:
        seen.append(given)
        return []

    computations = type(FAKES)(FAKES.series, windows, FAKES.trial)
    client = TestClient(make(computations=computations, clock=lambda: AS_OF_UNIX_S + 3_599.0))
    put_satellite(client)
    put_orbit(client)
    assert client.get(f"{HOME}/windows?kind=lee&{SPAN}").json()["windows"] == []
    inputs, satellite, start, end = seen[0]
    assert (inputs.as_of_unix_s, inputs.mass_law, inputs.horizon_low_days) == (AS_OF_UNIX_S, "jvb", 7.0)
    assert satellite.elements is not None
    assert (satellite.spacecraft.id, satellite.elements.mean_motion_rev_per_day) == ("kestrel-1", 14.8)
    assert end - start == 3_600.0
