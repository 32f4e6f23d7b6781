"""Attitude laws: where each face looks, in GCRF."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from app.core.spacecraft.model import AttitudeLaw, AttitudeLawKind, Joint, Quaternion, Spacecraft

Floats = npt.NDArray[np.float64]


def lvlh_axes(r_km: Floats, v_km_s: Floats) -> Floats:
    """LVLH axes as GCRF vectors, (axis, 3, ...): +Z nadir, +Y opposite the orbit normal, +X completes."""
    z = -unit(r_km)
    y = -unit(cross(r_km, v_km_s))
    return np.stack([cross(y, z), y, z])


def body_axes(law: AttitudeLaw, r_km: Floats, v_km_s: Floats, sun_km: Floats) -> Floats:
    """Body axes as GCRF vectors, (axis, 3, ...), under an attitude law.

    ``r_km``, ``v_km_s``, ``sun_km``: (3, ...) GCRF. For ``sun``: +Z to the Sun as seen from the satellite,
    +Y as near the orbit normal as it goes.
    """
    if law.kind is AttitudeLawKind.NADIR:
        return lvlh_axes(r_km, v_km_s)
    if law.kind is AttitudeLawKind.SUN:
        z = unit(sun_km - r_km)
        x = unit(cross(cross(r_km, v_km_s), z))
        return np.stack([x, cross(z, x), z])
    assert law.quaternion_xyzw is not None
    fixed = rotation_matrix(law.quaternion_xyzw).T
    return np.broadcast_to(fixed.reshape(3, 3, *([1] * (r_km.ndim - 1))), (3, *r_km.shape))


def in_axes(axes: Floats, vectors: Floats) -> Floats:
    """Components along ``axes`` (axis, 3, ...) of vectors (3, T), (3, S, T): same shape as the vectors.

    Axes (3, 3, T) serve vectors (3, S, T) too.
    """
    if vectors.ndim > axes.ndim - 1:
        axes = axes[:, :, None]
    out = np.empty(vectors.shape)
    for axis in range(3):
        np.multiply(axes[axis, 0], vectors[0], out=out[axis])
        out[axis] += axes[axis, 1] * vectors[1]
        out[axis] += axes[axis, 2] * vectors[2]
    return out


def body_normals(spacecraft: Spacecraft, axes: Floats, r_km: Floats, sun_km: Floats) -> list[Floats]:
    """Outward normals of all faces in body axes: (3,) for a fixed face, (3, ...) for one that follows the Sun."""
    normals = [np.array(face.normal) for face in spacecraft.faces]
    joints = {joint.name: joint for joint in spacecraft.joints}
    if any(face.joint for face in spacecraft.faces):
        sun_body = in_axes(axes, unit(sun_km - r_km))
        for index, face in enumerate(spacecraft.faces):
            if face.joint is not None:
                normals[index] = _track(joints[face.joint], normals[index], sun_body)
    return normals


def body_outward(law: AttitudeLaw, axes: Floats, r_km: Floats) -> Floats:
    """r/|r| in body axes: (3,) under the law ``nadir``, whose +Z looks the other way, else the shape of ``r_km``."""
    if law.kind is AttitudeLawKind.NADIR:
        return np.array([0.0, 0.0, -1.0])
    return in_axes(axes, unit(r_km))


def dot(vectors: Floats, other: Floats) -> Floats:
    """Scalar product of vectors (3, ...) with another (3,) or (3, ...); components that are zero cost nothing."""
    used = [axis for axis in range(3) if np.any(other[axis])]
    product: Floats = vectors[used[0]] * other[used[0]]
    for axis in used[1:]:
        product += vectors[axis] * other[axis]
    return product


def rotation_matrix(quaternion_xyzw: Quaternion) -> Floats:
    """Matrix (3, 3) of a unit quaternion, scalar last: body vectors to GCRF."""
    x, y, z, w = quaternion_xyzw
    return np.array(
        [
            [1 - 2 * (y * y + z * z), 2 * (x * y - z * w), 2 * (x * z + y * w)],
            [2 * (x * y + z * w), 1 - 2 * (x * x + z * z), 2 * (y * z - x * w)],
            [2 * (x * z - y * w), 2 * (y * z + x * w), 1 - 2 * (x * x + y * y)],
        ]
    )


def cross(one: Floats, other: Floats) -> Floats:
    """Cross product of vectors whose components are on the first axis (five times the speed of ``np.cross``)."""
    return np.stack([one[i - 2] * other[i - 1] - one[i - 1] * other[i - 2] for i in range(3)])


def unit(vectors: Floats) -> Floats:
    """Normalise vectors whose components are on the first axis."""
    length = np.sqrt(np.einsum("k...,k...->...", vectors, vectors))
    normalised: Floats = vectors / length
    return normalised


def _track(joint: Joint, normal: Floats, sun_body: Floats) -> Floats:
    """Turn ``normal`` with the joint so that its ``sun_normal`` is as near the Sun as it goes: (3, ...)."""
    axis, zero = np.array(joint.axis), np.array(joint.sun_normal)
    zero = zero - axis * (axis @ zero)
    zero /= np.linalg.norm(zero)
    third = np.cross(axis, zero)
    toward = np.einsum("k,k...->...", zero, sun_body)
    across = np.einsum("k,k...->...", third, sun_body)
    length = np.hypot(toward, across)
    # With the Sun along the axis every angle is equal; the joint then rests at zero.
    resting = length < 1e-12
    length = np.where(resting, 1.0, length)
    cosine, sine = np.where(resting, 1.0, toward / length), np.where(resting, 0.0, across / length)
    along, on_zero, on_third = axis @ normal, zero @ normal, third @ normal
    shape = (3, *([1] * cosine.ndim))
    turned: Floats = (
        axis.reshape(shape) * along
        + zero.reshape(shape) * (on_zero * cosine - on_third * sine)
        + third.reshape(shape) * (on_zero * sine + on_third * cosine)
    )
    return turned
