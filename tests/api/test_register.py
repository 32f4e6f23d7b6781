from __future__ import annotations

import pytest
from starlette.testclient import TestClient

from app.formats.satellite import from_spacecraft, parse_spacecraft
from tests.api.harness import SATELLITE, is_problem, put_satellite

ADDRESS = "/v1/satellites/kestrel-1"


def test_a_satellite_is_registered_replaced_and_given_back_with_every_default(both: TestClient) -> None:
    first = both.put(ADDRESS, json=SATELLITE)
    assert (first.status_code, first.headers["location"]) == (201, ADDRESS)
    second = both.put(ADDRESS, json={**SATELLITE, "name": "Other"})
    assert second.status_code == 200
    assert "location" not in second.headers
    found = both.get(ADDRESS).json()
    assert found == second.json() == from_spacecraft(parse_spacecraft(found))
    assert found["name"] == "Other"


def test_what_is_read_can_be_written_back_and_changes_nothing(client: TestClient) -> None:
    put_satellite(client)
    before = client.get(ADDRESS)
    assert client.put(ADDRESS, json=before.json()).status_code == 200
    assert client.get(ADDRESS).headers["etag"] == before.headers["etag"]


def test_a_removed_satellite_is_gone(both: TestClient) -> None:
    put_satellite(both)
    assert both.delete(ADDRESS).status_code == 204
    assert is_problem(both.get(ADDRESS), 404, detail="there is no satellite 'kestrel-1'")
    assert is_problem(both.delete(ADDRESS), 404)
    assert both.get("/v1/satellites").json() == {"items": [], "next_cursor": None}


@pytest.mark.parametrize(
    ("change", "field"),
    [
        ({"faces": []}, "faces"),
        ({"colour": "red"}, "colour"),
        ({"faces": [{**SATELLITE["faces"][0], "area_m2": -1.0}]}, "faces.0.area_m2"),
        ({"policy": {"ready_at": 3.0}}, "policy"),
        ({"id": "kestrel-2"}, "id"),
    ],
)
def test_a_wrong_field_is_named(client: TestClient, change: dict[str, object], field: str) -> None:
    assert is_problem(client.put(ADDRESS, json={**SATELLITE, **change}), 422, field=field)


@pytest.mark.parametrize("name", ["Kestrel", "a b", "-x", "x" * 65, "%00", "%F0%9F%9B%B0"])
def test_an_id_that_cannot_be_one_is_refused_on_writing_and_unknown_on_reading(
    both: TestClient, name: str
) -> None:
    assert is_problem(both.put(f"/v1/satellites/{name}", json=SATELLITE), 422, field="id")
    assert is_problem(both.get(f"/v1/satellites/{name}"), 404)
    assert is_problem(both.delete(f"/v1/satellites/{name}"), 404)


def test_if_match_guards_against_overwriting_another_change(both: TestClient) -> None:
    put_satellite(both)
    mine = {"If-Match": both.get(ADDRESS).headers["etag"]}
    assert both.put(ADDRESS, json={**SATELLITE, "name": "First"}, headers=mine).status_code == 200
    assert is_problem(both.put(ADDRESS, json={**SATELLITE, "name": "Second"}, headers=mine), 412)
    assert is_problem(both.delete(ADDRESS, headers=mine), 412)
    assert both.get(ADDRESS).json()["name"] == "First"


def test_another_satellites_change_does_not_break_if_match(client: TestClient) -> None:
    put_satellite(client)
    mine = {"If-Match": client.get(ADDRESS).headers["etag"]}
    put_satellite(client, "kestrel-2")
    assert client.put(ADDRESS, json={**SATELLITE, "name": "Mine"}, headers=mine).status_code == 200


def test_if_none_match_star_registers_only_what_is_not_there(client: TestClient) -> None:
    absent = {"If-None-Match": "*"}
    assert client.put(ADDRESS, json=SATELLITE, headers=absent).status_code == 201
    assert is_problem(client.put(ADDRESS, json=SATELLITE, headers=absent), 412)
    assert is_problem(client.put("/v1/satellites/new", json=SATELLITE, headers={"If-Match": "*"}), 412)
