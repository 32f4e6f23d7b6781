from __future__ import annotations

import pytest
from starlette.testclient import TestClient

from tests.api.harness import advisory, is_problem, publish_advisories, put_satellite


@pytest.fixture
def filled(both: TestClient) -> TestClient:
    for name in ("kestrel-1", "kestrel-2"):
        put_satellite(both, name)
    publish_advisories(
        both,
        advisory("kestrel-1", "PER-2026", level="shelter"),
        advisory("kestrel-1", "GEM-2026"),
        advisory("kestrel-2", "PER-2026"),
    )
    return both


@pytest.mark.parametrize(
    ("query", "ids"),
    [
        ("", {"PER-2026.kestrel-1", "GEM-2026.kestrel-1", "PER-2026.kestrel-2"}),
        ("satellite=kestrel-1", {"PER-2026.kestrel-1", "GEM-2026.kestrel-1"}),
        ("stream=PER", {"PER-2026.kestrel-1", "PER-2026.kestrel-2"}),
        ("level=shelter", {"PER-2026.kestrel-1"}),
        ("level=steady", set()),
        ("status=withdrawn", set()),
        ("changed_since=2026-08-10T06:00:00Z&satellite=kestrel-2", {"PER-2026.kestrel-2"}),
        ("changed_since=2026-08-10T06:00:01Z", set()),
    ],
)
def test_filters(filled: TestClient, query: str, ids: set[str]) -> None:
    answer = filled.get(f"/v1/advisories?{query}")
    assert {each["id"] for each in answer.json()["items"]} == ids


@pytest.mark.parametrize(
    ("query", "field"),
    [
        ("satellite=%00", "satellite"),
        ("stream=", "stream"),
        ("level=red", "level"),
        ("changed_since=today", "changed_since"),
        ("limit=0", "limit"),
    ],
)
def test_a_wrong_filter_is_named(both: TestClient, query: str, field: str) -> None:
    assert is_problem(both.get(f"/v1/advisories?{query}"), 422, field=field)


def test_an_advisory_and_its_revisions(filled: TestClient) -> None:
    bodies = (
        advisory("kestrel-1", "PER-2026", level="ready"),
        advisory("kestrel-1", "GEM-2026"),
        advisory("kestrel-2", "PER-2026"),
    )
    publish_advisories(filled, *bodies)
    latest = filled.get("/v1/advisories/PER-2026.kestrel-1").json()
    assert (latest["revision"], latest["status"], latest["level"]) == (2, "current", "ready")
    assert latest["changes"] == [{"what": "level", "text": "Level went from shelter to ready."}]
    history = filled.get("/v1/advisories/PER-2026.kestrel-1/revisions").json()["items"]
    assert [(each["revision"], each["status"]) for each in history] == [(1, "superseded"), (2, "current")]


def test_removing_a_satellite_withdraws_its_advisories(filled: TestClient) -> None:
    filled.delete("/v1/satellites/kestrel-2")
    assert filled.get("/v1/advisories/PER-2026.kestrel-2").json()["status"] == "withdrawn"
    withdrawn = filled.get("/v1/advisories?status=withdrawn").json()["items"]
    assert [each["id"] for each in withdrawn] == ["PER-2026.kestrel-2"]


@pytest.mark.parametrize("name", ["PER-2026.nobody", "%00", "x" * 300, "%FF%FE"])
def test_unknown_advisories_are_not_found(both: TestClient, name: str) -> None:
    assert is_problem(both.get(f"/v1/advisories/{name}"), 404)
    assert is_problem(both.get(f"/v1/advisories/{name}/revisions"), 404)


@pytest.mark.parametrize("query", ["satellite=kestrel-9", "stream=XYZ"])
def test_a_name_nobody_bears_is_refused_not_taken_for_all_clear(client: TestClient, query: str) -> None:
    assert is_problem(client.get(f"/v1/advisories?{query}"), 422, field=query.partition("=")[0])
