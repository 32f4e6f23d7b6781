from __future__ import annotations

from starlette.testclient import TestClient

from tests.api.harness import is_problem


def test_streams_are_listed_by_code_with_every_values_source(client: TestClient) -> None:
    items = client.get("/v1/streams").json()["items"]
    assert [each["code"] for each in items] == ["GEM", "PER", "QUA"]
    assert items[1]["components"] == [
        {"zhr_peak": {"value": 100.0, "source": "invented", "provenance": "memory"}}
    ]
    assert [each["enabled"] for each in items] == [False, True, False]


def test_one_stream(client: TestClient) -> None:
    assert client.get("/v1/streams/PER").json()["name"] == "Stream PER"
    assert is_problem(client.get("/v1/streams/per"), 404)
    assert is_problem(client.get("/v1/streams/%00"), 404)
