"""Cauchy 1832: the mean projected area of a convex body over all orientations is a quarter of its surface."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.exposure.faces import Places, StreamSet, hazard_rates
from app.core.spacecraft.model import AttitudeLaw, AttitudeLawKind, Criterion, CriterionKind, Face, Spacecraft
from app.core.streams.flux import MASS_LAWS
from tests.published.probes import FREE, plates, stream

MASS = Criterion(CriterionKind.MASS, 1e-6)


def tetrahedron() -> Spacecraft:
    """A closed body of four unequal faces: each normal times area sums to nothing."""
    corners = np.array([[0.0, 0.0, 0.0], [2.0, 0.1, 0.0], [0.3, 1.5, 0.2], [0.4, 0.3, 1.1]])
    faces = []
    for left_out in range(4):
        a, b, c = np.delete(corners, left_out, axis=0)
        outward = np.cross(b - a, c - a) / 2.0
        outward *= -np.sign(outward @ (corners[left_out] - a))
        faces.append(Face(f"face {left_out}", tuple(outward), float(np.linalg.norm(outward)), (MASS,)))
    return Spacecraft("body", "Body", tuple(faces), AttitudeLaw(AttitudeLawKind.INERTIAL, FREE))


def rates_from(body: Spacecraft, directions: np.ndarray) -> np.ndarray:
    """Rates (C, N) of a fast stream that moves along ``directions`` (3, N), met just under its radiant."""
    streams = StreamSet((stream(2.2, 59.1),), MASS_LAWS["jvb"])
    sun = np.broadcast_to([[1.5e8], [0.0], [0.0]], directions.shape)
    places = Places(-7000.0 * directions, np.zeros(directions.shape), sun)
    return hazard_rates(body, streams, directions[:, None, :], places)[:, 0]


def evenly(count: int) -> np.ndarray:
    """Directions spread evenly over the sphere along a golden-angle spiral, (3, count)."""
    z = 1.0 - (2.0 * np.arange(count) + 1.0) / count
    turn, level = np.arange(count) * np.pi * (3.0 - np.sqrt(5.0)), np.sqrt(1.0 - z**2)
    return np.array([level * np.cos(turn), level * np.sin(turn), z])


@pytest.mark.case(52)
def test_impacts_on_a_tumbling_convex_body():
    # turning the body past the stream is the same as sending the stream from everywhere
    body = tetrahedron()
    areas = np.array([face.area_m2 for face in body.faces])
    square_on = rates_from(plates([(1.0, 0.0, 0.0)], MASS), np.array([[-1.0], [0.0], [0.0]]))[0, 0]
    impacts = areas @ rates_from(body, evenly(20_000))
    one_permille = 1e-3
    assert_allclose(impacts.mean() / (square_on * areas.sum()), 0.25, rtol=one_permille)
