from __future__ import annotations

import gzip
from collections.abc import Callable, Iterator
from typing import Any

import pytest
from fastapi import FastAPI
from sqlalchemy.exc import OperationalError
from starlette.testclient import TestClient

from app.api.bodies import MAX_BODY_BYTES
from tests.api.harness import FAKES, is_problem

JSON = {"Content-Type": "application/json"}


@pytest.mark.parametrize(
    "path", ["/", "/v1", "/v1/", "/v1/satellites/", "/v1/predictions/x", "/docs", "/redoc"]
)
def test_an_unknown_address_is_a_problem(client: TestClient, path: str) -> None:
    assert is_problem(client.get(path), 404)


@pytest.mark.parametrize(
    ("method", "path", "allowed"),
    [
        ("POST", "/v1/satellites/x", "DELETE, GET, HEAD, PUT"),
        ("GET", "/v1/trials", "POST"),
        ("PATCH", "/v1/runs", "GET, HEAD, POST"),
        ("OPTIONS", "/livez", "GET, HEAD"),
        ("BREW", "/v1/advisories", "GET, HEAD"),
    ],
)
def test_a_wrong_method_is_told_the_right_ones(
    client: TestClient, method: str, path: str, allowed: str
) -> None:
    answer = client.request(method, path)
    assert is_problem(answer, 405)
    assert answer.headers["allow"] == allowed


@pytest.mark.parametrize("media_type", [None, "", "text/plain", "application/x-www-form-urlencoded", "é;;"])
def test_a_json_body_must_say_that_it_is_one(client: TestClient, media_type: str | None) -> None:
    headers = {} if media_type is None else {"Content-Type": media_type.encode("latin-1")}
    assert is_problem(client.post("/v1/trials", content=b"{}", headers=headers), 415)


@pytest.mark.parametrize(
    "content",
    [
        b"",
        b"{",
        b'{"a": NaN}',
        b'{"a": 1e999}',
        b'{"a": 1, "a": 2}',
        b'{"a": "\\ud800"}',
        b"\xff\xfe",
        b"[" * 100_000,
        b'{"a":' * 50_000,
        b'{"a": ' + b"9" * 10_000 + b"}",
        gzip.compress(b"{}", mtime=0),
    ],
)
def test_a_body_that_is_no_json_is_refused(client: TestClient, content: bytes) -> None:
    answer = client.post("/v1/trials", content=content, headers=JSON)
    assert is_problem(answer, 422)
    assert answer.json()["where"]


@pytest.mark.parametrize("depth", [21, 200, 900, 935, 960, 995])
def test_a_body_nested_more_deeply_than_needed_is_refused(client: TestClient, depth: int) -> None:
    content = b'{"orbit":' * depth + b"1" + b"}" * depth
    answer = client.post("/v1/trials", content=content, headers=JSON)
    assert is_problem(answer, 422)
    assert "nested" in answer.json()["detail"]


def test_a_body_that_is_too_large_is_refused_with_and_without_a_declared_length(client: TestClient) -> None:
    content = b" " * (MAX_BODY_BYTES + 1)

    def parts() -> Iterator[bytes]:
        for start in range(0, len(content), 65_536):
            yield content[start : start + 65_536]

    assert is_problem(client.post("/v1/trials", content=content, headers=JSON), 413)
    assert is_problem(client.post("/v1/trials", content=parts(), headers=JSON), 413)
    lying = {**JSON, "Content-Length": "9" * 5_000}
    assert is_problem(client.post("/v1/trials", content=b"{", headers=lying), 422)


@pytest.mark.parametrize("query", ["page=1", "limit=1&limit=2", "=1", "x%00y=1", "%FF=1", "a" * 500 + "=1"])
def test_unknown_and_repeated_parameters_are_refused_by_name(client: TestClient, query: str) -> None:
    for path in ("/v1/advisories", "/v1/runs/x"):
        answer = client.get(f"{path}?{query}")
        assert is_problem(answer, 422)
        assert answer.json()["field"]


@pytest.mark.parametrize("path", ["/livez", "/v1/streams/PER", "/openapi.json", "/v1/satellites/x"])
def test_a_route_without_parameters_takes_none(client: TestClient, path: str) -> None:
    assert is_problem(client.get(f"{path}?verbose=1"), 422, field="verbose")


def test_a_bug_is_a_500_that_shows_nothing_of_the_inside(make: Callable[..., FastAPI]) -> None:
    def broken(*_: Any) -> dict[str, Any]:
        raise ZeroDivisionError("secret")

    client = TestClient(make(computations=type(FAKES)(FAKES.series, FAKES.lee_windows, broken)))
    answer = client.post("/v1/trials", json={})
    assert is_problem(answer, 500)
    assert "secret" not in answer.text
    assert "Error" not in answer.text
    assert answer.headers["x-content-type-options"] == "nosniff"
    assert 'status="500"' in client.get("/metrics").text


def test_a_number_that_is_not_finite_never_leaves(make: Callable[..., FastAPI]) -> None:
    def infinite(*_: Any) -> dict[str, Any]:
        return {"states": [{"factor": float("inf")}]}

    client = TestClient(make(computations=type(FAKES)(FAKES.series, FAKES.lee_windows, infinite)))
    assert is_problem(client.post("/v1/trials", json={}), 500)


def test_a_database_that_is_away_is_a_503_to_try_again(make: Callable[..., FastAPI]) -> None:
    def away(*_: Any) -> dict[str, Any]:
        raise OperationalError("SELECT secret", {}, Exception("gone"))

    client = TestClient(make(computations=type(FAKES)(FAKES.series, FAKES.lee_windows, away)))
    answer = client.post("/v1/trials", json={})
    assert is_problem(answer, 503, type="/problems/unavailable")
    assert answer.headers["retry-after"] == "5"
    assert "secret" not in answer.text


@pytest.mark.parametrize("host", ["[", "[::1", "a/b?c#d", "x" * 5_000, ""])
def test_a_strange_host_changes_nothing(client: TestClient, host: str) -> None:
    for path in ("/v1/advisories", "/v1/streams?limit=1", "/readyz"):
        usual, strange = client.get(path), client.get(path, headers={"Host": host})
        assert (strange.status_code, strange.content) == (200, usual.content)
        assert strange.headers.get("etag") == usual.headers.get("etag")
        assert strange.headers.get("link") == usual.headers.get("link")
