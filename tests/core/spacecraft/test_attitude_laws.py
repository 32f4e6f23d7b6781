"""Attitude laws against their definitions and against scipy's rotations.

LVLH: +Z to the Earth's centre, +Y opposite the orbit normal, +X completes (CCSDS and common practice).
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose
from scipy.optimize import minimize_scalar
from scipy.spatial.transform import Rotation

from app.core.spacecraft.attitude import (
    body_axes,
    body_normals,
    body_outward,
    cross,
    dot,
    in_axes,
    lvlh_axes,
    rotation_matrix,
    unit,
)
from app.core.spacecraft.model import (
    AttitudeLaw,
    AttitudeLawKind,
    Criterion,
    CriterionKind,
    Face,
    Joint,
    Spacecraft,
)

FIXED = settings(derandomize=True, deadline=None, max_examples=100)
rounding = 1e-12
seeds = st.integers(0, 2**32 - 1)
MASS = Criterion(CriterionKind.MASS, 1e-6)


def state(seed: int, *shape: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Positions km, velocities km/s, Sun km."""
    rng = np.random.default_rng(seed)
    r, v, sun = (rng.normal(size=(3, *shape)) for _ in range(3))
    return 7000.0 * unit(r), 7.0 * unit(v), 1.5e8 * unit(sun)


def law_of(kind: AttitudeLawKind, seed: int = 0) -> AttitudeLaw:
    if kind is not AttitudeLawKind.INERTIAL:
        return AttitudeLaw(kind)
    return AttitudeLaw(kind, tuple(Rotation.from_quat(np.random.default_rng(seed).normal(size=4)).as_quat()))


def test_lvlh_by_hand():
    # at +x, flying to +y: nadir is -x, the orbit normal +z, and ahead is +y
    axes = lvlh_axes(np.array([7000.0, 0.0, 0.0]), np.array([0.0, 7.5, 0.0]))
    assert_allclose(axes, [[0.0, 1.0, 0.0], [0.0, 0.0, -1.0], [-1.0, 0.0, 0.0]], atol=rounding)


def test_ahead_is_level_on_an_eccentric_orbit():
    # climbing: +X stays level and in the plane of the orbit, although the velocity is not level
    ahead = lvlh_axes(np.array([7000.0, 0.0, 0.0]), np.array([3.0, 7.5, 0.0]))[0]
    assert_allclose(ahead, [0.0, 1.0, 0.0], atol=rounding)


@FIXED
@given(seeds, st.sampled_from(list(AttitudeLawKind)))
def test_body_axes_are_right_handed_and_orthonormal(seed: int, kind: AttitudeLawKind):
    axes = body_axes(law_of(kind, seed), *state(seed, 5))
    products = np.einsum("ikt,jkt->ijt", axes, axes)
    assert_allclose(products, np.repeat(np.eye(3)[..., None], 5, axis=2), atol=rounding)
    assert_allclose(cross(axes[0], axes[1]), axes[2], atol=rounding)


@FIXED
@given(seeds)
def test_the_sun_law_puts_z_on_the_sun_and_y_as_near_the_orbit_normal_as_it_goes(seed: int):
    r_km, v_km_s, sun_km = state(seed)
    axes = body_axes(AttitudeLaw(AttitudeLawKind.SUN), r_km, v_km_s, sun_km)
    to_sun = unit(sun_km - r_km)
    assert_allclose(axes[2], to_sun, atol=rounding)
    normal = unit(np.cross(r_km, v_km_s))
    # the nearest direction square to the Sun is the normal's own projection
    nearest = normal - (normal @ to_sun) * to_sun
    assert_allclose(axes[1], nearest / np.linalg.norm(nearest), atol=1e-9)


@FIXED
@given(seeds)
def test_the_matrix_of_a_quaternion_equals_scipy(seed: int):
    # scipy keeps the scalar last too
    turn = Rotation.from_quat(np.random.default_rng(seed).normal(size=4))
    assert_allclose(rotation_matrix(tuple(turn.as_quat())), turn.as_matrix(), atol=rounding)


