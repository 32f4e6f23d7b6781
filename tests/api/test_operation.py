from __future__ import annotations

import time
from collections.abc import Callable
from datetime import timedelta

import pytest
from fastapi import FastAPI
from prometheus_client.parser import text_string_to_metric_families
from starlette.testclient import TestClient

from app.jobs.run import Seams
from app.pipeline import SatelliteResult
from app.settings import Settings
from app.store.session import Store
from tests.api.harness import (
    WALL,
    advisory,
    context_of,
    is_problem,
    make_app,
    publish_advisories,
    put_satellite,
)


def test_alive_touches_nothing(sqlite_settings: Settings) -> None:
    app = make_app(sqlite_settings, None)  # type: ignore[arg-type]  (the settings' own database)
    app.state.context.store.close()
    object.__setattr__(app.state.context, "store", None)
    assert TestClient(app).get("/livez").json() == {"status": "alive"}


def test_ready_on_an_empty_register_and_after_a_run(both: TestClient) -> None:
    assert both.get("/readyz").json()["published_run"] is None
    put_satellite(both)
    run = publish_advisories(both, advisory())
    found = both.get("/readyz").json()
    assert (found["published_run"], found["published_run_age_s"]) == (run.id, 0.0)


@pytest.mark.parametrize("published", [True, False])
def test_not_ready_when_the_newest_run_is_too_old_or_overdue(
    make: Callable[..., FastAPI], published: bool
) -> None:
    now = [WALL]
    client = TestClient(make(wall=lambda: now[0]))
    put_satellite(client)
    if published:
        publish_advisories(client, advisory())
    now[0] += timedelta(seconds=172_800)
    assert client.get("/readyz").status_code == 200
    now[0] += timedelta(seconds=1)
    assert is_problem(client.get("/readyz"), 503, type="/problems/not-ready")
    assert "run" in client.get("/readyz").json()["detail"]


def test_not_ready_with_an_older_schema(settings: Settings, store: Store) -> None:
    store.migrate("base")
    client = TestClient(make_app(settings, store))
    assert is_problem(client.get("/readyz"), 503)
    assert "stonechat migrate" in client.get("/readyz").json()["detail"]


def test_metrics_count_by_route_not_by_address(client: TestClient) -> None:
    put_satellite(client)
    client.head("/v1/satellites/kestrel-1")
    client.get("/nowhere/at/all")
    families = {each.name: each for each in text_string_to_metric_families(client.get("/metrics").text)}
    counted = {
        (s.labels["method"], s.labels["route"], s.labels["status"])
        for s in families["stonechat_requests"].samples
        if s.name.endswith("_total")
    }
    assert ("HEAD", "/v1/satellites/{satellite_id}", "200") in counted
    assert ("GET", "unmatched", "404") in counted
    assert families["stonechat_database_up"].samples[0].value == 1.0
    assert families["stonechat_changes"].samples[0].value == 1.0


def test_metrics_survive_a_database_without_tables(settings: Settings, store: Store) -> None:
    store.migrate("base")
    answer = TestClient(make_app(settings, store)).get("/metrics")
    assert "stonechat_database_up 0.0" in answer.text


def test_every_answer_carries_the_security_headers(client: TestClient) -> None:
    for path in ("/livez", "/v1/advisories", "/nope", "/v1/advisories?x=1"):
        headers = client.get(path).headers
        assert headers["x-content-type-options"] == "nosniff"
        assert headers["content-security-policy"].startswith("default-src 'none'")
        assert headers["referrer-policy"] == "no-referrer"


def compute_one(_inputs: object, satellites: list) -> list[SatelliteResult]:  # type: ignore[type-arg]
    return [SatelliteResult(each.spacecraft.id, "failed", "it has no orbit", ()) for each in satellites]


def test_the_application_works_through_the_queue_while_it_runs(make: Callable[..., FastAPI]) -> None:
    app = make(work=True, seams=Seams(compute=compute_one))
    with TestClient(app) as client:
        put_satellite(client)
        address = client.post("/v1/runs").headers["location"]
        while (run := client.get(address).json())["state"] in ("queued", "running"):
            time.sleep(0.05)
    assert run["state"] == "published", run
    assert run["satellites"]["items"] == [
        {"satellite": "kestrel-1", "state": "failed", "reason": "it has no orbit"}
    ]


def test_without_work_a_queued_run_stays_queued(client: TestClient) -> None:
    with client:
        address = client.post("/v1/runs").headers["location"]
    assert client.get(address).json()["state"] == "queued"
    assert context_of(client).settings.connections == 5
