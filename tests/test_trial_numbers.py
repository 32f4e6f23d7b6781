"""The numbers of a trial against published and derived ones (check values: their source beside each)."""

from __future__ import annotations

import copy
import math
from typing import Any

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.sky.times import TimeGrid, parse_utc
from tests.trials import EXAMPLE, MISSING, only, request, run

MASS = {"kind": "mass", "min_mass_g": 1e-6}
five_digits = 1e-5


def test_the_rate_follows_the_solar_longitude():
    stream, _ = only(run(EXAMPLE))
    longitude = TimeGrid(np.array([parse_utc("2026-08-13T02:00:00Z")])).solar_longitude_deg[0]
    assert abs(longitude - 140.0) < 0.1
    assert_allclose(stream["zhr"], 100.0 * 10.0 ** (-0.2 * abs(longitude - 140.0)), rtol=five_digits)


def test_the_reference_mass_is_the_smallest_asked_for():
    pair = [{"kind": "mass", "min_mass_g": 1e-3}, MASS]
    stream, _ = only(run(request(faces__0__criteria=pair)))
    assert stream["min_mass_g"] == 1e-6


@pytest.mark.parametrize(
    ("law", "v_entry_km_s", "mass_g"),
    [
        # Jacchia, Verniani & Briggs 1967 in the short form of Peterson 1999; Verniani 1973: magnitude 6.5
        ("jvb", 20.0, 1.5946e-3),
        ("jvb", 35.0, 1.8093e-4),
        ("jvb", 70.0, 1.2214e-5),
        ("verniani", 20.0, 6.7902e-3),
        ("verniani", 35.0, 7.2398e-4),
        ("verniani", 70.0, 4.5249e-5),
    ],
)
def test_without_a_mass_the_reference_is_magnitude_six_and_a_half(
    law: str, v_entry_km_s: float, mass_g: float
):
    four_digits = 1e-4
    entry = {"streams__0__v_geocentric_km_s": MISSING, "streams__0__v_inf_km_s": v_entry_km_s}
    charge = [{"kind": "charge", "min_charge_c": 1e-9}]
    stream, _ = only(run(request(faces__0__criteria=charge, **entry), law))
    assert_allclose(stream["min_mass_g"], mass_g, rtol=four_digits)


@pytest.mark.parametrize(("v_inf_km_s", "f_zenith"), [(20.0, 1.1487), (35.0, 1.0496), (59.1, 1.0175)])
def test_the_flux_at_infinity_is_that_of_koschack_and_rendtel(v_inf_km_s: float, f_zenith: float):
    """ZHR 100, r 2.6: 57.44 per 1000 km2 and hour (Koschack & Rendtel 1990), less the zenith focusing (derived)."""
    two_decimals = 2e-4
    changes = {
        "streams__0__b_rise_per_deg": 0.0,
        "streams__0__b_fall_per_deg": 0.0,
        "streams__0__population_index_r": 2.6,
        "streams__0__v_geocentric_km_s": v_inf_km_s,
        "faces__0__criteria": [{"kind": "charge", "min_charge_c": 1e-9}],
    }
    stream, _ = only(run(request(**changes)))
    assert stream["zhr"] == 100.0
    assert_allclose(stream["flux_at_infinity_per_m2_s"] * f_zenith, 57.44e-9 / 3600.0, rtol=two_decimals)


def arriving(
    theta_deg: float, v_inf_km_s: float, r_km: float = 6778.0, v_km_s: tuple[float, ...] = (0.0, 0.0, 0.0)
) -> dict[str, Any]:
    """A place on the GCRF x axis, the stream's flow ``theta_deg`` from it towards -y; the face looks to +y."""
    return request(
        states__0__r_km=[r_km, 0.0, 0.0],
        states__0__v_km_s=list(v_km_s),
        faces__0__normal=[0, 1, 0],
        faces__0__criteria=[MASS],
        streams__0__v_geocentric_km_s=v_inf_km_s,
        streams__0__radiant_ra_deg=180.0 - theta_deg,
        streams__0__radiant_dec_deg=0.0,
    )


def test_a_focused_stream_has_the_published_density_and_velocity():
    # derived, proven by direct integration: r 6778, theta 90, v 20: n+ 1.013430, v_r -2.60190, v_t 22.60190
    stream, _ = only(run(arriving(90.0, 20.0)))
    assert_allclose(stream["density_ratio"], 1.013430, atol=1e-6)
    assert_allclose(stream["speed_km_s"], math.hypot(2.60190, 22.60190), rtol=1e-6)
    assert_allclose(
        np.array(stream["from_direction"]) * stream["speed_km_s"], [2.60190, 22.60190, 0.0], atol=1e-5
    )


def test_the_flux_on_a_face_square_to_it_is_the_published_one():
    # flux over flux at infinity 1.152837 for r 6778, theta 90, v 20 (derived)
    document = arriving(90.0, 20.0)
    document["faces"][0]["normal"] = [2.60190, 22.60190, 0.0]
    stream, criterion = only(run(document))
    ratio = criterion["stream_flux_per_m2_s"]["XXX"] / stream["flux_at_infinity_per_m2_s"]
    assert_allclose(ratio, 1.152837, rtol=five_digits)


