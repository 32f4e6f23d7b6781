"""What holds for every route of the API, whatever is sent to it."""

from __future__ import annotations

import json
import string
from collections.abc import Iterator
from contextlib import ExitStack
from typing import Any
from urllib.parse import parse_qsl, quote, urlencode

import pytest
from fastapi import FastAPI
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from sqlalchemy.engine import URL
from starlette.testclient import TestClient

from app.api import examples
from app.api.app import REAL_COMPUTATIONS
from app.api.openapi import document
from app.api.routes import ROUTERS
from app.settings import load_settings
from app.store.session import open_store
from tests.api.harness import (
    SPAN,
    advisory,
    context_of,
    make_app,
    publish_advisories,
    put_orbit,
    put_satellite,
)
from tests.databases import PostgresqlTemplate, SqliteTemplate

SATELLITE = "kestrel-1"
MANY = settings(
    max_examples=150,
    derandomize=True,
    deadline=None,
    suppress_health_check=[HealthCheck.too_slow, HealthCheck.function_scoped_fixture],
)
MEDIA_TYPES = ["application/json", "application/xml", "text/csv", "text/plain", "image/png", "", ";", "a/b/c"]
WORDS = [
    SATELLITE,
    "PER-2026.kestrel-1",
    "PER",
    "run-1",
    "..",
    "%",
    "\x00",
    "\U0001f6f0",
    "a/b",
    "x" * 300,
    "~",
]
SPAN_PAIRS = parse_qsl(SPAN)
VALUES = [
    *("lee", "attitude", "2026-08-13T02:00:00Z", "2026-08-13T03:00:00Z", "0001-01-01T00:00:00Z"),
    *("9999-12-31T23:59:59Z", "2026-08-13T02:00:00+05:00", "9" * 5_000, "-1", "1e400", "nan", "", "\x00"),
    *("ready", "WyJhIl0", "\ufffd", "60", "aperture", "charge", "2026-W33-4T00:00:00Z", "true"),
]


GENUINE = {"satellite_id": SATELLITE, "advisory_id": "PER-2026.kestrel-1", "code": "PER", "run_id": "run-1"}
NEEDED = {
    "/v1/satellites/{satellite_id}/enhancement": SPAN_PAIRS,
    "/v1/satellites/{satellite_id}/windows": [("kind", "lee"), *SPAN_PAIRS],
}


def described() -> dict[str, Any]:
    """The paths of the API with their calls, known before there is a database."""
    app = FastAPI()
    for router in ROUTERS:
        app.include_router(router)
    found: dict[str, Any] = document(app)["paths"]
    return found


CALLS_BY_PATH = described()


@pytest.fixture(scope="module", params=["sqlite", "postgresql"])
def client(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Iterator[TestClient]:
    """One application for all generated cases, with the real computations; what is registered changes as they go."""
    if request.param == "sqlite":
        sqlite: SqliteTemplate = request.getfixturevalue("sqlite_template")
        context = sqlite.copy(tmp_path_factory.mktemp("contract"))
    else:
        server: PostgresqlTemplate = request.getfixturevalue("postgresql_template")
        context = server.copy()
    with context as url:
        yield from _clients(url)


def _clients(url: URL) -> Iterator[TestClient]:
    chosen = load_settings(
        database_url=url.render_as_string(hide_password=False), executor="serial", workers=0
    )
    with ExitStack() as stack:
        store = stack.enter_context(open_store(chosen))
        app = make_app(chosen, store, computations=REAL_COMPUTATIONS)
        client = stack.enter_context(TestClient(app))
        put_satellite(client)
        put_orbit(client)
        publish_advisories(client, advisory())
        yield client


def check(answer: Any) -> None:
    """No answer blames the server, and every refusal is a problem that says something."""
    assert answer.status_code < 500, answer.text
    assert answer.headers["x-content-type-options"] == "nosniff"
    if answer.status_code >= 400 and answer.request.method != "HEAD":
        body = answer.json()
        assert answer.headers["content-type"] == "application/problem+json"
        assert body["status"] == answer.status_code
        assert body["title"]
        assert body["detail"]
        assert "Traceback" not in answer.text


word = st.one_of(st.sampled_from(WORDS), st.text(max_size=20))
value = st.one_of(st.sampled_from(VALUES), st.text(max_size=30))
json_values = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=10),
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(st.text(max_size=8), inner, max_size=4),
    max_leaves=12,
)


