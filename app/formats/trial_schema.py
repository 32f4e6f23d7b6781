"""The fields of a trial request: what may be there, of what type, within what limits."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import BaseModel, ConfigDict, Field

from app.formats.satellite_schema import (
    MAX_FACES,
    MAX_JOINTS,
    AttitudeIn,
    Components3,
    FaceIn,
    JointIn,
    Name,
)

MAX_STATES = 20_000
MAX_STREAM_ROWS = 200
Moment = Annotated[str, Field(max_length=40)]


class _Strict(BaseModel):
    model_config = ConfigDict(extra="forbid", strict=True, allow_inf_nan=False, frozen=True)


class StateIn(_Strict):
    """One state of the satellite, GCRF."""

    t: Moment
    r_km: Components3
    v_km_s: Components3


class StreamIn(_Strict):
    """One activity component of a stream, in the catalogue's own columns; rows with one code belong together.

    Give ``v_geocentric_km_s``, or ``v_inf_km_s`` (the catalogued entry speed, the Earth's pull included).
    """

    code: Name
    name: Name | None = None
    component: Name | None = None
    solar_longitude_peak_deg: float
    zhr_peak: float
    b_rise_per_deg: float
    b_fall_per_deg: float
    population_index_r: float
    v_geocentric_km_s: float | None = None
    v_inf_km_s: float | None = None
    radiant_ra_deg: float
    radiant_dec_deg: float
    drift_ra_deg_per_deg: float = 0.0
    drift_dec_deg_per_deg: float = 0.0
    start_solar_longitude_deg: float | None = None
    end_solar_longitude_deg: float | None = None
    bulk_density_kg_m3: float | None = None
    radiant_spread_deg: float | None = None


class TrialIn(_Strict):
    """A trial: states (or an orbit with from, to, step_s), an attitude, faces, and streams of its own if any."""

    as_of: Moment
    states: list[StateIn] | None = Field(default=None, min_length=1, max_length=MAX_STATES)
    orbit: dict[str, Any] | None = None
    from_: Moment | None = Field(default=None, alias="from")
    to: Moment | None = None
    step_s: float | None = Field(default=None, ge=1.0, le=86_400.0)
    frame: Literal["GCRF"] = "GCRF"
    attitude: AttitudeIn = AttitudeIn()
    faces: list[FaceIn] = Field(min_length=1, max_length=MAX_FACES)
    joints: list[JointIn] = Field(default=[], max_length=MAX_JOINTS)
    streams: list[StreamIn] | None = Field(default=None, min_length=1, max_length=MAX_STREAM_ROWS)
