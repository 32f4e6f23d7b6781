"""Spacecraft: faces, criteria, joints, attitude law and policy (plain frozen records).

The constructors check what must hold for the physics to make sense and raise ``FieldError``.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from enum import StrEnum

from app.errors import FieldError

Vector = tuple[float, float, float]
Quaternion = tuple[float, float, float, float]
UNIT_TOLERANCE = 1e-12  # a length this close to 1 is rounding, not a vector to normalise


class CriterionKind(StrEnum):
    """What counts as harm."""

    PENETRATION = "penetration"  # the wall is perforated
    CHARGE = "charge"  # the impact plasma carries at least this charge
    ENERGY = "energy"  # the particle has at least this kinetic energy
    MASS = "mass"  # the particle has at least this mass


# Thresholds outside these ranges ask the flux laws for masses nobody has measured (Gruen et al. 1985
# state theirs for 1e-18 to 1e2 g).
THRESHOLD_LIMITS: dict[CriterionKind, tuple[str, float, float]] = {
    CriterionKind.PENETRATION: ("wall_mm", 1e-3, 1e3),
    CriterionKind.CHARGE: ("min_charge_c", 1e-15, 1e4),
    CriterionKind.ENERGY: ("min_energy_j", 1e-12, 1e9),
    CriterionKind.MASS: ("min_mass_g", 1e-18, 1e4),
}


@dataclass(frozen=True)
class Criterion:
    """One harm threshold: ``threshold`` is wall_mm, min_charge_c, min_energy_j or min_mass_g by kind.

    ``label`` groups the same harm over faces; it defaults to the kind.
    """

    kind: CriterionKind
    threshold: float
    material: str | None = None
    label: str = ""

    def __post_init__(self) -> None:
        field_name, low, high = THRESHOLD_LIMITS[self.kind]
        if not low <= self.threshold <= high:
            raise FieldError(
                f"criteria.{field_name}", f"is {self.threshold!r}; it must lie between {low:g} and {high:g}"
            )
        if not self.label:
            object.__setattr__(self, "label", self.kind.value)


@dataclass(frozen=True)
class Joint:
    """An axis about which faces turn; at angle zero ``sun_normal`` is as near the Sun as it goes.

    Both vectors are in body axes.
    """

    name: str
    axis: Vector
    sun_normal: Vector

    def __post_init__(self) -> None:
        object.__setattr__(self, "axis", _unit("joints.axis", self.axis))
        object.__setattr__(self, "sun_normal", _unit("joints.sun_normal", self.sun_normal))
        cosine = sum(a * b for a, b in zip(self.axis, self.sun_normal, strict=True))
        if abs(cosine) > 0.999:
            raise FieldError("joints.sun_normal", "must not lie along the joint's own axis")


@dataclass(frozen=True)
class Face:
    """A flat outer surface: outward ``normal`` in body axes, ``area_m2`` of one side."""

    name: str
    normal: Vector
    area_m2: float
    criteria: tuple[Criterion, ...]
    sensitive: bool = False
    weight: float = 1.0
    joint: str | None = None

    def __post_init__(self) -> None:
        object.__setattr__(self, "normal", _unit(f"faces.{self.name}.normal", self.normal))
        _positive(f"faces.{self.name}.area_m2", self.area_m2)
        labels = [criterion.label for criterion in self.criteria]
        if not labels:
            raise FieldError(f"faces.{self.name}.criteria", "give at least one criterion")
        if len(set(labels)) < len(labels):
            raise FieldError(f"faces.{self.name}.criteria", "two criteria share a label; give each its own")


class AttitudeLawKind(StrEnum):
    """How the spacecraft points when nothing is done."""

    NADIR = "nadir"  # body axes follow LVLH
    SUN = "sun"  # body +Z to the Sun, +Y to the orbit normal as near as it goes
    INERTIAL = "inertial"  # fixed in GCRF


@dataclass(frozen=True)
class AttitudeLaw:
    """Nominal attitude. ``quaternion_xyzw`` (scalar last, body to GCRF) only for ``inertial``."""

    kind: AttitudeLawKind = AttitudeLawKind.NADIR
    quaternion_xyzw: Quaternion | None = None

    def __post_init__(self) -> None:
        if (self.kind is AttitudeLawKind.INERTIAL) != (self.quaternion_xyzw is not None):
            raise FieldError(
                "attitude.quaternion_xyzw", "give it for the law 'inertial', and only for that law"
            )
        if self.quaternion_xyzw is not None:
            norm = math.sqrt(sum(q * q for q in self.quaternion_xyzw))
            if not 0.99 < norm < 1.01:
                raise FieldError("attitude.quaternion_xyzw", f"its norm is {norm:.6g}; it must be 1")
            object.__setattr__(self, "quaternion_xyzw", _scaled(self.quaternion_xyzw, norm))


@dataclass(frozen=True)
class Policy:
    """The operator's own thresholds. The defaults are examples, not recommendations.

    ``ready_at`` and ``shelter_at`` act on enhancement factors; a passage that adds fewer than
    ``min_expected_impacts`` stays ``steady``; lee windows shorter than ``min_lee_s`` are not offered.
    """

    ready_at: float = 1.5
    shelter_at: float = 2.5
    min_expected_impacts: float = 1e-7
    min_lee_s: float = 60.0

    def __post_init__(self) -> None:
        if not 1.0 < self.ready_at < self.shelter_at or not math.isfinite(self.shelter_at):
            raise FieldError("policy", "needs 1 < ready_at < shelter_at")
        if not (self.min_expected_impacts >= 0.0 and math.isfinite(self.min_expected_impacts)):
            raise FieldError("policy.min_expected_impacts", "must be zero or more")
        if not (self.min_lee_s >= 0.0 and math.isfinite(self.min_lee_s)):
            raise FieldError("policy.min_lee_s", "must be zero or more")


@dataclass(frozen=True)
class Spacecraft:
    """One registered satellite, without its orbit."""

    id: str
    name: str
    faces: tuple[Face, ...]
    attitude: AttitudeLaw = field(default_factory=AttitudeLaw)
    joints: tuple[Joint, ...] = ()
    policy: Policy = field(default_factory=Policy)

    def __post_init__(self) -> None:
        names = [face.name for face in self.faces]
        if not names:
            raise FieldError("faces", "give at least one face")
        if len(set(names)) < len(names):
            raise FieldError("faces", "two faces share a name")
        joints = [joint.name for joint in self.joints]
        if len(set(joints)) < len(joints):
            raise FieldError("joints", "two joints share a name")
        for face in self.faces:
            if face.joint is not None and face.joint not in joints:
                raise FieldError(f"faces.{face.name}.joint", f"there is no joint named '{face.joint}'")


def _unit(where: str, vector: Vector) -> Vector:
    norm = math.sqrt(sum(x * x for x in vector))
    if not (math.isfinite(norm) and norm > 1e-9):
        raise FieldError(where, "must be a finite vector that is not zero")
    x, y, z = _scaled(vector, norm)
    return x, y, z


def _scaled(components: tuple[float, ...], norm: float) -> tuple[float, ...]:
    # What is of length 1 already keeps its bits: a record read back from the store equals the one written.
    scale = 1.0 if abs(norm - 1.0) < UNIT_TOLERANCE else norm
    return tuple(component / scale for component in components)


def _positive(where: str, value: float) -> None:
    if not (math.isfinite(value) and value > 0.0):
        raise FieldError(where, f"must be a finite number above zero, not {value!r}")