@st.composite
def spoilt(draw: st.DrawFn, sample: Any) -> Any:
    """A sample document with one of its values, at any depth, replaced by anything, or left out."""
    if isinstance(sample, dict) and sample and draw(st.integers(0, 4)):
        name = draw(st.sampled_from(sorted(sample)))
        if not draw(st.integers(0, 5)):
            return {key: value for key, value in sample.items() if key != name}
        return {**sample, name: draw(spoilt(sample[name]))}
    if isinstance(sample, list) and sample and draw(st.integers(0, 4)):
        return [draw(spoilt(sample[0])), *sample[1:]]
    return draw(json_values)


def encoded(text: str) -> str:
    return quote(text.encode("utf-8", "replace"), safe="")


@pytest.mark.parametrize("path", sorted(CALLS_BY_PATH))
@settings(MANY, max_examples=40)
@given(data=st.data())
def test_any_address_and_query(client: TestClient, path: str, data: st.DataObject) -> None:
    known = [
        p["name"] for p in CALLS_BY_PATH[path].get("get", {}).get("parameters", ()) if p["in"] == "query"
    ]
    names = st.sampled_from([*known, "other"]) if known else st.just("other")
    pairs = data.draw(st.lists(st.tuples(names, value), max_size=4, unique_by=lambda pair: pair[0]))
    if data.draw(st.booleans()):
        pairs += [pair for pair in NEEDED.get(path, ()) if pair[0] not in dict(pairs)]
    for name in [part[1:-1] for part in path.split("/") if part.startswith("{")]:
        genuine = data.draw(st.booleans())
        path = path.replace(f"{{{name}}}", GENUINE[name] if genuine else encoded(data.draw(word)) or "x")
    method = data.draw(st.sampled_from(["GET", "GET", "GET", "HEAD", "PUT", "POST", "PATCH", "TRACE"]))
    query = urlencode([(n, v.encode("utf-8", "replace")) for n, v in pairs])
    check(client.request(method, f"{path}?{query}"))


@MANY
@given(raw=st.binary(max_size=40))
def test_any_bytes_in_address_and_query(client: TestClient, raw: bytes) -> None:
    check(client.get(f"/v1/satellites/{quote(raw, safe='')}"))
    check(client.get(f"/v1/advisories?cursor={quote(raw, safe='')}&{quote(raw, safe='')}"))


CALLS = [
    ("PUT", f"/v1/satellites/{SATELLITE}", examples.SATELLITE),
    ("PUT", f"/v1/satellites/{SATELLITE}/orbit", examples.OMM),
    ("POST", "/v1/runs", {**examples.RUN_REQUEST, "satellites": [SATELLITE]}),
    ("POST", "/v1/trials", examples.TRIAL_REQUEST),
]


@pytest.mark.parametrize(("method", "path", "sample"), CALLS, ids=["satellite", "orbit", "run", "trial"])
@MANY
@given(data=st.data())
def test_any_document(client: TestClient, method: str, path: str, sample: Any, data: st.DataObject) -> None:
    document = data.draw(spoilt(sample))
    content = json.dumps(document).encode()  # NaN and Infinity included
    check(client.request(method, path, content=content, headers={"Content-Type": "application/json"}))


@pytest.mark.parametrize(("method", "path", "_sample"), CALLS, ids=["satellite", "orbit", "run", "trial"])
@MANY
@given(content=st.binary(max_size=200), media_type=st.sampled_from(MEDIA_TYPES))
def test_any_bytes_as_a_body(
    client: TestClient, method: str, path: str, _sample: Any, content: bytes, media_type: str
) -> None:
    check(client.request(method, path, content=content, headers={"Content-Type": media_type}))


