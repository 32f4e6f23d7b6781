"""The stream catalogue: ``app/data/streams.csv`` -> ``Catalogue``, every value with its source.

One row per activity component. The column ``evidence`` holds, for every value of the row and for nothing else,
``column=SOURCE/provenance``, separated by blanks; sources joined by ``+`` stand for a value taken from them together.
Provenance is ``read`` (seen in the publication or a transcription of it), ``memory`` (recollected) or ``computed``.
"""

from __future__ import annotations

import csv
import hashlib
import io
import math
from collections.abc import Mapping, Sequence
from functools import cache
from importlib.resources import files
from typing import Any, NoReturn

from app.core.constants import ESCAPE_SPEED2_KM2_S2
from app.core.streams.model import (
    DEFAULT_DENSITY_KG_M3,
    DEFAULT_SPREAD_DEG,
    Catalogue,
    CatalogueEntry,
    Component,
    Stream,
)
from app.errors import CatalogueError, FieldError, InputError

TEXTS = ("code", "name", "component", "confidence", "parent_body", "evidence", "notes")
OF_COMPONENT = ("solar_longitude_peak_deg", "zhr_peak", "b_rise_per_deg", "b_fall_per_deg")
OF_STREAM = (
    "population_index_r",
    "v_geocentric_km_s",
    "v_entry_km_s",
    "radiant_ra_deg",
    "radiant_dec_deg",
    "drift_ra_deg_per_deg",
    "drift_dec_deg_per_deg",
    "start_solar_longitude_deg",
    "end_solar_longitude_deg",
    "bulk_density_kg_m3",
    "radiant_spread_deg",
)
VALUES = (*OF_COMPONENT, *OF_STREAM)
NEEDED = ("solar_longitude_peak_deg", "radiant_ra_deg", "radiant_dec_deg")
PROVENANCE = ("read", "memory", "computed")
CONFIDENCE = {"A": True, "B": True, "C": False}
OUTBURST = "outburst-branch"  # a component without annual level
RATE_AT_LIMIT_ZHR = 1.0
# What stands in for a value nobody published: value, source, provenance.
ASSUMED = {
    "drift_ra_deg_per_deg": (0.0, "NONE", "computed"),
    "drift_dec_deg_per_deg": (0.0, "NONE", "computed"),
    "bulk_density_kg_m3": (DEFAULT_DENSITY_KG_M3, "ECSS10-04", "memory"),
    "radiant_spread_deg": (DEFAULT_SPREAD_DEG, "MCV22", "computed"),
}

Value = dict[str, Any]
Row = dict[str, Any]  # the texts, "number" (1 is the header), "values": {column: Value}


@cache
def load_catalogue() -> Catalogue:
    """The catalogue shipped with the program. Raises ``CatalogueError`` when the file has been damaged."""
    return read_catalogue(files("app").joinpath("data/streams.csv").read_bytes(), load_sources())


@cache
def load_sources() -> Mapping[str, str]:
    """Citation of each source key."""
    text = files("app").joinpath("data/sources.csv").read_text(encoding="utf-8")
    return {row["key"]: row["citation"] for row in csv.DictReader(io.StringIO(text))}


def read_catalogue(data: bytes, sources: Mapping[str, str] | None = None) -> Catalogue:
    """Read a catalogue; the digest is the SHA-256 of its bytes.

    Raises ``CatalogueError`` naming row and column of the first value that is wrong, ``InputError`` when the
    file is no such table at all.
    """
    known = load_sources() if sources is None else sources
    rows = [_row(number, raw, known) for number, raw in enumerate(_table(data), start=2)]
    members: dict[str, list[Row]] = {}
    for row in rows:
        members.setdefault(row["code"], []).append(row)
    return Catalogue(tuple(_entry(group) for group in members.values()), hashlib.sha256(data).hexdigest())


def entry_document(entry: CatalogueEntry, sources: Mapping[str, str] | None = None) -> dict[str, Any]:
    """An entry as JSON values, each number with its source, citation and provenance."""
    known = load_sources() if sources is None else sources
    components = [
        {
            column: {**value, "citation": [known[key] for key in value["source"].split("+")]}
            for column, value in component.items()
        }
        for component in entry.values
    ]
    return {
        "code": entry.code,
        "name": entry.name,
        "confidence": entry.confidence,
        "enabled": entry.enabled,
        "why_off": entry.why_off,
        "components": components,
        "notes": list(entry.notes),
    }


