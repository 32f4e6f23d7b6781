"""What the processes of the nursery do."""

from __future__ import annotations

import json
import os
import threading
from collections.abc import Sequence
from concurrent.futures import ThreadPoolExecutor
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

from app.errors import ConflictError
from app.jobs.run import Seams, run_once
from app.pipeline import Registered, RunInputs, SatelliteResult
from app.settings import Settings, load_settings
from app.store.clock import utc_now
from app.store.fleet import get_satellite, put_satellite
from app.store.runs import list_runs
from app.store.session import Store, open_store
from tests.samples import AS_OF_UNIX_S, CATALOGUE, FakeCompute, band, body, spacecraft

PASSAGES = ("PER-2026", "GEM-2026")
STEP_S = 60.0
STEPS = 60
READY = "ready"


def moving(inputs: RunInputs, satellites: Sequence[Registered]) -> list[SatelliteResult]:
    """Every advisory moves with every step of ``as_of``, so that each run publishes all of them anew."""
    step = round((inputs.as_of_unix_s - AS_OF_UNIX_S) / STEP_S) % STEPS
    factor = [{"criterion": "mass", **band(1.5**step)}]
    return [_moved(each.spacecraft.id, factor) for each in satellites]


def _moved(satellite: str, factor: list[dict[str, Any]]) -> SatelliteResult:
    bodies = tuple(body(satellite, passage, satellite_enhancement_peak=factor) for passage in PASSAGES)
    return SatelliteResult(satellite, "computed", None, bodies)


def compute_for_ever(url: str, wall_ahead_s: float, told: str) -> None:
    """Say that all is ready, then compute run after run; write the id of each once it is published."""

    def ahead() -> datetime:
        return utc_now() + timedelta(seconds=wall_ahead_s)

    settings = settings_for(url)
    seams = Seams(compute=moving, catalogue=lambda: CATALOGUE, clock=ahead)
    with open_store(settings) as store, Path(told).open("a") as file:
        file.write(READY + "\n")
        file.flush()
        while True:
            file.write(run_once(store, settings, _next_as_of(store), seams=seams).id + "\n")
            file.flush()


def compute_with_workers(url: str, told: str) -> None:
    """Compute one long run in worker processes, each of which writes its process id into a file."""
    settings = load_settings(database_url=url, executor="processes", workers=2)
    compute = FakeCompute(seconds=60.0, trace=Path(told))
    with open_store(settings) as store:
        run_once(store, settings, AS_OF_UNIX_S, seams=Seams(compute=compute, catalogue=lambda: CATALOGUE))


def compete(url: str, times: int, told: str) -> None:
    """Try to compute as often as that; write what became of each try into a file."""
    settings = settings_for(url)
    seams = Seams(compute=moving, catalogue=lambda: CATALOGUE)
    outcomes = []
    with open_store(settings) as store:
        for _ in range(times):
            try:
                outcomes.append(run_once(store, settings, AS_OF_UNIX_S, seams=seams).id)
            except ConflictError:
                outcomes.append("refused")
    Path(told).write_text(json.dumps(outcomes))


def add_ones(url: str, threads: int, times: int) -> None:
    """Read a number, write it back increased by one: in several threads, as often as that in each."""
    with open_store(settings_for(url)) as store, ThreadPoolExecutor(threads) as pool:
        for future in [pool.submit(_add_ones, store, times) for _ in range(threads)]:
            future.result()


def _add_ones(store: Store, times: int) -> None:
    for _ in range(times):
        with store.write() as session:
            count = int(get_satellite(session, "kestrel-1").spacecraft.name)
            put_satellite(session, spacecraft(name=str(count + 1)))
        with store.read() as session:
            assert int(get_satellite(session, "kestrel-1").spacecraft.name) > count


def migrate_and_write(url: str) -> None:
    """Do what a process does on a new database, all at the same time as others."""
    with open_store(settings_for(url)) as store:
        store.migrate()
        with store.write() as session:
            put_satellite(session, spacecraft(f"sat-{os.getpid()}-{threading.get_ident()}"))


def settings_for(url: str) -> Settings:
    return load_settings(database_url=url, executor="serial", workers=0)


def _next_as_of(store: Store) -> float:
    with store.read() as session:
        latest = list_runs(session, limit=1)
    return latest[0].as_of_unix_s + STEP_S if latest else AS_OF_UNIX_S
