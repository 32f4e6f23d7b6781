"""Loading files into the register, on both databases."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given
from hypothesis import settings as profile
from hypothesis import strategies as st

from app.commands.load import BATCH, Line, is_fleet, load_files
from app.store.fleet import current_orbit, get_satellite, list_satellites, orbit_history, put_satellite
from app.store.session import Store
from tests.samples import spacecraft

FACE = {"name": "front", "normal": [1, 0, 0], "area_m2": 1.0}
OLDER, NEWER = "2026-08-08T00:00:00Z", "2026-08-09T00:00:00Z"


def message(
    name: str = "Kestrel", object_id: str = "2026-900A", epoch: str = NEWER, **more: Any
) -> dict[str, Any]:
    return {
        "OBJECT_NAME": name,
        "OBJECT_ID": object_id,
        "EPOCH": epoch,
        "MEAN_MOTION": 15.0,
        "ECCENTRICITY": 0.001,
        "INCLINATION": 51.6,
        "RA_OF_ASC_NODE": 10.0,
        "ARG_OF_PERICENTER": 20.0,
        "MEAN_ANOMALY": 30.0,
        **more,
    }


def load(store: Store, folder: Path, document: object, name: str = "given.json") -> list[Line]:
    path = folder / name
    path.write_text(json.dumps(document), encoding="utf-8")
    return list(load_files(store, [path]))


def register(store: Store, *members: tuple[str, str]) -> None:
    with store.write() as session:
        for satellite_id, name in members:
            put_satellite(session, spacecraft(satellite_id, name))


def epoch_in_use(store: Store, satellite_id: str) -> float:
    with store.read() as session:
        return current_orbit(session, satellite_id).elements.epoch_unix_s


def test_takes_what_is_right_and_reports_what_is_not(store: Store, tmp_path: Path) -> None:
    wrong = {"id": "b", "faces": [{**FACE, "area_m2": -1.0}]}
    lines = load(store, tmp_path, {"satellites": [{"id": "a", "faces": [FACE]}, wrong]})
    assert [line.refused for line in lines] == [False, True]
    assert "satellites.1.faces" in lines[1].text
    with store.read() as session:
        assert get_satellite(session, "a").id == "a"


def test_a_fleet_file_may_carry_orbits(store: Store, tmp_path: Path) -> None:
    lines = load(store, tmp_path, {"satellites": [{"id": "a", "faces": [FACE], "orbit": message()}]})
    assert [line.text.split(": ", 1)[1] for line in lines] == [
        "satellite 'a' registered",
        f"orbit of 'a', epoch {NEWER}, taken",
    ]


def test_an_entry_with_a_wrong_orbit_is_refused_whole(store: Store, tmp_path: Path) -> None:
    entry = {"id": "a", "faces": [FACE], "orbit": message(ECCENTRICITY=1.2)}
    lines = load(store, tmp_path, {"satellites": [entry]})
    assert [line.refused for line in lines] == [True]
    assert load(store, tmp_path, message("a"))[0].refused  # nothing of it was registered


def test_says_what_changed(store: Store, tmp_path: Path) -> None:
    first = {"satellites": [{"id": "a", "faces": [FACE]}]}
    other = {"satellites": [{"id": "a", "faces": [FACE], "name": "Alder"}]}
    states = [load(store, tmp_path, each)[0].text.rsplit(" ", 1)[1] for each in (first, first, other)]
    assert states == ["registered", "unchanged", "replaced"]


@pytest.mark.parametrize(
    ("name", "object_id"),
    [
        ("KESTREL", "2026-900A"),
        ("kestrel-1", "2026-900A"),
        ("something", "Kestrel"),
        (" Kestrel ", "2026-900A"),
    ],
)
def test_an_orbit_finds_its_satellite_by_id_or_name(
    store: Store, tmp_path: Path, name: str, object_id: str
) -> None:
    register(store, ("kestrel-1", "Kestrel"), ("merlin-1", "Merlin"))
    (line,) = load(store, tmp_path, message(name, object_id))
    assert not line.refused
    assert "'kestrel-1'" in line.text


def test_an_orbit_of_nobody_is_refused_with_the_remedy(store: Store, tmp_path: Path) -> None:
    register(store, ("kestrel-1", "Kestrel"))
    (line,) = load(store, tmp_path, message("Merlin"))
    assert line.refused
    assert "'Merlin' (2026-900A) fits no registered satellite; register one" in line.text


@pytest.mark.parametrize(
    ("members", "given_name", "given_id"),
    [
        ([("a", "Twin"), ("b", "Twin")], "twin", "2026-900A"),
        ([("a", "Ash"), ("ash", "Beech")], "Ash", "2026-900A"),
        ([("a", "Ash"), ("b", "Beech")], "Ash", "b"),
    ],
)
def test_an_orbit_that_could_be_two_satellites_is_not_guessed(
    store: Store, tmp_path: Path, members: list[tuple[str, str]], given_name: str, given_id: str
) -> None:
    register(store, *members)
    (line,) = load(store, tmp_path, message(given_name, given_id))
    assert line.refused
    assert f"fits several satellites: {members[0][0]}, {members[1][0]}" in line.text


@pytest.mark.parametrize("order", [(OLDER, NEWER), (NEWER, OLDER)])
def test_of_several_sets_the_newest_is_used(store: Store, tmp_path: Path, order: tuple[str, str]) -> None:
    register(store, ("kestrel-1", "Kestrel"))
    sets = [message(epoch=each) for each in order]
    texts = [line.text for line in load(store, tmp_path, sets)]
    assert [NEWER in texts[0], "taken" in texts[0]] == [True, True]
    assert [OLDER in texts[1], "passed over" in texts[1]] == [True, True]
    assert "unchanged" in load(store, tmp_path, sets)[0].text
    with store.read() as session:
        assert len(orbit_history(session, "kestrel-1")) == 1


def test_says_when_an_older_orbit_replaces_a_newer_one(store: Store, tmp_path: Path) -> None:
    register(store, ("kestrel-1", "Kestrel"))
    load(store, tmp_path, message(epoch=NEWER))
    newer_unix_s = epoch_in_use(store, "kestrel-1")
    (line,) = load(store, tmp_path, message(epoch=OLDER))
    assert f"taken; it is OLDER than the one it replaces, of epoch {NEWER}" in line.text
    assert epoch_in_use(store, "kestrel-1") < newer_unix_s


def test_a_file_that_cannot_be_read_does_not_stop_the_others(store: Store, tmp_path: Path) -> None:
    good = tmp_path / "good.json"
    good.write_text(json.dumps({"satellites": [{"id": "a", "faces": [FACE]}]}), encoding="utf-8")
    lines = list(load_files(store, [tmp_path / "missing.toml", tmp_path, good]))
    assert [line.refused for line in lines] == [True, True, False]
    assert lines[0].text == f"{tmp_path / 'missing.toml'}: No such file or directory"


def test_a_large_fleet_is_stored_batch_by_batch(store: Store, tmp_path: Path) -> None:
    members = [{"id": f"s{number}", "faces": [FACE]} for number in range(2 * BATCH + 1)]
    path = tmp_path / "fleet.json"
    path.write_text(json.dumps({"satellites": members}), encoding="utf-8")
    told = load_files(store, [path])
    assert "'s0' registered" in next(told).text
    with store.read() as session:
        assert len(list_satellites(session, limit=len(members))) == BATCH
    assert len(list(told)) == len(members) - 1


def test_an_ephemeris_is_refused_by_its_name(store: Store, tmp_path: Path) -> None:
    path = tmp_path / "track.kvn"
    path.write_text("CCSDS_OEM_VERS = 2.0\nCREATION_DATE = 2026-08-09T00:00:00\n", encoding="utf-8")
    (line,) = load_files(store, [path])
    assert line.refused
    assert "OEM" in line.text


@pytest.mark.parametrize(
    ("name", "text", "fleet"),
    [
        ("a.toml", "", True),
        ("a.json", '{"satellites": []}', True),
        ("a.json", '\ufeff \n{\n "satellites": []}', True),
        ("a", "# ours\n[[satellites]]\nid = 'a'\n", True),
        ("a", "[[ satellites ]]\nid = 'a'\n", True),
        ("a", "satellites = []", True),
        ("a.json", json.dumps(message()), False),
        ("a.json", json.dumps([message("satellites")]), False),
        ("a.csv", "OBJECT_NAME,EPOCH\nsatellites = 1,2026\n", False),
        ("a", "", False),
    ],
)
def test_tells_a_fleet_from_orbits(name: str, text: str, fleet: bool) -> None:
    assert is_fleet(Path(name), text.encode()) is fleet


@pytest.mark.parametrize("database_url", ["sqlite"], indirect=True)
@given(
    data=st.binary(max_size=80),
    start=st.sampled_from(["", "{", "[", "<", "1 ", "CCSDS_OMM_VERS = 2.0\n", "[["]),
)
@profile(
    max_examples=100,
    derandomize=True,
    deadline=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
def test_any_bytes_are_refused_in_one_line_each(
    store: Store, tmp_path: Path, start: str, data: bytes
) -> None:
    path = tmp_path / "any"
    path.write_bytes(start.encode() + data)
    lines = list(load_files(store, [path]))
    assert lines
    assert all(line.refused and str(path) in line.text and line.text.isprintable() for line in lines)
