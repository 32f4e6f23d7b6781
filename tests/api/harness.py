"""Invented computations, a small invented catalogue, and shortcuts for tests of the API."""

from __future__ import annotations

from datetime import UTC, datetime
from typing import Any

import numpy as np
from fastapi import FastAPI
from starlette.testclient import TestClient

from app.api import examples
from app.api.app import create_app
from app.api.deps import Computations, Context
from app.core.streams.model import Catalogue, CatalogueEntry, Component, Stream
from app.errors import FieldError
from app.on_demand import Series
from app.pipeline import Registered, RunInputs, SatelliteResult
from app.settings import Settings
from app.store.runs import RunRecord, start_run
from app.store.session import Store
from app.store.staging import publish, stage

AS_OF_UNIX_S = 1_786_320_000.0  # 2026-08-10T00:00:00Z
WALL = datetime(2026, 8, 10, 6, 0, tzinfo=UTC)
SPAN = "from=2026-08-13T02:00:00Z&to=2026-08-13T03:00:00Z"
SATELLITE = {name: value for name, value in examples.SATELLITE.items() if name != "id"}
PER = Stream("PER", "Perseids", (Component("main", 140.0, 100.0, 0.2, 0.2),), 2.2, 59.1, 48.0, 58.0)


def entry(code: str) -> CatalogueEntry:
    values = ({"zhr_peak": {"value": 100.0, "source": "IMO18", "provenance": "read"}},)
    stream = PER if code == "PER" else None
    return CatalogueEntry(code, f"Stream {code}", "A", stream is not None, None, stream, values)


CATALOGUE = Catalogue(tuple(entry(code) for code in ("PER", "GEM", "QUA")), "d" * 64)


def fake_series(inputs: RunInputs, satellite: Registered, start: float, end: float, step_s: float) -> Series:
    """A factor of 2 on the first row; the other rows have no background."""
    unix_s = np.arange(start, end + 1.0, step_s)
    rows = tuple((f.name, c.label) for f in satellite.spacecraft.faces for c in f.criteria)
    labels = tuple(dict.fromkeys(label for _, label in rows))
    excess = np.full((len(rows), 1, len(unix_s)), np.inf)
    excess[0] = 1.0
    whole = np.ones((len(labels), 1, len(unix_s)))
    return Series(
        unix_s,
        ("PER",),
        rows,
        1.0 + excess.sum(axis=1),
        excess,
        labels,
        1.0 + whole.sum(axis=1),
        whole,
        np.zeros(len(rows)),
        np.full((1, len(unix_s)), 97.0),
        np.zeros((1, len(unix_s)), dtype=bool),
    )


def fake_windows(inputs: RunInputs, satellite: Registered, start: float, end: float) -> list[dict[str, Any]]:
    return [examples.LEE_WINDOW]


def fake_trial(document: object, catalogue: Catalogue, law: str) -> dict[str, Any]:
    if not isinstance(document, dict) or "faces" not in document:
        raise FieldError("faces", "is missing")
    return {"states": examples.TRIAL["states"]}


FAKES = Computations(fake_series, fake_windows, fake_trial)


def make_app(settings: Settings, store: Store, **more: Any) -> FastAPI:
    given = {
        "catalogue": CATALOGUE,
        "computations": FAKES,
        "clock": lambda: AS_OF_UNIX_S,
        "wall": lambda: WALL,
    }
    return create_app(settings, store, **{**given, **more})


def context_of(client: TestClient) -> Context:
    context: Context = client.app.state.context  # type: ignore[attr-defined]
    return context


def put_satellite(client: TestClient, satellite_id: str = "kestrel-1", **more: Any) -> None:
    answer = client.put(f"/v1/satellites/{satellite_id}", json={**SATELLITE, **more})
    assert answer.status_code == 201, answer.text


def put_orbit(client: TestClient, satellite_id: str = "kestrel-1", **more: Any) -> None:
    answer = client.put(f"/v1/satellites/{satellite_id}/orbit", json={**examples.OMM, **more})
    assert answer.status_code == 200, answer.text


def advisory(satellite_id: str = "kestrel-1", passage: str = "PER-2026", **more: Any) -> dict[str, Any]:
    """An advisory as a run makes it."""
    made = {name: v for name, v in examples.ADVISORY.items() if name not in ("revision", "status", "changes")}
    names = {"id": f"{passage}.{satellite_id}", "satellite": satellite_id, "passage": passage}
    return {**made, **names, "stream": passage.split("-")[0], **more}


def publish_advisories(client: TestClient, *bodies: dict[str, Any]) -> RunRecord:
    """Publish a run over the whole register; a satellite without a body has failed."""
    context = context_of(client)
    run = start_run(context.store, AS_OF_UNIX_S, clock=context.wall)
    satellites = sorted({body["satellite"] for body in bodies})
    results = [
        SatelliteResult(each, "computed", None, tuple(b for b in bodies if b["satellite"] == each))
        for each in satellites
    ]
    stage(context.store, run, results)
    return publish(context.store, run, clock=context.wall)


def is_problem(answer: Any, status: int, **members: str) -> bool:
    """Check that an answer is a problem document with these members."""
    body = answer.json()
    assert answer.status_code == body["status"] == status, answer.text
    assert answer.headers["content-type"] == "application/problem+json"
    assert body["type"].startswith("/problems/")
    assert body["title"]
    assert body["detail"]
    assert {name: body.get(name) for name in members} == members
    return True
