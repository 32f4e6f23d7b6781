"""A satellite's wire format: the fleet file's entry and the body of ``PUT /v1/satellites/{id}``."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeVar

from pydantic import BaseModel

from app.core.spacecraft.model import (
    THRESHOLD_LIMITS,
    AttitudeLaw,
    AttitudeLawKind,
    Criterion,
    CriterionKind,
    Face,
    Joint,
    Policy,
    Spacecraft,
)
from app.errors import FieldError
from app.formats.satellite_schema import (
    AttitudeIn,
    ChargeIn,
    CriterionIn,
    EnergyIn,
    FaceIn,
    JointIn,
    MassIn,
    PenetrationIn,
    PolicyIn,
    SatelliteIn,
    check_id,
)
from app.formats.text import shown
from app.formats.validation import validated

__all__ = [
    "AttitudeIn",
    "CriterionIn",
    "FaceIn",
    "JointIn",
    "PolicyIn",
    "SatelliteIn",
    "from_spacecraft",
    "parse_spacecraft",
    "to_spacecraft",
]

THRESHOLD_FIELDS = {kind: field for kind, (field, _, _) in THRESHOLD_LIMITS.items()}
# Example defaults, not recommendations: a 1 mm aluminium wall, and a charge of a millicoulomb.
DEFAULT_CRITERIA = (
    Criterion(CriterionKind.PENETRATION, 1.0, "al-6061-t6"),
    Criterion(CriterionKind.CHARGE, 1e-3),
)
PARTS: dict[str, type[BaseModel]] = {
    "attitude": AttitudeIn,
    "faces": FaceIn,
    "faces.criteria.penetration": PenetrationIn,
    "faces.criteria.charge": ChargeIn,
    "faces.criteria.energy": EnergyIn,
    "faces.criteria.mass": MassIn,
    "joints": JointIn,
    "policy": PolicyIn,
}
M = TypeVar("M")
T = TypeVar("T")


def parse_spacecraft(data: object) -> Spacecraft:
    """Read one satellite with its ``id``; ``FieldError`` gives the dotted path of the first wrong field."""
    return to_spacecraft(validated(SatelliteIn, data, PARTS))


def to_spacecraft(model: SatelliteIn, id: str | None = None) -> Spacecraft:
    """Make the core's record. ``id`` (from an address) must agree with the body's, when that has one.

    Raises ``FieldError`` with the dotted path for whatever the core refuses.
    """
    satellite_id = _agreed_id(model.id, id)
    return Spacecraft(
        id=satellite_id,
        name=model.name or satellite_id,
        faces=tuple(_at(f"faces.{i}", _face, face) for i, face in enumerate(model.faces)),
        attitude=_attitude(model.attitude),
        joints=tuple(_at(f"joints.{i}", _joint, joint) for i, joint in enumerate(model.joints)),
        policy=Policy(**model.policy.model_dump()),
    )


def from_spacecraft(spacecraft: Spacecraft) -> dict[str, Any]:
    """Write the wire format with every default spelt out; ``parse_spacecraft`` reads it back."""
    attitude: dict[str, Any] = {"law": spacecraft.attitude.kind.value}
    if spacecraft.attitude.quaternion_xyzw is not None:
        attitude["quaternion_xyzw"] = list(spacecraft.attitude.quaternion_xyzw)
    policy = spacecraft.policy
    return {
        "id": spacecraft.id,
        "name": spacecraft.name,
        "attitude": attitude,
        "faces": [_face_dict(face) for face in spacecraft.faces],
        "joints": [
            {"name": joint.name, "axis": list(joint.axis), "sun_normal": list(joint.sun_normal)}
            for joint in spacecraft.joints
        ],
        "policy": {name: getattr(policy, name) for name in PolicyIn.model_fields},
    }


def _face_dict(face: Face) -> dict[str, Any]:
    return {
        "name": face.name,
        "normal": list(face.normal),
        "area_m2": face.area_m2,
        "sensitive": face.sensitive,
        "weight": face.weight,
        "joint": face.joint,
        "criteria": [_criterion_dict(criterion) for criterion in face.criteria],
    }


def _criterion_dict(criterion: Criterion) -> dict[str, Any]:
    result: dict[str, Any] = {
        "kind": criterion.kind.value,
        THRESHOLD_FIELDS[criterion.kind]: criterion.threshold,
        "label": criterion.label,
    }
    if criterion.material is not None:
        result["material"] = criterion.material
    return result


def _agreed_id(in_body: str | None, given: str | None) -> str:
    chosen = in_body if given is None else given
    if chosen is None:
        raise FieldError("id", "is missing")
    if in_body is not None and in_body != chosen:
        raise FieldError("id", f"is {shown(in_body)}, the address says {shown(given)}; make them agree")
    try:
        return check_id(chosen)
    except ValueError as error:
        raise FieldError("id", str(error)) from None


def _attitude(model: AttitudeIn) -> AttitudeLaw:
    quaternion = model.quaternion_xyzw
    if quaternion is None:
        return AttitudeLaw(AttitudeLawKind(model.law))
    x, y, z, w = quaternion
    return AttitudeLaw(AttitudeLawKind(model.law), (x, y, z, w))


def _face(model: FaceIn) -> Face:
    x, y, z = model.normal
    criteria = tuple(_criterion(each) for each in model.criteria or ())
    return Face(
        name=model.name,
        normal=(x, y, z),
        area_m2=model.area_m2,
        criteria=criteria or DEFAULT_CRITERIA,
        sensitive=model.sensitive,
        weight=model.weight,
        joint=model.joint,
    )


def _criterion(model: CriterionIn) -> Criterion:
    kind = CriterionKind(model.kind)
    material = model.material if isinstance(model, PenetrationIn) else None
    return Criterion(kind, getattr(model, THRESHOLD_FIELDS[kind]), material, model.label or "")


def _joint(model: JointIn) -> Joint:
    (ax, ay, az), (sx, sy, sz) = model.axis, model.sun_normal
    return Joint(model.name, (ax, ay, az), (sx, sy, sz))


def _at(path: str, make: Callable[[M], T], model: M) -> T:
    """Make a core record; a refused field's path becomes ``path`` and the field's own name."""
    try:
        return make(model)
    except FieldError as error:
        raise FieldError(f"{path}.{error.field.rpartition('.')[2]}", error.problem) from None
