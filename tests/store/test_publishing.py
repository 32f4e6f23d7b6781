"""A run becomes visible whole or not at all; a revision is never edited."""

from __future__ import annotations

import threading
from typing import Any

import pytest
from sqlalchemy import event, text
from sqlalchemy.exc import DBAPIError

from app.errors import NotFoundError
from app.store.advisories import get_advisory, list_advisories, revisions
from app.store.changes import current_change
from app.store.fleet import delete_satellite, put_satellite
from app.store.runs import get_run, run_satellites, start_run
from app.store.session import Store
from app.store.staging import REMOVED_MEANWHILE, publish, stage
from tests.samples import AS_OF_UNIX_S, DAY_S, body, spacecraft
from tests.store.steps import broken, computed, register, row_counts, visible, whole_run

FLEET = ("a", "b", "c")


def all_at(level: str, *passages: str) -> list[Any]:
    return [computed(each, *(body(each, p, level) for p in passages or ("PER-2026",))) for each in FLEET]


def test_nothing_is_seen_before_the_run_is_published(store: Store) -> None:
    register(store, *FLEET)
    run = start_run(store, AS_OF_UNIX_S)
    progress = [stage(store, run, [result]).satellites_done for result in all_at("ready")]
    assert progress == [1, 2, 3]
    assert visible(store) == []
    with store.read() as session, pytest.raises(NotFoundError):
        get_advisory(session, "PER-2026.a")
    published = publish(store, run)
    assert (published.state, published.computed, published.failed) == ("published", 3, 0)
    assert published.revisions_new == 3
    assert visible(store) == [(f"PER-2026.{each}", 1, "current", "ready") for each in FLEET]


def test_all_of_a_run_has_one_change_number_and_one_time(store: Store) -> None:
    register(store, *FLEET)
    run = whole_run(store, *all_at("ready", "PER-2026", "GEM-2026"))
    with store.read() as session:
        records = list_advisories(session)
        assert current_change(session) == run.change_seq
    assert {(each.change_seq, each.changed_at) for each in records} == {(run.change_seq, run.finished_at)}


def test_a_later_run_supersedes_what_moved_and_leaves_the_rest(store: Store) -> None:
    register(store, *FLEET)
    whole_run(store, *all_at("ready"))
    run = whole_run(store, computed("a", body("a", level="shelter")), computed("b", body("b")))
    assert run.revisions_new == 1
    assert visible(store) == [
        ("PER-2026.a", 2, "current", "shelter"),
        ("PER-2026.b", 1, "current", "ready"),
        ("PER-2026.c", 1, "current", "ready"),
    ]
    with store.read() as session:
        history = revisions(session, "PER-2026.a")
    assert [(each.revision, each.status, each.level) for each in history] == [
        (1, "superseded", "ready"),
        (2, "current", "shelter"),
    ]


def test_the_same_run_again_publishes_no_revision(store: Store) -> None:
    register(store, *FLEET)
    whole_run(store, *all_at("ready"))
    assert whole_run(store, *all_at("ready")).revisions_new == 0


def test_a_satellite_that_failed_keeps_its_advisories(store: Store) -> None:
    register(store, "a")
    whole_run(store, computed("a", body("a")))
    whole_run(store, *broken(["a"]))
    assert visible(store) == [("PER-2026.a", 1, "current", "ready")]


def test_a_passage_that_is_no_longer_found_is_withdrawn_and_may_come_back(store: Store) -> None:
    register(store, "a")
    for bodies in ([body("a")], [], [], [body("a")]):
        whole_run(store, computed("a", *bodies))
    with store.read() as session:
        history = revisions(session, "PER-2026.a")
    assert [(each.status, each.level) for each in history] == [
        ("superseded", "ready"),
        ("superseded", "steady"),
        ("current", "ready"),
    ]


