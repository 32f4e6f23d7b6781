"""The fields of a satellite in JSON or TOML: what may be there, of what type, within what limits."""

from __future__ import annotations

import re
from typing import Annotated, Any, Literal

from pydantic import AfterValidator, BaseModel, ConfigDict, Field

from app.core.exposure.damage import MATERIALS
from app.core.spacecraft.model import THRESHOLD_LIMITS, CriterionKind, Policy
from app.formats.text import name_problem, shown

ID_PATTERN = r"^[a-z0-9][a-z0-9._-]{0,63}$"
MAX_FACES = 256
MAX_CRITERIA = 16
MAX_JOINTS = 64


def _name(text: str) -> str:
    problem = name_problem(text)
    if problem:
        raise ValueError(problem)
    return text


def check_id(text: str) -> str:
    """Return a satellite's id as it is; ``ValueError`` says what it may be."""
    if not re.fullmatch(ID_PATTERN, text):
        allowed = "use 1 to 64 of a-z, 0-9, '.', '_', '-', starting with a letter or digit"
        raise ValueError(f"is {shown(text)}; {allowed}")
    return text


def _material(text: str) -> str:
    if text not in MATERIALS:
        raise ValueError(f"{shown(text)} is not known; choose one of {', '.join(MATERIALS)}")
    return text


def _limits(kind: CriterionKind) -> Any:
    _, low, high = THRESHOLD_LIMITS[kind]
    return Field(ge=low, le=high)


Name = Annotated[str, AfterValidator(_name)]
Material = Annotated[str, AfterValidator(_material), Field(json_schema_extra={"enum": [*MATERIALS]})]
SatelliteId = Annotated[str, AfterValidator(check_id), Field(json_schema_extra={"pattern": ID_PATTERN})]
Components3 = Annotated[list[float], Field(min_length=3, max_length=3)]
Components4 = Annotated[list[float], Field(min_length=4, max_length=4)]


class _Strict(BaseModel):
    model_config = ConfigDict(extra="forbid", strict=True, allow_inf_nan=False, frozen=True)


class PenetrationIn(_Strict):
    """The wall is perforated."""

    kind: Literal["penetration"]
    wall_mm: float = _limits(CriterionKind.PENETRATION)
    material: Material
    label: Name | None = None


class ChargeIn(_Strict):
    """The impact plasma carries at least this charge."""

    kind: Literal["charge"]
    min_charge_c: float = _limits(CriterionKind.CHARGE)
    label: Name | None = None


class EnergyIn(_Strict):
    """The particle has at least this kinetic energy."""

    kind: Literal["energy"]
    min_energy_j: float = _limits(CriterionKind.ENERGY)
    label: Name | None = None


class MassIn(_Strict):
    """The particle has at least this mass."""

    kind: Literal["mass"]
    min_mass_g: float = _limits(CriterionKind.MASS)
    label: Name | None = None


CriterionIn = Annotated[PenetrationIn | ChargeIn | EnergyIn | MassIn, Field(discriminator="kind")]


class FaceIn(_Strict):
    """A flat outer surface; ``normal`` points outward in body axes and need not be of unit length.

    ``weight`` is kept for the attitude advice of a later version; nothing computed now depends on it.
    """

    name: Name
    normal: Components3
    area_m2: float = Field(gt=0.0, le=1e6)
    sensitive: bool = False
    weight: float = Field(default=1.0, ge=0.0, le=1e6)
    joint: Name | None = None
    criteria: list[CriterionIn] | None = Field(default=None, min_length=1, max_length=MAX_CRITERIA)


class JointIn(_Strict):
    """An axis about which faces turn; both vectors in body axes."""

    name: Name
    axis: Components3
    sun_normal: Components3


class AttitudeIn(_Strict):
    """Nominal attitude. ``quaternion_xyzw``: scalar last, body to GCRF, for ``inertial`` only."""

    law: Literal["nadir", "sun", "inertial"] = "nadir"
    quaternion_xyzw: Components4 | None = None


class PolicyIn(_Strict):
    """The operator's own thresholds; the defaults are examples."""

    ready_at: float = Policy.ready_at
    shelter_at: float = Policy.shelter_at
    min_expected_impacts: float = Policy.min_expected_impacts
    min_lee_s: float = Policy.min_lee_s


class SatelliteIn(_Strict):
    """One satellite. ``id`` may come from the address instead; ``name`` defaults to it."""

    id: SatelliteId | None = None
    name: Name | None = None
    attitude: AttitudeIn = AttitudeIn()
    faces: list[FaceIn] = Field(min_length=1, max_length=MAX_FACES)
    joints: list[JointIn] = Field(default=[], max_length=MAX_JOINTS)
    policy: PolicyIn = PolicyIn()
