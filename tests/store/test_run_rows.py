"""Runs as rows: asked for, started one at a time, taken over when dead, listed."""

from __future__ import annotations

import pytest

from app.errors import ConflictError, NotFoundError
from app.store.changes import current_change
from app.store.fleet import delete_satellite
from app.store.readiness import freshness
from app.store.runs import (
    LEASE_S,
    RunState,
    claim_queued,
    fail_run,
    get_run,
    heartbeat,
    latest_published,
    list_runs,
    queue_run,
    run_satellites,
    start_run,
)
from app.store.session import Store
from app.store.staging import publish, stage
from tests.samples import AS_OF_UNIX_S, DAY_S, body
from tests.store.steps import Wall, broken, computed, register, row_counts, whole_run


def queue(store: Store, as_of_unix_s: float = AS_OF_UNIX_S, ids: list[str] | None = None) -> str:
    with store.write() as session:
        return queue_run(session, as_of_unix_s, ids)


def state(store: Store, run_id: str) -> str:
    with store.read() as session:
        return get_run(session, run_id).state


def test_a_started_run_holds_every_registered_satellite(store: Store) -> None:
    register(store, "b", "a", "c")
    with store.write() as session:
        delete_satellite(session, "c", AS_OF_UNIX_S)
    run = start_run(store, AS_OF_UNIX_S)
    assert (run.state, run.satellites_total, run.satellites_done) == (RunState.RUNNING, 2, 0)
    assert run.as_of_unix_s == AS_OF_UNIX_S
    with store.read() as session:
        rows = run_satellites(session, run.id)
    assert [(row.satellite_id, row.state) for row in rows] == [("a", "pending"), ("b", "pending")]


def test_a_run_may_be_of_some_satellites(store: Store) -> None:
    register(store, "a", "b", "c")
    run = start_run(store, AS_OF_UNIX_S, ["c", "a", "c"])
    with store.read() as session:
        assert [row.satellite_id for row in run_satellites(session, run.id)] == ["a", "c"]


def test_a_run_of_unknown_satellites_is_refused_by_name(store: Store) -> None:
    register(store, "a")
    with pytest.raises(NotFoundError, match=r"there is no satellite 'x', 'y'$"):
        start_run(store, AS_OF_UNIX_S, ["a", "y", "x"])
    with pytest.raises(NotFoundError, match=r"and 2 more$"):
        queue(store, ids=[f"x{number}" for number in range(7)])
    with store.read() as session:
        assert list_runs(session) == []


def test_a_second_run_is_refused_and_told_of_the_first(store: Store) -> None:
    first = start_run(store, AS_OF_UNIX_S)
    with pytest.raises(ConflictError, match=f"run {first.id} is under way .* takes over in 1"):
        start_run(store, AS_OF_UNIX_S)


def test_queued_runs_are_claimed_in_order_one_at_a_time(store: Store) -> None:
    first, second = queue(store), queue(store, AS_OF_UNIX_S - DAY_S)
    run = claim_queued(store)
    assert run is not None
    assert (run.id, run.state) == (first, RunState.RUNNING)
    assert claim_queued(store) is None
    publish(store, run)
    after = claim_queued(store)
    assert after is not None
    assert after.id == second


def test_nothing_queued_is_nothing_to_claim(store: Store) -> None:
    with store.read() as session:
        before = current_change(session)
    assert claim_queued(store) is None
    with store.read() as session:
        assert current_change(session) == before


def test_a_queued_run_takes_the_register_as_it_is_when_it_starts(store: Store) -> None:
    register(store, "a", "b")
    queue(store, ids=["a", "b"])
    with store.write() as session:
        delete_satellite(session, "b", AS_OF_UNIX_S)
    run = claim_queued(store)
    assert run is not None
    assert run.satellites_total == 1


def test_a_silent_run_is_taken_over_after_its_lease(store: Store) -> None:
    wall = Wall()
    register(store, "a")
    dead = start_run(store, AS_OF_UNIX_S, clock=wall)
    stage(store, dead, [computed("a", body("a"))])
    wall.wait_s(LEASE_S)
    with pytest.raises(ConflictError):
        start_run(store, AS_OF_UNIX_S, clock=wall)
    wall.wait_s(1.0)
    start_run(store, AS_OF_UNIX_S, clock=wall)
    with store.read() as session:
        record = get_run(session, dead.id)
    assert (record.state, record.reason) == ("failed", "its process gave no sign of life for 121 s")
    assert row_counts(store) == {"bodies": 0, "staged": 0, "revisions": 0}


def test_the_queue_takes_over_from_a_silent_run_too(store: Store) -> None:
    wall = Wall()
    dead = start_run(store, AS_OF_UNIX_S, clock=wall)
    wanted = queue(store)
    wall.wait_s(LEASE_S + 1.0)
    claimed = claim_queued(store, clock=wall)
    assert claimed is not None
    assert (claimed.id, state(store, dead.id)) == (wanted, "failed")


