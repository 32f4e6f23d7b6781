"""Killing a computing process at any instant loses nothing and shows nothing half-done."""

from __future__ import annotations

import os
import random
import signal
import time
from dataclasses import replace
from datetime import UTC, datetime, timedelta
from pathlib import Path

import psutil
from sqlalchemy import select, text
from sqlalchemy.engine import URL

from app.jobs.run import Seams, run_once
from app.settings import Settings
from app.store.changes import current_change
from app.store.runs import RunRecord, RunState, list_runs
from app.store.session import Store
from app.store.tables import Revision
from tests.jobs.victims import PASSAGES, READY, STEP_S, moving
from tests.nursery import Nursery
from tests.samples import AS_OF_UNIX_S, CATALOGUE
from tests.store.steps import register, row_counts

KILLS, SEED = 30, 20260812
MOST_RUNS = 2  # that a process may publish before it is killed during the next one
LEASES_S = 1000.0  # each process lives so much later than the one before that its lease has ended
SEAMS = Seams(compute=moving, catalogue=lambda: CATALOGUE)
FLEET = [f"sat-{number:02d}" for number in range(30)]  # two chunks


def lines(file: Path) -> list[str]:
    return file.read_text().splitlines() if file.exists() else []


def wait_for_lines(file: Path, count: int, pid: int) -> None:
    while len(lines(file)) < count:
        assert psutil.Process(pid).status() != psutil.STATUS_ZOMBIE, "the process ended by itself"
        time.sleep(0.002)


def runs_in(store: Store) -> list[RunRecord]:
    with store.read() as session:
        return list_runs(session, limit=10_000)[::-1]


def check_whole(store: Store, last_change: int) -> int:
    """Every published run is there with all it published, nothing else is visible; return the change counter."""
    with store.read() as session:
        rows = session.execute(select(Revision.run_id, Revision.revision, Revision.status)).all()
        change = current_change(session)
        published = [run.id for run in list_runs(session, limit=10_000) if run.state == RunState.PUBLISHED]
    published.reverse()
    expected = [
        (run_id, number, "current" if number == len(published) else "superseded")
        for number, run_id in enumerate(published, start=1)
        for _ in range(len(FLEET) * len(PASSAGES))
    ]
    assert sorted(tuple(row) for row in rows) == sorted(expected)
    assert change >= last_change
    return change


def check_file(store: Store) -> None:
    """SQLite's own opinion of its file."""
    if store.engine.dialect.name == "sqlite":
        with store.read() as session:
            assert session.scalar(text("PRAGMA integrity_check")) == "ok"
            assert session.execute(text("PRAGMA foreign_key_check")).all() == []


def test_killing_a_run_at_any_instant_shows_nothing_half_done(
    store: Store, settings: Settings, database_url: URL, nursery: Nursery, tmp_path: Path
) -> None:
    register(store, *FLEET)
    chance, change, started = random.Random(SEED), 0, time.monotonic()
    run_once(store, settings, AS_OF_UNIX_S, seams=SEAMS)
    run_s, told = time.monotonic() - started, [tmp_path / f"told-{number}" for number in range(KILLS)]
    url = database_url.render_as_string(hide_password=False)
    for number, file in enumerate(told):
        pid = nursery.start("tests.jobs.victims:compute_for_ever", url, (number + 1) * LEASES_S, str(file))
        wait_for_lines(file, 1 + chance.randint(0, MOST_RUNS), pid)
        time.sleep(chance.uniform(0.0, run_s))
        os.kill(pid, signal.SIGKILL)
        assert nursery.wait(pid) == -signal.SIGKILL
        change = check_whole(store, change)
        check_file(store)
    published = {run.id for run in runs_in(store) if run.state == "published"}
    assert {line for file in told for line in lines(file) if line != READY} <= published
    # Kills must have met runs that had staged something, or this test has shown little.
    dead = [run for run in runs_in(store) if run.state != "published"]
    assert len(dead) > KILLS // 3
    assert any(run.satellites_done for run in dead)
    check_clean_end(store, settings)


def check_clean_end(store: Store, settings: Settings) -> None:
    """The next run takes over, publishes, and leaves nothing of the dead ones."""
    late = datetime.now(UTC) + timedelta(seconds=(KILLS + 2) * LEASES_S)
    last = runs_in(store)[-1]
    run = run_once(store, settings, last.as_of_unix_s + STEP_S, seams=replace(SEAMS, clock=lambda: late))
    assert run.revisions_new == len(FLEET) * len(PASSAGES)
    check_whole(store, 0)
    counts = row_counts(store)
    assert (counts["staged"], counts["bodies"]) == (0, counts["revisions"])
    assert {each.state for each in runs_in(store)} == {RunState.PUBLISHED, RunState.FAILED}


def test_workers_end_with_the_process_that_is_killed(
    store: Store, database_url: URL, nursery: Nursery, tmp_path: Path
) -> None:
    register(store, *FLEET)
    told = tmp_path / "told"
    url = database_url.render_as_string(hide_password=False)
    pid = nursery.start("tests.jobs.victims:compute_with_workers", url, str(told))
    wait_for_lines(told, 2, pid)
    workers = [psutil.Process(int(line.split()[0])) for line in lines(told)]
    os.kill(pid, signal.SIGKILL)
    assert nursery.wait(pid) == -signal.SIGKILL
    assert psutil.wait_procs(workers, timeout=30.0)[1] == []
