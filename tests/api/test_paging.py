from __future__ import annotations

import base64
import json
from typing import Any

import pytest
from starlette.testclient import TestClient

from tests.api.harness import advisory, is_problem, publish_advisories, put_satellite

NAMES = [f"kestrel-{i}" for i in range(7)]


def walk(client: TestClient, path: str, limit: int) -> list[list[Any]]:
    """Follow the Link headers from page to page."""
    pages = []
    address: str | None = f"{path}{'&' if '?' in path else '?'}limit={limit}"
    while address:
        answer = client.get(address)
        assert answer.status_code == 200, answer.text
        body = answer.json()
        part = body.get("satellites", body)
        pages.append(part["items"])
        link = answer.links.get("next")
        assert (link is None) == (part["next_cursor"] is None)
        address = link["url"] if link else None
    return pages


@pytest.fixture
def filled(both: TestClient) -> tuple[TestClient, str]:
    for name in NAMES:
        put_satellite(both, name)
    run = publish_advisories(both, *(advisory(name) for name in NAMES))
    for _ in range(6):
        both.post("/v1/runs")
    return both, run.id


@pytest.mark.parametrize("limit", [1, 2, 3, 7, 200])
@pytest.mark.parametrize(
    ("path", "key"),
    [
        ("/v1/satellites", "id"),
        ("/v1/advisories", "id"),
        ("/v1/advisories?stream=PER&level=ready", "id"),
        ("/v1/runs", "id"),
        ("/v1/runs/{run}", "satellite"),
    ],
)
def test_following_the_links_visits_everything_once(
    filled: tuple[TestClient, str], path: str, key: str, limit: int
) -> None:
    client, run = filled
    pages = walk(client, path.replace("{run}", run), limit)
    seen = [item[key] for page in pages for item in page]
    assert len(seen) == len(set(seen)) == 7
    assert {len(page) for page in pages[:-1]} <= {limit}


def test_streams_and_revisions_page_too(client: TestClient) -> None:
    assert [[s["code"] for s in page] for page in walk(client, "/v1/streams", 2)] == [["GEM", "PER"], ["QUA"]]
    put_satellite(client)
    for level in ("ready", "shelter", "ready"):
        publish_advisories(client, advisory(level=level))
    pages = walk(client, "/v1/advisories/PER-2026.kestrel-1/revisions", 2)
    assert [[each["revision"] for each in page] for page in pages] == [[1, 2], [3]]


def test_an_advisory_that_changes_between_two_pages_is_met_again_and_none_is_missed(
    client: TestClient,
) -> None:
    for name in NAMES:
        put_satellite(client, name)
    publish_advisories(client, *(advisory(name) for name in NAMES))
    first = client.get("/v1/advisories?limit=3")
    changed = [advisory(name, level="shelter" if name == NAMES[0] else "ready") for name in NAMES]
    publish_advisories(client, *changed)
    rest = client.get(first.links["next"]["url"].replace("limit=3", "limit=200")).json()["items"]
    seen = [(each["satellite"], each["level"]) for each in first.json()["items"] + rest]
    assert {name for name, _ in seen} == set(NAMES)
    assert (NAMES[0], "shelter") in seen


def cursor(*parts: Any) -> str:
    return base64.urlsafe_b64encode(json.dumps(parts).encode()).decode().rstrip("=")


@pytest.mark.parametrize(
    "bad",
    [
        "",
        "x",
        "%00",
        "====",
        cursor(),
        cursor("00000000", 1, "a"),
        cursor(1),
        "W10",
        "bnVsbA",
        "e" * 401,
        "é",
    ],
)
@pytest.mark.parametrize("path", ["/v1/satellites", "/v1/advisories", "/v1/runs", "/v1/streams"])
def test_a_cursor_that_is_none_is_refused(client: TestClient, path: str, bad: str) -> None:
    assert is_problem(client.get(path, params={"cursor": bad}), 422, field="cursor")


def test_a_cursor_belongs_to_its_list_and_its_filters(client: TestClient) -> None:
    for name in NAMES[:2]:
        put_satellite(client, name)
    publish_advisories(client, *(advisory(name) for name in NAMES[:2]))
    held = client.get("/v1/advisories?limit=1&level=ready").json()["next_cursor"]
    assert client.get(f"/v1/advisories?level=ready&cursor={held}").status_code == 200
    for path in (f"/v1/advisories?cursor={held}", f"/v1/advisories?level=steady&cursor={held}"):
        assert is_problem(client.get(path), 422, field="cursor")
    assert is_problem(client.get(f"/v1/satellites?cursor={held}"), 422, field="cursor")


@pytest.mark.parametrize(
    "key", [(2**63, "a"), (-1, "a"), (True, "a"), (1.0, "a"), (1, "\u0000"), ("a", 1), (1,)]
)
def test_a_forged_key_is_refused_before_the_database_sees_it(both: TestClient, key: tuple[Any, ...]) -> None:
    put_satellite(both)
    put_satellite(both, "kestrel-2")
    publish_advisories(both, advisory(), advisory("kestrel-2"))
    genuine = both.get("/v1/advisories?limit=1").json()["next_cursor"]
    name = json.loads(base64.urlsafe_b64decode(genuine + "=" * (-len(genuine) % 4)))[0]
    answer = both.get("/v1/advisories", params={"cursor": cursor(name, *key)})
    assert is_problem(answer, 422, field="cursor")