def test_a_run_leaves_alone_what_lies_beyond_its_outlook(store: Store) -> None:
    register(store, "a")
    whole_run(store, computed("a", body("a")))
    run = start_run(store, AS_OF_UNIX_S - 30.0 * DAY_S)
    stage(store, run, [computed("a")], looked_until_unix_s=AS_OF_UNIX_S)
    publish(store, run)
    assert visible(store) == [("PER-2026.a", 1, "current", "ready")]


def test_a_run_is_not_published_before_all_its_satellites_are_computed(store: Store) -> None:
    register(store, *FLEET)
    run = start_run(store, AS_OF_UNIX_S)
    stage(store, run, all_at("ready")[:2])
    with pytest.raises(RuntimeError, match="before all its satellites"):
        publish(store, run)
    assert visible(store) == []


def test_a_result_that_comes_twice_or_of_another_satellite_is_dropped(store: Store) -> None:
    register(store, "a", "b")
    run = start_run(store, AS_OF_UNIX_S, ["a"])
    stage(store, run, [computed("a", body("a"))])
    stage(store, run, [computed("a", body("a", "GEM-2026")), computed("b", body("b"))])
    assert publish(store, run).revisions_new == 1
    assert visible(store) == [("PER-2026.a", 1, "current", "ready")]


class Break(Exception):
    """The fault that tests inject."""


def publish_broken_at(store: Store, run: Any, statement: int) -> bool:
    """Publish; let the n-th statement (or the commit, after the last) break. False when none was left to break."""
    count = 0

    def strike(*_: object) -> None:
        nonlocal count
        count += 1
        if count == statement:
            raise Break

    event.listen(store.engine, "before_cursor_execute", strike)
    event.listen(store.engine, "commit", strike)
    try:
        publish(store, run)
    except Break:
        return True
    finally:
        event.remove(store.engine, "before_cursor_execute", strike)
        event.remove(store.engine, "commit", strike)
    return False


def test_publishing_that_breaks_at_any_statement_shows_nothing_and_can_be_repeated(store: Store) -> None:
    register(store, *FLEET)
    whole_run(store, *all_at("ready", "PER-2026", "GEM-2026"))
    before = visible(store)
    run = start_run(store, AS_OF_UNIX_S)
    stage(store, run, all_at("shelter"))
    counts, statement = row_counts(store), 1
    while publish_broken_at(store, run, statement):
        assert visible(store) == before
        assert row_counts(store) == counts
        statement += 1
    assert statement > 8
    assert [each[1:] for each in visible(store)] == [(2, "withdrawn", "steady")] * 3 + [
        (2, "current", "shelter")
    ] * 3


def test_a_reader_sees_whole_runs_only(store: Store) -> None:
    register(store, *FLEET)
    whole_run(store, *all_at("ready"))
    seen: set[tuple[Any, ...]] = set()
    end = threading.Event()

    def look() -> None:
        while not end.is_set():
            seen.add(tuple(each[1:] for each in visible(store)))

    reader = threading.Thread(target=look)
    reader.start()
    for number in range(10):
        whole_run(store, *all_at("shelter" if number % 2 == 0 else "ready"))
    end.set()
    reader.join()
    assert len(seen) > 1
    assert all(len(set(snapshot)) == 1 and len(snapshot) == len(FLEET) for snapshot in seen)


def test_removing_a_satellite_withdraws_what_has_not_ended(store: Store) -> None:
    register(store, "a", "b")
    ended = body("a", "SDA-2026", end="2026-08-09T00:00:00Z")
    whole_run(store, computed("a", body("a"), ended), computed("b", body("b")))
    with store.write() as session:
        delete_satellite(session, "a", AS_OF_UNIX_S)
    assert visible(store) == [
        ("PER-2026.a", 2, "withdrawn", "steady"),
        ("PER-2026.b", 1, "current", "ready"),
        ("SDA-2026.a", 1, "current", "ready"),
    ]
    with store.read() as session:
        record = get_advisory(session, "PER-2026.a")
        assert record.change_seq == current_change(session)
    assert record.body["changes"] == [
        {"what": "withdrawn", "text": "The satellite was removed from the register."}
    ]


