"""Random streams, places and bodies for the properties of exposure."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from hypothesis import settings
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from app.core.exposure.faces import Places, StreamSet
from app.core.spacecraft.model import (
    AttitudeLaw,
    AttitudeLawKind,
    Criterion,
    CriterionKind,
    Face,
    Joint,
    Spacecraft,
)
from app.core.streams.flux import MASS_LAWS
from app.core.streams.model import Component, Stream

FIXED = settings(derandomize=True, deadline=None, max_examples=60)
SUN_KM = 1.5e8
CRITERIA = (
    Criterion(CriterionKind.MASS, 1e-6),
    Criterion(CriterionKind.CHARGE, 1e-9),
    Criterion(CriterionKind.ENERGY, 1.0),
    Criterion(CriterionKind.PENETRATION, 1.0, "al-6061-t6"),
)
BOX = ((1, 0, 0), (-1, 0, 0), (0, 1, 0), (0, -1, 0), (0, 0, 1), (0, 0, -1))


@dataclass(frozen=True)
class Scene:
    """S streams and T places: ``downstream`` (3, S, T), ``zhr`` (S, T)."""

    streams: StreamSet
    downstream: np.ndarray
    places: Places
    zhr: np.ndarray

    def turned(self, turn: np.ndarray) -> Scene:
        """The same world seen from axes turned by the matrix ``turn``."""
        moved = (
            np.einsum("ij,j...->i...", turn, v)
            for v in (self.places.r_km, self.places.v_km_s, self.places.sun_km)
        )
        return Scene(
            self.streams, np.einsum("ij,j...->i...", turn, self.downstream), Places(*moved), self.zhr
        )


def directions(rng: np.random.Generator, *shape: int) -> np.ndarray:
    vectors = rng.normal(size=(3, *shape))
    return vectors / np.linalg.norm(vectors, axis=0)


@st.composite
def scenes(draw: st.DrawFn) -> Scene:
    """Two streams at seven places from 6500 km outward, speeds up to 8 km/s."""
    rng = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    streams = []
    for code in ("AAA", "BBB"):
        r, speed = draw(st.floats(1.8, 3.5)), draw(st.floats(11.0, 72.0))
        density, spread = draw(st.floats(300.0, 3000.0)), draw(st.floats(0.0, 1.2))
        component = Component("main", 140.0, 100.0, 1.0, 1.0)
        streams.append(
            Stream(
                code,
                code,
                (component,),
                r,
                speed,
                0.0,
                0.0,
                bulk_density_kg_m3=density,
                radiant_spread_deg=spread,
            )
        )
    law = MASS_LAWS[draw(st.sampled_from(sorted(MASS_LAWS)))]
    r_km = directions(rng, 7) * np.exp(rng.uniform(np.log(6500.0), np.log(60_000.0), 7))
    places = Places(r_km, directions(rng, 7) * rng.uniform(1.0, 8.0, 7), directions(rng, 7) * SUN_KM)
    return Scene(
        StreamSet(tuple(streams), law), directions(rng, 2, 7), places, rng.uniform(0.0, 5000.0, (2, 7))
    )


@st.composite
def rotations(draw: st.DrawFn) -> np.ndarray:
    rng = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    return Rotation.from_quat(rng.normal(size=4)).as_matrix()


def attitude(kind: AttitudeLawKind, turn: np.ndarray | None = None) -> AttitudeLaw:
    """The law; an inertial one holds the body axes of the matrix ``turn``."""
    if kind is not AttitudeLawKind.INERTIAL:
        return AttitudeLaw(kind)
    return AttitudeLaw(kind, tuple(Rotation.from_matrix(np.eye(3) if turn is None else turn).as_quat()))


def box(
    law: AttitudeLaw, areas: tuple[float, ...] = (1.0,) * 6, criteria: tuple[Criterion, ...] = CRITERIA
) -> Spacecraft:
    """A closed box; areas of its six faces, opposite ones beside each other."""
    faces = tuple(Face(f"{n}", n, a, criteria) for n, a in zip(BOX, areas, strict=True))
    return Spacecraft("box", "Box", faces, law)


def winged(law: AttitudeLaw) -> Spacecraft:
    """A box with an array that follows the Sun about +Y."""
    wing = Face("array", (0.0, 0.0, 1.0), 4.0, CRITERIA, joint="drive")
    joint = Joint("drive", (0.0, 1.0, 0.0), (0.0, 0.0, 1.0))
    return Spacecraft("winged", "Winged", (*box(law).faces, wing), law, (joint,))
