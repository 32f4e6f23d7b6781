"""Real orbits: every element set of the published SGP4 verification file (Vallado et al. 2006, AIAA 2006-6753).

The file ships inside the ``sgp4`` package. Each set is computed near its own epoch, with a stream peaking every
fifteen degrees of solar longitude so that none is without a passage.
"""

from __future__ import annotations

import json
import math
from dataclasses import replace
from functools import cache
from importlib import resources

import pytest

from app.core.orbit.elements import MeanElements
from app.core.sky.times import parse_utc
from app.core.streams.model import Component, Stream
from app.errors import FileError
from app.formats.tle import read_tle
from app.pipeline import Registered, SatelliteResult, compute_satellites
from tests.core.advice.samples import DAY_S, PERSEIDS, WALL, box, catalogue, inputs

NAME = "SGP4-VER.TLE"
RESULTS = read_tle(resources.files("sgp4").joinpath(NAME).read_text("ascii"), NAME, text_after_column_69=True)
SETS = [r for r in RESULTS if isinstance(r, MeanElements)]
# Perigee in the air, or down within three days; the file's own remarks tell of low perigees and decay.
GROUNDED = {
    "16925": "perigee at 6461 km",
    "22312": "perigee at 6458 km",
    "28350": "decaying",
    "28872": "perigee at 6326 km",
    "29141": "decaying",
}
GOOD = [e for e in SETS if e.object_name not in GROUNDED]


def every_fifteen_degrees() -> tuple[Stream, ...]:
    return tuple(
        replace(
            PERSEIDS,
            code=f"S{peak:03d}",
            components=(Component("main", float(peak), 50.0, 0.3, 0.3),),
            radiant_ra_deg=float(peak),
            start_solar_longitude_deg=(peak - 5.0) % 360.0,
            end_solar_longitude_deg=(peak + 5.0) % 360.0,
        )
        for peak in range(0, 360, 15)
    )


@cache
def computed(elements: MeanElements, days_after: float = 0.0) -> SatelliteResult:
    run = inputs(
        as_of_unix_s=elements.epoch_unix_s + days_after * DAY_S,
        outlook_days=30.0,
        horizon_low_days=3.0,
        horizon_high_days=3.0,
        catalogue=catalogue(*every_fifteen_degrees()),
    )
    (result,) = compute_satellites(run, [Registered(box(WALL), elements)])
    return result


def numbers(value: object) -> list[float]:
    if isinstance(value, dict):
        return [x for each in value.values() for x in numbers(each)]
    if isinstance(value, list | tuple):
        return [x for each in value for x in numbers(each)]
    return [float(value)] if isinstance(value, int | float) else []


def test_every_set_of_the_file_is_accounted_for():
    refused = [r for r in RESULTS if isinstance(r, FileError)]
    assert (len(refused), len(SETS), len(RESULTS)) == (3, 30, 33)
    assert all("checksum" in r.problem for r in refused)
    assert GROUNDED.keys() < {e.object_name for e in SETS}


@pytest.mark.parametrize(
    "elements", [e for e in SETS if e.object_name in GROUNDED], ids=lambda e: e.object_name
)
def test_orbits_that_reach_the_air_are_rows_that_say_so(elements: MeanElements):
    result = computed(elements)
    assert (result.state, result.advisories) == ("failed", ())
    assert result.reason is not None
    assert GROUNDED[elements.object_name] in result.reason


@pytest.mark.parametrize("elements", GOOD, ids=[e.object_name for e in GOOD])
def test_every_other_orbit_ends_in_finite_advisories(elements: MeanElements):
    result = computed(elements)
    assert (result.state, result.reason) == ("computed", None)
    assert 2 <= len(result.advisories) <= 3
    json.dumps(result.advisories, allow_nan=False)
    assert all(math.isfinite(x) for x in numbers(result.advisories))
    for body in result.advisories:
        assert parse_utc(body["onset"]) <= parse_utc(body["peak_at"]) <= parse_utc(body["end"])
        assert all(row["mid"] >= 1.0 for row in body["enhancement_peak"])
        assert all(w["duration_s"] >= 60 for w in body["lee_windows"])


def test_most_of_them_have_a_plan_in_their_first_days():
    plans = [e.object_name for e in GOOD if any(a["depth"] == "plan" for a in computed(e).advisories)]
    assert len(plans) >= 15


@pytest.mark.parametrize("days_after", [20.0, 400.0])
def test_a_set_long_past_its_epoch_still_gives_the_outlook(days_after: float):
    stale = computed(next(e for e in SETS if e.object_name == "28057"), days_after)
    assert stale.state == "computed"
    assert {a["depth"] for a in stale.advisories} == {"outlook"}


def test_all_sets_at_once_a_fleet_in_one_run_long_after_their_epochs():
    run = inputs(catalogue=catalogue(*every_fifteen_degrees()), outlook_days=30.0)
    results = compute_satellites(run, [Registered(box(WALL), e) for e in SETS])
    failed = [e.object_name for e, r in zip(SETS, results, strict=True) if r.state == "failed"]
    assert failed == ["16925", "22312", "28872"]  # no plan, so a decay within it is not looked for
