"""Fleet files in TOML and JSON; the fleet is invented."""

from __future__ import annotations

import json
import tomllib
from typing import Any

import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from app.core.orbit.elements import MeanElements
from app.core.spacecraft.model import Spacecraft
from app.errors import FileError
from app.formats.fleet import Fleet, read_fleet

ONE = "1 99001U 26012B   26224.87851851  .00002182  00000-0  44063-4 0  9993"
TWO = "2 99001  51.6412 348.7242 0006703 331.7664  19.3264 15.50103472 41363"
TOML = f"""
[[satellites]]
id = "kestrel-1"
name = "Kestrel 1"
faces = [{{name = "aperture", normal = [0, 0, 1], area_m2 = 0.3}}]
orbit.tle = '''
{ONE}
{TWO}
'''

[[satellites]]
id = "kestrel-2"
attitude = {{law = "sun"}}
faces = [{{name = "aperture", normal = [0, 0, 1], area_m2 = 0.3}}]
[satellites.orbit]
OBJECT_NAME = "KESTREL 2"
OBJECT_ID = "2026-012C"
EPOCH = 2026-08-12T23:05:04.0006+02:00
MEAN_MOTION = 15.50103472
ECCENTRICITY = 0.0006703
INCLINATION = 51.6412
RA_OF_ASC_NODE = 348.7242
ARG_OF_PERICENTER = 331.7664
MEAN_ANOMALY = 19.3264

[[satellites]]
id = "kestrel-3"
faces = [{{name = "aperture", normal = [0, 0, 1], area_m2 = 0.3}}]
"""
FACES = [{"name": "f", "normal": [0, 0, 1], "area_m2": 1.0}]


def fleet_of(*entries: object) -> Fleet:
    return read_fleet(json.dumps({"satellites": entries}).encode(), "fleet.json")


def test_toml_with_both_orbit_forms_and_none():
    fleet = read_fleet(TOML.encode(), "fleet.toml")
    assert fleet.refused == []
    assert [spacecraft.id for spacecraft, _ in fleet.satellites] == ["kestrel-1", "kestrel-2", "kestrel-3"]
    first, second, third = [elements for _, elements in fleet.satellites]
    assert first is not None
    assert second is not None
    assert third is None
    assert first.object_id == "2026-012B"
    assert second.epoch_unix_s == pytest.approx(first.epoch_unix_s + 0.0013, abs=1e-3)  # same minute, in UTC


def test_json_gives_the_same_fleet():
    document = tomllib.loads(TOML)
    document["satellites"][1]["orbit"]["EPOCH"] = "2026-08-12T21:05:04.0006Z"
    assert read_fleet(json.dumps(document).encode(), "fleet.json") == read_fleet(TOML.encode(), "fleet.toml")


@pytest.mark.parametrize(
    ("entry", "where", "says"),
    [
        (7, "satellites.1", "a satellite is an object"),
        ({"faces": FACES}, "satellites.1.id", "is missing"),
        ({"id": "good", "faces": FACES}, "satellites.1.id", "'good' appears twice"),
        (
            {"id": "b", "faces": [{**FACES[0], "area_m2": -1}]},
            "satellites.1.faces.0.area_m2",
            "greater than 0",
        ),
        ({"id": "b", "faces": FACES, "orbit": "LEO"}, "satellites.1.orbit", "OMM keywords"),
        ({"id": "b", "faces": FACES, "orbit": {"tle": ONE}}, "line 1", "not followed by its line 2"),
        (
            {"id": "b", "faces": FACES, "orbit": {"tle": f"{ONE}\n{TWO}\n" * 2}},
            "satellites.1.orbit.tle",
            "give one",
        ),
        ({"id": "b", "faces": FACES, "orbit": {"tle": "", "x": 1}}, "satellites.1.orbit", "alone"),
        ({"id": "b", "faces": FACES, "orbit": {}}, "satellites.1.orbit, OBJECT_NAME", "is missing"),
        (
            {"id": "b", "faces": FACES, "orbit": {"EPOCH": []}},
            "satellites.1.orbit, 'EPOCH'",
            "a number or a string",
        ),
    ],
)
def test_a_wrong_entry_is_refused_whole_and_alone(entry: object, where: str, says: str):
    fleet = fleet_of({"id": "good", "faces": FACES}, entry, {"id": "also-good", "faces": FACES})
    assert [spacecraft.id for spacecraft, _ in fleet.satellites] == ["good", "also-good"]
    (refused,) = fleet.refused
    assert refused.where == where
    assert refused.source.startswith("fleet.json")
    assert says in refused.problem


@pytest.mark.parametrize(
    ("data", "where", "says"),
    [
        (b"", "line 1", "empty"),
        (b"\xff\xfe", "byte 1", "UTF-8"),
        (b"{", "line 1", "is not JSON"),
        (b"{}", "satellites", "at least one satellite"),
        (b'{"satellites": []}', "satellites", "at least one satellite"),
        (b'{"satellites": [], "units": 1}', "'units'", "no field here"),
        (b"satellites = 1", "satellites", "a list"),
        (b"id = ", "TOML", "neither TOML nor JSON"),
        (b"id = 1\nid = 2", "TOML", "neither TOML nor JSON"),
        (b"id = 0x" + b"f" * 20_000, "TOML", "more than 64 bits"),
        (b"id = 0001-01-01T00:00:00+12:00", "TOML", "neither TOML nor JSON"),
        (b"x = " + b"[" * 100_000, "line 1", "nested too deeply"),
        (b"# " + b"x" * 9 * 2**20, "size", "split the file"),
    ],
)
def test_a_broken_file_is_one_refusal(data: bytes, where: str, says: str):
    fleet = read_fleet(data, "fleet")
    assert fleet.satellites == []
    (refused,) = fleet.refused
    assert refused.where == where
    assert says in refused.problem


texts = st.text("a\u00e9\u2028\x00\n{[,\U0001f600", max_size=8)


def damaged(text: str) -> st.SearchStrategy[bytes]:
    """Arbitrary bytes put into the middle of a good file: gets past the first look."""
    cut = st.integers(0, len(text))
    return st.builds(lambda i, j, junk: text[:i].encode() + junk + text[j:].encode(), cut, cut, st.binary())


anything: st.SearchStrategy[Any] = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats() | texts,
    lambda s: st.lists(s) | st.dictionaries(texts, s),
)
documents = st.fixed_dictionaries({"satellites": st.lists(anything)}).map(lambda d: json.dumps(d).encode())


@given(st.binary() | damaged(TOML) | documents)
@example(b'{"satellites": [' + b"[" * 900 + b"]" * 900 + b"]}")
@example(b'{"satellites": [{"id": "a", "faces": ' + b"[" * 900 + b"]" * 900 + b"}]}")
@example(b"satellites = [" + b"{a = " * 100 + b"1" + b"}" * 100 + b"]")
def test_any_bytes_give_a_fleet(data: bytes):
    fleet = read_fleet(data, "any.bin")
    assert fleet.satellites or fleet.refused
    for spacecraft, elements in fleet.satellites:
        assert isinstance(spacecraft, Spacecraft)
        assert elements is None or isinstance(elements, MeanElements)
    for error in fleet.refused:
        assert isinstance(error, FileError)
        assert "\n" not in str(error)
        str(error).encode("utf-8")
