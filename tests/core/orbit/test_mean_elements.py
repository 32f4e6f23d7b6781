"""What a set of mean elements accepts, and how long it is trusted."""

from __future__ import annotations

import dataclasses
import math

import numpy as np
import pytest

from app.core.orbit.elements import MeanElements
from app.core.orbit.trust import trusted_count
from app.errors import FieldError

GOOD = MeanElements(
    "KESTREL", "2026-012B", 2461262.5, 0.25, 15.2, 0.001, 51.6, 10.0, 20.0, 30.0, 1e-5, 1e-6, 1e-9
)
NUMBERS = [f.name for f in dataclasses.fields(MeanElements) if f.type == "float"]
DAY_S = 86400.0


@pytest.mark.parametrize("name", NUMBERS)
@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf])
def test_every_number_must_be_finite(name: str, value: float):
    with pytest.raises(FieldError) as caught:
        dataclasses.replace(GOOD, **{name: value})
    assert caught.value.field == name


def test_the_fields_checked_are_all_there_are():
    assert len(NUMBERS) == 11
    assert {"mean_motion_dot_rev_per_day2", "mean_motion_ddot_rev_per_day3"} < set(NUMBERS)


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("mean_motion_rev_per_day", 0.0),
        ("mean_motion_rev_per_day", 25.0),
        ("eccentricity", 1.0),
        ("eccentricity", -1e-9),
        ("inclination_deg", 180.1),
        ("bstar_per_earth_radius", 11.0),
    ],
)
def test_limits(name: str, value: float):
    with pytest.raises(FieldError, match=name):
        dataclasses.replace(GOOD, **{name: value})


def test_epoch_in_seconds():
    # JD 2440587.5 is 1970-01-01 (textbook); JD 2461262.5 is 2026-08-10
    assert dataclasses.replace(GOOD, epoch_jd=2440587.5, epoch_fraction=0.5).epoch_unix_s == 43200.0
    assert GOOD.epoch_unix_s == 1_786_320_000.0 + 0.25 * DAY_S


def test_low_orbits_are_those_below_225_minutes():
    assert GOOD.is_low_orbit
    assert not dataclasses.replace(GOOD, mean_motion_rev_per_day=1440.0 / 225.1).is_low_orbit
    assert dataclasses.replace(GOOD, mean_motion_rev_per_day=1440.0 / 224.9).is_low_orbit


def test_an_orbit_is_trusted_for_its_horizon_on_either_side_of_its_epoch():
    days = np.arange(0.0, 20.0)
    assert trusted_count(GOOD, 7.0, GOOD.epoch_unix_s + days * DAY_S) == 8
    assert trusted_count(GOOD, 7.0, GOOD.epoch_unix_s + (days - 5.0) * DAY_S) == 13
    assert trusted_count(GOOD, 7.0, GOOD.epoch_unix_s + (days - 7.5) * DAY_S) == 0
    assert trusted_count(GOOD, 7.0, GOOD.epoch_unix_s + (days + 8.0) * DAY_S) == 0
    assert trusted_count(GOOD, 7.0, np.empty(0)) == 0
