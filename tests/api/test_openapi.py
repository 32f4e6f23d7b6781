from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import jsonschema
import pytest
from starlette.testclient import TestClient

from app.api.docs import SAMPLES
from tests.api.harness import SPAN, advisory, publish_advisories, put_orbit, put_satellite

NOUNS = {"/v1/satellites", "/v1/advisories", "/v1/streams", "/v1/runs", "/v1/trials"}
HOME = "/v1/satellites/{satellite_id}"


def operations(openapi: dict[str, Any]) -> Iterator[tuple[str, str, dict[str, Any]]]:
    for path, calls in openapi["paths"].items():
        for method, call in calls.items():
            yield path, method, call


def contents(call: dict[str, Any]) -> Iterator[tuple[str, dict[str, Any]]]:
    """Every body of an operation, sent or answered, with its media type."""
    yield from call.get("requestBody", {}).get("content", {}).items()
    for answer in call["responses"].values():
        yield from answer.get("content", {}).items()


def check(openapi: dict[str, Any], schema: dict[str, Any], document: Any) -> None:
    """Validate against a schema of the description (JSON Schema 2020-12, which OpenAPI 3.1 uses)."""
    whole = {**schema, "components": openapi["components"]}
    jsonschema.Draft202012Validator(whole).validate(document)


@pytest.fixture
def openapi(client: TestClient) -> dict[str, Any]:
    found: dict[str, Any] = client.get("/openapi.json").json()
    return found


def test_the_description_is_whole(openapi: dict[str, Any]) -> None:
    assert openapi["openapi"].startswith("3.1")
    assert set(openapi["paths"]) >= NOUNS
    for schema in openapi["components"]["schemas"].values():
        jsonschema.Draft202012Validator.check_schema(schema)


def test_every_operation_has_examples_and_they_fit_their_schemas(openapi: dict[str, Any]) -> None:
    for path, method, call in operations(openapi):
        assert call["description"], (path, method)
        shown = [part for _, part in contents(call) if "example" in part]
        assert shown or "204" in call["responses"], (path, method)
        for part in shown:
            check(openapi, part["schema"], part["example"])
        for answer in ("200", "201", "202"):
            for part in call["responses"].get(answer, {}).get("content", {}).values():
                assert "example" in part, (path, method)
        if "requestBody" in call:
            assert all("example" in part for part in call["requestBody"]["content"].values())


def test_every_path_parameter_has_an_example(openapi: dict[str, Any]) -> None:
    for path, method, call in operations(openapi):
        for parameter in call.get("parameters", ()):
            if parameter["in"] == "path":
                assert parameter["schema"]["examples"], (path, method)


def test_errors_are_problems_and_the_frameworks_own_schema_is_gone(openapi: dict[str, Any]) -> None:
    assert not {"HTTPValidationError", "ValidationError"} & set(openapi["components"]["schemas"])
    for path, method, call in operations(openapi):
        for status, answer in call["responses"].items():
            if status == "default" or int(status) >= 400:
                assert list(answer["content"]) == ["application/problem+json"], (path, method, status)


@pytest.mark.parametrize("status", sorted(SAMPLES))
def test_a_sample_problem_has_the_status_it_stands_for(status: int) -> None:
    assert SAMPLES[status][0].status == status


def test_the_request_examples_are_accepted_and_the_answers_fit(
    client: TestClient, openapi: dict[str, Any]
) -> None:
    """Send each example as a client would; also the orbit in each of its notations."""
    put_satellite(client)
    put_satellite(client, "kestrel-2")
    for path, method, call in operations(openapi):
        for media_type, part in call.get("requestBody", {}).get("content", {}).items():
            address = path.replace("{satellite_id}", "kestrel-1")
            body = {"json": part["example"]} if "json" in media_type else {"content": part["example"]}
            answer = client.request(method, address, headers={"Content-Type": media_type}, **body)
            described = call["responses"][str(answer.status_code)]
            assert answer.status_code < 300, answer.text
            check(openapi, described["content"]["application/json"]["schema"], answer.json())


def test_every_answer_to_a_get_fits_its_schema(client: TestClient, openapi: dict[str, Any]) -> None:
    put_satellite(client)
    put_orbit(client)
    names = {"satellite_id": "kestrel-1", "advisory_id": "PER-2026.kestrel-1", "code": "PER"}
    names["run_id"] = publish_advisories(client, advisory()).id
    queries = {f"{HOME}/enhancement": SPAN, f"{HOME}/windows": f"kind=lee&{SPAN}"}
    for path, method, call in operations(openapi):
        if method == "get" and path not in ("/metrics", "/openapi.json"):
            answer = client.get(f"{path.format(**names)}?{queries.get(path, '')}")
            assert answer.status_code == 200, answer.text
            check(openapi, call["responses"]["200"]["content"]["application/json"]["schema"], answer.json())
            problem = client.get(f"{path.format(**names)}?nonsense=1")
            check(openapi, {"$ref": "#/components/schemas/Problem"}, problem.json())
