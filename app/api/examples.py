"""Sample documents for the OpenAPI description: an invented satellite, in the shapes that are answered."""

from __future__ import annotations

from typing import Any

from app.core.advice.advisory import CAUTION

DIGEST = "9f2c0d5be1a74c3388d6f0a1b2c3d4e5f60718293a4b5c6d7e8f901234567890"
SATELLITE: dict[str, Any] = {
    "id": "kestrel-1",
    "name": "Kestrel 1",
    "attitude": {"law": "nadir"},
    "faces": [
        {
            "name": "aperture",
            "normal": [0.0, 0.0, 1.0],
            "area_m2": 0.35,
            "sensitive": True,
            "criteria": [
                {"kind": "penetration", "wall_mm": 1.0, "material": "al-6061-t6"},
                {"kind": "charge", "min_charge_c": 1e-3},
            ],
        }
    ],
    "joints": [],
    "policy": {"ready_at": 1.5, "shelter_at": 2.5, "min_expected_impacts": 1e-7, "min_lee_s": 60.0},
}
OMM: dict[str, Any] = {
    "CCSDS_OMM_VERS": "3.0",
    "OBJECT_NAME": "KESTREL 1",
    "OBJECT_ID": "2026-012B",
    "CENTER_NAME": "EARTH",
    "REF_FRAME": "TEME",
    "TIME_SYSTEM": "UTC",
    "MEAN_ELEMENT_THEORY": "SGP4",
    "EPOCH": "2026-08-09T18:00:00Z",
    "MEAN_MOTION": 14.8,
    "ECCENTRICITY": 0.0011,
    "INCLINATION": 98.2,
    "RA_OF_ASC_NODE": 210.4,
    "ARG_OF_PERICENTER": 87.0,
    "MEAN_ANOMALY": 273.2,
    "BSTAR": 0.00004,
    "MEAN_MOTION_DOT": 0.0,
    "MEAN_MOTION_DDOT": 0.0,
}
ORBIT: dict[str, Any] = {
    "satellite": "kestrel-1",
    "source_format": "omm-json",
    "received_at": "2026-08-09T19:02:11Z",
    "epoch": "2026-08-09T18:00:00Z",
    "age_days": 0.25,
    "as_of": "2026-08-10T00:00:00Z",
    "omm": OMM,
    "notes": [],
}
OMM_KVN = "\n".join(f"{name} = {value}" for name, value in OMM.items()) + "\n"
OMM_CSV = ",".join(OMM) + "\n" + ",".join(str(value) for value in OMM.values()) + "\n"
LEE_WINDOW: dict[str, Any] = {
    "start": "2026-08-13T01:12:40Z",
    "end": "2026-08-13T01:45:10Z",
    "duration_s": 1950,
    "streams": ["PER"],
}


def band(mid: float, **more: Any) -> dict[str, Any]:
    """Write a value whose band is not computed yet."""
    return {**more, "low": None, "mid": mid, "high": None}


