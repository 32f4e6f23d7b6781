"""A trial request in JSON -> the core's ``Trial``."""

from __future__ import annotations

import json
import math
from collections.abc import Sequence
from typing import Any

import numpy as np
from pydantic import BaseModel

from app.core.constants import ESCAPE_SPEED2_KM2_S2
from app.core.orbit.elements import MeanElements
from app.core.orbit.sgp4_batch import first_failure, propagate
from app.core.sky.times import parse_utc, regular_grid
from app.core.spacecraft.model import Spacecraft
from app.core.streams.model import DEFAULT_DENSITY_KG_M3, DEFAULT_SPREAD_DEG, Catalogue, Component, Stream
from app.core.trial import Floats, Trial
from app.errors import FieldError, FileError
from app.formats.orbit import read_orbits
from app.formats.satellite import PARTS, parse_spacecraft
from app.formats.text import MAX_NAME_LENGTH, shown
from app.formats.trial_schema import MAX_STATES, StateIn, StreamIn, TrialIn
from app.formats.validation import validated

TRIAL_PARTS: dict[str, type[BaseModel]] = {**PARTS, "states": StateIn, "streams": StreamIn}
WITHOUT_ORBIT = ("from", "to", "step_s")


def parse_trial(document: object, catalogue: Catalogue) -> Trial:
    """Read a trial; ``FieldError`` gives the dotted path of the first wrong field and what to mend."""
    model = validated(TrialIn, document, TRIAL_PARTS)
    unix_s, r_km, v_km_s = _orbit_states(model) if model.orbit is not None else _given_states(model)
    streams = catalogue.streams if model.streams is None else _streams(model.streams)
    parse_utc(model.as_of, "as_of")
    return Trial(_spacecraft(model), streams, model.streams is not None, unix_s, r_km, v_km_s)


def _spacecraft(model: TrialIn) -> Spacecraft:
    faces = [face.model_dump(exclude_none=True) for face in model.faces]
    for face in faces:
        _label_repeated(face.get("criteria", []))
    return parse_spacecraft(
        {
            "id": "trial",
            "attitude": model.attitude.model_dump(exclude_none=True),
            "faces": faces,
            "joints": [joint.model_dump() for joint in model.joints],
        }
    )


def _label_repeated(criteria: list[dict[str, Any]]) -> None:
    """Two criteria of one kind are allowed in a trial; the second gets a label of its own."""
    seen: dict[str, int] = {}
    for criterion in criteria:
        kind = criterion["kind"]
        seen[kind] = seen.get(kind, 0) + 1
        if seen[kind] > 1 and "label" not in criterion:
            criterion["label"] = f"{kind}-{seen[kind]}"


def _given_states(model: TrialIn) -> tuple[Floats, Floats, Floats]:
    if model.states is None:
        raise FieldError("states", "is missing; give states, or an orbit with from, to and step_s")
    for name, value in zip(WITHOUT_ORBIT, (model.from_, model.to, model.step_s), strict=True):
        if value is not None:
            raise FieldError(name, "belongs to an orbit; with states leave it out")
    unix_s = np.array([parse_utc(state.t, f"states.{i}.t") for i, state in enumerate(model.states)])
    r_km = np.array([state.r_km for state in model.states]).T
    v_km_s = np.array([state.v_km_s for state in model.states]).T
    return unix_s, r_km, v_km_s


def _orbit_states(model: TrialIn) -> tuple[Floats, Floats, Floats]:
    if model.states is not None:
        raise FieldError("orbit", "give either states or an orbit, not both")
    if model.from_ is None or model.to is None or model.step_s is None:
        missing = [
            n for n, v in zip(WITHOUT_ORBIT, (model.from_, model.to, model.step_s), strict=True) if v is None
        ]
        raise FieldError(missing[0], "is missing; an orbit needs from, to and step_s")
    start, stop = parse_utc(model.from_, "from"), parse_utc(model.to, "to")
    if stop < start:
        raise FieldError("to", "must not be earlier than 'from'")
    if (stop - start) / model.step_s >= MAX_STATES:
        raise FieldError("step_s", f"asks for more than {MAX_STATES} states")
    grid = regular_grid(start, stop, model.step_s)
    ephemeris = propagate([_elements(model.orbit)], grid)
    failure = first_failure(ephemeris, 0, grid.unix_s)
    if failure:
        raise FieldError("orbit", failure)
    return grid.unix_s, ephemeris.r_km[0].T, ephemeris.v_km_s[0].T


