from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest
from fastapi import FastAPI
from starlette.testclient import TestClient

from tests.api.harness import AS_OF_UNIX_S, advisory, is_problem, publish_advisories, put_satellite


def test_a_run_is_queued_as_of_now_for_all(both: TestClient) -> None:
    answer = both.post("/v1/runs")
    run = answer.json()
    assert (answer.status_code, answer.headers["retry-after"]) == (202, "5")
    assert answer.headers["location"] == f"/v1/runs/{run['id']}"
    assert (run["state"], run["as_of"]) == ("queued", "2026-08-10T00:00:00Z")
    assert both.get(answer.headers["location"]).json()["id"] == run["id"]


def test_a_run_may_name_its_instant_and_satellites(both: TestClient) -> None:
    put_satellite(both)
    asked = {"as_of": "2026-08-11T12:00:00Z", "satellites": ["kestrel-1", "kestrel-1"]}
    answer = both.post("/v1/runs", json=asked)
    assert (answer.status_code, answer.json()["as_of"]) == (202, "2026-08-11T12:00:00Z")


@pytest.mark.parametrize(
    ("body", "field"),
    [
        ({"as_of": "now"}, "as_of"),
        ({"as_of": 5}, "as_of"),
        ({"satellites": []}, "satellites"),
        ({"satellites": ["nobody"]}, "satellites"),
        ({"satellites": ["\u0000"]}, "satellites.0"),
        ({"satelites": ["a"]}, "satelites"),
        ([], "document"),
    ],
)
def test_a_wrong_request_is_named(both: TestClient, body: Any, field: str) -> None:
    assert is_problem(both.post("/v1/runs", json=body), 422, field=field)


def test_a_published_run_tells_what_became_of_each_satellite(both: TestClient) -> None:
    for name in ("kestrel-1", "kestrel-2"):
        put_satellite(both, name)
    run = publish_advisories(both, advisory("kestrel-1"), advisory("kestrel-2"))
    found = both.get(f"/v1/runs/{run.id}").json()
    assert (found["state"], found["computed"], found["revisions_new"]) == ("published", 2, 2)
    states = [(each["satellite"], each["state"]) for each in found["satellites"]["items"]]
    assert states == [("kestrel-1", "computed"), ("kestrel-2", "computed")]
    failed = both.get(f"/v1/runs/{run.id}?state=failed").json()
    assert failed["satellites"]["items"] == []


def test_runs_are_listed_the_newest_first(both: TestClient) -> None:
    ids = [both.post("/v1/runs").json()["id"] for _ in range(3)]
    assert [each["id"] for each in both.get("/v1/runs").json()["items"]] == ids[::-1]
    assert is_problem(both.get("/v1/runs/%00"), 404)
    assert is_problem(both.get("/v1/runs/run-1"), 404)


def test_the_clock_is_cut_to_whole_seconds(make: Callable[..., FastAPI]) -> None:
    client = TestClient(make(clock=lambda: AS_OF_UNIX_S + 0.75))
    assert client.post("/v1/runs").json()["as_of"] == "2026-08-10T00:00:00Z"
