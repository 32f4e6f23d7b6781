"""Levels, onset and end, impacts: against profiles whose crossings and integrals are known in closed form."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.advice.assessment import Assessment, Level, assess, crossing_span, integral
from app.core.advice.factors import Baseline
from app.core.spacecraft.model import Face
from tests.core.advice.samples import CHARGE, DAY_S, MASS, judged_by

PEAK = 1_786_585_000.0
AREA_M2, BACKGROUND = 2.0, 1e-6
UNIX_S = PEAK + np.linspace(-5.0 * DAY_S, 5.0 * DAY_S, 14_401)  # a minute apart
DECAY_PER_S = 0.7 * np.log(10.0) / DAY_S
ten_seconds = 10.0
UP, DOWN = (0.0, 0.0, 1.0), (0.0, 0.0, -1.0)


def profile(peak_excess: float) -> np.ndarray:
    """A Jenniskens (1994) profile, 0.7 decades a day, as rates (1, T) that make this excess at the peak."""
    return BACKGROUND * peak_excess * np.exp(-DECAY_PER_S * np.abs(UNIX_S - PEAK))[None]


def judge(peak_excess: float, **policy: float) -> Assessment:
    return assess(judged_by([BACKGROUND], **policy), UNIX_S, profile(peak_excess), PEAK)


def reach_s(peak_excess: float, threshold: float) -> float:
    """Seconds from the peak at which the excess has fallen to a threshold."""
    return float(np.log(peak_excess / threshold) / DECAY_PER_S)


@pytest.mark.parametrize(
    ("factor", "level"),
    [(1.0, "steady"), (1.49, "steady"), (1.5, "ready"), (2.49, "ready"), (2.5, "shelter"), (80.0, "shelter")],
)
def test_levels_follow_the_thresholds(factor: float, level: str):
    # a threshold itself counts; excesses are exact here because 1.5 and 2.5 are
    assert judge(factor - 1.0, min_expected_impacts=0.0).level is Level(level)


@pytest.mark.parametrize(("factor", "level"), [(1.2, "ready"), (1.3, "shelter"), (1.1, "steady")])
def test_the_thresholds_are_the_operators_own(factor: float, level: str):
    assert judge(factor - 1.0, ready_at=1.15, shelter_at=1.25).level is Level(level)


def test_onset_and_end_are_where_the_factor_passes_ready_at():
    judged = judge(4.0)
    assert judged.peak_unix_s == PEAK
    reach = reach_s(4.0, 0.5)
    assert_allclose([PEAK - judged.onset_unix_s, judged.end_unix_s - PEAK], reach, atol=ten_seconds)


def test_a_steady_passage_lasts_while_it_stands_above_half_its_peak():
    judged = judge(0.2)
    reach = reach_s(2.0, 1.0)
    assert judged.level is Level.STEADY
    assert_allclose([PEAK - judged.onset_unix_s, judged.end_unix_s - PEAK], reach, atol=ten_seconds)


def test_impacts_are_the_integral_between_onset_and_end():
    # both sides: 2 A F (1 - e^-k t)/k, with e^-k t = 0.5/4 at onset and end
    one_permille = 1e-3
    judged = judge(4.0)
    expected = 2.0 * AREA_M2 * BACKGROUND * 4.0 * (1.0 - 0.5 / 4.0) / DECAY_PER_S
    assert_allclose(judged.impacts, [expected], rtol=one_permille)
    lasting = 2.0 * reach_s(4.0, 0.5)
    assert_allclose(judged.background_impacts, [AREA_M2 * BACKGROUND * lasting], rtol=one_permille)


def test_peaks_are_factors_over_the_whole_series():
    judged = judge(4.0)
    assert_allclose([judged.governing_peak, *judged.row_peak, *judged.satellite_peak], 5.0)


def test_fewer_impacts_than_the_floor_keep_a_passage_steady():
    expected = 2.0 * AREA_M2 * BACKGROUND * 100.0 * (1.0 - 0.5 / 100.0) / DECAY_PER_S
    assert judge(100.0, min_expected_impacts=1.01 * expected).level is Level.STEADY
    assert judge(100.0, min_expected_impacts=0.99 * expected).level is Level.SHELTER


BOTH = (Face("small", UP, 1e-6, (MASS,), sensitive=True), Face("large", DOWN, 10.0, (MASS,)))
DULL = (Face("small", UP, 1e-6, (MASS,)), BOTH[1])


def on_two_faces(faces: tuple[Face, ...], **policy: float) -> tuple[Baseline, np.ndarray]:
    """A tenfold factor on the small face, a tenth more on the large one."""
    return judged_by([BACKGROUND, BACKGROUND], faces, **policy), np.concatenate([profile(9.0), profile(0.1)])


def test_a_sensitive_face_raises_the_level_alone():
    base, rates = on_two_faces(BOTH, min_expected_impacts=0.0)
    assert assess(base, UNIX_S, rates, PEAK).level is Level.SHELTER


def test_a_face_that_is_not_sensitive_does_not():
    base, rates = on_two_faces(DULL, min_expected_impacts=0.0)
    judged = assess(base, UNIX_S, rates, PEAK)
    assert judged.level is Level.STEADY
    assert_allclose(judged.row_peak, [10.0, 1.1])  # it is told all the same


def test_the_floor_counts_the_impacts_of_the_trigger_itself():
    # the large face has plenty of impacts; those on the small sensitive one are too few to cry wolf over
    base, rates = on_two_faces(BOTH, min_expected_impacts=1e-6)
    judged = assess(base, UNIX_S, rates, PEAK)
    assert judged.impacts[0] > 1e-2
    assert judged.level is Level.STEADY


def test_a_trigger_below_the_floor_does_not_stretch_a_passage_that_counts():
    base, rates = on_two_faces(BOTH, min_expected_impacts=1e-6)
    judged = assess(base, UNIX_S, rates * np.array([[1.0], [20.0]]), PEAK)
    assert judged.level is Level.SHELTER  # 1 + 2.0 on the satellite
    assert_allclose(judged.governing_peak, 3.0, rtol=1e-5)
    assert_allclose(PEAK - judged.onset_unix_s, reach_s(2.0, 0.5), atol=ten_seconds)


def test_each_label_has_impacts_of_its_own():
    faces = (Face("front", UP, 2.0, (MASS, CHARGE)),)
    base = judged_by([BACKGROUND, 10.0 * BACKGROUND], faces)
    judged = assess(base, UNIX_S, np.concatenate([profile(4.0), profile(2.0)]), PEAK)
    assert_allclose(judged.impacts[0] / judged.impacts[1], 2.0)
    assert_allclose(judged.satellite_peak, [5.0, 1.2])


def test_shelter_gaps_between_do_not_end_a_passage():
    lit = np.sin(2.0 * np.pi * (UNIX_S - PEAK) / 5550.0 + 1.0) > -0.3
    judged = assess(judged_by([BACKGROUND]), UNIX_S, profile(4.0) * lit, PEAK)
    assert_allclose(judged.end_unix_s - judged.onset_unix_s, 2.0 * reach_s(4.0, 0.5), atol=2 * 3000.0)


def test_a_passage_under_way_begins_with_the_series():
    after = UNIX_S >= PEAK + 3600.0
    judged = assess(judged_by([BACKGROUND]), UNIX_S[after], profile(4.0)[:, after], PEAK)
    assert judged.onset_unix_s == judged.peak_unix_s == UNIX_S[after][0]


def test_a_stream_that_is_never_met_is_steady_with_finite_numbers():
    judged = assess(judged_by([BACKGROUND], min_expected_impacts=0.0), UNIX_S, 0.0 * profile(1.0), PEAK)
    assert judged.level is Level.STEADY
    assert (judged.onset_unix_s, judged.end_unix_s) == (UNIX_S[0], UNIX_S[-1])
    assert judged.impacts.tolist() == [0.0]
    assert judged.governing_peak == 1.0


def test_the_peak_is_told_where_the_stream_itself_is_strongest():
    # one sample a little above the others, half a day off: the same peak to a hundredth, told at the maximum
    rates = profile(4.0)
    odd = int(np.argmin(np.abs(UNIX_S - PEAK - 43_200.0)))
    rates[0, odd] = BACKGROUND * 4.0 * 1.005
    judged = assess(judged_by([BACKGROUND]), UNIX_S, rates, PEAK)
    assert abs(judged.peak_unix_s - PEAK) <= ten_seconds
    assert_allclose(judged.governing_peak, 1.0 + 4.0 * 1.005)
    rates[0, odd] = BACKGROUND * 4.0 * 1.02
    assert assess(judged_by([BACKGROUND]), UNIX_S, rates, PEAK).peak_unix_s == UNIX_S[odd]


def test_crossings_are_interpolated():
    span = crossing_span(np.array([0.0, 10.0, 20.0, 30.0]), np.array([0.0, 4.0, 2.0, 0.0]), 1.0)
    assert_allclose(span, (2.5, 25.0))


def test_a_span_of_one_instant_keeps_the_samples_beside_it():
    assert crossing_span(np.array([0.0, 10.0, 20.0]), np.array([0.0, 4.0, 2.0]), 4.0) == (0.0, 20.0)
    assert crossing_span(np.array([0.0, 10.0, 20.0]), np.array([4.0, 1.0, 0.0]), 4.0) == (0.0, 10.0)


@pytest.mark.parametrize(("start", "end"), [(0.0, 30.0), (3.0, 17.0), (12.0, 12.0), (25.0, 30.0)])
def test_the_integral_of_a_line_is_exact_on_whole_steps(start: float, end: float):
    # trapezoid, and linear in between: exact at the samples, and everywhere for a constant
    unix_s = np.array([0.0, 10.0, 20.0, 30.0])
    values = np.stack([np.full(4, 2.0), unix_s])
    constant, line = integral(unix_s, values, start, end)
    assert_allclose(constant, 2.0 * (end - start))
    if start % 10.0 == end % 10.0 == 0.0:
        assert_allclose(line, 0.5 * (end**2 - start**2))
