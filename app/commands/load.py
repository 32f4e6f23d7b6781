"""``stonechat load``: satellites and orbits from files, with a line for whatever is refused."""

from __future__ import annotations

import argparse
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from sqlalchemy.orm import Session

from app.core.orbit.elements import MeanElements
from app.core.sky.times import format_utc
from app.errors import FileError, InputError
from app.formats.fleet import read_fleet
from app.formats.orbit import read_orbits
from app.settings import load_settings
from app.store.fleet import list_satellites, put_orbit, put_satellite
from app.store.session import Store, open_store

PAGE = 1000
FORMATS = {".json": "omm-json", ".xml": "omm-xml", ".kvn": "omm-kvn", ".csv": "omm-csv", ".tle": "tle"}


@dataclass
class Report:
    """What a load took and what it refused, a line each."""

    taken: list[str] = field(default_factory=list)
    refused: list[str] = field(default_factory=list)


def run(options: argparse.Namespace) -> int:
    """Load the files in order; 1 when anything in them was refused."""
    settings = load_settings(dir=options.dir)
    with open_store(settings) as store:
        store.require_head()
        report = load_files(store, options.files)
    for line in report.taken:
        print(line)
    for line in report.refused:
        print(f"refused: {line}")
    if report.refused:
        raise InputError(
            f"refused {len(report.refused)} of what was given (listed above); the rest was taken"
        )
    return 0


def load_files(store: Store, paths: Sequence[Path]) -> Report:
    """Load files in order. Of each file, what is right is stored by one transaction; the rest is reported."""
    report = Report()
    for path in paths:
        data, source = path.read_bytes(), str(path)
        if is_fleet(path, data):
            _load_fleet(store, data, source, report)
        else:
            _load_orbits(store, data, path, report)
    return report


def is_fleet(path: Path, data: bytes) -> bool:
    """Whether a file holds satellites rather than orbits: TOML, or a JSON object with ``satellites``."""
    return path.suffix.lower() == ".toml" or (data.lstrip().startswith(b"{") and b'"satellites"' in data)


def _load_fleet(store: Store, data: bytes, source: str, report: Report) -> None:
    try:
        fleet = read_fleet(data, source)
    except InputError as error:
        report.refused.append(error.detail)
        return
    with store.write() as session:
        for spacecraft, elements in fleet.satellites:
            new = put_satellite(session, spacecraft)
            report.taken.append(
                f"{source}: satellite '{spacecraft.id}' {'registered' if new else 'is up to date'}"
            )
            if elements is not None:
                _put(session, spacecraft.id, elements, "fleet", source, report)
    report.refused += [refusal.detail for refusal in fleet.refused]


def _load_orbits(store: Store, data: bytes, path: Path, report: Report) -> None:
    results = read_orbits(data, str(path))
    report.refused += [each.detail for each in results if isinstance(each, FileError)]
    found = sorted((each for each in results if isinstance(each, MeanElements)), key=lambda e: e.epoch_unix_s)
    if not found:
        return
    form = FORMATS.get(path.suffix.lower(), "text")
    with store.write() as session:
        owners = dict(_names(session))
        for elements in found:  # by epoch: of several sets for one satellite the newest stays in use
            satellite_id = owners.get(elements.object_name.casefold()) or owners.get(
                elements.object_id.casefold()
            )
            if satellite_id is None:
                report.refused.append(_unmatched(elements, str(path)))
            else:
                _put(session, satellite_id, elements, form, str(path), report)


def _names(session: Session) -> Iterator[tuple[str, str]]:
    """What an orbit file may call each registered satellite: its name or its id."""
    last: str | None = None
    while page := list_satellites(session, after=last, limit=PAGE):
        for record in page:
            yield record.spacecraft.name.casefold(), record.id
            yield record.id.casefold(), record.id
        last = page[-1].id


def _put(
    session: Session, satellite_id: str, elements: MeanElements, form: str, source: str, report: Report
) -> None:
    new = put_orbit(session, satellite_id, elements, form)
    state = "taken" if new else "is up to date"
    report.taken.append(
        f"{source}: orbit of '{satellite_id}', epoch {format_utc(elements.epoch_unix_s)}, {state}"
    )


def _unmatched(elements: MeanElements, source: str) -> str:
    return (
        f"{source}: the orbit of '{elements.object_name}' ({elements.object_id or 'no id'}) fits no registered "
        "satellite; register one whose id or name is the same, or PUT the orbit to its address"
    )