def test_a_heartbeat_keeps_a_run_and_is_no_visible_change(store: Store) -> None:
    wall = Wall()
    run = start_run(store, AS_OF_UNIX_S, clock=wall)
    with store.read() as session:
        before = current_change(session)
    wall.wait_s(LEASE_S)
    assert heartbeat(store, run.id, clock=wall)
    wall.wait_s(LEASE_S)
    with pytest.raises(ConflictError):
        start_run(store, AS_OF_UNIX_S, clock=wall)
    with store.read() as session:
        assert current_change(session) == before


def test_a_run_that_lost_its_place_can_neither_beat_stage_nor_publish(store: Store) -> None:
    wall = Wall()
    register(store, "a")
    dead = start_run(store, AS_OF_UNIX_S, clock=wall)
    wall.wait_s(LEASE_S + 1.0)
    whole_run(store, computed("a", body("a", level="shelter")), clock=wall)
    assert not heartbeat(store, dead.id, clock=wall)
    with pytest.raises(ConflictError, match="another one took over"):
        stage(store, dead, [computed("a", body("a"))])
    with store.write() as session:
        session.connection().exec_driver_sql("UPDATE run_satellites SET state = 'computed'")
    with pytest.raises(ConflictError, match="another one took over"):
        publish(store, dead)
    assert row_counts(store) == {"bodies": 1, "staged": 0, "revisions": 1}


def test_failing_a_run_drops_what_it_staged_and_keeps_the_reason(store: Store) -> None:
    register(store, "a")
    run = start_run(store, AS_OF_UNIX_S)
    stage(store, run, [computed("a", body("a"))])
    fail_run(store, run.id, "the operator stopped it")
    fail_run(store, run.id, "a later word")
    with store.read() as session:
        record = get_run(session, run.id)
    assert (record.state, record.reason) == ("failed", "the operator stopped it")
    assert record.finished_at is not None
    assert row_counts(store) == {"bodies": 0, "staged": 0, "revisions": 0}
    assert start_run(store, AS_OF_UNIX_S).state == "running"


def test_a_published_run_does_not_fail_any_more(store: Store) -> None:
    register(store, "a")
    run = whole_run(store, computed("a", body("a")))
    fail_run(store, run.id, "too late")
    assert state(store, run.id) == "published"


def test_what_is_unknown_is_not_found(store: Store) -> None:
    with store.read() as session, pytest.raises(NotFoundError, match="there is no run 'x'"):
        get_run(session, "x")
    with pytest.raises(NotFoundError):
        fail_run(store, "x", "no reason")


def test_runs_are_listed_the_newest_first_in_pages(store: Store) -> None:
    ids = [queue(store) for _ in range(5)]
    found: list[str] = []
    after: int | None = None
    with store.read() as session:
        while page := list_runs(session, after, limit=2):
            found += [run.id for run in page]
            after = page[-1].requested_seq
    assert found == ids[::-1]


def test_the_satellites_of_a_run_are_listed_in_pages_and_by_state(store: Store) -> None:
    ids = ["a", "b", "c", "d", "e"]
    register(store, *ids)
    run = whole_run(store, *(computed(each) for each in ids[:3]), *broken(ids[3:]))
    assert (run.computed, run.failed, run.satellites_done) == (3, 2, 5)
    found: list[str] = []
    with store.read() as session:
        while page := run_satellites(session, run.id, found[-1] if found else None, limit=2):
            found += [row.satellite_id for row in page]
        marked = run_satellites(session, run.id, state="failed")
    assert found == ids
    assert [(row.satellite_id, row.reason) for row in marked] == [(i, "its orbit has decayed") for i in "de"]


def test_the_latest_published_run_is_the_one_published_last(store: Store) -> None:
    wall = Wall()
    register(store, "a")
    with store.read() as session:
        assert latest_published(session) is None
        assert freshness(session).run_id is None
        assert freshness(session).waiting_since is not None
    whole_run(store, computed("a"), clock=wall)
    wall.wait_s(-3600.0)  # a clock that was set back
    last = whole_run(store, computed("a"), as_of_unix_s=AS_OF_UNIX_S - DAY_S, clock=wall)
    fail_run(store, start_run(store, AS_OF_UNIX_S).id, "stopped")
    with store.read() as session:
        assert latest_published(session) == last
        assert freshness(session).published_at == wall.now


def test_every_step_of_a_run_is_a_visible_change(store: Store) -> None:
    register(store, "a")
    seen: list[int] = []

    def look() -> None:
        with store.read() as session:
            seen.append(current_change(session))

    look()
    run_id = queue(store)
    look()
    run = claim_queued(store)
    assert run is not None
    look()
    stage(store, run, [computed("a", body("a"))])
    look()
    publish(store, run)
    look()
    assert seen == sorted(set(seen))
    with store.read() as session:
        assert get_run(session, run_id).change_seq == seen[-1]
