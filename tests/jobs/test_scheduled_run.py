"""A whole run: claim, compute, stage, publish; and what an error in between leaves behind."""

from __future__ import annotations

import threading
from dataclasses import replace
from datetime import datetime, timedelta

import pytest
from sqlalchemy import event
from sqlalchemy.exc import OperationalError

from app.errors import CatalogueError, ConflictError, NotFoundError
from app.jobs.heartbeat import BEATS_PER_LEASE, Heartbeat
from app.jobs.run import Seams, perform, run_once
from app.settings import Settings
from app.store.advisories import list_advisories
from app.store.clock import utc_now
from app.store.fleet import delete_satellite, put_satellite
from app.store.runs import RunRecord, get_run, list_runs, run_satellites, start_run
from app.store.session import Store
from tests.samples import AS_OF_UNIX_S, CATALOGUE, DAY_S, FakeCompute, spacecraft
from tests.store.steps import register, row_counts, visible

FLEET = [f"sat-{number:02d}" for number in range(45)]  # three chunks


def seams(**more: object) -> Seams:
    return Seams(compute=FakeCompute(**more), catalogue=lambda: CATALOGUE)  # type: ignore[arg-type]


def only_run(store: Store) -> RunRecord:
    with store.read() as session:
        (run,) = list_runs(session)
    return run


def test_a_run_publishes_the_fleet_and_tells_how_far_it_is(store: Store, settings: Settings) -> None:
    register(store, *FLEET)
    told: list[tuple[int, int]] = []
    run = run_once(store, settings, AS_OF_UNIX_S, None, lambda *each: told.append(each), seams=seams())
    assert (run.state, run.computed, run.failed, run.revisions_new) == ("published", 45, 0, 45)
    assert told == [(0, 45), (20, 45), (40, 45), (45, 45)]
    assert run == only_run(store)
    assert len(visible(store)) == 45


def test_a_run_may_be_of_some_satellites(store: Store, settings: Settings) -> None:
    register(store, *FLEET)
    run_once(store, settings, AS_OF_UNIX_S, ["sat-03", "sat-01"], seams=seams())
    assert [each[0] for each in visible(store)] == ["PER-2026.sat-01", "PER-2026.sat-03"]


def test_a_run_of_an_empty_register_is_published_empty(store: Store, settings: Settings) -> None:
    run = run_once(store, settings, AS_OF_UNIX_S, seams=seams())
    assert (run.state, run.satellites_total) == ("published", 0)


def test_a_run_of_an_unknown_satellite_is_refused(store: Store, settings: Settings) -> None:
    with pytest.raises(NotFoundError, match="'sat-99'"):
        run_once(store, settings, AS_OF_UNIX_S, ["sat-99"], seams=seams())


def test_a_satellite_that_cannot_be_computed_is_a_marked_row(store: Store, settings: Settings) -> None:
    register(store, "a", "b", "c")
    run = run_once(store, settings, AS_OF_UNIX_S, seams=seams(failing=("a",), raising=("c",)))
    assert (run.computed, run.failed) == (1, 2)
    with store.read() as session:
        rows = run_satellites(session, run.id)
    assert [(row.satellite_id, row.state, row.reason) for row in rows] == [
        ("a", "failed", "its orbit has decayed"),
        ("b", "computed", None),
        ("c", "failed", "ZeroDivisionError: no number for c"),
    ]


def test_a_run_goes_to_the_real_computation_without_an_orbit_and_says_so(
    store: Store, settings: Settings
) -> None:
    with store.write() as session:
        put_satellite(session, spacecraft("a"))
    short = settings.model_copy(update={"outlook_days": 30.0})
    run = run_once(store, short, AS_OF_UNIX_S, seams=Seams(catalogue=lambda: CATALOGUE))
    with store.read() as session:
        (row,) = run_satellites(session, run.id)
    assert (row.state, row.reason) == ("failed", "no orbit is registered; give it an OMM or TLE")


def test_the_real_computation_can_be_stored_and_repeats_without_news(
    store: Store, settings: Settings
) -> None:
    register(store, "a")
    short = settings.model_copy(
        update={"outlook_days": 30.0, "horizon_low_days": 3.0, "horizon_high_days": 3.0}
    )
    real = Seams(catalogue=lambda: CATALOGUE)
    first = run_once(store, short, AS_OF_UNIX_S, seams=real)
    with store.read() as session:
        assert [row.reason for row in run_satellites(session, first.id)] == [None]
        (record,) = list_advisories(session)
    assert (record.id, record.body["provenance"]["run"]) == ("PER-2026.a", first.id)
    assert record.body["provenance"]["catalogue_digest"] == CATALOGUE.digest
    assert run_once(store, short, AS_OF_UNIX_S, seams=real).revisions_new == 0


def test_a_run_withdraws_nothing_beyond_its_outlook(store: Store, settings: Settings) -> None:
    register(store, "a")
    run_once(store, settings, AS_OF_UNIX_S, seams=seams())
    short = settings.model_copy(update={"outlook_days": 10.0})
    run_once(store, short, AS_OF_UNIX_S - 20.0 * DAY_S, seams=seams(passages=()))
    assert visible(store) == [("PER-2026.a", 1, "current", "ready")]
    run_once(store, settings, AS_OF_UNIX_S - 20.0 * DAY_S, seams=seams(passages=()))
    assert visible(store) == [("PER-2026.a", 2, "withdrawn", "steady")]