ADVISORY: dict[str, Any] = {
    "id": "PER-2026.kestrel-1",
    "satellite": "kestrel-1",
    "stream": "PER",
    "stream_name": "Perseids",
    "passage": "PER-2026",
    "revision": 1,
    "status": "current",
    "level": "ready",
    "depth": "plan",
    "issued_at": "2026-08-10T00:00:00Z",
    "onset": "2026-08-12T11:20:00Z",
    "peak_at": "2026-08-13T02:10:00Z",
    "end": "2026-08-13T16:05:00Z",
    "peak_solar_longitude_deg": 140.05,
    "peak_zhr": 97.4,
    "radiant_ra_deg": 48.2,
    "radiant_dec_deg": 58.1,
    "v_geocentric_km_s": 59.1,
    "satellite_enhancement_peak": [band(1.8, criterion="charge"), band(1.1, criterion="penetration")],
    "enhancement_peak": [band(2.1, criterion="charge", face="aperture", sensitive=True)],
    "expected_impacts": [band(1.2e-5, criterion="charge")],
    "background_impacts": [band(2.3e-5, criterion="charge")],
    "lee_windows": [LEE_WINDOW],
    "lee_windows_from": "2026-08-12T11:20:00Z",
    "lee_windows_until": "2026-08-13T16:05:00Z",
    "safe_attitude_windows": [],
    "plan_until": "2026-08-16T18:00:00Z",
    "actions": [
        "Prepare before 2026-08-12T11:20:00Z: staff the console and keep manoeuvres out of the passage."
    ],
    "changes": [{"what": "new", "text": "First advisory for this passage."}],
    "provenance": {
        "run": "run-20260810T000000Z-1f2e3d4c",
        "as_of": "2026-08-10T00:00:00Z",
        "software": "stonechat 0.1.0",
        "catalogue_digest": DIGEST,
        "orbit_epoch": "2026-08-09T18:00:00Z",
        "orbit_age_days": 0.25,
        "mass_law": "jvb",
    },
    "caution": CAUTION,
}
PROVENANCE: dict[str, Any] = {
    "software": "stonechat 0.1.0",
    "catalogue_digest": DIGEST,
    "mass_law": "jvb",
    "orbit_epoch": "2026-08-09T18:00:00Z",
    "orbit_source_format": "omm-json",
}
ENHANCEMENT: dict[str, Any] = {
    "satellite": "kestrel-1",
    "times": ["2026-08-13T02:00:00Z", "2026-08-13T02:01:00Z"],
    "streams": {"PER": {"zhr": [97.3, 97.4], "sheltered": [False, False]}},
    "whole": [
        {
            "criterion": "charge",
            "low": None,
            "mid": [1.7, 1.8],
            "high": None,
            "by_stream": {"PER": [0.7, 0.8]},
        }
    ],
    "faces": [
        {
            "criterion": "charge",
            "face": "aperture",
            "background_per_m2_s": 3.1e-10,
            "low": None,
            "mid": [2.0, 2.1],
            "high": None,
            "by_stream": {"PER": [1.0, 1.1]},
        }
    ],
    "provenance": PROVENANCE,
    "caution": CAUTION,
}
WINDOWS: dict[str, Any] = {
    "satellite": "kestrel-1",
    "kind": "lee",
    "windows": [LEE_WINDOW],
    "provenance": PROVENANCE,
    "caution": CAUTION,
}
STREAM: dict[str, Any] = {
    "code": "PER",
    "name": "Perseids",
    "confidence": "A",
    "enabled": True,
    "why_off": None,
    "parent_body": {
        "value": "109P/Swift-Tuttle",
        "source": "MDC",
        "citation": ["International Astronomical Union, Meteor Data Center"],
        "provenance": "read",
    },
    "component_names": ["main"],
    "components": [
        {
            "zhr_peak": {
                "value": 100.0,
                "source": "IMO18",
                "citation": ["International Meteor Organization, 2018 Meteor Shower Calendar"],
                "provenance": "read",
            }
        }
    ],
    "notes": [],
    "catalogue_digest": DIGEST,
}
RUN: dict[str, Any] = {
    "id": "run-20260810T000000Z-1f2e3d4c",
    "state": "published",
    "as_of": "2026-08-10T00:00:00Z",
    "requested_at": "2026-08-10T00:00:01Z",
    "started_at": "2026-08-10T00:00:02Z",
    "finished_at": "2026-08-10T00:00:40Z",
    "satellites_total": 2,
    "satellites_done": 2,
    "computed": 1,
    "failed": 1,
    "revisions_new": 12,
    "reason": None,
}
RUN_SATELLITES: list[dict[str, Any]] = [
    {"satellite": "kestrel-1", "state": "computed", "reason": None},
    {"satellite": "kestrel-2", "state": "failed", "reason": "no orbit is registered; give it an OMM or TLE"},
]
QUEUED: dict[str, Any] = {
    **RUN,
    "state": "queued",
    "started_at": None,
    "finished_at": None,
    **dict.fromkeys(("satellites_total", "satellites_done", "computed", "failed", "revisions_new"), 0),
}
RUN_REQUEST: dict[str, Any] = {"as_of": "2026-08-10T00:00:00Z", "satellites": ["kestrel-1", "kestrel-2"]}
TRIAL_REQUEST: dict[str, Any] = {
    "as_of": "2026-08-10T00:00:00Z",
    "states": [{"t": "2026-08-13T02:00:00Z", "r_km": [7000.0, 0.0, 0.0], "v_km_s": [0.0, 7.5, 0.0]}],
    "frame": "GCRF",
    "attitude": {"law": "inertial", "quaternion_xyzw": [0.0, 0.0, 0.0, 1.0]},
    "faces": [
        {
            "name": "aperture",
            "normal": [1.0, 0.0, 0.0],
            "area_m2": 0.35,
            "criteria": [{"kind": "mass", "min_mass_g": 1e-6}],
        }
    ],
}
TRIAL: dict[str, Any] = {
    "states": [
        {
            "t": "2026-08-13T02:00:00Z",
            "streams": [
                {
                    "code": "PER",
                    "zhr": 97.1,
                    "flux_at_infinity_per_m2_s": 1e-10,
                    "min_mass_g": 1e-6,
                    "sheltered": False,
                    "density_ratio": 1.0,
                    "speed_km_s": 60.1,
                    "from_direction": [0.352, 0.402, 0.845],
                }
            ],
            "faces": [
                {
                    "name": "aperture",
                    "criteria": [
                        {
                            "kind": "mass",
                            "stream_flux_per_m2_s": {"PER": 3.5e-11},
                            "background_flux_per_m2_s": 1e-8,
                            "enhancement": {"low": None, "mid": 1.0035, "high": None},
                        }
                    ],
                }
            ],
        }
    ],
    "caution": CAUTION,
}
READY: dict[str, Any] = {
    "status": "ready",
    "schema": "newest",
    "published_run": RUN["id"],
    "published_run_age_s": 5400.0,
    "published_run_failed": 1,
}