def _table(data: bytes) -> list[dict[str, str]]:
    try:
        reader = csv.DictReader(io.StringIO(data.decode("utf-8"), newline=""), strict=True)
        rows = list(reader)
    except (UnicodeDecodeError, csv.Error) as error:
        raise InputError(f"stream catalogue: is not a table of comma-separated UTF-8 text: {error}") from None
    header = list(reader.fieldnames or [])
    for column in (*TEXTS, *VALUES):
        if header.count(column) != 1:
            raise CatalogueError(1, "header", column, "must be there exactly once")
    for column in header:
        if column not in TEXTS and column not in VALUES:
            raise CatalogueError(1, "header", column[:40], "is no column of this table; remove it")
    for number, row in enumerate(rows, start=2):
        if None in row or None in row.values():
            raise CatalogueError(number, str(row["code"]), "code", f"the row must have {len(header)} fields")
    return rows


def _row(number: int, raw: dict[str, str], sources: Mapping[str, str]) -> Row:
    texts = {column: raw[column].strip() for column in TEXTS}
    for column in ("code", "name", "component"):
        if not texts[column]:
            _refuse(number, texts, column, "is empty")
    if texts["confidence"] not in CONFIDENCE:
        _refuse(number, texts, "confidence", f"is '{texts['confidence']}'; it must be A, B or C")
    evidence = _evidence(number, texts, sources)
    values: dict[str, Value] = {}
    for column in VALUES:
        if not raw[column].strip():
            continue
        source, provenance = evidence.pop(column, (None, None))
        if source is None:
            _refuse(number, texts, "evidence", f"says nothing of {column}")
        number_read = _number(number, texts, column, raw[column])
        values[column] = {"value": number_read, "source": source, "provenance": provenance}
    if evidence:
        _refuse(number, texts, "evidence", f"names {next(iter(evidence))}, which is empty or no column")
    for column in NEEDED:
        if column not in values:
            _refuse(number, texts, column, "is empty")
    return {**texts, "number": number, "values": values}


def _evidence(
    number: int, texts: Mapping[str, str], sources: Mapping[str, str]
) -> dict[str, tuple[str | None, str | None]]:
    found: dict[str, tuple[str | None, str | None]] = {}
    for item in texts["evidence"].split():
        column, equals, claim = item.partition("=")
        source, slash, provenance = claim.rpartition("/")
        if not equals or not slash or column in found:
            _refuse(
                number, texts, "evidence", f"'{item[:60]}' must be column=SOURCE/provenance, once per column"
            )
        if provenance not in PROVENANCE:
            _refuse(number, texts, "evidence", f"provenance of {column[:40]} must be {', '.join(PROVENANCE)}")
        for key in source.split("+"):
            if key not in sources:
                _refuse(number, texts, "evidence", f"source '{key[:40]}' is not in sources.csv")
        found[column] = source, provenance
    return found


def _number(number: int, texts: Mapping[str, str], column: str, text: str) -> float:
    try:
        value = float(text)
    except ValueError:
        _refuse(number, texts, column, f"'{text[:40]}' is not a number")
    if not math.isfinite(value):
        _refuse(number, texts, column, f"'{text[:40]}' is not a finite number")
    return value


def _refuse(number: int, texts: Mapping[str, str], column: str, problem: str) -> NoReturn:
    raise CatalogueError(number, texts["code"], column, problem)


def _entry(group: Sequence[Row]) -> CatalogueEntry:
    annual = [row for row in group if row["component"] != OUTBURST]
    _check_components(group)
    _check_agreement(annual)
    main = annual[0] if annual else group[0]
    for row in group:
        _complete(row)
    why_off = _why_off(main, annual)
    stream = _stream(main, annual) if annual and not _incomplete(annual) else None
    return CatalogueEntry(
        code=main["code"],
        name=main["name"],
        confidence=main["confidence"],
        enabled=why_off is None,
        why_off=why_off,
        stream=stream,
        values=tuple(row["values"] for row in group),
        notes=tuple(dict.fromkeys(row["notes"] for row in group if row["notes"])),
    )


