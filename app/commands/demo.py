"""``stonechat demo``: the whole path on an invented fleet, with a frozen clock so that everyone sees the same."""

from __future__ import annotations

import argparse
import shutil
import tempfile
import tomllib
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from app.commands.compute import progress_bar, shown_on
from app.commands.load import load_files
from app.commands.outlook import Satellite, Scenario, outlook_lines
from app.commands.serve import serve
from app.core.sky.times import format_utc, parse_utc
from app.errors import SettingsError, StonechatError
from app.jobs.run import run_once
from app.resources import resource_dir
from app.settings import SQLITE_FILE, Settings, load_settings
from app.store.advisories import AdvisoryFilter, list_advisories
from app.store.fleet import list_satellites
from app.store.runs import RunRecord, run_satellites
from app.store.session import Store, open_store

MARK = "stonechat-demo"  # this empty file in a folder says that its database may be replaced
PAGE = 500
HOST = "127.0.0.1"


@dataclass(frozen=True)
class DemoFiles:
    """What the demo is made of."""

    scenario: Scenario
    paths: tuple[Path, ...]


def run(options: argparse.Namespace) -> int:
    """Compute and print the outlook of the invented fleet; then serve it, unless told to stop."""
    files = demo_files(resource_dir("data_demo"))
    with _folder(options.dir) as folder:
        settings = load_settings(dir=folder, database_url="")
        settings = settings.model_copy(update={"database_url": ""})
        with open_store(settings) as store:
            record = _prepare(store, settings, files)
            for line in outlook_lines(files.scenario, _fleet(store, record)):
                print(line)
            if not options.once:
                _serve(store, settings, files.scenario, options.port)
    return 0


def demo_files(folder: Path) -> DemoFiles:
    """Read the scenario shipped with the program."""
    values: dict[str, Any] = tomllib.loads((folder / "demo.toml").read_text(encoding="utf-8"))
    scenario = Scenario(
        operator=values["operator"],
        as_of_unix_s=parse_utc(values["as_of"], "as_of"),
        utc_offset_hours=values["utc_offset_hours"],
        outlook_days=values["outlook_days"],
    )
    return DemoFiles(scenario, (folder / "fleet.toml", *sorted((folder / "orbits").iterdir())))


@contextmanager
def _folder(wanted: Path | None) -> Iterator[Path]:
    """A fresh folder for the database; a folder asked for is kept, and its former demo replaced."""
    if wanted is None:
        folder = Path(tempfile.mkdtemp(prefix="stonechat-demo-"))
        try:
            yield folder
        finally:
            shutil.rmtree(folder, ignore_errors=True)
        return
    wanted.mkdir(parents=True, exist_ok=True)
    if (wanted / SQLITE_FILE).exists() and not (wanted / MARK).exists():
        raise SettingsError(
            f"{wanted / SQLITE_FILE} was not made by the demo and will not be replaced; name another --dir"
        )
    for leftover in wanted.glob(f"{SQLITE_FILE}*"):
        leftover.unlink()
    (wanted / MARK).touch()
    yield wanted


def _prepare(store: Store, settings: Settings, files: DemoFiles) -> RunRecord:
    store.migrate()
    report = load_files(store, files.paths)
    if report.refused:
        raise StonechatError(f"the demo's own data was refused: {report.refused[0]}")
    with progress_bar() as bar:
        return run_once(store, settings, files.scenario.as_of_unix_s, progress=shown_on(bar))


def _fleet(store: Store, record: RunRecord) -> Iterator[Satellite]:
    with store.read() as session:
        members = list_satellites(session, limit=PAGE)
        failed = {
            e.satellite_id: e.reason for e in run_satellites(session, record.id, limit=PAGE) if e.reason
        }
        for member in members:
            found = list_advisories(session, AdvisoryFilter(satellite=member.id), limit=PAGE)
            bodies = tuple(each.body for each in found)
            yield Satellite(member.id, member.spacecraft.name, failed.get(member.id), bodies)


def _serve(store: Store, settings: Settings, scenario: Scenario, port: int) -> None:
    base = f"http://{HOST}:{port}"
    print(f"\nServing {base} with the clock held at {format_utc(scenario.as_of_unix_s)}; Ctrl-C ends it. Try")
    print(f"  curl -s '{base}/v1/advisories?level=shelter'")
    print(f"  curl -s '{base}/v1/satellites'")
    serve(settings, store, HOST, port, clock=lambda: scenario.as_of_unix_s)