def page(*items: Any, cursor: str | None = None) -> dict[str, Any]:
    """Write a page of a list."""
    return {"items": list(items), "next_cursor": cursor}


_HEAD = ("CCSDS_OMM_VERS",)
_METADATA = ("OBJECT_NAME", "OBJECT_ID", "CENTER_NAME", "REF_FRAME", "TIME_SYSTEM", "MEAN_ELEMENT_THEORY")
_TLE = ("BSTAR", "MEAN_MOTION_DOT", "MEAN_MOTION_DDOT")


def _tags(names: tuple[str, ...]) -> str:
    return "".join(f"<{name}>{OMM[name]}</{name}>" for name in names)


OMM_XML = (
    '<?xml version="1.0" encoding="UTF-8"?>\n<omm id="CCSDS_OMM_VERS" version="3.0"><header>'
    "<CREATION_DATE>2026-08-09T18:30:00Z</CREATION_DATE><ORIGINATOR>EXAMPLE</ORIGINATOR></header>"
    f"<body><segment><metadata>{_tags(_METADATA)}</metadata><data><meanElements>"
    f"{_tags(tuple(n for n in OMM if n not in (*_HEAD, *_METADATA, *_TLE)))}</meanElements>"
    f"<tleParameters>{_tags(_TLE)}</tleParameters></data></segment></body></omm>"
)

NAMED: dict[str, Any] = {
    "satellite": SATELLITE,
    "satellites": page(SATELLITE),
    "omm": OMM,
    "orbit": ORBIT,
    "enhancement": ENHANCEMENT,
    "windows": WINDOWS,
    "advisory": ADVISORY,
    "advisories": page(ADVISORY),
    "stream": STREAM,
    "streams": page(STREAM),
    "run request": RUN_REQUEST,
    "queued run": QUEUED,
    "run": {**RUN, "satellites": page(*RUN_SATELLITES)},
    "runs": page(RUN),
    "trial request": TRIAL_REQUEST,
    "trial": TRIAL,
    "alive": {"status": "alive"},
    "ready": READY,
}
