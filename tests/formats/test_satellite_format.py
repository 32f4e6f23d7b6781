"""The wire format of a satellite; the operator and its satellites are invented."""

from __future__ import annotations

import json
from typing import Any

import jsonschema
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.core.spacecraft.model import AttitudeLawKind, Criterion, CriterionKind, Spacecraft
from app.errors import FieldError
from app.formats.satellite import SatelliteIn, from_spacecraft, parse_spacecraft, to_spacecraft

FULL: dict[str, Any] = {
    "id": "kestrel-1",
    "name": "Kestrel 1",
    "attitude": {"law": "inertial", "quaternion_xyzw": [0, 0, 0, 1]},
    "faces": [
        {
            "name": "aperture",
            "normal": [0, 0, 1],
            "area_m2": 0.3,
            "sensitive": True,
            "weight": 2.0,
            "joint": None,
            "criteria": [
                {"kind": "penetration", "wall_mm": 0.5, "material": "al-2024-t3"},
                {"kind": "charge", "min_charge_c": 1e-6, "label": "sensor upset"},
                {"kind": "energy", "min_energy_j": 1.0},
                {"kind": "mass", "min_mass_g": 1e-6},
            ],
        },
        {"name": "panel", "normal": [1, 0, 0], "area_m2": 4, "joint": "array"},
    ],
    "joints": [{"name": "array", "axis": [0, 1, 0], "sun_normal": [0, 0, 1]}],
    "policy": {"ready_at": 1.4, "shelter_at": 2, "min_expected_impacts": 0.0, "min_lee_s": 90},
}
SHORT: dict[str, Any] = {"id": "k", "faces": [{"name": "f", "normal": [0, 0, 1], "area_m2": 1}]}


def put(path: str, value: object) -> dict[str, Any]:
    """Copy FULL with the value at a dotted path replaced."""
    document = json.loads(json.dumps(FULL))
    at: Any = document
    *steps, last = [int(step) if step.isdigit() else step for step in path.split(".")]
    for step in steps:
        at = at[step]
    at[last] = value
    return document  # type: ignore[no-any-return]


def test_every_field_arrives():
    spacecraft = parse_spacecraft(FULL)
    aperture, panel = spacecraft.faces
    assert (spacecraft.id, spacecraft.name) == ("kestrel-1", "Kestrel 1")
    assert spacecraft.attitude.kind is AttitudeLawKind.INERTIAL
    assert (aperture.area_m2, aperture.sensitive, aperture.weight) == (0.3, True, 2.0)
    assert aperture.criteria[1] == Criterion(CriterionKind.CHARGE, 1e-6, label="sensor upset")
    assert panel.joint == spacecraft.joints[0].name == "array"
    assert (spacecraft.policy.ready_at, spacecraft.policy.min_lee_s) == (1.4, 90.0)


def test_defaults_are_both_harms_nadir_and_the_example_policy():
    spacecraft = parse_spacecraft(SHORT)
    assert spacecraft.name == "k"
    assert spacecraft.attitude.kind is AttitudeLawKind.NADIR
    assert spacecraft.faces[0].criteria == (
        Criterion(CriterionKind.PENETRATION, 1.0, "al-6061-t6"),
        Criterion(CriterionKind.CHARGE, 1e-3),
    )


@pytest.mark.parametrize("document", [FULL, SHORT])
def test_written_form_is_explicit_json_and_reads_back(document: dict[str, Any]):
    spacecraft = parse_spacecraft(document)
    written = json.loads(json.dumps(from_spacecraft(spacecraft)))
    assert parse_spacecraft(written) == spacecraft
    assert set(written) == set(SatelliteIn.model_fields)
    assert all(len(face["criteria"]) >= 2 for face in written["faces"])


vectors = st.tuples(*[st.floats(-10, 10)] * 3).filter(lambda v: sum(x * x for x in v) > 1e-6)


@given(vectors)
def test_unit_vectors_read_back_within_a_rounding(vector: tuple[float, float, float]):
    first = parse_spacecraft(put("faces.0.normal", list(vector)))
    again = parse_spacecraft(from_spacecraft(first))
    assert again.faces[0].normal == pytest.approx(first.faces[0].normal, abs=1e-15)


