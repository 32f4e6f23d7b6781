"""``stonechat load``: satellites and orbits from files, with a line for whatever is refused."""

from __future__ import annotations

import argparse
import re
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TypeVar

from sqlalchemy.orm import Session

from app.commands.files import os_problem, printable, read_file
from app.commands.register import Register, read_register
from app.core.orbit.elements import MeanElements
from app.core.sky.times import format_utc
from app.core.spacecraft.model import Spacecraft
from app.errors import FileError, InputError, NotFoundError, StonechatError
from app.formats.fleet import read_fleet
from app.formats.orbit import read_orbits
from app.settings import load_settings
from app.store.fleet import current_orbit, put_orbit, put_satellite
from app.store.session import Store, open_store

FORMATS = {".json": "omm-json", ".xml": "omm-xml", ".kvn": "omm-kvn", ".csv": "omm-csv", ".tle": "tle"}
FLEET = re.compile(rb'"satellites"|^\s*(\[\[\s*satellites\s*\]\]|satellites\s*=)', re.MULTILINE)
BYTE_ORDER_MARK = b"\xef\xbb\xbf"
BATCH = 200  # satellites stored by one transaction, about a second's work
Entry = TypeVar("Entry")


@dataclass(frozen=True)
class Line:
    """What became of one satellite, orbit or line of a file."""

    refused: bool
    text: str


def run(options: argparse.Namespace) -> int:
    """Load the files in order; 1 when anything in them was refused."""
    settings = load_settings(dir=options.dir)
    refused = total = 0
    with open_store(settings, create=False) as store:
        store.require_head()
        for line in load_files(store, options.files):
            print(printable(f"refused: {line.text}" if line.refused else line.text))
            refused, total = refused + line.refused, total + 1
    if refused:
        rest = "nothing was stored" if refused == total else "the rest is in the database"
        raise InputError(f"refused {refused} of {total} (listed above); {rest}")
    return 0


def load_files(store: Store, paths: Sequence[Path]) -> Iterator[Line]:
    """Load files in order and say what became of their content; a file that cannot be read is a refused line.

    A satellite and the orbit beside it are stored together or not at all. A line is told once it is true.
    """
    for path in paths:
        try:
            data = read_file(path)
            load = _load_fleet if is_fleet(path, data) else _load_orbits
            yield from load(store, data, path)
        except OSError as error:
            yield Line(True, os_problem(error))
        except StonechatError as error:  # the database is busy, or a satellite was removed meanwhile
            yield Line(True, f"{path}: {error.detail}; what is not listed of this file was not stored")


def is_fleet(path: Path, data: bytes) -> bool:
    """Whether a file holds satellites rather than orbits alone: by its ending, else by its beginning."""
    if path.suffix.lower() == ".toml":
        return True
    start = data.removeprefix(BYTE_ORDER_MARK).lstrip()
    found = FLEET.search(start)
    # JSON and TOML may be laid out at will; the list of satellites is the only thing a fleet file holds.
    return found is not None and (start.startswith(b"{") or found.start() == 0 or start.startswith(b"#"))


def _load_fleet(store: Store, data: bytes, path: Path) -> Iterator[Line]:
    fleet = read_fleet(data, str(path))
    with store.read() as session:
        register = read_register(session)

    def put(session: Session, entry: tuple[Spacecraft, MeanElements | None]) -> Iterator[Line]:
        spacecraft, elements = entry
        yield _put_satellite(session, register, spacecraft, path)
        if elements is not None:
            yield _put_orbit(session, spacecraft.id, elements, "fleet", path)

    yield from _in_batches(store, fleet.satellites, put)
    yield from (Line(True, refusal.detail) for refusal in fleet.refused)


def _load_orbits(store: Store, data: bytes, path: Path) -> Iterator[Line]:
    results = read_orbits(data, str(path))
    found = [each for each in results if isinstance(each, MeanElements)]
    with store.read() as session:
        owned, unowned = _by_owner(read_register(session), found, path)
    form = FORMATS.get(path.suffix.lower(), "text")

    def put(session: Session, entry: tuple[str, list[MeanElements]]) -> Iterator[Line]:
        # Of several sets for one satellite the newest is used; stored one after the other, the older ones
        # would come and go each time the file is loaded.
        satellite_id, sets = entry
        *older, newest = sorted(sets, key=lambda each: each.epoch_unix_s)
        yield _put_orbit(session, satellite_id, newest, form, path)
        yield from (_passed_over(satellite_id, each, path) for each in older)

    yield from _in_batches(store, list(owned.items()), put)
    yield from unowned
    yield from (Line(True, each.detail) for each in results if isinstance(each, FileError))


def _in_batches(
    store: Store, entries: Sequence[Entry], put: Callable[[Session, Entry], Iterator[Line]]
) -> Iterator[Line]:
    """Store entries a batch at a time: other writers wait for a transaction to end, and must not wait long."""
    for start in range(0, len(entries), BATCH):
        with store.write() as session:
            taken = [line for entry in entries[start : start + BATCH] for line in put(session, entry)]
        yield from taken


def _by_owner(
    register: Register, found: Sequence[MeanElements], path: Path
) -> tuple[dict[str, list[MeanElements]], list[Line]]:
    owned: dict[str, list[MeanElements]] = {}
    unowned: list[Line] = []
    for elements in found:
        owners = register.owners(elements)
        if len(owners) == 1:
            owned.setdefault(owners[0], []).append(elements)
        else:
            unowned.append(_unmatched(elements, owners, path))
    return owned, unowned


def _put_satellite(session: Session, register: Register, spacecraft: Spacecraft, path: Path) -> Line:
    before = register.satellites.get(spacecraft.id)
    put_satellite(session, spacecraft)
    state = "registered" if before is None else "unchanged" if before == spacecraft else "replaced"
    return Line(False, f"{path}: satellite '{spacecraft.id}' {state}")


def _put_orbit(session: Session, satellite_id: str, elements: MeanElements, form: str, path: Path) -> Line:
    before = _epoch_in_use(session, satellite_id)
    new = put_orbit(session, satellite_id, elements, form)
    state = "taken" if new else "unchanged"
    if before is not None and before > elements.epoch_unix_s:
        state += f"; it is OLDER than the one it replaces, of epoch {format_utc(before)}"
    return Line(False, f"{_orbit_of(satellite_id, elements, path)} {state}")


def _epoch_in_use(session: Session, satellite_id: str) -> float | None:
    try:
        return current_orbit(session, satellite_id).elements.epoch_unix_s
    except NotFoundError:
        return None


def _passed_over(satellite_id: str, elements: MeanElements, path: Path) -> Line:
    return Line(False, f"{_orbit_of(satellite_id, elements, path)} passed over: the file has a newer one")


def _orbit_of(satellite_id: str, elements: MeanElements, path: Path) -> str:
    return f"{path}: orbit of '{satellite_id}', epoch {format_utc(elements.epoch_unix_s)},"


def _unmatched(elements: MeanElements, owners: Sequence[str], path: Path) -> Line:
    orbit = f"{path}: the orbit of '{elements.object_name}' ({elements.object_id or 'no object id'})"
    if owners:
        return Line(
            True, f"{orbit} fits several satellites: {', '.join(owners)}; name it by one satellite's id"
        )
    return Line(
        True,
        f"{orbit} fits no registered satellite; register one with that id or name, or rename the object in the file",
    )