def _elements(orbit: dict[str, Any] | None) -> MeanElements:
    for keyword, value in (orbit or {}).items():
        if isinstance(value, dict | list):
            name = keyword[:MAX_NAME_LENGTH] if keyword.isprintable() else shown(keyword)
            raise FieldError(f"orbit.{name}", "must be a number or a text")
    results = read_orbits(json.dumps(orbit).encode(), "orbit", "application/json")
    if len(results) != 1:
        raise FieldError("orbit", f"holds {len(results)} element sets; give one OMM object")
    if isinstance(results[0], FileError):
        raise FieldError(f"orbit.{results[0].where}", results[0].problem)
    return results[0]


def _streams(rows: Sequence[StreamIn]) -> tuple[Stream, ...]:
    members: dict[str, list[int]] = {}
    for i, row in enumerate(rows):
        members.setdefault(row.code, []).append(i)
    return tuple(_stream(rows, indices) for indices in members.values())


def _stream(rows: Sequence[StreamIn], indices: Sequence[int]) -> Stream:
    first = rows[indices[0]]
    _check_agreement(rows, indices)
    place = f"streams.{indices[0]}"
    try:
        return Stream(
            code=first.code,
            name=first.name or first.code,
            components=tuple(_component(rows[i], f"streams.{i}") for i in indices),
            population_index_r=first.population_index_r,
            v_geocentric_km_s=_geocentric_km_s(first, place),
            radiant_ra_deg=first.radiant_ra_deg,
            radiant_dec_deg=first.radiant_dec_deg,
            drift_ra_deg_per_deg=first.drift_ra_deg_per_deg,
            drift_dec_deg_per_deg=first.drift_dec_deg_per_deg,
            start_solar_longitude_deg=first.start_solar_longitude_deg,
            end_solar_longitude_deg=first.end_solar_longitude_deg,
            bulk_density_kg_m3=_or(first.bulk_density_kg_m3, DEFAULT_DENSITY_KG_M3),
            radiant_spread_deg=_or(first.radiant_spread_deg, DEFAULT_SPREAD_DEG),
        )
    except FieldError as error:
        field = error.field if error.field.startswith("streams.") else f"{place}.{error.field}"
        raise FieldError(field, error.problem) from None


def _component(row: StreamIn, place: str) -> Component:
    try:
        return Component(
            row.component or "main",
            row.solar_longitude_peak_deg,
            row.zhr_peak,
            row.b_rise_per_deg,
            row.b_fall_per_deg,
        )
    except FieldError as error:
        raise FieldError(f"{place}.{error.field}", error.problem) from None


def _geocentric_km_s(row: StreamIn, place: str) -> float:
    if row.v_geocentric_km_s is not None:
        return row.v_geocentric_km_s
    if row.v_inf_km_s is None:
        raise FieldError(f"{place}.v_geocentric_km_s", "is missing; give it, or v_inf_km_s (the entry speed)")
    squared = row.v_inf_km_s**2 - ESCAPE_SPEED2_KM2_S2
    if row.v_inf_km_s <= 0.0 or squared <= 0.0:
        raise FieldError(
            f"{place}.v_inf_km_s",
            f"is {shown(row.v_inf_km_s)}; an entry speed is above {math.sqrt(ESCAPE_SPEED2_KM2_S2):.1f} km/s, "
            "the Earth's pull alone",
        )
    return math.sqrt(squared)


def _check_agreement(rows: Sequence[StreamIn], indices: Sequence[int]) -> None:
    own = {"component", "solar_longitude_peak_deg", "zhr_peak", "b_rise_per_deg", "b_fall_per_deg"}
    first = rows[indices[0]].model_dump(exclude=own)
    for i in indices[1:]:
        for name, value in rows[i].model_dump(exclude=own).items():
            if value != first[name]:
                raise FieldError(
                    f"streams.{i}.{name}", f"differs from the other row of stream {rows[i].code}"
                )


def _or(value: float | None, default: float) -> float:
    return default if value is None else value