@pytest.mark.parametrize(
    ("path", "value", "field", "says"),
    [
        ("id", "Kestrel", "id", "use 1 to 64 of"),
        ("id", "-k", "id", "use 1 to 64 of"),
        ("id", "k" * 65, "id", "use 1 to 64 of"),
        ("id", "kestrel-1\n", "id", "use 1 to 64 of"),
        ("colour", "red", "colour", "allowed are id, name, attitude, faces, joints, policy"),
        ("name", "a\tb", "name", "control characters"),
        ("faces", [], "faces", "at least 1 item"),
        ("faces.0.mass_kg", 1, "faces.0.mass_kg", "allowed are name, normal, area_m2"),
        ("faces.0.area_m2", "0.3", "faces.0.area_m2", "is '0.3'; it should be a valid number"),
        ("faces.0.area_m2", 0, "faces.0.area_m2", "greater than 0"),
        ("faces.0.area_m2", True, "faces.0.area_m2", "valid number"),
        ("faces.0.area_m2", float("nan"), "faces.0.area_m2", "finite"),
        ("faces.0.area_m2", 10**400, "faces.0.area_m2", "number"),
        ("faces.0.normal", [0, 0], "faces.0.normal", "at least 3 items"),
        ("faces.0.normal", [0, 0, 0], "faces.0.normal", "not zero"),
        ("faces.0.normal", [1e200, 1e200, 0], "faces.0.normal", "finite vector"),
        ("faces.0.sensitive", "yes", "faces.0.sensitive", "boolean"),
        ("faces.0.joint", "wing", "faces.aperture.joint", "no joint named 'wing'"),
        ("faces.0.criteria", [], "faces.0.criteria", "at least 1 item"),
        (
            "faces.0.criteria.0.kind",
            "dent",
            "faces.0.criteria.0",
            "choose one of penetration, charge, energy, mass",
        ),
        ("faces.0.criteria.0.material", "tin", "faces.0.criteria.0.material", "choose one of al-6061-t6"),
        ("faces.0.criteria.0.wall_mm", 0, "faces.0.criteria.0.wall_mm", "greater than or equal to 0.001"),
        (
            "faces.0.criteria.0.min_mass_g",
            1,
            "faces.0.criteria.0.min_mass_g",
            "allowed are kind, wall_mm, material",
        ),
        ("faces.0.criteria.1.label", "energy", "faces.0.criteria", "two criteria share a label"),
        ("faces.1.name", "aperture", "faces", "two faces share a name"),
        ("joints.0.axis", [0, 0, 2], "joints.0.sun_normal", "along the joint's own axis"),
        ("attitude.law", "spin", "attitude.law", "'nadir', 'sun' or 'inertial'"),
        ("attitude.law", "sun", "attitude.quaternion_xyzw", "only for that law"),
        ("attitude.quaternion_xyzw", [0, 0, 0, 2], "attitude.quaternion_xyzw", "its norm is 2"),
        ("policy.ready_at", 3, "policy", "1 < ready_at < shelter_at"),
        ("policy.min_lee_s", -1, "policy.min_lee_s", "zero or more"),
    ],
)
def test_wrong_field_is_named_with_what_is_allowed(path: str, value: object, field: str, says: str):
    with pytest.raises(FieldError) as caught:
        parse_spacecraft(put(path, value))
    assert caught.value.field == field
    assert says in caught.value.problem


@pytest.mark.parametrize("document", [None, 7, "x", [], [FULL], {}])
def test_what_is_no_satellite_is_refused(document: object):
    with pytest.raises(FieldError):
        parse_spacecraft(document)


def test_id_may_come_from_the_address_and_must_agree():
    model = SatelliteIn.model_validate({k: v for k, v in FULL.items() if k != "id"})
    assert to_spacecraft(model, "merlin-2").id == "merlin-2"
    with pytest.raises(FieldError, match="id: is missing"):
        to_spacecraft(model)
    with pytest.raises(FieldError, match="use 1 to 64 of"):
        to_spacecraft(model, "Merlin 2")
    with pytest.raises(FieldError, match="make them agree"):
        to_spacecraft(SatelliteIn.model_validate(FULL), "merlin-2")


def test_published_schema_accepts_what_the_reader_accepts():
    schema = SatelliteIn.model_json_schema()
    jsonschema.validate(FULL, schema)
    jsonschema.validate(from_spacecraft(parse_spacecraft(SHORT)), schema)
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(put("faces.0.criteria.0.material", "tin"), schema)


values = st.recursive(st.none() | st.text("a\n", max_size=3) | st.floats(), st.lists, max_leaves=4)


@given(st.dictionaries(st.sampled_from([*FULL, "x"]), values, max_size=2))
def test_any_json_gives_a_spacecraft_or_a_field_error(document: dict[str, Any]):
    try:
        result: object = parse_spacecraft({**FULL, **document})
    except FieldError as error:
        result = str(error)
    assert isinstance(result, Spacecraft) or "\n" not in str(result)
