"""Lists of advisories: pages, filters, order of change."""

from __future__ import annotations

from datetime import timedelta

import pytest

from app.errors import NotFoundError
from app.store.advisories import AdvisoryFilter, AdvisoryRecord, get_advisory, list_advisories, revisions
from app.store.fleet import delete_satellite
from app.store.session import Store
from app.store.text import canonical_json
from tests.samples import AS_OF_UNIX_S, body
from tests.store.steps import Wall, computed, register, whole_run

EVERYTHING = AdvisoryFilter()


@pytest.fixture
def wall() -> Wall:
    return Wall()


@pytest.fixture
def filled(store: Store, wall: Wall) -> Store:
    """Two runs, six hours apart: the second one moves PER of a and withdraws GEM of b."""
    register(store, "a", "b")
    gem = body("b", "GEM-2026", "steady")
    whole_run(store, computed("a", body("a")), computed("b", body("b", level="shelter"), gem), clock=wall)
    wall.wait_s(21_600.0)
    moved = body("a", level="shelter")
    whole_run(store, computed("a", moved), computed("b", body("b", level="shelter")), clock=wall)
    return store


def listed(store: Store, wanted: AdvisoryFilter = EVERYTHING) -> list[str]:
    with store.read() as session:
        return [record.id for record in list_advisories(session, wanted)]


def test_the_list_is_in_the_order_of_change(filled: Store) -> None:
    assert listed(filled) == ["PER-2026.b", "GEM-2026.b", "PER-2026.a"]


@pytest.mark.parametrize(
    ("wanted", "found"),
    [
        (AdvisoryFilter(satellite="b"), ["PER-2026.b", "GEM-2026.b"]),
        (AdvisoryFilter(satellite="b", stream="GEM"), ["GEM-2026.b"]),
        (AdvisoryFilter(stream="PER"), ["PER-2026.b", "PER-2026.a"]),
        (AdvisoryFilter(level="shelter"), ["PER-2026.b", "PER-2026.a"]),
        (AdvisoryFilter(level="ready"), []),
        (AdvisoryFilter(status="withdrawn"), ["GEM-2026.b"]),
        (AdvisoryFilter(satellite="c"), []),
    ],
)
def test_filters_look_at_the_latest_revision(filled: Store, wanted: AdvisoryFilter, found: list[str]) -> None:
    assert listed(filled, wanted) == found


def test_changed_since_includes_its_own_instant(filled: Store, wall: Wall) -> None:
    moment = timedelta(microseconds=1)
    assert listed(filled, AdvisoryFilter(changed_since=wall.now)) == ["GEM-2026.b", "PER-2026.a"]
    assert listed(filled, AdvisoryFilter(changed_since=wall.now + moment)) == []
    assert len(listed(filled, AdvisoryFilter(changed_since=wall.now - timedelta(hours=6)))) == 3
    assert len(listed(filled, AdvisoryFilter(changed_since=wall.now - timedelta(hours=6) + moment))) == 2


def test_changed_since_misses_nothing_after_the_clock_was_set_back(store: Store, wall: Wall) -> None:
    register(store, "a", "b")
    both = computed("a", body("a")), computed("b", body("b"))
    whole_run(store, *both, clock=wall)
    last_seen = AdvisoryFilter(changed_since=wall.now)
    wall.wait_s(-3_600.0)
    whole_run(store, *(computed(each, body(each, level="shelter")) for each in "ab"), clock=wall)
    assert listed(store, last_seen) == ["PER-2026.a", "PER-2026.b"]
    with store.write() as session:
        delete_satellite(session, "a", AS_OF_UNIX_S, clock=wall)
        delete_satellite(session, "b", AS_OF_UNIX_S, clock=wall)
    assert listed(store, last_seen) == ["PER-2026.a", "PER-2026.b"]


def pages(store: Store, limit: int) -> list[list[AdvisoryRecord]]:
    found: list[list[AdvisoryRecord]] = []
    after: tuple[int, str] | None = None
    with store.read() as session:
        while page := list_advisories(session, EVERYTHING, after, limit):
            found.append(page)
            after = (page[-1].change_seq, page[-1].id)
    return found


def test_pages_put_together_are_the_whole_list(store: Store) -> None:
    # Ids that a language's own order would sort differently from bytes.
    ids = ["a-1", "a_1", "a.1", "a1", "B1", "b1", "z"]
    register(store, *ids)
    for level in ("ready", "shelter"):
        whole_run(store, *(computed(each, body(each, level=level)) for each in ids[:4]))
        whole_run(store, *(computed(each, body(each, level=level)) for each in ids[4:]))
    for limit in (1, 2, 3, 7, 10):
        found = [record for page in pages(store, limit) for record in page]
        assert [record.id for record in found] == [
            *sorted(f"PER-2026.{each}" for each in ids[:4]),
            *sorted(f"PER-2026.{each}" for each in ids[4:]),
        ]


def test_an_advisory_that_changes_between_two_pages_moves_to_the_end(filled: Store) -> None:
    with filled.read() as session:
        first = list_advisories(session, limit=1)
    whole_run(filled, computed("b", body("b", level="ready")))
    with filled.read() as session:
        rest = list_advisories(session, after=(first[0].change_seq, first[0].id))
    assert [(record.id, record.revision) for record in (*first, *rest)] == [
        ("PER-2026.b", 1),
        ("GEM-2026.b", 2),
        ("PER-2026.a", 2),
        ("PER-2026.b", 2),
    ]


def test_one_advisory_comes_back_whole_with_todays_status(filled: Store) -> None:
    with filled.read() as session:
        record = get_advisory(session, "PER-2026.a")
        history = revisions(session, "PER-2026.a")
    changes = [{"what": "level", "text": "Level went from ready to shelter."}]
    expected = {**body("a", level="shelter"), "revision": 2, "status": "current", "changes": changes}
    assert record.body == expected
    assert [each.body["status"] for each in history] == ["superseded", "current"]
    assert (record.satellite, record.stream, record.level) == ("a", "PER", "shelter")


def test_a_body_is_stored_byte_for_byte(filled: Store) -> None:
    with filled.read() as session:
        record = get_advisory(session, "PER-2026.a")
        stored = session.connection().exec_driver_sql(
            "SELECT body FROM bodies WHERE advisory_id = 'PER-2026.a' AND revision = 2"
        )
        text = stored.scalar_one()
    assert text == canonical_json({name: v for name, v in record.body.items() if name != "status"})


def test_revisions_page_by_number(filled: Store) -> None:
    with filled.read() as session:
        assert [each.revision for each in revisions(session, "PER-2026.a", limit=1)] == [1]
        assert [each.revision for each in revisions(session, "PER-2026.a", after=1)] == [2]
        assert revisions(session, "PER-2026.a", after=2) == []


def test_an_unknown_advisory_is_not_found(filled: Store) -> None:
    with filled.read() as session:
        for call in (get_advisory, revisions):
            with pytest.raises(NotFoundError, match=r"there is no advisory 'PER-2026\.x'"):
                call(session, "PER-2026.x")
