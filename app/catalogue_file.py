"""The stream catalogue: ``app/data/streams.csv`` -> ``Catalogue``, every value with its source.

A stream is on when its confidence is A or B, it has an annual level, and its profile of activity is known or can be
derived; otherwise ``why_off`` says what is missing. What nobody published is derived or assumed here, and marked so.
"""

from __future__ import annotations

import csv
import hashlib
import io
import math
from collections.abc import Mapping, Sequence
from functools import cache
from importlib.resources import files
from typing import Any, TypeVar

from app.core.constants import ESCAPE_SPEED2_KM2_S2
from app.core.streams.model import (
    DEFAULT_DENSITY_KG_M3,
    DEFAULT_SPREAD_DEG,
    Catalogue,
    CatalogueEntry,
    Component,
    Stream,
)
from app.errors import CatalogueError, FieldError
from app.formats.stream_table import (
    OF_COMPONENT,
    OF_STREAM,
    OUTBURST,
    StreamRow,
    Value,
    read_stream_table,
)

Record = TypeVar("Record", Component, Stream)

ON = ("A", "B")
RATE_AT_LIMIT_ZHR = 1.0  # common practice: a stream counts as active while it gives a meteor an hour
SLOPES = {"b_rise_per_deg": "start_solar_longitude_deg", "b_fall_per_deg": "end_solar_longitude_deg"}
# What stands in for a value nobody published.
ASSUMED = {
    "drift_ra_deg_per_deg": {"value": 0.0, "source": "NONE", "provenance": "computed"},
    "drift_dec_deg_per_deg": {"value": 0.0, "source": "NONE", "provenance": "computed"},
    "bulk_density_kg_m3": {"value": DEFAULT_DENSITY_KG_M3, "source": "ECSS10-04", "provenance": "memory"},
    "radiant_spread_deg": {"value": DEFAULT_SPREAD_DEG, "source": "MCV22", "provenance": "computed"},
}
# Fills the gaps of a row while its other values are checked; never part of a catalogue.
HARMLESS = {"zhr_peak": 0.0, "b_rise_per_deg": 0.0, "b_fall_per_deg": 0.0, "population_index_r": 2.5}


@cache
def load_catalogue() -> Catalogue:
    """The catalogue shipped with the program. Raises ``CatalogueError`` when the file has been damaged."""
    return read_catalogue(files("app").joinpath("data/streams.csv").read_bytes(), load_sources())


@cache
def load_sources() -> Mapping[str, str]:
    """Citation of each source key."""
    text = files("app").joinpath("data/sources.csv").read_text(encoding="utf-8")
    return {row["key"]: row["citation"] for row in csv.DictReader(io.StringIO(text), strict=True)}


def read_catalogue(data: bytes, sources: Mapping[str, str] | None = None) -> Catalogue:
    """Read a catalogue; the digest is the SHA-256 of its bytes.

    Raises ``CatalogueError`` naming row and column of the first value that is wrong, ``InputError`` when the
    file is no such table at all.
    """
    members: dict[str, list[StreamRow]] = {}
    for row in read_stream_table(data, load_sources() if sources is None else sources):
        members.setdefault(row.code, []).append(row)
    return Catalogue(tuple(_entry(group) for group in members.values()), hashlib.sha256(data).hexdigest())


def entry_document(entry: CatalogueEntry, sources: Mapping[str, str] | None = None) -> dict[str, Any]:
    """An entry as JSON values, each number with its source, citation and provenance."""
    known = load_sources() if sources is None else sources

    def cited(value: Mapping[str, Any]) -> dict[str, Any]:
        return {**value, "citation": [known[key] for key in value["source"].split("+")]}

    return {
        "code": entry.code,
        "name": entry.name,
        "confidence": entry.confidence,
        "enabled": entry.enabled,
        "why_off": entry.why_off,
        "parent_body": cited(entry.parent_body) if entry.parent_body else None,
        "component_names": list(entry.component_names),
        "components": [{column: cited(v) for column, v in component.items()} for component in entry.values],
        "notes": list(entry.notes),
    }


def _entry(group: Sequence[StreamRow]) -> CatalogueEntry:
    annual = [row for row in group if row.annual]
    _check_components(group)
    _check_agreement(annual)
    for row in group:
        _complete(row)
        _check_ranges(row)
    main = annual[0] if annual else group[0]
    why_off = _why_off(main, annual)
    return CatalogueEntry(
        code=main.code,
        name=main.texts["name"],
        confidence=main.texts["confidence"],
        enabled=why_off is None,
        why_off=why_off,
        stream=_stream(annual) if annual and not _incomplete(annual) else None,
        values=tuple(row.values for row in group),
        notes=_notes(group),
        component_names=tuple(row.component for row in group),
        parent_body=main.parent_body,
    )


def _check_components(group: Sequence[StreamRow]) -> None:
    seen: set[str] = set()
    for row in group:
        if row.component in seen:
            row.refuse("component", f"'{row.component}' is there twice for this stream")
        seen.add(row.component)
        if row.texts["name"] != group[0].texts["name"]:
            row.refuse("name", "differs from the stream's first row")
        if row.annual and "zhr_peak" not in row.values:
            row.refuse("zhr_peak", f"is empty; only a component '{OUTBURST}' has no annual level")
        for column in ("zhr_peak", *SLOPES):
            if not row.annual and column in row.values:
                row.refuse(column, f"must be empty: a component '{OUTBURST}' has no annual level")
        _check_limits(row)


