from __future__ import annotations

from collections.abc import Callable

from fastapi import FastAPI
from starlette.testclient import TestClient

from app.catalogue_file import load_catalogue
from tests.api.harness import is_problem


def test_streams_are_listed_by_code_those_that_are_off_included(client: TestClient) -> None:
    items = client.get("/v1/streams").json()["items"]
    assert [(each["code"], each["enabled"]) for each in items] == [
        ("GEM", False),
        ("PER", True),
        ("QUA", False),
    ]


def test_every_value_of_the_real_catalogue_has_its_source(make: Callable[..., FastAPI]) -> None:
    catalogue = load_catalogue()
    client = TestClient(make(catalogue=catalogue))
    items = client.get("/v1/streams?limit=200").json()["items"]
    assert {each["code"] for each in items} == {entry.code for entry in catalogue.entries}
    values = [value for each in items for row in each["components"] for value in row.values()]
    assert len(values) > 500
    assert all(value["citation"] and value["source"] and value["provenance"] for value in values)
    assert all(each["why_off"] for each in items if not each["enabled"])


def test_one_stream(client: TestClient) -> None:
    assert client.get("/v1/streams/PER").json()["name"] == "Stream PER"
    assert is_problem(client.get("/v1/streams/per"), 404)
    assert is_problem(client.get("/v1/streams/%00"), 404)
