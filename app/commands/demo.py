"""``stonechat demo``: the whole path on an invented fleet, with a frozen clock so that everyone sees the same."""

from __future__ import annotations

import argparse
import os
import shutil
import socket
import tempfile
import tomllib
from collections.abc import Iterator, Sequence
from contextlib import ExitStack, contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from app.catalogue_file import load_catalogue
from app.commands.compute import progress_bar, shown_on
from app.commands.load import load_files
from app.commands.outlook import outlook_lines
from app.commands.scenario import Satellite, Scenario
from app.core.sky.times import format_utc, parse_utc
from app.errors import SettingsError, StonechatError
from app.jobs.run import run_once
from app.resources import resource_dir
from app.settings import SQLITE_FILE, Settings, load_settings
from app.store.advisories import AdvisoryFilter, list_advisories
from app.store.fleet import list_satellites
from app.store.runs import RunRecord, run_satellites
from app.store.session import Store, open_store

MARK = "stonechat-demo.txt"  # in a folder, it says that the database there may be replaced
MARK_TEXT = (
    "The database in this folder belongs to the demo; every `stonechat demo --dir` here makes it anew.\n"
)
SQLITE_ENDINGS = (
    "",
    "-wal",
    "-shm",
    "-journal",
)  # all that a database is on disk; a copy beside it is somebody's
PAGE = 500
PINNED = ("mass_law", "horizon_low_days", "horizon_high_days", "outlook_days")
HOST = "127.0.0.1"


@dataclass(frozen=True)
class DemoFiles:
    """What the demo is made of."""

    scenario: Scenario
    paths: tuple[Path, ...]


def run(options: argparse.Namespace) -> int:
    """Compute and print the outlook of the invented fleet; then serve it, unless told to stop."""
    files = demo_files(resource_dir("data_demo"))
    with ExitStack() as stack:
        listener = None if options.once else stack.enter_context(_listen(options.port))
        settings = _settings(stack.enter_context(_folder(options.dir)))
        store = stack.enter_context(open_store(settings))
        members = list(_fleet(store, _prepare(store, settings, files)))
        for line in outlook_lines(files.scenario, members):
            print(line)
        example = _example(files.scenario, members)
        if listener is None:
            _say_what_next(options.port, example)
        else:
            _serve(store, settings, files.scenario, listener, example)
    return 0


def demo_files(folder: Path) -> DemoFiles:
    """Read the scenario shipped with the program."""
    values: dict[str, Any] = tomllib.loads((folder / "demo.toml").read_text(encoding="utf-8"))
    scenario = Scenario(
        operator=values["operator"],
        as_of_unix_s=parse_utc(values["as_of"], "as_of"),
        utc_offset_hours=values["utc_offset_hours"],
        outlook_days=values["outlook_days"],
        maxima_deg={s.code: s.components[0].solar_longitude_peak_deg for s in load_catalogue().streams},
    )
    return DemoFiles(scenario, (folder / "fleet.toml", *sorted((folder / "orbits").iterdir())))


def _settings(folder: Path) -> Settings:
    """An SQLite file in the folder and the defaults of whatever a number depends on, whatever the environment says.

    Eight satellites need no workers.
    """
    same_for_everyone = {name: Settings.model_fields[name].default for name in PINNED}
    return load_settings(dir=folder, database_url="", executor="serial", **same_for_everyone)


@contextmanager
def _folder(wanted: Path | None) -> Iterator[Path]:
    """A fresh folder for the database; a folder asked for is kept, and its former demo replaced."""
    if wanted is None:
        folder = Path(tempfile.mkdtemp(prefix="stonechat-demo-"))
        try:
            yield folder
        finally:
            shutil.rmtree(folder)
        return
    wanted.mkdir(parents=True, exist_ok=True)
    found = [path for ending in SQLITE_ENDINGS if os.path.lexists(path := wanted / f"{SQLITE_FILE}{ending}")]
    if found and not (wanted / MARK).exists():
        raise SettingsError(
            f"{found[0]} was not made by the demo and will not be replaced; name another --dir"
        )
    for leftover in found:
        leftover.unlink()
    (wanted / MARK).write_text(MARK_TEXT, encoding="utf-8")
    yield wanted


def _prepare(store: Store, settings: Settings, files: DemoFiles) -> RunRecord:
    store.migrate()
    refused = [line.text for line in load_files(store, files.paths) if line.refused]
    if refused:
        raise StonechatError(f"the demo's own data was refused: {refused[0]}")
    with progress_bar() as bar:
        return run_once(store, settings, files.scenario.as_of_unix_s, progress=shown_on(bar))


def _fleet(store: Store, record: RunRecord) -> Iterator[Satellite]:
    with store.read() as session:
        rows = run_satellites(session, record.id, limit=PAGE, state="failed")
        failed = {each.satellite_id: each.reason for each in rows}
        for member in list_satellites(session, limit=PAGE):
            found = list_advisories(session, AdvisoryFilter(satellite=member.id), limit=PAGE)
            bodies = tuple(each.body for each in found)
            craft = member.spacecraft
            yield Satellite(craft.id, craft.name, craft.policy, failed.get(craft.id), bodies)


def _example(scenario: Scenario, members: Sequence[Satellite]) -> str:
    """The path of the most urgent advisory; settings may be such that none is urgent."""
    ranked = [each for member in scenario.by_urgency(list(members)) for each in scenario.urgent(member)]
    return f"/v1/advisories/{ranked[0]['id']}" if ranked else "/v1/advisories"


def _say_what_next(port: int, example: str) -> None:
    print("\nNext: `stonechat demo` prints this, then serves the API. Ask it, for instance:")
    print(f"  curl -s http://{HOST}:{port}{example}")


@contextmanager
def _listen(port: int) -> Iterator[socket.socket]:
    # The server's libraries take a second, which --once need not wait for.
    from app.commands.serve import listen

    with listen(HOST, port) as listener:
        yield listener


def _serve(
    store: Store, settings: Settings, scenario: Scenario, listener: socket.socket, example: str
) -> None:
    from app.commands.serve import address, serve

    base = address(listener)
    print(f"\nServing {base} with the clock held at {format_utc(scenario.as_of_unix_s)}.")
    print("Ctrl-C ends it. In another terminal, try")
    print(f"  curl -s {base}{example}")
    print(f"  curl -s '{base}/v1/advisories?level=shelter'", flush=True)
    serve(settings, store, listener, clock=lambda: scenario.as_of_unix_s)