def _check_limits(row: StreamRow) -> None:
    start, end = (row.number_in(column) for column in SLOPES.values())
    for column, own, other in zip(SLOPES.values(), (start, end), (end, start), strict=True):
        if own is None and other is not None:
            row.refuse(column, "is empty; give both limits of activity or neither")
    if start is None or end is None:
        return
    peak = row.values["solar_longitude_peak_deg"]["value"]
    if not (peak - start) % 360.0 <= (end - start) % 360.0:
        row.refuse(
            "solar_longitude_peak_deg", f"is {peak:g}, outside the limits of activity {start:g} to {end:g}"
        )


def _check_agreement(annual: Sequence[StreamRow]) -> None:
    for row in annual[1:]:
        if row.texts["confidence"] != annual[0].texts["confidence"]:
            row.refuse("confidence", "differs from the stream's first row")
        for column in OF_STREAM:
            mine, first = row.number_in(column), annual[0].number_in(column)
            if mine != first:
                row.refuse(column, f"is {_shown(mine)}; the stream's first row has {_shown(first)}")


def _shown(value: float | None) -> str:
    return "empty" if value is None else f"{value:g}"


def _complete(row: StreamRow) -> None:
    """Fill in what can be derived or is assumed, marked as such."""
    for column, assumed in ASSUMED.items():
        row.values.setdefault(column, dict(assumed))
    speed = row.number_in("v_entry_km_s")
    if speed is not None and not math.sqrt(ESCAPE_SPEED2_KM2_S2) < speed < 81.0:
        row.refuse(
            "v_entry_km_s", f"is {speed:g}; it must lie above 11.1 (the Earth's pull alone) and below 81"
        )
    if "v_geocentric_km_s" not in row.values:
        if speed is None:
            row.refuse("v_geocentric_km_s", "is empty, and so is v_entry_km_s; give one of them")
        row.values["v_geocentric_km_s"] = _computed(math.sqrt(speed**2 - ESCAPE_SPEED2_KM2_S2), "ENTRY")
    for slope, limit in SLOPES.items():
        derived = _slope_from_limit(row, limit)
        if slope not in row.values and derived is not None:
            row.values[slope] = _computed(derived, "LIMITS")


def _computed(value: float, source: str) -> Value:
    return {"value": value, "source": source, "provenance": "computed"}


def _slope_from_limit(row: StreamRow, limit: str) -> float | None:
    """B = log10(ZHR at peak / 1 per hour) / degrees from the peak to the limit of activity."""
    peak_zhr, limit_deg = row.number_in("zhr_peak"), row.number_in(limit)
    if peak_zhr is None or limit_deg is None or peak_zhr <= RATE_AT_LIMIT_ZHR:
        return None
    away = limit_deg - row.values["solar_longitude_peak_deg"]["value"]
    degrees = (-away if limit.startswith("start") else away) % 360.0
    return math.log10(peak_zhr / RATE_AT_LIMIT_ZHR) / degrees if 0.0 < degrees < 180.0 else None


def _check_ranges(row: StreamRow) -> None:
    """Let the records judge every value of the row, also of a row that will not be used."""
    given = {**HARMLESS, **{column: value["value"] for column, value in row.values.items()}}
    _stream_of(row, given, (_component(row, given),))


def _why_off(main: StreamRow, annual: Sequence[StreamRow]) -> str | None:
    if not annual:
        return "no annual level: silent until a prediction names it"
    if main.texts["confidence"] not in ON:
        return "confidence C: unconfirmed or contradictory; listed, not used"
    return _incomplete(annual)


def _incomplete(annual: Sequence[StreamRow]) -> str | None:
    """Say what a stream would need to be computed; None when it has it."""
    if any("population_index_r" not in row.values for row in annual):
        return "no published population index"
    if any(slope not in row.values for row in annual for slope in SLOPES):
        return "no published slope of activity, and no limits of activity to derive one from"
    return None


def _stream(annual: Sequence[StreamRow]) -> Stream:
    components = tuple(_component(row, {k: v["value"] for k, v in row.values.items()}) for row in annual)
    return _stream_of(annual[0], {k: v["value"] for k, v in annual[0].values.items()}, components)


def _component(row: StreamRow, given: Mapping[str, float]) -> Component:
    return _built(
        row, Component, {"name": row.component, **{column: given[column] for column in OF_COMPONENT}}
    )


def _stream_of(row: StreamRow, given: Mapping[str, float], components: tuple[Component, ...]) -> Stream:
    shared = {column: given[column] for column in OF_STREAM if column in given and column != "v_entry_km_s"}
    named = {"code": row.code, "name": row.texts["name"], "components": components}
    return _built(row, Stream, {**named, **shared})


def _built(row: StreamRow, kind: type[Record], values: Mapping[str, Any]) -> Record:
    try:
        return kind(**values)
    except FieldError as error:
        raise CatalogueError(row.number, row.code, error.field, error.problem) from None


def _notes(group: Sequence[StreamRow]) -> tuple[str, ...]:
    """What the table says in words, each once, the parent body included."""
    notes = [row.texts["notes"] for row in group if row.texts["notes"]]
    parents = [row.parent_body for row in group if row.parent_body]
    notes += [f"Parent body: {p['value']} ({p['source']}, {p['provenance']})" for p in parents]
    return tuple(dict.fromkeys(notes))
