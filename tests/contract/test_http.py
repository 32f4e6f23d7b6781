"""What holds for every route: HEAD, entity tags, times, the caution."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import pytest
from starlette.testclient import TestClient

from app.api import examples
from tests.api.any_database import BOTH, SATELLITE, described, lasting_client
from tests.api.harness import SPAN, context_of

CALLS_BY_PATH = described()


@pytest.fixture(scope="module", params=BOTH)
def client(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Iterator[TestClient]:
    with lasting_client(request, tmp_path_factory) as lasting:
        yield lasting


def gets(client: TestClient) -> Iterator[str]:
    client.put(f"/v1/satellites/{SATELLITE}", json=examples.SATELLITE)
    client.put(f"/v1/satellites/{SATELLITE}/orbit", json=examples.OMM)
    run = client.get("/v1/runs").json()["items"][-1]["id"]
    names = {"satellite_id": SATELLITE, "advisory_id": "PER-2026.kestrel-1", "code": "PER", "run_id": run}
    for path in sorted(CALLS_BY_PATH):
        query = f"?{SPAN}" if path.endswith("enhancement") else ""
        yield path.format(**names) + (f"?kind=lee&{SPAN}" if path.endswith("windows") else query)
    yield "/v1/satellites/nobody"
    yield "/nowhere"


def test_every_get_answers_head_with_the_same_headers_and_no_body(client: TestClient) -> None:
    for address in gets(client):
        full, short = client.get(address), client.head(address)
        assert (short.status_code, short.content) == (full.status_code, b"")
        if address == "/metrics":  # its length follows what has been counted meanwhile
            del full.headers["content-length"], short.headers["content-length"]
        assert dict(short.headers) == dict(full.headers), address


def test_every_get_under_v1_has_a_strong_tag_and_honours_it(client: TestClient) -> None:
    found = [each for each in gets(client) if each.startswith("/v1/") and "nobody" not in each]
    answers = [(each, client.get(each)) for each in found]
    readable = [(each, full) for each, full in answers if full.status_code == 200]
    assert len(readable) == len(found) - 1  # all but /v1/trials, which takes POST alone
    for address, full in readable:
        assert full.headers["etag"].startswith('"')
        known = {"If-None-Match": full.headers["etag"]}
        assert client.get(address, headers=known).status_code == 304
        assert client.head(address, headers=known).status_code == 304


def times_and_numbers(document: Any, name: str = "") -> Iterator[tuple[str, Any]]:
    if isinstance(document, dict):
        for key, value in document.items():
            yield from times_and_numbers(value, key)
    elif isinstance(document, list):
        for value in document:
            yield from times_and_numbers(value, name)
    else:
        yield name, document


TIMES = {
    *(
        "as_of",
        "issued_at",
        "onset",
        "peak_at",
        "end",
        "start",
        "times",
        "epoch",
        "orbit_epoch",
        "plan_until",
    ),
    *("received_at", "requested_at", "started_at", "finished_at"),
}


def test_times_end_in_z(client: TestClient) -> None:
    seen = set()
    for address in gets(client):
        if address.startswith("/v1/"):
            for name, value in times_and_numbers(client.get(address).json()):
                if name in TIMES and value is not None:
                    assert value.endswith("Z"), (address, name, value)
                    seen.add(name)
    assert {"as_of", "onset", "times", "epoch", "requested_at"} <= seen


@pytest.mark.parametrize(
    "path", ["advisories/PER-2026.kestrel-1", f"satellites/{SATELLITE}/enhancement?{SPAN}"]
)
def test_the_caution_goes_with_the_advice(client: TestClient, path: str) -> None:
    assert "crewed" in client.get(f"/v1/{path}").json()["caution"]
    assert context_of(client).settings.executor == "serial"
