"""What a spacecraft's records accept, keep and refuse."""

from __future__ import annotations

import dataclasses
import math

import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from app.core.spacecraft.model import (
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

FIXED = settings(derandomize=True, max_examples=300)
MASS = Criterion(CriterionKind.MASS, 1e-6)
component = st.floats(-1e3, 1e3)
vectors = st.tuples(component, component, component).filter(lambda v: math.hypot(*v) > 1e-6)
quaternions = st.tuples(component, component, component, component).filter(lambda q: math.hypot(*q) > 1e-3)


def unit(quaternion: tuple[float, ...]) -> tuple[float, ...]:
    norm = math.hypot(*quaternion)
    return tuple(q / norm for q in quaternion)


def face(normal: tuple[float, ...] = (0, 0, 1), name: str = "front", **more: object) -> Face:
    return Face(name, normal, 1.0, (MASS,), **more)


@FIXED
@given(vectors)
def test_a_normal_is_normalised_once_and_keeps_its_bits_after_that(vector: tuple[float, float, float]):
    once = face(vector)
    assert math.isclose(math.hypot(*once.normal), 1.0, rel_tol=1e-14)
    assert face(once.normal) == once


@FIXED
@given(vectors, vectors)
def test_a_joint_keeps_the_bits_of_its_vectors(axis: tuple[float, ...], sun_normal: tuple[float, ...]):
    cosine = sum(a * b for a, b in zip(face(axis).normal, face(sun_normal).normal, strict=True))
    assume(abs(cosine) < 0.99)
    once = Joint("drive", axis, sun_normal)
    assert (once.axis, once.sun_normal) == (face(axis).normal, face(sun_normal).normal)
    assert Joint("drive", once.axis, once.sun_normal) == once


@FIXED
@given(quaternions, st.floats(0.991, 1.009))
def test_a_quaternion_is_normalised_once_and_keeps_its_bits_after_that(q: tuple[float, ...], scale: float):
    given_ = tuple(scale * x for x in unit(q))
    once = AttitudeLaw(AttitudeLawKind.INERTIAL, given_)
    assert math.isclose(math.hypot(*once.quaternion_xyzw), 1.0, rel_tol=1e-14)
    assert AttitudeLaw(AttitudeLawKind.INERTIAL, once.quaternion_xyzw) == once


def test_a_vector_of_length_one_is_left_alone():
    third = 1.0 / math.sqrt(3.0)
    assert face((third, third, third)).normal == (third, third, third)
    assert face((0, 0, 2)).normal == (0.0, 0.0, 1.0)
    assert all(type(x) is float for x in face((0, 0, 1)).normal)


@pytest.mark.parametrize(
    "normal", [(0, 0, 0), (math.nan, 0, 1), (math.inf, 0, 0), (1e-10, 0, 0), (1e200, 1e200, 0)]
)
def test_a_normal_without_direction_is_refused(normal: tuple[float, ...]):
    with pytest.raises(FieldError) as caught:
        face(normal)
    assert caught.value.field == "faces.front.normal"


@pytest.mark.parametrize("area_m2", [0.0, -1.0, math.nan, math.inf])
def test_an_area_must_be_above_zero(area_m2: float):
    with pytest.raises(FieldError, match="above zero"):
        Face("front", (0, 0, 1), area_m2, (MASS,))


@pytest.mark.parametrize(
    ("kind", "low", "high", "field"),
    [
        (CriterionKind.PENETRATION, 1e-4, 1e4, "wall_mm"),
        (CriterionKind.CHARGE, 1e-16, 1e5, "min_charge_c"),
        (CriterionKind.ENERGY, 1e-13, 1e10, "min_energy_j"),
        (CriterionKind.MASS, 1e-19, 1e5, "min_mass_g"),
    ],
)
def test_thresholds_outside_what_was_measured_are_refused(
    kind: CriterionKind, low: float, high: float, field: str
):
    for threshold in (low, high, math.nan, -1.0):
        with pytest.raises(FieldError) as caught:
            Criterion(kind, threshold)
        assert caught.value.field == f"criteria.{field}"


def test_a_criterion_is_labelled_by_its_kind_unless_named():
    assert MASS.label == "mass"
    assert Criterion(CriterionKind.MASS, 1e-6, label="coarse").label == "coarse"


def test_a_face_needs_criteria_with_labels_of_their_own():
    with pytest.raises(FieldError, match="at least one"):
        Face("front", (0, 0, 1), 1.0, ())
    with pytest.raises(FieldError, match="share a label"):
        Face("front", (0, 0, 1), 1.0, (MASS, Criterion(CriterionKind.MASS, 1e-3)))


def test_a_spacecraft_needs_faces_and_joints_with_names_of_their_own():
    joint = Joint("drive", (0, 1, 0), (0, 0, 1))
    with pytest.raises(FieldError, match="at least one face"):
        Spacecraft("a", "A", ())
    with pytest.raises(FieldError, match="two faces"):
        Spacecraft("a", "A", (face(), face()))
    with pytest.raises(FieldError, match="two joints"):
        Spacecraft("a", "A", (face(),), joints=(joint, joint))
    with pytest.raises(FieldError, match="no joint named 'wing'"):
        Spacecraft("a", "A", (face(joint="wing"),), joints=(joint,))


def test_a_joint_cannot_bring_its_own_axis_to_the_sun():
    with pytest.raises(FieldError, match="own axis"):
        Joint("drive", (0, 1, 0), (0, -1, 0.001))


def test_only_an_inertial_law_takes_a_quaternion():
    with pytest.raises(FieldError, match="only for that law"):
        AttitudeLaw(AttitudeLawKind.NADIR, (0, 0, 0, 1))
    with pytest.raises(FieldError, match="give it"):
        AttitudeLaw(AttitudeLawKind.INERTIAL)
    with pytest.raises(FieldError, match="norm is 2"):
        AttitudeLaw(AttitudeLawKind.INERTIAL, (0, 0, 0, 2))
    with pytest.raises(FieldError, match="norm is nan"):
        AttitudeLaw(AttitudeLawKind.INERTIAL, (0, 0, math.nan, 1))


@pytest.mark.parametrize(
    "wrong",
    [
        {"ready_at": 1.0},
        {"ready_at": 2.5},
        {"shelter_at": math.inf},
        {"ready_at": math.nan},
        {"min_expected_impacts": -1.0},
        {"min_expected_impacts": math.nan},
        {"min_lee_s": -1.0},
        {"min_lee_s": math.inf},
    ],
)
def test_thresholds_of_a_policy_must_make_sense(wrong: dict[str, float]):
    with pytest.raises(FieldError, match="policy"):
        Policy(**wrong)


def test_records_are_frozen():
    with pytest.raises(dataclasses.FrozenInstanceError):
        MASS.threshold = 1.0
