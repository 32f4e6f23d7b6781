"""Serial and in worker processes: the same interface, the same results."""

from __future__ import annotations

import multiprocessing
import os
import threading
from collections.abc import Callable
from pathlib import Path

import psutil
import pytest
from sqlalchemy import select

from app.jobs.executor import ONE_THREAD, executor, in_process
from app.jobs.run import Seams, run_once
from app.settings import Settings, load_settings
from app.store.runs import run_satellites
from app.store.session import Store, open_store
from app.store.tables import Body
from tests.databases import SqliteTemplate
from tests.samples import AS_OF_UNIX_S, CATALOGUE, FakeCompute
from tests.store.steps import register, visible

FLEET = [f"sat-{number:02d}" for number in range(45)]  # three chunks


def processes(workers: int = 2) -> Settings:
    return load_settings(executor="processes", workers=workers)


def seams(**more: object) -> Seams:
    return Seams(compute=FakeCompute(**more), catalogue=lambda: CATALOGUE)  # type: ignore[arg-type]


def test_without_workers_everything_is_computed_here() -> None:
    assert in_process(processes(0))
    assert in_process(load_settings(executor="serial", workers=3))
    assert not in_process(processes())
    with executor(processes(0)) as pool:
        assert pool.submit(os.getpid).result() == os.getpid()
        assert pool.submit(threading.get_ident).result() == threading.get_ident()


def test_the_serial_executor_hands_on_errors() -> None:
    with executor(processes(0)) as pool:
        future = pool.submit(int, "seven")
    with pytest.raises(ValueError, match="seven"):
        future.result()


def test_workers_are_other_processes_and_gone_at_the_end() -> None:
    with executor(processes()) as pool:
        workers = {psutil.Process(pid) for pid in pool.map(_pid, range(4))}
        assert os.getpid() not in {worker.pid for worker in workers}
    assert psutil.wait_procs(list(workers), timeout=10.0)[1] == []


def _pid(_: int) -> int:
    return os.getpid()


def _environment(name: str) -> str | None:
    return os.environ.get(name)


def test_a_worker_computes_in_one_thread_and_our_own_environment_stays() -> None:
    before = dict(os.environ)
    with executor(processes()) as pool:
        assert list(pool.map(_environment, ONE_THREAD)) == ["1"] * len(ONE_THREAD)
    assert dict(os.environ) == before
    assert multiprocessing.active_children() == []


RunBytes = Callable[[Settings, Seams], list[tuple[str, str]]]


@pytest.fixture
def run_bytes(sqlite_template: SqliteTemplate, tmp_path: Path) -> RunBytes:
    """Compute the fleet in a fresh database and return what it published, the run's random id aside."""

    def compute(settings: Settings, seams: Seams) -> list[tuple[str, str]]:
        folder = tmp_path / f"{settings.executor}-{settings.workers}"
        folder.mkdir()
        with sqlite_template.copy(folder) as url, open_store(load_settings(database_url=str(url))) as store:
            register(store, *FLEET)
            run = run_once(store, settings, AS_OF_UNIX_S, seams=seams)
            assert run.computed == len(FLEET)
            with store.read() as session:
                rows = session.execute(select(Body.advisory_id, Body.body).order_by(Body.advisory_id))
                return [(row.advisory_id, row.body.replace(run.id, "")) for row in rows]

    return compute


@pytest.mark.parametrize("of", [seams(), Seams(catalogue=lambda: CATALOGUE)], ids=["invented", "real"])
def test_serial_and_processes_give_the_same_bytes(run_bytes: RunBytes, of: Seams) -> None:
    short = {"outlook_days": 30.0, "horizon_low_days": 1.0, "horizon_high_days": 1.0}
    alone = run_bytes(processes(0).model_copy(update=short), of)
    assert len(alone) == len(FLEET)
    assert run_bytes(processes(2).model_copy(update=short), of) == alone
    assert run_bytes(processes(3).model_copy(update=short), of) == alone


def test_a_worker_that_dies_marks_only_the_culprit(store: Store) -> None:
    register(store, *FLEET)
    run = run_once(store, processes(), AS_OF_UNIX_S, seams=seams(killing=("sat-07",), raising=("sat-31",)))
    assert (run.state, run.computed, run.failed) == ("published", len(FLEET) - 2, 2)
    with store.read() as session:
        marked = run_satellites(session, run.id, state="failed")
    assert [(row.satellite_id, row.reason) for row in marked] == [
        ("sat-07", "its worker process died while computing it"),
        ("sat-31", "ZeroDivisionError: no number for sat-31"),
    ]
    assert len(visible(store)) == len(FLEET) - 2
