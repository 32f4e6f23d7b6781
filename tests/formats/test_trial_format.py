"""A trial request is read strictly: what is unknown, missing or impossible is refused by the name of its field."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.orbit.sgp4_batch import propagate
from app.core.sky.times import TimeGrid, parse_utc
from app.core.spacecraft.model import AttitudeLawKind
from app.core.streams.model import DEFAULT_DENSITY_KG_M3, DEFAULT_SPREAD_DEG
from app.core.trial import Trial
from app.errors import FieldError
from app.formats.trial import parse_trial
from tests.core.advice.samples import LOW, PERSEIDS, SPRING, catalogue
from tests.trials import EXAMPLE, MISSING, OMM, by_orbit, request

CATALOGUE = catalogue(PERSEIDS, SPRING)


def parse(document: object) -> Trial:
    return parse_trial(document, CATALOGUE)


def refusal(document: object) -> FieldError:
    with pytest.raises(FieldError) as error:
        parse(document)
    return error.value


def test_the_example_is_read_as_it_stands():
    trial = parse(EXAMPLE)
    assert trial.own_streams
    assert trial.unix_s.tolist() == [parse_utc("2026-08-13T02:00:00Z")]
    assert trial.r_km.tolist() == [[7000.0], [0.0], [0.0]]
    assert trial.v_km_s.tolist() == [[0.0], [7.5], [0.0]]
    (stream,) = trial.streams
    assert (stream.code, stream.v_geocentric_km_s, stream.radiant_spread_deg) == ("XXX", 59.1, 0.0)
    (face,) = trial.spacecraft.faces
    assert [c.kind.value for c in face.criteria] == ["mass", "penetration", "charge", "energy"]
    assert trial.spacecraft.attitude.kind is AttitudeLawKind.INERTIAL


def test_what_may_be_left_out_has_defaults():
    left_out = ("frame", "attitude", "faces__0__criteria", "streams__0__drift_ra_deg_per_deg")
    more = ("streams__0__drift_dec_deg_per_deg", "streams__0__radiant_spread_deg")
    trial = parse(request(**dict.fromkeys((*left_out, *more), MISSING)))
    assert trial.spacecraft.attitude.kind is AttitudeLawKind.NADIR
    assert {c.kind.value for c in trial.spacecraft.faces[0].criteria} == {"penetration", "charge"}
    (stream,) = trial.streams
    assert (stream.radiant_spread_deg, stream.bulk_density_kg_m3) == (
        DEFAULT_SPREAD_DEG,
        DEFAULT_DENSITY_KG_M3,
    )
    assert (stream.name, stream.drift_ra_deg_per_deg) == ("XXX", 0.0)


def test_without_streams_it_is_the_catalogues():
    trial = parse(request(streams=MISSING))
    assert trial.streams == CATALOGUE.streams
    assert not trial.own_streams


@pytest.mark.parametrize(
    ("path", "field", "allowed"),
    [
        ("colour", "colour", "as_of"),
        ("states__0__x", "states.0.x", "t, r_km, v_km_s"),
        ("attitude__spin", "attitude.spin", "law, quaternion_xyzw"),
        ("faces__0__colour", "faces.0.colour", "name, normal, area_m2"),
        ("faces__0__criteria__0__min_charge_c", "faces.0.criteria.0.min_charge_c", "kind, min_mass_g, label"),
        ("faces__0__criteria__1__x", "faces.0.criteria.1.x", "kind, wall_mm, material, label"),
        ("streams__0__speed", "streams.0.speed", "code, name, component"),
    ],
)
def test_an_unknown_field_is_refused_by_name_with_the_known_ones(path: str, field: str, allowed: str):
    error = refusal(request(**{path: 1}))
    assert error.field == field
    assert error.problem.startswith("is no field here; allowed are ")
    assert allowed in error.problem


def test_an_unknown_field_of_a_joint_is_refused_too():
    joint = {"name": "drive", "axis": [0, 1, 0], "sun_normal": [0, 0, 1], "speed": 1}
    assert refusal(request(joints=[joint])).field == "joints.0.speed"


REQUIRED = [
    *("as_of", "faces", "states__0__t", "states__0__r_km", "states__0__v_km_s"),
    *("faces__0__name", "faces__0__normal", "faces__0__area_m2", "faces__0__criteria__0__min_mass_g"),
    *(
        f"streams__0__{name}"
        for name in (
            *("code", "solar_longitude_peak_deg", "zhr_peak", "b_rise_per_deg", "b_fall_per_deg"),
            *("population_index_r", "v_geocentric_km_s", "radiant_ra_deg", "radiant_dec_deg"),
        )
    ),
]


@pytest.mark.parametrize("path", REQUIRED)
def test_what_is_missing_is_named(path: str):
    error = refusal(request(**{path: MISSING}))
    assert error.field == path.replace("__", ".")
    assert error.problem.startswith("is missing")


@pytest.mark.parametrize(
    ("path", "value", "field"),
    [
        ("as_of", "yesterday", "as_of"),
        ("as_of", "2026-08-10T00:00:00", "as_of"),
        ("states__0__t", "2026-08-13T02:00:00+02:00", "states.0.t"),
        ("states__0__r_km", [7000.0, 0.0], "states.0.r_km"),
        ("states__0__r_km", [7000.0, 0.0, "0"], "states.0.r_km.2"),
        ("states__0__v_km_s", [0.0, float("nan"), 0.0], "states.0.v_km_s.1"),
        ("states", [], "states"),
        ("states", MISSING, "states"),
        ("frame", "TEME", "frame"),
        ("attitude__law", "spin", "attitude.law"),
        ("attitude__quaternion_xyzw", [0, 0, 0, 2], "attitude.quaternion_xyzw"),
        ("attitude__quaternion_xyzw", MISSING, "attitude.quaternion_xyzw"),
        ("faces", [], "faces"),
        ("faces__0__area_m2", 0.0, "faces.0.area_m2"),
        ("faces__0__criteria__0__kind", "luck", "faces.0.criteria.0"),
        ("faces__0__criteria__0__min_mass_g", -1.0, "faces.0.criteria.0.min_mass_g"),
        ("faces__0__criteria__1__material", "paper", "faces.0.criteria.1.material"),
        ("streams", [], "streams"),
        ("streams__0__zhr_peak", -1, "streams.0.zhr_peak"),
        ("streams__0__population_index_r", 1.2, "streams.0.population_index_r"),
        ("streams__0__radiant_dec_deg", 91.0, "streams.0.radiant_dec_deg"),
        ("streams__0__radiant_spread_deg", -0.1, "streams.0.radiant_spread_deg"),
        ("streams__0__start_solar_longitude_deg", 130.0, "streams.0.start_solar_longitude_deg"),
        ("streams__0__code", "", "streams.0.code"),
        ("from", "2026-08-13T02:00:00Z", "from"),
        ("step_s", 60.0, "step_s"),
    ],
)
def test_what_is_wrong_is_named(path: str, value: object, field: str):
    assert refusal(request(**{path: value})).field == field


@pytest.mark.parametrize("document", [None, [], "trial", 7, True])
def test_what_is_no_object_is_refused(document: object):
    assert refusal(document).field == "document"


def test_the_entry_speed_may_stand_in_for_the_geocentric_one():
    # v_geocentric^2 = v_entry^2 - 123.063: the Earth's pull down to 6478 km
    trial = parse(request(streams__0__v_geocentric_km_s=MISSING, streams__0__v_inf_km_s=60.0))
    assert_allclose(trial.streams[0].v_geocentric_km_s, math.sqrt(60.0**2 - 123.063), rtol=1e-7)
    assert_allclose(trial.streams[0].v_entry_km_s, 60.0, rtol=1e-12)


@pytest.mark.parametrize("entry_km_s", [11.0, 0.0, -60.0])
def test_an_entry_speed_below_the_earths_own_pull_is_refused(entry_km_s: float):
    error = refusal(request(streams__0__v_geocentric_km_s=MISSING, streams__0__v_inf_km_s=entry_km_s))
    assert error.field == "streams.0.v_inf_km_s"
    assert "above 11.1 km/s" in error.problem


def rows(*changes: dict[str, Any]) -> list[dict[str, Any]]:
    return [{**EXAMPLE["streams"][0], **change} for change in changes]


def test_rows_of_one_code_are_components_of_one_stream():
    own = {"component": "late", "solar_longitude_peak_deg": 141.0, "zhr_peak": 30, "b_fall_per_deg": 2.0}
    trial = parse(request(streams=rows({"component": "early"}, own, {"code": "YYY"})))
    first, second = trial.streams
    assert [s.code for s in trial.streams] == ["XXX", "YYY"]
    peaks = [(c.name, c.solar_longitude_peak_deg, c.zhr_peak, c.b_fall_per_deg) for c in first.components]
    assert peaks == [("early", 140.0, 100.0, 0.2), ("late", 141.0, 30.0, 2.0)]
    assert len(second.components) == 1


def test_components_of_one_stream_must_agree_on_the_rest():
    error = refusal(request(streams=rows({}, {"radiant_ra_deg": 49.0})))
    assert (error.field, error.problem) == (
        "streams.1.radiant_ra_deg",
        "differs from the other row of stream XXX",
    )


def test_a_wrong_component_is_named_by_its_own_row():
    assert refusal(request(streams=rows({}, {"zhr_peak": -5}))).field == "streams.1.zhr_peak"


def test_two_criteria_of_one_kind_get_labels_of_their_own():
    pair = [{"kind": "mass", "min_mass_g": 1e-6}, {"kind": "mass", "min_mass_g": 1e-3}]
    trial = parse(request(faces__0__criteria=pair))
    assert [c.label for c in trial.spacecraft.faces[0].criteria] == ["mass", "mass-2"]


def test_an_orbit_gives_the_states_of_sgp4():
    trial = parse(by_orbit())
    assert trial.unix_s.tolist() == [parse_utc("2026-08-13T02:00:00Z") + 120.0 * i for i in range(6)]
    truth = propagate([replace(LOW, object_name="KESTREL")], TimeGrid(trial.unix_s))
    assert_allclose(trial.r_km, truth.r_km[0].T, rtol=0, atol=1e-6)
    assert_allclose(trial.v_km_s, truth.v_km_s[0].T, rtol=0, atol=1e-9)


def test_an_orbit_at_one_instant():
    trial = parse(by_orbit(to="2026-08-13T02:00:00Z"))
    assert trial.unix_s.tolist() == [parse_utc("2026-08-13T02:00:00Z")]
    assert 6700.0 < np.linalg.norm(trial.r_km) < 7000.0


@pytest.mark.parametrize(
    ("change", "field"),
    [
        ({"from": MISSING}, "from"),
        ({"to": MISSING}, "to"),
        ({"step_s": MISSING}, "step_s"),
        ({"to": "2026-08-13T01:00:00Z"}, "to"),
        ({"from": "soon"}, "from"),
        ({"step_s": 0.5}, "step_s"),
        ({"to": "2026-08-20T02:00:00Z", "step_s": 1}, "step_s"),
        ({"states": EXAMPLE["states"]}, "orbit"),
        ({"orbit": {}}, "orbit.OBJECT_NAME"),
        ({"orbit": {**OMM, "ECCENTRICITY": 1.2}}, "orbit.ECCENTRICITY"),
        ({"orbit": {**OMM, "REF_FRAME": "ICRF"}}, "orbit.REF_FRAME"),
        ({"orbit": {**OMM, "EPOCH": {"year": 2026}}}, "orbit.EPOCH"),
        ({"orbit": {**OMM, "MEAN_MOTION": 16.2, "BSTAR": 0.05}}, "orbit"),
        ({"orbit": [OMM]}, "orbit"),
        ({"orbit": "1 25544U"}, "orbit"),
    ],
)
def test_a_wrong_orbit_is_named(change: dict[str, Any], field: str):
    assert refusal(by_orbit(**change)).field == field


def test_a_decayed_orbit_says_when():
    error = refusal(by_orbit(orbit={**OMM, "MEAN_MOTION": 16.2, "BSTAR": 0.05}))
    assert "at 2026-08-13T02:00:00Z" in error.problem
