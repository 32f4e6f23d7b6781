"""Extreme but allowed satellites, orbits and trials are computed, or refused with a reason."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st
from starlette.testclient import TestClient

from app.api import examples
from tests.api.any_database import BOTH, MANY, check, lasting_client
from tests.api.harness import SPAN


@pytest.fixture(scope="module", params=BOTH)
def client(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Iterator[TestClient]:
    with lasting_client(request, tmp_path_factory) as lasting:
        yield lasting


orbits = st.fixed_dictionaries(
    {
        "MEAN_MOTION": st.floats(0.001, 20.0) | st.sampled_from([0.05, 1.0027, 2.0, 15.5, 17.2]),
        "ECCENTRICITY": st.floats(0.0, 0.9999999),
        "INCLINATION": st.floats(0.0, 180.0),
        "BSTAR": st.floats(-10.0, 10.0) | st.just(0.0),
        "EPOCH": st.sampled_from(["2026-08-12T00:00:00Z", "2026-08-09T18:00:00Z", "1960-01-01T00:00:00Z"]),
    }
)
attitudes = st.sampled_from(
    [{"law": "nadir"}, {"law": "sun"}, {"law": "inertial", "quaternion_xyzw": [0.5, 0.5, 0.5, 0.5]}]
)
faces = st.fixed_dictionaries(
    {
        "name": st.just("f"),
        "normal": st.tuples(st.sampled_from([-1.0, 1.0]), st.floats(-1e6, 1e6), st.floats(-1.0, 1.0)),
        "area_m2": st.floats(1e-300, 1e6),
        "criteria": st.one_of(
            st.builds(lambda m: [{"kind": "mass", "min_mass_g": m}], st.floats(1e-18, 1e4)),
            st.builds(lambda q: [{"kind": "charge", "min_charge_c": q}], st.floats(1e-15, 1e4)),
            st.builds(lambda e: [{"kind": "energy", "min_energy_j": e}], st.floats(1e-12, 1e9)),
            st.builds(
                lambda w: [{"kind": "penetration", "wall_mm": w, "material": "al-6061-t6"}],
                st.floats(1e-3, 1e3),
            ),
        ),
    }
)


@MANY
@given(orbit=orbits, attitude=attitudes, face=faces)
def test_whatever_is_accepted_is_computed_or_refused_with_a_reason(
    client: TestClient, orbit: dict[str, Any], attitude: dict[str, Any], face: dict[str, Any]
) -> None:
    home = "/v1/satellites/extreme"
    taken = client.put(home, json={"faces": [face], "attitude": attitude})
    check(taken)
    check(client.put(f"{home}/orbit", json={**examples.OMM, **orbit}))
    check(client.get(f"{home}/enhancement?{SPAN}&step_s=900"))
    check(client.get(f"{home}/windows?kind=lee&{SPAN}"))


def vector(most: float) -> st.SearchStrategy[list[float]]:
    return st.lists(st.floats(-most, most), min_size=3, max_size=3)


own_streams = st.fixed_dictionaries(
    {
        "code": st.just("XXX"),
        "solar_longitude_peak_deg": st.floats(0.0, 360.0),
        "zhr_peak": st.floats(0.0, 1e7),
        "b_rise_per_deg": st.floats(0.0, 1e4),
        "b_fall_per_deg": st.floats(0.0, 1e4),
        "population_index_r": st.floats(1.31, 6.0),
        "v_geocentric_km_s": st.floats(1.0, 80.0),
        "radiant_ra_deg": st.floats(-360.0, 720.0),
        "radiant_dec_deg": st.floats(-90.0, 90.0),
        "radiant_spread_deg": st.floats(0.0, 10.0),
    }
)


@MANY
@given(r_km=vector(50_000.0), v_km_s=vector(15.0), face=faces, attitude=attitudes, stream=own_streams)
def test_whatever_trial_is_accepted_is_computed(
    client: TestClient, r_km: Any, v_km_s: Any, face: Any, attitude: Any, stream: Any
) -> None:
    states = [{"t": "2026-08-13T02:00:00Z", "r_km": r_km, "v_km_s": v_km_s}]
    trial = {"as_of": "2026-08-10T00:00:00Z", "states": states, "attitude": attitude, "faces": [face]}
    check(client.post("/v1/trials", json={**trial, "streams": [stream]}))