@pytest.mark.parametrize("error", [OSError("the disk is full"), KeyboardInterrupt()])
def test_a_run_that_is_broken_off_shows_nothing_and_records_why(
    store: Store, settings: Settings, error: BaseException
) -> None:
    register(store, *FLEET)

    def progress(done: int, _total: int) -> None:
        if done:
            raise error

    with pytest.raises(type(error)):
        run_once(store, settings, AS_OF_UNIX_S, None, progress, seams=seams())
    run = only_run(store)
    assert run.state == "failed"
    assert run.reason == f"{type(error).__name__}: {error}".rstrip(": ")
    assert row_counts(store) == {"bodies": 0, "staged": 0, "revisions": 0}
    assert run_once(store, settings, AS_OF_UNIX_S, seams=seams()).state == "published"


def test_a_catalogue_that_cannot_be_read_fails_the_run_with_its_row(store: Store, settings: Settings) -> None:
    def broken() -> object:
        raise CatalogueError(7, "PER", "zhr_peak", "is not a number")

    with pytest.raises(CatalogueError):
        run_once(store, settings, AS_OF_UNIX_S, seams=replace(seams(), catalogue=broken))
    assert only_run(store).reason == (
        "CatalogueError: stream catalogue, row 7 (PER), column zhr_peak: is not a number"
    )


def test_a_run_that_was_taken_over_meanwhile_gives_up(store: Store, settings: Settings) -> None:
    register(store, *FLEET)
    late = utc_now() + timedelta(days=1)

    def progress(done: int, _total: int) -> None:
        if done == 20:
            run_once(store, settings, AS_OF_UNIX_S, seams=replace(seams(level="shelter"), clock=lambda: late))

    with pytest.raises(ConflictError, match="another one took over"):
        run_once(store, settings, AS_OF_UNIX_S, None, progress, seams=seams())
    with store.read() as session:
        second, first = list_runs(session)
    assert (first.state, second.state) == ("failed", "published")
    assert first.reason is not None
    assert "no sign of life" in first.reason
    assert {each[3] for each in visible(store)} == {"shelter"}
    assert row_counts(store) == {"bodies": 45, "staged": 0, "revisions": 45}


def test_a_satellite_removed_during_the_run_drops_out(store: Store, settings: Settings) -> None:
    register(store, *FLEET)

    def progress(done: int, _total: int) -> None:
        if done == 20:
            with store.write() as session:
                delete_satellite(session, "sat-00", AS_OF_UNIX_S)
                delete_satellite(session, "sat-44", AS_OF_UNIX_S)

    run = run_once(store, settings, AS_OF_UNIX_S, None, progress, seams=seams())
    assert (run.state, run.computed, run.failed, run.satellites_done) == ("published", 43, 2, 45)
    assert len(visible(store)) == 43


def test_a_long_run_shows_that_it_is_alive(store: Store, settings: Settings) -> None:
    register(store, "a")
    beaten, beats = threading.Event(), 0

    def clock() -> datetime:
        nonlocal beats
        if threading.current_thread().name.startswith("heartbeat"):
            beats += 1
            if beats == 2:
                beaten.set()
        return utc_now()

    def compute(inputs, satellites):  # type: ignore[no-untyped-def]
        assert beaten.wait(30.0)
        return FakeCompute()(inputs, satellites)

    lively = Seams(compute=compute, catalogue=lambda: CATALOGUE, clock=clock, lease_s=0.1 * BEATS_PER_LEASE)
    run = run_once(store, settings, AS_OF_UNIX_S, seams=lively)
    assert run.heartbeat_at is not None
    assert run.started_at is not None
    assert run.heartbeat_at > run.started_at
    assert not [each for each in threading.enumerate() if each.name.startswith("heartbeat")]


def test_a_heartbeat_outlives_a_database_that_fails_for_a_while(
    store: Store, caplog: pytest.LogCaptureFixture
) -> None:
    run = start_run(store, AS_OF_UNIX_S)
    failures, beaten = iter([OSError("gone"), OSError("gone")]), threading.Event()

    def strike(_connection: object, _cursor: object, statement: str, *_: object) -> None:
        if "heartbeat_at" not in statement:
            return
        error = next(failures, None)
        if error is not None:
            raise OperationalError(statement, {}, error)
        beaten.set()

    event.listen(store.engine, "before_cursor_execute", strike)
    with Heartbeat(store, run.id, 0.05 * BEATS_PER_LEASE, utc_now):
        assert beaten.wait(30.0)
    event.remove(store.engine, "before_cursor_execute", strike)
    assert sum("could not show that it is alive" in each.message for each in caplog.records) == 2


def test_an_error_while_publishing_leaves_a_failed_run(store: Store, settings: Settings) -> None:
    register(store, "a")
    run = start_run(store, AS_OF_UNIX_S)

    def strike(_connection: object, _cursor: object, statement: str, *_: object) -> None:
        if statement.startswith("DELETE FROM staged"):
            raise OSError("the disk is full")

    event.listen(store.engine, "before_cursor_execute", strike)
    with pytest.raises(OSError, match="disk"):
        perform(store, settings, run, seams=seams())
    event.remove(store.engine, "before_cursor_execute", strike)
    with store.read() as session:
        assert get_run(session, run.id).reason == "OSError: the disk is full"
    assert visible(store) == []
