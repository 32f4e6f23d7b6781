"""What must hold for hazard rates on faces, whatever the stream, the place and the attitude."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from app.core.constants import BLOCKING_RADIUS_KM
from app.core.exposure.damage import critical_mass
from app.core.exposure.faces import BLOCK, Places, StreamSet, criterion_rows, hazard_rates, stream_focusing
from app.core.exposure.focusing import relative_velocity
from app.core.spacecraft.attitude import unit
from app.core.spacecraft.model import AttitudeLawKind, Spacecraft
from app.core.streams.flux import MASS_LAWS
from tests.core.exposure.strategies import (
    BOX,
    CRITERIA,
    FIXED,
    Scene,
    attitude,
    box,
    rotations,
    scenes,
    winged,
)
from tests.published.probes import stream

one_billionth = 1e-9
laws = st.sampled_from(list(AttitudeLawKind))


def rates_of(spacecraft: Spacecraft, scene: Scene) -> np.ndarray:
    return hazard_rates(spacecraft, scene.streams, scene.downstream, scene.places, scene.zhr)


@FIXED
@given(scenes(), laws)
def test_never_negative_never_undefined(scene: Scene, law: AttitudeLawKind):
    rates = rates_of(winged(attitude(law)), scene)
    assert np.isfinite(rates).all()
    assert (rates >= 0.0).all()


@FIXED
@given(scenes(), laws)
def test_sheltered_means_zero_and_only_then(scene: Scene, law: AttitudeLawKind):
    focused = stream_focusing(scene.streams, scene.downstream, scene.places.r_km)
    on_box = rates_of(box(attitude(law)), scene).sum(axis=0)
    sheltered = focused.margin > 0.0
    assert (on_box[sheltered] == 0.0).all()
    assert (on_box[~sheltered] > 0.0).all()


@FIXED
@given(scenes(), rotations(), st.tuples(*[st.floats(0.01, 50.0)] * 3))
def test_the_six_faces_of_a_box_balance_its_projected_area(
    scene: Scene, turn: np.ndarray, areas: tuple[float, float, float]
):
    # A box cut by a plane square to the flow shows |n.u| of each pair of faces, whichever looks upstream.
    spacecraft = box(attitude(AttitudeLawKind.INERTIAL, turn), tuple(np.repeat(areas, 2)), CRITERIA[:1])
    total = np.einsum("c,cst->st", np.repeat(areas, 2), rates_of(spacecraft, scene))
    assert_allclose(total, projected(scene, turn, np.array(areas)), rtol=one_billionth)


def projected(scene: Scene, turn: np.ndarray, areas: np.ndarray) -> np.ndarray:
    """Flux above the mass through the projected area of a box, branch by branch, (S, T)."""
    focused = stream_focusing(scene.streams, scene.downstream, scene.places.r_km)
    outward, speed = unit(scene.places.r_km), scene.streams.v_inf_km_s
    law = scene.streams.flux_law
    above = law.at_1_g * critical_mass(CRITERIA[0], 1000.0).at_1_km_s_g ** -law.exponent
    total = np.zeros(scene.zhr.shape)
    for branch in focused.branches:
        velocity = relative_velocity(branch, focused.q, speed, scene.downstream, outward, scene.places.v_km_s)
        in_body = np.einsum("kb,kst->bst", turn, velocity)
        total += branch.density_ratio * np.einsum("b,bst->st", areas, np.abs(in_body)) / speed
    return total * scene.zhr * above[:, None]


@FIXED
@given(scenes(), rotations())
def test_opposite_faces_differ_by_the_flow(scene: Scene, turn: np.ndarray):
    # The rates of a box above a mass, as a vector, are the number flux: they do not depend on how it is turned.
    def flow(hold: np.ndarray) -> np.ndarray:
        rates = rates_of(box(attitude(AttitudeLawKind.INERTIAL, hold), criteria=CRITERIA[:1]), scene)
        return np.einsum("ib,bf,fst->ist", hold, np.array(BOX, dtype=float).T, rates)

    scale = np.abs(flow(np.eye(3))).max()
    assert_allclose(flow(turn), flow(np.eye(3)), rtol=0.0, atol=one_billionth * scale)


@FIXED
@given(scenes(), rotations(), rotations(), laws)
def test_turning_everything_changes_nothing(
    scene: Scene, turn: np.ndarray, hold: np.ndarray, law: AttitudeLawKind
):
    before = rates_of(winged(attitude(law, hold)), scene)
    after = rates_of(winged(attitude(law, turn @ hold)), scene.turned(turn))
    assert_allclose(after, before, rtol=1e-7, atol=one_billionth * before.max())


@FIXED
@given(scenes(), rotations())
def test_a_criterion_asks_the_flux_law_for_its_critical_mass(scene: Scene, turn: np.ndarray):
    spacecraft = box(attitude(AttitudeLawKind.INERTIAL, turn))
    focused = stream_focusing(scene.streams, scene.downstream, scene.places.r_km)
    outward, v_inf = unit(scene.places.r_km), scene.streams.v_inf_km_s
    expected = np.zeros((len(criterion_rows(spacecraft)), *scene.zhr.shape))
    for branch in focused.branches:
        velocity = relative_velocity(branch, focused.q, v_inf, scene.downstream, outward, scene.places.v_km_s)
        speed = np.linalg.norm(velocity, axis=0)
        for index, row in enumerate(criterion_rows(spacecraft)):
            inward = np.maximum(-np.einsum("b,kb,kst->st", np.array(BOX[row.face]), turn, velocity), 0.0)
            for s, one in enumerate(scene.streams.streams):
                limit = critical_mass(row.criterion, one.bulk_density_kg_m3)
                counted = np.maximum(inward if limit.normal_speed else speed, 1e-9)[s]
                mass_g = limit.at_1_km_s_g * counted**-limit.speed_exponent
                law = scene.streams.subset([s]).flux_law
                flux = law.flux_per_m2_s(scene.zhr[s], mass_g) / v_inf[s]
                expected[index, s] += branch.density_ratio[s] * flux * inward[s]
    assert_allclose(rates_of(spacecraft, scene), expected, rtol=1e-8, atol=1e-12 * expected.max())


@FIXED
@given(scenes(), st.floats(1e-6, 1e6))
def test_twice_the_rate_is_twice_the_hazard(scene: Scene, times: float):
    spacecraft = box(attitude(AttitudeLawKind.NADIR))
    once = rates_of(spacecraft, scene)
    more = rates_of(spacecraft, Scene(scene.streams, scene.downstream, scene.places, times * scene.zhr))
    assert_allclose(more, times * once, rtol=one_billionth)
    per_unit = hazard_rates(spacecraft, scene.streams, scene.downstream, scene.places)
    assert_allclose(per_unit * scene.zhr, once, rtol=one_billionth)


@FIXED
@given(scenes(), laws)
def test_each_stream_and_each_instant_stand_alone(scene: Scene, law: AttitudeLawKind):
    spacecraft = winged(attitude(law))
    together = rates_of(spacecraft, scene)
    for s in range(2):
        part = Scene(scene.streams.subset([s]), scene.downstream[:, [s]], scene.places, scene.zhr[[s]])
        assert_allclose(rates_of(spacecraft, part)[:, 0], together[:, s], rtol=one_billionth, atol=0.0)
    shape = (3, *scene.zhr.shape)
    own = Places(*(np.broadcast_to(v[:, None], shape) for v in vars(scene.places).values()))
    assert_allclose(
        rates_of(spacecraft, Scene(scene.streams, scene.downstream, own, scene.zhr)),
        together,
        rtol=one_billionth,
    )


def test_long_series_are_worked_in_blocks_without_a_seam():
    instants = 2 * BLOCK + 17
    phase = np.linspace(0.0, 6.0, instants)
    r_km = 7000.0 * np.array([np.cos(phase), np.sin(phase), 0.0 * phase])
    v_km_s = 7.5 * np.array([-np.sin(phase), np.cos(phase), 0.0 * phase])
    places = Places(r_km, v_km_s, np.broadcast_to([[0.0], [0.0], [1.5e8]], r_km.shape))
    streams = StreamSet((stream(2.2, 59.1),), MASS_LAWS["jvb"])
    downstream = np.broadcast_to(np.array([-0.6, 0.0, -0.8]).reshape(3, 1, 1), (3, 1, instants))
    spacecraft = winged(attitude(AttitudeLawKind.NADIR))
    whole = hazard_rates(spacecraft, streams, downstream, places)
    for start in (0, BLOCK - 3, 2 * BLOCK + 5):
        part = slice(start, start + 9)
        alone = hazard_rates(spacecraft, streams, downstream[..., part], places.block(part))
        assert_allclose(alone, whole[..., part], rtol=1e-12)


@pytest.mark.parametrize("law", list(AttitudeLawKind))
def test_rows_run_face_by_face(law: AttitudeLawKind):
    rows = criterion_rows(winged(attitude(law)))
    assert [(row.face, row.criterion.kind) for row in rows] == [
        (face, criterion.kind) for face in range(7) for criterion in CRITERIA
    ]


def test_a_place_inside_the_shadow_of_every_stream_meets_nothing():
    # straight behind the Earth, just above the air, no stream of 11 km/s or more arrives
    r_km = np.array([[BLOCKING_RADIUS_KM + 100.0], [0.0], [0.0]])
    places = Places(r_km, np.array([[0.0], [7.8], [0.0]]), np.array([[0.0], [1.5e8], [0.0]]))
    streams = StreamSet((stream(2.2, 59.1),), MASS_LAWS["jvb"])
    rates = hazard_rates(
        box(attitude(AttitudeLawKind.NADIR)), streams, np.array([1.0, 0, 0]).reshape(3, 1, 1), places
    )
    assert not rates.any()
