"""Trial requests: the standing example and variations of it."""

from __future__ import annotations

import copy
import json
from typing import Any

from app.catalogue_file import load_catalogue
from app.trial import run_trial

CATALOGUE = load_catalogue()

EXAMPLE: dict[str, Any] = {
    "as_of": "2026-08-10T00:00:00Z",
    "states": [{"t": "2026-08-13T02:00:00Z", "r_km": [7000.0, 0.0, 0.0], "v_km_s": [0.0, 7.5, 0.0]}],
    "frame": "GCRF",
    "attitude": {"law": "inertial", "quaternion_xyzw": [0, 0, 0, 1]},
    "faces": [
        {
            "name": "aperture",
            "normal": [1, 0, 0],
            "area_m2": 0.35,
            "criteria": [
                {"kind": "mass", "min_mass_g": 1e-6},
                {"kind": "penetration", "wall_mm": 1.0, "material": "al-6061-t6"},
                {"kind": "charge", "min_charge_c": 1e-9},
                {"kind": "energy", "min_energy_j": 1.0},
            ],
        }
    ],
    "streams": [
        {
            "code": "XXX",
            "solar_longitude_peak_deg": 140.0,
            "zhr_peak": 100,
            "b_rise_per_deg": 0.2,
            "b_fall_per_deg": 0.2,
            "population_index_r": 2.2,
            "v_geocentric_km_s": 59.1,
            "radiant_ra_deg": 48.0,
            "radiant_dec_deg": 58.0,
            "drift_ra_deg_per_deg": 0.0,
            "drift_dec_deg_per_deg": 0.0,
            "radiant_spread_deg": 0.0,
        }
    ],
}
OMM: dict[str, Any] = {
    "OBJECT_NAME": "KESTREL",
    "OBJECT_ID": "2026-012B",
    "CENTER_NAME": "EARTH",
    "REF_FRAME": "TEME",
    "TIME_SYSTEM": "UTC",
    "MEAN_ELEMENT_THEORY": "SGP4",
    "EPOCH": "2026-08-10T06:00:00",
    "MEAN_MOTION": 15.2,
    "ECCENTRICITY": 0.001,
    "INCLINATION": 51.6,
    "RA_OF_ASC_NODE": 10.0,
    "ARG_OF_PERICENTER": 20.0,
    "MEAN_ANOMALY": 30.0,
    "BSTAR": 0.0,
}
MISSING = object()


def request(**changes: Any) -> dict[str, Any]:
    """The example with dotted paths changed (``faces__0__name``) or, given ``MISSING``, left out."""
    document = copy.deepcopy(EXAMPLE)
    for path, value in changes.items():
        *way, last = [int(step) if step.isdigit() else step for step in path.split("__")]
        place: Any = document
        for step in way:
            place = place[step]
        if value is MISSING:
            del place[last]
        else:
            place[last] = value
    return document


def by_orbit(**changes: Any) -> dict[str, Any]:
    """The example along an orbit instead of states."""
    document = request(states=MISSING)
    document.update(
        {"orbit": dict(OMM), "from": "2026-08-13T02:00:00Z", "to": "2026-08-13T02:10:00Z", "step_s": 120}
    )
    document.update(changes)
    return {name: value for name, value in document.items() if value is not MISSING}


def run(document: object, law: str = "jvb") -> dict[str, Any]:
    """Answer a trial with the shipped catalogue; the answer is JSON."""
    answer = run_trial(document, CATALOGUE, law)
    assert json.loads(json.dumps(answer, allow_nan=False)) == answer
    return answer


def only(answer: dict[str, Any]) -> tuple[dict[str, Any], dict[str, Any]]:
    """The one stream and the first criterion of the one face of a trial of one state."""
    (state,) = answer["states"]
    (stream,) = state["streams"]
    (face,) = state["faces"]
    return stream, face["criteria"][0]