@FIXED
@given(seeds)
def test_an_inertial_law_turns_body_vectors_into_gcrf(seed: int):
    law = law_of(AttitudeLawKind.INERTIAL, seed)
    axes = body_axes(law, *state(seed, 4))
    body = np.random.default_rng(seed).normal(size=3)
    expected = Rotation.from_quat(law.quaternion_xyzw).apply(body)
    assert_allclose(
        np.einsum("a,akt->kt", body, axes), np.repeat(expected[:, None], 4, axis=1), atol=rounding
    )


@FIXED
@given(seeds, st.sampled_from(list(AttitudeLawKind)))
def test_components_in_body_axes(seed: int, kind: AttitudeLawKind):
    r_km, v_km_s, sun_km = state(seed, 5)
    law = law_of(kind, seed)
    axes = body_axes(law, r_km, v_km_s, sun_km)
    assert_allclose(in_axes(axes, v_km_s), np.einsum("akt,kt->at", axes, v_km_s), atol=1e-11)
    by_stream = np.random.default_rng(seed).normal(size=(3, 2, 5))
    assert_allclose(in_axes(axes, by_stream), np.einsum("akt,kst->ast", axes, by_stream), atol=1e-11)
    outward = body_outward(law, axes, r_km)
    spread = outward if outward.ndim == 2 else np.repeat(outward[:, None], 5, axis=1)
    assert_allclose(spread, in_axes(axes, unit(r_km)), atol=1e-11)


def test_products_skip_nothing_but_zeros():
    vectors = np.random.default_rng(1).normal(size=(3, 2, 4))
    for normal in (np.array([0.0, 0.0, -1.0]), np.array([0.6, 0.0, 0.8]), np.array([1.0, 2.0, 3.0])):
        assert_allclose(dot(vectors, normal), np.einsum("kst,k->st", vectors, normal), atol=rounding)
    each = np.random.default_rng(2).normal(size=(3, 4))
    assert_allclose(dot(vectors, each), np.einsum("kst,kt->st", vectors, each), atol=rounding)


def tracking(
    axis: np.ndarray, sun_normal: np.ndarray, normal: np.ndarray, sun_body: np.ndarray
) -> np.ndarray:
    """Our normal of a jointed face, (3,), for a Sun given in body axes."""
    joint = Joint("drive", tuple(axis), tuple(sun_normal))
    face = Face("array", tuple(normal), 1.0, (MASS,), joint="drive")
    spacecraft = Spacecraft("a", "A", (face,), AttitudeLaw(AttitudeLawKind.INERTIAL, (0, 0, 0, 1)), (joint,))
    axes = np.eye(3)[..., None]
    (found,) = body_normals(spacecraft, axes, np.zeros((3, 1)), 1.5e8 * sun_body[:, None])
    return found[:, 0]


@FIXED
@given(seeds)
def test_a_joint_turns_its_face_to_the_best_angle(seed: int):
    axis, sun_normal, normal, sun = unit(np.random.default_rng(seed).normal(size=(3, 4))).T

    def turned(angle: float) -> Rotation:
        return Rotation.from_rotvec(angle * axis)

    def off_sun(angle: float) -> float:
        return -float(turned(angle).apply(sun_normal) @ sun)

    coarse = min(np.linspace(-np.pi, np.pi, 25), key=off_sun)
    best = minimize_scalar(
        off_sun, bounds=(coarse - 0.3, coarse + 0.3), method="bounded", options={"xatol": 1e-10}
    )
    angle_tolerance = 1e-6  # of a minimum found by comparing values
    assert_allclose(
        tracking(axis, sun_normal, normal, sun), turned(best.x).apply(normal), atol=angle_tolerance
    )


def test_a_joint_rests_at_zero_when_the_sun_lies_on_its_axis():
    y, z = np.array([0.0, 1.0, 0.0]), np.array([0.0, 0.0, 1.0])
    assert_allclose(tracking(y, z, np.array([0.6, 0.0, 0.8]), y), [0.6, 0.0, 0.8], atol=rounding)


@pytest.mark.parametrize("degrees", [0.0, 30.0, 90.0, 170.0, -100.0])
def test_an_array_on_the_usual_axis_faces_the_sun_it_can_reach(degrees: float):
    angle = np.radians(degrees)
    sun = np.array([np.sin(angle), 0.0, np.cos(angle)])
    y, z = np.array([0.0, 1.0, 0.0]), np.array([0.0, 0.0, 1.0])
    assert_allclose(tracking(y, z, z, sun), sun, atol=rounding)
