"""The API behind a real server on the loopback interface, from registration to advisories."""

from __future__ import annotations

import socket
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import httpx
import pytest
import uvicorn
from fastapi import FastAPI

from app.api import examples
from app.api.app import create_app
from app.settings import load_settings
from app.store.session import open_store
from tests.api.harness import AS_OF_UNIX_S, SATELLITE
from tests.databases import SqliteTemplate

POLLS = 1_200  # of a twentieth of a second; a run that never ends fails the test rather than hang it
HOME = "/v1/satellites/kestrel-1"


@contextmanager
def served(app: FastAPI) -> Iterator[str]:
    """Serve on a free port of the loopback interface; give the address."""
    with socket.socket() as listener:
        listener.bind(("127.0.0.1", 0))
        server = uvicorn.Server(uvicorn.Config(app, log_config=None, lifespan="on"))
        thread = threading.Thread(target=server.run, kwargs={"sockets": [listener]})
        thread.start()
        try:
            yield f"http://127.0.0.1:{listener.getsockname()[1]}"
        finally:
            server.should_exit = True
            thread.join()


@pytest.fixture
def client(sqlite_template: SqliteTemplate, tmp_path: Path) -> Iterator[httpx.Client]:
    with sqlite_template.copy(tmp_path) as url:
        text = url.render_as_string(hide_password=False)
        settings = load_settings(database_url=text, executor="serial", workers=0, outlook_days=60.0)
        with open_store(settings) as store:
            app = create_app(settings, store, work=True, clock=lambda: AS_OF_UNIX_S)
            with served(app) as address, httpx.Client(base_url=address, timeout=60.0) as client:
                yield client


def finished(client: httpx.Client, address: str) -> dict[str, object]:
    for _ in range(POLLS):
        run: dict[str, object] = client.get(address).json()
        if run["state"] not in ("queued", "running"):
            return run
        time.sleep(0.05)
    raise AssertionError(f"{address} does not end")


def test_from_registration_to_advisories(client: httpx.Client) -> None:
    assert client.get("/readyz").status_code == 200
    assert client.put(HOME, json=SATELLITE).status_code == 201
    assert client.put(f"{HOME}/orbit", json=examples.OMM).status_code == 200
    asked = client.post("/v1/runs")
    assert asked.status_code == 202
    run = finished(client, asked.headers["location"])
    assert (run["state"], run["computed"]) == ("published", 1), run

    found = client.get("/v1/advisories?stream=PER").json()["items"]
    assert [each["id"] for each in found] == ["PER-2026.kestrel-1"]
    # The Perseids peak near solar longitude 140.0 (IMO meteor shower calendar), in 2026 on 13 August (UTC).
    assert found[0]["peak_at"].startswith("2026-08-13T")
    assert set(examples.ADVISORY) >= set(found[0]), "document the new fields"
    assert set(found[0]) >= set(examples.ADVISORY), "these fields are gone"

    span = f"from={found[0]['peak_at']}&to=2026-08-13T20:00:00Z"
    series = client.get(f"{HOME}/enhancement?{span}&step_s=300&criterion=charge").json()
    assert max(series["faces"][0]["mid"]) > 1.0
    windows = client.get(f"{HOME}/windows?kind=lee&{span}").json()["windows"]
    assert windows
    assert all(window["start"] < window["end"] for window in windows)


def test_the_server_itself_keeps_to_the_contract(client: httpx.Client) -> None:
    full, short = client.get("/v1/advisories"), client.head("/v1/advisories")
    assert (short.status_code, short.content) == (200, b"")
    assert short.headers["content-length"] == full.headers["content-length"]
    known = {"If-None-Match": full.headers["etag"]}
    assert client.get("/v1/advisories", headers=known).status_code == 304
    large = client.post("/v1/trials", content=b" " * 2_000_000, headers={"Content-Type": "application/json"})
    assert (large.status_code, large.headers["content-type"]) == (413, "application/problem+json")
    assert client.get("/v1/satellites/%00%ff").json()["status"] == 404
