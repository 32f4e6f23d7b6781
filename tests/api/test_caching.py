from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import replace

import pytest
from fastapi import FastAPI
from sqlalchemy import event
from sqlalchemy.engine import Engine
from starlette.testclient import TestClient

from app.settings import Settings
from tests.api.harness import (
    AS_OF_UNIX_S,
    CATALOGUE,
    SPAN,
    advisory,
    context_of,
    publish_advisories,
    put_orbit,
    put_satellite,
)

HOME = "/v1/satellites/kestrel-1"
PATHS = [
    "/v1/satellites",
    HOME,
    f"{HOME}/orbit",
    f"{HOME}/enhancement?{SPAN}",
    f"{HOME}/windows?kind=lee&{SPAN}",
    "/v1/advisories",
    "/v1/advisories?level=ready",
    "/v1/advisories/PER-2026.kestrel-1",
    "/v1/advisories/PER-2026.kestrel-1/revisions",
    "/v1/streams",
    "/v1/streams/PER",
    "/v1/runs",
    "/v1/runs/{run}",
]


def fill(client: TestClient) -> str:
    put_satellite(client)
    put_orbit(client)
    return publish_advisories(client, advisory()).id


@pytest.mark.parametrize("path", PATHS)
def test_a_get_that_finds_nothing_new_is_a_304_with_the_headers_of_the_200(
    both: TestClient, path: str
) -> None:
    path = path.replace("{run}", fill(both))
    full = both.get(path)
    assert full.status_code == 200, full.text
    tag = full.headers["etag"]
    assert tag.startswith('"')
    assert full.headers["cache-control"] == "private, no-cache"
    for given in (tag, f"W/{tag}", f'"x", {tag}', "*"):
        short = both.get(path, headers={"If-None-Match": given})
        assert (short.status_code, short.content) == (304, b"")
        for name in ("etag", "cache-control", "vary"):
            assert short.headers[name] == full.headers[name]
    assert both.get(path, headers={"If-None-Match": '"x"'}).status_code == 200


def test_every_address_and_query_has_a_tag_of_its_own(client: TestClient) -> None:
    run = fill(client)
    tags = [client.get(path.replace("{run}", run)).headers["etag"] for path in PATHS]
    assert len(set(tags)) == len(PATHS)


def test_an_error_has_no_tag_and_is_not_kept(client: TestClient) -> None:
    answer = client.get(HOME, headers={"If-None-Match": "*"})
    assert answer.status_code == 404
    assert "etag" not in answer.headers
    assert answer.headers["cache-control"] == "no-store"


@pytest.mark.parametrize("path", PATHS[3:5])
def test_a_computed_answers_tag_follows_satellite_orbit_settings_and_catalogue(
    make: Callable[..., FastAPI], sqlite_settings: Settings, path: str
) -> None:
    client = TestClient(make())
    fill(client)
    tags = [client.get(path).headers["etag"]]
    put_orbit(client, MEAN_ANOMALY=5.0)
    tags.append(client.get(path).headers["etag"])
    client.put(HOME, json={**client.get(HOME).json(), "name": "Other"})
    tags.append(client.get(path).headers["etag"])
    other = make(catalogue=replace(CATALOGUE, digest="e" * 64))
    tags.append(TestClient(other).get(path).headers["etag"])
    context = context_of(client)
    changed = sqlite_settings.model_copy(update={"mass_law": "verniani"})
    client.app.state.context = replace(context, settings=changed)  # type: ignore[attr-defined]
    tags.append(client.get(path).headers["etag"])
    assert len(set(tags)) == len(tags)


def test_the_orbits_tag_lasts_until_its_age_changes(make: Callable[..., FastAPI]) -> None:
    now = [AS_OF_UNIX_S]
    client = TestClient(make(clock=lambda: now[0]))
    put_satellite(client)
    put_orbit(client)
    first = client.get(f"{HOME}/orbit").headers["etag"]
    now[0] += 3_599.0
    assert client.get(f"{HOME}/orbit").headers["etag"] == first
    now[0] += 1.0
    assert client.get(f"{HOME}/orbit").headers["etag"] != first


@contextmanager
def statements(engine: Engine) -> Iterator[list[str]]:
    seen: list[str] = []

    def note(_connection: object, _cursor: object, statement: str, *_: object) -> None:
        seen.append(statement)

    event.listen(engine, "before_cursor_execute", note)
    yield seen
    event.remove(engine, "before_cursor_execute", note)


@pytest.mark.parametrize(
    "path", ["/v1/advisories", "/v1/satellites", "/v1/runs", "/v1/advisories/PER-2026.kestrel-1"]
)
def test_a_poll_that_finds_nothing_new_costs_one_read(both: TestClient, path: str) -> None:
    fill(both)
    known = {"If-None-Match": both.get(path).headers["etag"]}
    with statements(context_of(both).store.engine) as seen:
        assert both.get(path, headers=known).status_code == 304
    reads = [each for each in seen if each.lstrip().upper().startswith("SELECT")]
    assert len(reads) == 1
    assert "changes" in reads[0]