orbits = st.fixed_dictionaries(
    {
        "MEAN_MOTION": st.floats(0.001, 20.0) | st.sampled_from([0.05, 1.0027, 2.0, 15.5, 17.2]),
        "ECCENTRICITY": st.floats(0.0, 0.9999999),
        "INCLINATION": st.floats(0.0, 180.0),
        "BSTAR": st.floats(-10.0, 10.0) | st.just(0.0),
        "EPOCH": st.sampled_from(["2026-08-12T00:00:00Z", "2026-08-09T18:00:00Z", "1960-01-01T00:00:00Z"]),
    }
)
attitudes = st.sampled_from(
    [{"law": "nadir"}, {"law": "sun"}, {"law": "inertial", "quaternion_xyzw": [0.5, 0.5, 0.5, 0.5]}]
)
faces = st.fixed_dictionaries(
    {
        "name": st.just("f"),
        "normal": st.tuples(st.sampled_from([-1.0, 1.0]), st.floats(-1e6, 1e6), st.floats(-1.0, 1.0)),
        "area_m2": st.floats(1e-300, 1e6),
        "criteria": st.one_of(
            st.builds(lambda m: [{"kind": "mass", "min_mass_g": m}], st.floats(1e-18, 1e4)),
            st.builds(lambda q: [{"kind": "charge", "min_charge_c": q}], st.floats(1e-15, 1e4)),
            st.builds(lambda e: [{"kind": "energy", "min_energy_j": e}], st.floats(1e-12, 1e9)),
            st.builds(
                lambda w: [{"kind": "penetration", "wall_mm": w, "material": "al-6061-t6"}],
                st.floats(1e-3, 1e3),
            ),
        ),
    }
)


@MANY
@given(orbit=orbits, attitude=attitudes, face=faces)
def test_whatever_is_accepted_is_computed_or_refused_with_a_reason(
    client: TestClient, orbit: dict[str, Any], attitude: dict[str, Any], face: dict[str, Any]
) -> None:
    home = "/v1/satellites/extreme"
    taken = client.put(home, json={"faces": [face], "attitude": attitude})
    check(taken)
    check(client.put(f"{home}/orbit", json={**examples.OMM, **orbit}))
    check(client.get(f"{home}/enhancement?{SPAN}&step_s=900"))
    check(client.get(f"{home}/windows?kind=lee&{SPAN}"))


def vector(most: float) -> st.SearchStrategy[list[float]]:
    return st.lists(st.floats(-most, most), min_size=3, max_size=3)


own_streams = st.fixed_dictionaries(
    {
        "code": st.just("XXX"),
        "solar_longitude_peak_deg": st.floats(0.0, 360.0),
        "zhr_peak": st.floats(0.0, 1e7),
        "b_rise_per_deg": st.floats(0.0, 1e4),
        "b_fall_per_deg": st.floats(0.0, 1e4),
        "population_index_r": st.floats(1.31, 6.0),
        "v_geocentric_km_s": st.floats(1.0, 80.0),
        "radiant_ra_deg": st.floats(-360.0, 720.0),
        "radiant_dec_deg": st.floats(-90.0, 90.0),
        "radiant_spread_deg": st.floats(0.0, 10.0),
    }
)


@MANY
@given(r_km=vector(50_000.0), v_km_s=vector(15.0), face=faces, attitude=attitudes, stream=own_streams)
def test_whatever_trial_is_accepted_is_computed(
    client: TestClient, r_km: Any, v_km_s: Any, face: Any, attitude: Any, stream: Any
) -> None:
    states = [{"t": "2026-08-13T02:00:00Z", "r_km": r_km, "v_km_s": v_km_s}]
    trial = {"as_of": "2026-08-10T00:00:00Z", "states": states, "attitude": attitude, "faces": [face]}
    check(client.post("/v1/trials", json={**trial, "streams": [stream]}))


header_text = st.text(alphabet=string.printable.strip() + " \xff\x80", max_size=40).map(str.strip)


@MANY
@given(tags=header_text, media_type=header_text)
def test_any_header(client: TestClient, tags: str, media_type: str) -> None:
    given_tags = tags.encode("latin-1")
    for name in ("If-None-Match", "If-Match", "Accept", "Range", "Content-Type"):
        check(client.get("/v1/advisories", headers={name: given_tags}))
    guarded = {"If-Match": given_tags, "Content-Type": media_type.encode("latin-1")}
    check(client.put(f"/v1/satellites/{SATELLITE}", content=b"{}", headers=guarded))


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
