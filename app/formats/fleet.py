"""Fleet files: many satellites, each with an optional orbit, in TOML or JSON."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass, field
from datetime import UTC, date, datetime, time
from typing import Any

from app.core.orbit.elements import MeanElements
from app.core.spacecraft.model import Spacecraft
from app.errors import FieldError, FileError
from app.formats import omm
from app.formats.omm_syntax import Message, json_fields
from app.formats.satellite import parse_spacecraft
from app.formats.strict_json import load_json
from app.formats.text import decode, shown
from app.formats.tle import read_tle

MAX_TOML_BYTES = 8 * 2**20  # the TOML reader is pure Python: this much takes it seconds
ORBIT_FORMS = 'give an object of OMM keywords, or {"tle": "line 1\\nline 2"}'


@dataclass(frozen=True)
class Fleet:
    """What a fleet file gave, in file order: satellites with their orbit or None, and what was refused."""

    satellites: list[tuple[Spacecraft, MeanElements | None]] = field(default_factory=list)
    refused: list[FileError] = field(default_factory=list)


def read_fleet(data: bytes, source: str) -> Fleet:
    """Read ``{"satellites": [...]}``; a text that starts with ``{`` is JSON, any other TOML.

    An entry whose fields or orbit are wrong is refused whole, and so is a second entry with the same id.
    Nothing is raised: a file that cannot be read at all is one ``FileError`` in ``refused``.
    """
    fleet = Fleet()
    try:
        entries = _entries(_document(data, source), source)
    except FileError as error:
        fleet.refused.append(error)
        return fleet
    taken: set[str] = set()
    for number, entry in enumerate(entries):
        try:
            spacecraft, elements = _satellite(entry, source, f"satellites.{number}")
            _check_new(spacecraft.id, taken, source, f"satellites.{number}.id")
            fleet.satellites.append((spacecraft, elements))
        except FileError as error:
            fleet.refused.append(error)
    return fleet


def _check_new(satellite_id: str, taken: set[str], source: str, place: str) -> None:
    if satellite_id in taken:
        raise FileError(source, place, f"{shown(satellite_id)} appears twice; keep one entry")
    taken.add(satellite_id)


def _document(data: bytes, source: str) -> object:
    text = decode(data, source)
    if text.lstrip().startswith("{"):
        return load_json(text, source)
    text = decode(data, source, MAX_TOML_BYTES)
    try:
        return _plain(tomllib.loads(text))
    except RecursionError:
        raise FileError(source, "line 1", "the TOML is nested too deeply; flatten it") from None
    except (ValueError, OverflowError) as error:  # TOMLDecodeError names the line; the others are _plain's
        raise FileError(source, "TOML", f"is neither TOML nor JSON: {error}") from None


def _entries(document: object, source: str) -> list[object]:
    if not isinstance(document, dict):
        raise FileError(source, "line 1", 'a fleet file is an object with the list "satellites"')
    for key in document:
        if key != "satellites":
            raise FileError(source, shown(key), "is no field here; a fleet file holds only 'satellites'")
    entries = document.get("satellites")
    if not isinstance(entries, list) or not entries:
        raise FileError(source, "satellites", "must be a list with at least one satellite")
    return entries


def _satellite(entry: object, source: str, place: str) -> tuple[Spacecraft, MeanElements | None]:
    if not isinstance(entry, dict):
        raise FileError(source, place, f"is {shown(entry)}; a satellite is an object")
    orbit = entry.get("orbit")
    try:
        spacecraft = parse_spacecraft({key: value for key, value in entry.items() if key != "orbit"})
    except FieldError as error:
        raise FileError(source, f"{place}.{error.field}", error.problem) from None
    return spacecraft, None if orbit is None else _orbit(orbit, source, f"{place}.orbit")


def _orbit(orbit: object, source: str, place: str) -> MeanElements:
    if not isinstance(orbit, dict):
        raise FileError(source, place, f"is {shown(orbit)}; {ORBIT_FORMS}")
    if "tle" in orbit:
        return _tle(orbit, source, place)
    return omm.elements(Message(place, json_fields(orbit, source, place), complete=False), source)


def _tle(orbit: dict[str, Any], source: str, place: str) -> MeanElements:
    text = orbit["tle"]
    if len(orbit) > 1 or not isinstance(text, str):
        raise FileError(source, place, f"with 'tle' there is that text alone; {ORBIT_FORMS}")
    results = read_tle(text, f"{source}, {place}.tle")
    if len(results) > 1:
        raise FileError(source, f"{place}.tle", f"holds {len(results)} sets; give one")
    (result,) = results
    if isinstance(result, FileError):
        raise result
    return result


def _plain(value: Any) -> Any:
    """Turn TOML's dates into text, as JSON has them; integers beyond TOML's 64 bits are refused."""
    if isinstance(value, dict):
        return {key: _plain(each) for key, each in value.items()}
    if isinstance(value, list):
        return [_plain(each) for each in value]
    if isinstance(value, datetime):
        moment = value.astimezone(UTC).replace(tzinfo=None) if value.tzinfo else value
        return f"{moment.isoformat()}Z"
    if isinstance(value, date | time):
        return value.isoformat()
    if isinstance(value, int) and abs(value) >= 2**63:
        raise ValueError("an integer has more than 64 bits")
    return value
