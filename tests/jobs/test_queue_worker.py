"""The thread that computes what was asked for over HTTP."""

from __future__ import annotations

import threading
from collections.abc import Iterator
from contextlib import contextmanager

import pytest
from sqlalchemy import event
from sqlalchemy.exc import OperationalError

from app.jobs.queue import QueueWorker
from app.jobs.run import Seams
from app.settings import Settings
from app.store.runs import RunRecord, RunState, list_runs, queue_run, start_run
from app.store.session import Store
from app.store.staging import publish
from tests.samples import AS_OF_UNIX_S, CATALOGUE, DAY_S, FakeCompute
from tests.store.steps import register, visible

PATIENCE_S = 30.0
POLL_S = 0.02


@contextmanager
def working(store: Store, settings: Settings, **more: object) -> Iterator[QueueWorker]:
    seams = Seams(compute=FakeCompute(**more), catalogue=lambda: CATALOGUE)  # type: ignore[arg-type]
    worker = QueueWorker(store, settings, seams=seams, poll_s=POLL_S)
    worker.start()
    try:
        yield worker
    finally:
        worker.stop()


def ask(store: Store, as_of_unix_s: float = AS_OF_UNIX_S) -> str:
    with store.write() as session:
        return queue_run(session, as_of_unix_s)


def runs_when_idle(store: Store) -> list[RunRecord]:
    """All runs, in the order asked for, once none of them waits or runs."""
    pause = threading.Event()
    for _ in range(round(PATIENCE_S / POLL_S)):
        with store.read() as session:
            runs = list_runs(session)[::-1]
        if all(run.state in (RunState.PUBLISHED, RunState.FAILED) for run in runs):
            return runs
        pause.wait(POLL_S)
    raise AssertionError(f"after {PATIENCE_S} s: {runs}")


def test_what_is_asked_for_is_computed_in_order(store: Store, settings: Settings) -> None:
    register(store, "a", "b")
    ids = [ask(store), ask(store, AS_OF_UNIX_S + DAY_S)]
    with working(store, settings):
        runs = runs_when_idle(store)
    assert [(run.id, run.state.value) for run in runs] == [(each, "published") for each in ids]
    assert len(visible(store)) == 2


def test_a_run_that_fails_does_not_end_the_queue(store: Store, settings: Settings) -> None:
    register(store, "a")
    failures = iter([OSError("the disk is full")])

    def strike(_connection: object, _cursor: object, statement: str, *_: object) -> None:
        error = next(failures, None) if statement.startswith("INSERT INTO staged") else None
        if error is not None:
            raise error

    event.listen(store.engine, "before_cursor_execute", strike)
    ask(store), ask(store)
    with working(store, settings):
        first, second = runs_when_idle(store)
    assert (first.state.value, first.reason) == ("failed", "OSError: the disk is full")
    assert second.state.value == "published"


def test_a_database_that_fails_for_a_while_does_not_end_the_queue(
    store: Store, settings: Settings, caplog: pytest.LogCaptureFixture
) -> None:
    failures = iter(range(3))

    def strike(_connection: object, _cursor: object, statement: str, *_: object) -> None:
        if threading.current_thread().name == "queue" and next(failures, None) is not None:
            raise OperationalError(statement, {}, OSError("gone"))

    event.listen(store.engine, "before_cursor_execute", strike)
    ask(store)
    with working(store, settings):
        (run,) = runs_when_idle(store)
    assert run.state.value == "published"
    assert sum("will try again" in record.message for record in caplog.records) == 3


def test_stopping_gives_up_the_run_under_way_and_leaves_the_rest_queued(
    store: Store, settings: Settings
) -> None:
    register(store, *(f"sat-{number:02d}" for number in range(45)))
    ask(store), ask(store)
    begun, go_on = threading.Event(), threading.Event()

    def compute(inputs, satellites):  # type: ignore[no-untyped-def]
        begun.set()
        assert go_on.wait(PATIENCE_S)
        return FakeCompute()(inputs, satellites)

    worker = QueueWorker(store, settings, seams=Seams(compute, lambda: CATALOGUE), poll_s=POLL_S)
    worker.start()
    assert begun.wait(PATIENCE_S)
    threading.Timer(0.05, go_on.set).start()
    worker.stop()
    with store.read() as session:
        waiting, stopped = list_runs(session)
    assert (waiting.state.value, stopped.state.value) == ("queued", "failed")
    assert stopped.reason == (
        "Stopped: The server was stopped while the run was under way; ask for it again."
    )
    assert visible(store) == []


def test_a_run_of_another_process_is_waited_for(store: Store, settings: Settings) -> None:
    other = start_run(store, AS_OF_UNIX_S)
    wanted = ask(store)
    with working(store, settings):
        publish(store, other)
        runs = runs_when_idle(store)
    assert [(run.id, run.state.value) for run in runs] == [(other.id, "published"), (wanted, "published")]


def test_a_worker_starts_once_and_may_stop_before_it_starts(store: Store, settings: Settings) -> None:
    QueueWorker(store, settings).stop()
    with working(store, settings) as worker, pytest.raises(RuntimeError, match="started already"):
        worker.start()