def test_the_satellites_own_motion_is_taken_off():
    stream, _ = only(run(arriving(90.0, 20.0, v_km_s=(0.0, 0.0, 7.7))))
    expected = np.array([-2.60190, -22.60190, -7.7])
    assert_allclose(stream["speed_km_s"], np.linalg.norm(expected), rtol=1e-6)
    assert_allclose(stream["from_direction"], -expected / np.linalg.norm(expected), atol=1e-6)


def test_a_face_turned_away_meets_nothing():
    document = arriving(90.0, 20.0)
    document["faces"][0]["normal"] = [0, -1, 0]
    stream, criterion = only(run(document))
    assert not stream["sheltered"]
    assert criterion["stream_flux_per_m2_s"] == {"XXX": 0.0}
    assert criterion["enhancement"]["mid"] == 1.0


@pytest.mark.parametrize(
    ("theta_deg", "sheltered"), [(0.0, True), (64.1, True), (64.13, False), (180.0, False)]
)
def test_the_shadow_ends_where_it_is_published_to(theta_deg: float, sheltered: bool):
    # half-angle of the bent shadow at 6778 km for 20 km/s: 64.114 degrees (derived)
    stream, _ = only(run(arriving(theta_deg, 20.0)))
    assert stream["sheltered"] is sheltered


def test_a_sheltered_stream_is_nothing_and_says_so():
    stream, criterion = only(run(arriving(10.0, 59.1)))
    assert (stream["sheltered"], stream["density_ratio"]) == (True, 0.0)
    assert (stream["speed_km_s"], stream["from_direction"]) == (None, None)
    assert stream["flux_at_infinity_per_m2_s"] > 0.0
    assert criterion["stream_flux_per_m2_s"] == {"XXX": 0.0}
    assert criterion["enhancement"] == {"low": None, "mid": 1.0, "high": None}


def test_both_branches_are_counted_where_both_arrive():
    # r 42164, theta 10, v 15: beyond the start of the focus (18322 km) the far side's particles arrive as well
    stream, _ = only(run(arriving(3.0, 15.0, r_km=42164.0)))
    pull_km, half = 398600.4418 / 15.0**2, math.sin(math.radians(1.5))
    q = math.sqrt(1.0 + 2.0 * pull_km / (42164.0 * half**2))
    assert_allclose(stream["density_ratio"], (q * q + 1.0) / (2.0 * q), rtol=1e-9)


def test_enhancement_is_one_plus_streams_over_background():
    two = copy.deepcopy(EXAMPLE)
    two["streams"].append({**two["streams"][0], "code": "YYY", "zhr_peak": 40})
    for criterion in run(two)["states"][0]["faces"][0]["criteria"]:
        fluxes = criterion["stream_flux_per_m2_s"]
        assert list(fluxes) == ["XXX", "YYY"]
        assert_allclose(fluxes["YYY"], 0.4 * fluxes["XXX"], rtol=1e-12)
        factor = 1.0 + sum(fluxes.values()) / criterion["background_flux_per_m2_s"]
        assert_allclose(criterion["enhancement"]["mid"], factor, rtol=1e-12)


def test_components_of_one_code_add_up():
    two = copy.deepcopy(EXAMPLE)
    two["streams"].append({**two["streams"][0], "component": "second"})
    single, double = only(run(EXAMPLE)), only(run(two))
    assert_allclose(double[0]["zhr"], 2.0 * single[0]["zhr"], rtol=1e-12)
    assert_allclose(double[1]["stream_flux_per_m2_s"]["XXX"], 2.0 * single[1]["stream_flux_per_m2_s"]["XXX"])


def test_the_background_is_that_of_the_orbit_of_the_first_state():
    # averaged over the orbit: any state of one circular orbit has the same, to the quadrature's 0.1 percent
    one_permille = 1e-3
    speed = math.sqrt(398600.4418 / 7000.0)
    here, there = (
        only(run(request(states__0__r_km=r, states__0__v_km_s=v)))[1]["background_flux_per_m2_s"]
        for r, v in (([7000.0, 0.0, 0.0], [0.0, speed, 0.0]), ([0.0, 7000.0, 0.0], [-speed, 0.0, 0.0]))
    )
    assert_allclose(here, there, rtol=one_permille)


@pytest.mark.parametrize(
    ("v_km_s", "why"),
    [([0.0, 12.0, 0.0], "not bound to the Earth"), ([0.0, 5.0, 0.0], "reaches the air")],
    ids=["open", "falling"],
)
def test_a_state_without_an_orbit_is_assessed_and_the_background_explained(v_km_s: list[float], why: str):
    answer = run(request(states__0__v_km_s=v_km_s))
    (note,) = answer["notes"]
    assert "the first state alone" in note
    assert why in note
    assert only(answer)[1]["background_flux_per_m2_s"] > 0.0


def test_a_capped_lens_is_noted():
    slow = arriving(0.1, 15.0, r_km=42164.0)
    slow["streams"][0]["radiant_spread_deg"] = 1.0
    assert any("anti-radiant" in note for note in run(slow)["notes"])


def test_faces_without_background_have_no_factor():
    # a plate at rest on top of the air, looking straight down: every direction it sees is blocked
    document = arriving(90.0, 20.0, r_km=6478.0)
    document["faces"][0]["normal"] = [-1, 0, 0]
    _, criterion = only(run(document))
    assert criterion["background_flux_per_m2_s"] == 0.0
    assert criterion["enhancement"] == {"low": None, "mid": None, "high": None}