def _check_components(group: Sequence[Row]) -> None:
    seen: set[str] = set()
    for row in group:
        if row["component"] in seen:
            _refuse(row["number"], row, "component", f"'{row['component']}' is there twice for this stream")
        seen.add(row["component"])
        annual = row["component"] != OUTBURST
        if annual and "zhr_peak" not in row["values"]:
            _refuse(
                row["number"], row, "zhr_peak", f"is empty; only a component '{OUTBURST}' has no annual level"
            )
        for one, other in (("start", "end"), ("end", "start")):
            limit, partner = f"{one}_solar_longitude_deg", f"{other}_solar_longitude_deg"
            if limit in row["values"] and partner not in row["values"]:
                _refuse(row["number"], row, partner, "is empty; give both limits of activity or neither")


def _check_agreement(annual: Sequence[Row]) -> None:
    for row in annual[1:]:
        for column in ("name", "confidence"):
            if row[column] != annual[0][column]:
                _refuse(row["number"], row, column, "differs from the stream's first row")
        for column in OF_STREAM:
            mine, first = (r["values"].get(column, {}).get("value") for r in (row, annual[0]))
            if mine != first:
                _refuse(row["number"], row, column, f"is {mine}; the stream's first row has {first}")


def _complete(row: Row) -> None:
    """Fill in what can be derived or is assumed, marked as such."""
    values = row["values"]
    for column, (value, source, provenance) in ASSUMED.items():
        values.setdefault(column, {"value": value, "source": source, "provenance": provenance})
    if "v_geocentric_km_s" not in values and "v_entry_km_s" in values:
        squared = values["v_entry_km_s"]["value"] ** 2 - ESCAPE_SPEED2_KM2_S2
        if squared <= 0.0:
            _refuse(row["number"], row, "v_entry_km_s", "is below 11.1 km/s, the Earth's pull alone")
        values["v_geocentric_km_s"] = _computed(math.sqrt(squared), "ENTRY")
    if "v_geocentric_km_s" not in values:
        _refuse(row["number"], row, "v_geocentric_km_s", "is empty, and so is v_entry_km_s; give one of them")
    for slope, limit in (("b_rise_per_deg", "start"), ("b_fall_per_deg", "end")):
        derived = _slope_from_limit(values, limit)
        if slope not in values and derived is not None:
            values[slope] = _computed(derived, "LIMITS")


def _computed(value: float, source: str) -> Value:
    return {"value": value, "source": source, "provenance": "computed"}


def _slope_from_limit(values: Mapping[str, Value], limit: str) -> float | None:
    """B = log10(ZHR at peak / 1 per hour) / degrees from the peak to the limit of activity."""
    column = f"{limit}_solar_longitude_deg"
    if column not in values or "zhr_peak" not in values or values["zhr_peak"]["value"] <= RATE_AT_LIMIT_ZHR:
        return None
    way: float = values[column]["value"] - values["solar_longitude_peak_deg"]["value"]
    degrees = (-way if limit == "start" else way) % 360.0
    if not 0.0 < degrees < 180.0:
        return None
    peak = float(values["zhr_peak"]["value"])
    return math.log10(peak / RATE_AT_LIMIT_ZHR) / degrees


def _why_off(main: Row, annual: Sequence[Row]) -> str | None:
    if not annual:
        return "no annual level: silent until a prediction names it"
    if not CONFIDENCE[main["confidence"]]:
        return "confidence C: unconfirmed or contradictory; listed, not used"
    return _incomplete(annual)


def _incomplete(annual: Sequence[Row]) -> str | None:
    """Say what a stream would need to be computed; None when it has it."""
    if any("population_index_r" not in row["values"] for row in annual):
        return "no published population index"
    slopes = ("b_rise_per_deg", "b_fall_per_deg")
    if any(slope not in row["values"] for row in annual for slope in slopes):
        return "no published slope of activity, and no limits of activity to derive one from"
    return None


def _stream(main: Row, annual: Sequence[Row]) -> Stream:
    shared = {column: main["values"][column]["value"] for column in OF_STREAM if column in main["values"]}
    shared.pop("v_entry_km_s", None)
    components = tuple(_built(row, Component, {"name": row["component"], **_own(row)}) for row in annual)
    stream: Stream = _built(
        main, Stream, {"code": main["code"], "name": main["name"], "components": components, **shared}
    )
    return stream


def _own(row: Row) -> dict[str, float]:
    return {column: row["values"][column]["value"] for column in OF_COMPONENT}


def _built(row: Row, kind: Any, values: dict[str, Any]) -> Any:
    try:
        return kind(**values)
    except FieldError as error:
        _refuse(row["number"], row, error.field, error.problem)
