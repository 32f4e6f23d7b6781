from __future__ import annotations

import pytest
from starlette.testclient import TestClient

from app.api import examples
from tests.api.harness import AS_OF_UNIX_S, is_problem, put_orbit, put_satellite

ADDRESS = "/v1/satellites/kestrel-1/orbit"
# The test case of Spacetrack Report No. 3 (Hoots & Roehrich 1980), checksums added; lines from memory.
TLE = (
    "1 88888U          80275.98708465  .00073094  13844-3  66816-4 0    87\r\n"
    "2 88888  72.8435 115.9689 0086731  52.6988 110.5714 16.05824518  1058\r\n"
)


@pytest.mark.parametrize(
    ("text", "media_type", "source_format"),
    [
        (examples.OMM_KVN, "text/plain", "omm-kvn"),
        (examples.OMM_CSV, "text/csv", "omm-csv"),
        (examples.OMM_XML, "application/xml", "omm-xml"),
        (examples.OMM_XML, "application/vnd.example+xml", "omm-xml"),
        (examples.OMM_XML, "application/octet-stream", "omm-xml"),
    ],
)
def test_every_notation_gives_the_same_orbit(
    client: TestClient, text: str, media_type: str, source_format: str
) -> None:
    put_satellite(client)
    answer = client.put(ADDRESS, content=text, headers={"Content-Type": media_type})
    assert answer.status_code == 200, answer.text
    assert answer.json() == client.get(ADDRESS).json()
    assert (answer.json()["omm"], answer.json()["source_format"]) == (examples.OMM, source_format)


def test_a_two_line_set_is_taken(both: TestClient) -> None:
    put_satellite(both)
    answer = both.put(ADDRESS, content=TLE, headers={"Content-Type": "text/plain; charset=utf-8"})
    assert answer.status_code == 200, answer.text
    assert answer.json()["source_format"] == "tle"
    assert answer.json()["omm"]["MEAN_MOTION"] == 16.05824518
    assert answer.json()["epoch"].startswith("1980-10-01T23:41:24")  # day 275.98708465


def test_the_age_is_that_of_the_last_full_hour(make, sqlite_store) -> None:  # type: ignore[no-untyped-def]
    client = TestClient(make(clock=lambda: AS_OF_UNIX_S + 5_000.0))
    put_satellite(client)
    put_orbit(client)
    found = client.get(ADDRESS).json()
    assert (found["as_of"], found["age_days"]) == ("2026-08-10T01:00:00Z", round(7.0 / 24.0, 3))


def test_one_orbit_at_a_time(client: TestClient) -> None:
    put_satellite(client)
    answer = client.put(ADDRESS, json=[examples.OMM, examples.OMM])
    assert is_problem(answer, 422, detail="file: holds 2 element sets; send exactly one")


@pytest.mark.parametrize(
    ("omm", "where"),
    [
        ({**examples.OMM, "ECCENTRICITY": 1.2}, "ECCENTRICITY"),
        ({**examples.OMM, "REF_FRAME": "ICRF"}, "REF_FRAME"),
        ({name: value for name, value in examples.OMM.items() if name != "EPOCH"}, "EPOCH"),
    ],
)
def test_the_keyword_to_mend_is_named(client: TestClient, omm: dict[str, object], where: str) -> None:
    put_satellite(client)
    assert is_problem(client.put(ADDRESS, json=omm), 422, where=where)


def test_the_line_to_mend_is_named(client: TestClient) -> None:
    put_satellite(client)
    spoilt = TLE.replace("1058\r\n", "1059\r\n")
    answer = client.put(ADDRESS, content=spoilt, headers={"Content-Type": "text/plain"})
    assert is_problem(answer, 422, where="line 2")


def test_an_unknown_media_type_is_refused_with_those_that_are_read(client: TestClient) -> None:
    put_satellite(client)
    answer = client.put(ADDRESS, content="x", headers={"Content-Type": "image/png"})
    assert is_problem(answer, 415)
    assert "text/csv" in answer.json()["detail"]


def test_no_satellite_and_no_orbit_are_told_apart(both: TestClient) -> None:
    assert is_problem(both.put(ADDRESS, json=examples.OMM), 404, detail="there is no satellite 'kestrel-1'")
    put_satellite(both)
    assert is_problem(both.get(ADDRESS), 404)
    assert "no orbit yet" in both.get(ADDRESS).json()["detail"]


def test_if_match_guards_the_orbit_too(client: TestClient) -> None:
    put_satellite(client)
    assert is_problem(client.put(ADDRESS, json=examples.OMM, headers={"If-Match": "*"}), 412)
    put_orbit(client)
    mine = {"If-Match": client.get(ADDRESS).headers["etag"]}
    assert client.put(ADDRESS, json={**examples.OMM, "MEAN_ANOMALY": 1.0}, headers=mine).status_code == 200
    assert is_problem(client.put(ADDRESS, json=examples.OMM, headers=mine), 412)


def test_an_orbit_that_names_another_satellite_is_refused(client: TestClient) -> None:
    put_satellite(client)
    put_satellite(client, "kestrel-2")
    wrong = {**examples.OMM, "OBJECT_NAME": "KESTREL-2"}
    assert is_problem(client.put(ADDRESS, json=wrong), 422, where="OBJECT_NAME")
    assert client.get(ADDRESS).status_code == 404  # nothing was stored
    assert client.put(ADDRESS, json={**examples.OMM, "OBJECT_NAME": "ANOTHER NAME"}).status_code == 200


def test_it_is_said_when_an_older_orbit_replaces_a_newer_one(client: TestClient) -> None:
    put_satellite(client)
    assert client.put(ADDRESS, json=examples.OMM).json()["notes"] == []
    older = {**examples.OMM, "EPOCH": "2026-07-10T00:00:00"}
    (note,) = client.put(ADDRESS, json=older).json()["notes"]
    assert "older than the one it replaces" in note
