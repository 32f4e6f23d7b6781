"""Enhancement factors against their definitions, worked by hand."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.advice.factors import Baseline, baseline
from app.core.spacecraft.model import Criterion, CriterionKind, Face, Spacecraft
from app.errors import OrbitError
from tests.core.advice.samples import CHARGE, MASS, judged_by

UP, DOWN = (0.0, 0.0, 1.0), (0.0, 0.0, -1.0)
FACES = (
    Face("front", UP, 2.0, (MASS, CHARGE), sensitive=True),
    Face("back", DOWN, 3.0, (MASS,)),
)
# rows: front mass, front charge, back mass
BACKGROUND = [4.0, 10.0, 1.0]
RATES = np.array([[8.0, 0.0], [5.0, 1.0], [0.0, 3.0]])  # (C, T)


@pytest.fixture
def base() -> Baseline:
    return judged_by(BACKGROUND, FACES)


def test_rows_and_labels_keep_their_order(base: Baseline):
    assert base.labels == ("mass", "charge")
    assert base.area_m2.tolist() == [2.0, 2.0, 3.0]
    assert base.sensitive.tolist() == [True, True, False]
    assert base.of_label.tolist() == [[1.0, 0.0, 1.0], [0.0, 1.0, 0.0]]


def test_the_factor_of_a_face_is_one_plus_its_rate_over_its_background(base: Baseline):
    assert_allclose(1.0 + base.row_excess(RATES), [[3.0, 1.0], [1.5, 1.1], [1.0, 4.0]])


def test_the_factor_of_a_satellite_sums_area_times_rate(base: Baseline):
    # mass: (2 x 8 + 3 x 0) / (2 x 4 + 3 x 1) = 16/11, then 9/11; charge as on its only face
    assert_allclose(base.label_background_per_s, [11.0, 20.0])
    assert_allclose(base.satellite_excess(RATES), [[16.0 / 11.0, 9.0 / 11.0], [0.5, 0.1]])


def test_triggers_are_the_satellite_by_label_then_each_sensitive_row(base: Baseline):
    expected = [[16.0 / 11.0, 9.0 / 11.0], [0.5, 0.1], [2.0, 0.0], [0.5, 0.1]]
    assert_allclose(base.trigger_excess(RATES), expected)


def test_impacts_behind_the_triggers_are_rate_times_area(base: Baseline):
    assert_allclose(base.trigger_impacts_per_s(RATES), [[16.0, 9.0], [10.0, 2.0], [16.0, 0.0], [10.0, 2.0]])


def test_a_stream_axis_is_carried_through(base: Baseline):
    by_stream = np.stack([RATES, 2.0 * RATES], axis=1)
    assert_allclose(base.row_excess(by_stream)[:, 1], 2.0 * base.row_excess(RATES))
    assert_allclose(base.satellite_excess(by_stream)[:, 1], 2.0 * base.satellite_excess(RATES))


def test_one_face_alone_is_the_satellite():
    alone = judged_by([4.0])
    assert_allclose(alone.satellite_excess(RATES[:1]), alone.row_excess(RATES[:1]))


def test_a_label_of_its_own_groups_different_criteria():
    thin = Criterion(CriterionKind.MASS, 1e-7, label="optics")
    thick = Criterion(CriterionKind.ENERGY, 1.0, label="optics")
    base = judged_by([2.0, 6.0], (Face("a", UP, 1.0, (thin,)), Face("b", DOWN, 1.0, (thick,))))
    assert base.labels == ("optics",)
    assert_allclose(base.satellite_excess(np.array([[4.0], [4.0]])), [[1.0]])


@pytest.mark.parametrize("missing", [0.0, float("nan")])
def test_without_background_there_is_no_factor_and_the_face_is_named(missing: float):
    with pytest.raises(OrbitError, match="face 'front', charge: no background reaches it"):
        baseline(Spacecraft("wren", "Wren", FACES), np.array([4.0, missing, 1.0]))