def test_a_satellite_removed_after_it_was_staged_drops_out_of_the_run(store: Store) -> None:
    register(store, "a", "b")
    whole_run(store, computed("a", body("a")))
    run = start_run(store, AS_OF_UNIX_S)
    stage(store, run, [computed("a", body("a", level="shelter")), computed("b", body("b"))])
    with store.write() as session:
        delete_satellite(session, "a", AS_OF_UNIX_S)
    published = publish(store, run)
    assert (published.computed, published.failed, published.revisions_new) == (1, 1, 1)
    assert visible(store) == [
        ("PER-2026.a", 2, "withdrawn", "steady"),
        ("PER-2026.b", 1, "current", "ready"),
    ]
    with store.read() as session:
        (row,) = run_satellites(session, run.id, state="failed")
    assert (row.satellite_id, row.reason) == ("a", REMOVED_MEANWHILE)


def test_a_satellite_removed_before_it_was_staged_drops_out_even_if_it_came_back(store: Store) -> None:
    register(store, "a", "b")
    run = start_run(store, AS_OF_UNIX_S)
    with store.write() as session:
        delete_satellite(session, "a", AS_OF_UNIX_S)
        put_satellite(session, spacecraft("a"))
    stage(store, run, [computed("a", body("a")), computed("b", body("b"))])
    publish(store, run)
    assert visible(store) == [("PER-2026.b", 1, "current", "ready")]


def test_a_satellite_that_comes_back_goes_on_with_its_revisions(store: Store) -> None:
    register(store, "a")
    whole_run(store, computed("a", body("a")))
    with store.write() as session:
        delete_satellite(session, "a", AS_OF_UNIX_S)
    register(store, "a")
    whole_run(store, computed("a", body("a")))
    assert visible(store) == [("PER-2026.a", 3, "current", "ready")]


EDITS = [
    "UPDATE bodies SET body = '{}'",
    "UPDATE revisions SET level = 'steady'",
    "UPDATE revisions SET changed_at = '2030-01-01 00:00:00'",
    "UPDATE revisions SET change_seq = 1",
    "UPDATE revisions SET status = 'withdrawn'",
    "UPDATE revisions SET status = 'current'",
    "DELETE FROM revisions",
]


@pytest.mark.parametrize("edit", EDITS)
def test_the_database_itself_refuses_to_edit_a_revision(store: Store, edit: str) -> None:
    register(store, "a")
    whole_run(store, computed("a", body("a")))
    whole_run(store, computed("a", body("a", level="shelter")))
    with pytest.raises(DBAPIError, match="a revision is never edited"), store.write() as session:
        session.execute(text(edit))


def test_the_body_of_a_published_revision_cannot_be_deleted(store: Store) -> None:
    register(store, "a")
    whole_run(store, computed("a", body("a")))
    with pytest.raises(DBAPIError, match=r"(?i)foreign key"), store.write() as session:
        session.execute(text("DELETE FROM bodies"))


def test_the_database_itself_refuses_a_second_running_run(store: Store) -> None:
    start_run(store, AS_OF_UNIX_S)
    again = text(
        "INSERT INTO runs SELECT 'other', 99, state, as_of, selection, requested_at, started_at, finished_at, "
        "heartbeat_at, satellites_total, satellites_done, computed, failed, revisions_new, reason, change_seq "
        "FROM runs"
    )
    with pytest.raises(DBAPIError, match=r"(?i)unique"), store.write() as session:
        session.execute(again)


def test_a_run_can_be_read_while_it_is_under_way(store: Store) -> None:
    register(store, *FLEET)
    run = start_run(store, AS_OF_UNIX_S)
    stage(store, run, [all_at("ready")[0], *broken(["b"])])
    with store.read() as session:
        assert get_run(session, run.id).satellites_done == 2
        rows = run_satellites(session, run.id)
    assert [(row.state, row.reason) for row in rows] == [
        ("computed", None),
        ("failed", "its orbit has decayed"),
        ("pending", None),
    ]
