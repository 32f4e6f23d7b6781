"""Whatever bytes, addresses, queries, headers or documents are sent, no answer blames the server."""

from __future__ import annotations

import json
import string
from collections.abc import Iterator
from typing import Any
from urllib.parse import parse_qsl, quote, urlencode

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from starlette.testclient import TestClient

from app.api import examples
from tests.api.any_database import BOTH, MANY, SATELLITE, check, described, lasting_client
from tests.api.harness import SPAN

CALLS_BY_PATH = described()
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


@pytest.fixture(scope="module", params=BOTH)
def client(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Iterator[TestClient]:
    with lasting_client(request, tmp_path_factory) as lasting:
        yield lasting


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


header_text = st.text(alphabet=string.printable.strip() + " \xff\x80", max_size=40).map(str.strip)


@MANY
@given(tags=header_text, media_type=header_text)
def test_any_header(client: TestClient, tags: str, media_type: str) -> None:
    given_tags = tags.encode("latin-1")
    for name in ("If-None-Match", "If-Match", "Accept", "Range", "Content-Type", "Host", "X-Forwarded-Host"):
        check(client.get("/v1/advisories", headers={name: given_tags}))
    guarded = {"If-Match": given_tags, "Content-Type": media_type.encode("latin-1")}
    check(client.put(f"/v1/satellites/{SATELLITE}", content=b"{}", headers=guarded))
