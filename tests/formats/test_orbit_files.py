"""Dispatch by content, the store's canonical form and the API's OMM object, and hostile bytes."""

from __future__ import annotations

import json
import math
from dataclasses import replace
from typing import Any

import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from app.core.orbit.elements import MeanElements
from app.errors import FieldError, FileError
from app.formats.omm import read_omm
from app.formats.orbit import elements_from_dict, elements_to_dict, omm_object, read_orbits

ELEMENTS = MeanElements(
    "Kestrel 1", "2026-012B", 2461264.5, 0.87851851, 15.5, 0.00067, 51.64, 348.7, 331.8, 19.3
)
TLE = """KESTREL 1
1 99001U 26012B   26224.87851851  .00002182  00000-0  44063-4 0  9993
2 99001  51.6412 348.7242 0006703 331.7664  19.3264 15.50103472 41363
"""
OMM = json.dumps(omm_object(ELEMENTS))

numbers = st.floats(-1.0, 1.0)
elements = st.builds(
    MeanElements,
    object_name=st.just("Kestrel 1"),
    object_id=st.sampled_from(["", "2026-012B"]),
    epoch_jd=st.integers(0, 80_000).map(lambda day: 2435839.5 + day),
    epoch_fraction=st.floats(1e-3, 1.0, exclude_max=True),
    mean_motion_rev_per_day=st.floats(0.001, 20.0),
    eccentricity=st.floats(0.0, 0.9999999),
    inclination_deg=st.floats(0.0, 180.0),
    raan_deg=st.floats(-360.0, 360.0),
    arg_perigee_deg=st.floats(-360.0, 360.0),
    mean_anomaly_deg=st.floats(-360.0, 360.0),
    bstar_per_earth_radius=numbers,
    mean_motion_dot_rev_per_day2=numbers,
    mean_motion_ddot_rev_per_day3=numbers,
)


@pytest.mark.parametrize(
    ("text", "content_type"),
    [
        (TLE, None),
        (TLE, "text/plain; charset=utf-8"),
        (OMM, "application/json"),
        (OMM, "application/octet-stream"),
        (f"[{OMM}]", "application/vnd.example+json"),
    ],
)
def test_format_is_found_by_content_type_or_content(text: str, content_type: str | None):
    (result,) = read_orbits(text.encode(), "kestrel", content_type)
    assert isinstance(result, MeanElements)
    assert result.object_name.upper() == "KESTREL 1"


@pytest.mark.parametrize(
    ("text", "content_type", "says"),
    [
        (OMM, "image/png", "send one of application/json"),
        (TLE, "application/json", "is not JSON"),
        (OMM, "text/xml", "is not XML"),
        (
            "CCSDS_OEM_VERS = 3.0\nMETA_START\n",
            None,
            "OEM ephemerides are not read by this version; give an OMM or TLE",
        ),
        ("<ndm><oem/></ndm>", None, "OEM ephemerides are not read by this version; give an OMM or TLE"),
        ("hello", None, "holds no element set"),
        ("", None, "empty"),
    ],
)
def test_what_cannot_be_read_says_so(text: str, content_type: str | None, says: str):
    (result,) = read_orbits(text.encode(), "kestrel", content_type)
    assert isinstance(result, FileError)
    assert says in result.problem


@given(elements)
def test_canonical_form_survives_json_bit_for_bit(each: MeanElements):
    assert elements_from_dict(json.loads(json.dumps(elements_to_dict(each)))) == each


@given(elements)
def test_the_written_omm_object_reads_back_bit_for_bit(each: MeanElements):
    assert read_omm(json.dumps(omm_object(each)).encode(), "own.json") == [each]


@pytest.mark.parametrize(
    ("change", "field"),
    [
        ({"raan_deg": "12"}, "raan_deg"),
        ({"raan_deg": True}, "raan_deg"),
        ({"raan_deg": math.nan}, "raan_deg"),
        ({"bstar_per_earth_radius": 10**400}, "bstar_per_earth_radius"),
        ({"eccentricity": 1.0}, "eccentricity"),
        ({"object_name": "a\nb"}, "object_name"),
        ({"mass_kg": 1.0}, "'mass_kg'"),
    ],
)
def test_wrong_canonical_field_is_named(change: dict[str, Any], field: str):
    with pytest.raises(FieldError) as caught:
        elements_from_dict({**elements_to_dict(ELEMENTS), **change})
    assert caught.value.field == field


def test_missing_canonical_field_is_named():
    wanting = {k: v for k, v in elements_to_dict(ELEMENTS).items() if k != "epoch_jd"}
    with pytest.raises(FieldError, match="epoch_jd: is missing"):
        elements_from_dict(wanting)


def test_an_unnamed_object_id_is_written_as_unknown():
    assert omm_object(replace(ELEMENTS, object_id=""))["OBJECT_ID"] == "UNKNOWN"


texts = st.text("a\u00e9\u2028\x00\n{[,\U0001f600", max_size=8)


def damaged(text: str) -> st.SearchStrategy[bytes]:
    """Arbitrary bytes put into the middle of a good file: gets past the first look."""
    cut = st.integers(0, len(text))
    return st.builds(lambda i, j, junk: text[:i].encode() + junk + text[j:].encode(), cut, cut, st.binary())


@given(st.binary() | damaged(TLE) | damaged(OMM) | texts.map(str.encode), st.sampled_from([None, "text/csv"]))
@example(b"[" * 200_000, None)
@example(b"[" * 900 + b"]" * 900, None)
@example(b'{"a":' * 900 + b"1" + b"}" * 900, None)
@example(b"<a>" * 100_000, None)
@example(b"<a>" * 2000 + b"</a>" * 2000, None)
@example(b'<?xml version="1.0" encoding="utf-16"?><omm/>', None)
@example(b'<?xml version="1.0" encoding="no-such"?><omm/>', None)
@example(b"<omm>\x00</omm>", None)
@example(b'EPOCH,X\n"' + b"x" * 200_000, None)
@example(b"EPOCH,X\n\x00,\r1", "text/csv")
def test_any_bytes_give_elements_or_file_errors(data: bytes, content_type: str | None):
    results = read_orbits(data, "any.bin", content_type)
    assert results or data
    for result in results:
        assert isinstance(result, MeanElements | FileError)
        assert "\n" not in str(result)
        str(result).encode("utf-8")
