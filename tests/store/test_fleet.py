from __future__ import annotations

import pytest

from app.errors import NotFoundError
from app.store.changes import current_change
from app.store.fleet import (
    current_orbit,
    delete_satellite,
    fleet_for_run,
    get_satellite,
    list_satellites,
    orbit_history,
    put_orbit,
    put_satellite,
)
from app.store.session import Store
from tests.samples import AS_OF_UNIX_S, elements, spacecraft


def test_a_satellite_comes_back_as_it_was_put(store: Store) -> None:
    with store.write() as session:
        assert put_satellite(session, spacecraft())
    with store.read() as session:
        record = get_satellite(session, "kestrel-1")
    assert record.spacecraft == spacecraft()
    assert record.change_seq == 1


def test_the_same_satellite_again_is_no_change_another_one_is(store: Store) -> None:
    with store.write() as session:
        put_satellite(session, spacecraft())
        assert not put_satellite(session, spacecraft())
        assert current_change(session) == 1
        assert not put_satellite(session, spacecraft(ready_at=1.8))
        assert current_change(session) == 2
        assert get_satellite(session, "kestrel-1").spacecraft.policy.ready_at == 1.8


def test_what_is_not_registered_is_not_found(store: Store) -> None:
    with store.write() as session:
        for call in (
            lambda: get_satellite(session, "x"),
            lambda: current_orbit(session, "x"),
            lambda: put_orbit(session, "x", elements(), "tle"),
            lambda: delete_satellite(session, "x", AS_OF_UNIX_S),
        ):
            with pytest.raises(NotFoundError, match="there is no satellite 'x'"):
                call()


def test_pages_are_in_byte_order_and_complete(store: Store) -> None:
    ids = ["a-10", "a-9", "a.1", "a_1", "b", "a1", "a"]
    with store.write() as session:
        for satellite_id in ids:
            put_satellite(session, spacecraft(satellite_id))
    found: list[str] = []
    with store.read() as session:
        while page := list_satellites(session, after=found[-1] if found else None, limit=2):
            found += [record.id for record in page]
    assert found == sorted(ids)


def test_orbits_are_kept_and_the_newest_is_current(store: Store) -> None:
    with store.write() as session:
        put_satellite(session, spacecraft())
        assert put_orbit(session, "kestrel-1", elements(10.0), "tle")
        assert put_orbit(session, "kestrel-1", elements(20.0), "omm-json")
        before = current_change(session)
        assert not put_orbit(session, "kestrel-1", elements(20.0), "omm-xml")
        assert current_change(session) == before
    with store.read() as session:
        record = current_orbit(session, "kestrel-1")
        assert (record.elements, record.source_format) == (elements(20.0), "omm-json")
        assert [each.elements.mean_anomaly_deg for each in orbit_history(session, "kestrel-1")] == [
            20.0,
            10.0,
        ]


def test_without_orbit_says_what_to_give(store: Store) -> None:
    with store.write() as session:
        put_satellite(session, spacecraft())
        with pytest.raises(NotFoundError, match="has no orbit yet; give it an OMM or TLE"):
            current_orbit(session, "kestrel-1")


def test_the_fleet_for_a_run_has_orbits_where_there_are_any(store: Store) -> None:
    with store.write() as session:
        for satellite_id in ("b", "a", "c"):
            put_satellite(session, spacecraft(satellite_id))
        put_orbit(session, "b", elements(), "tle")
        delete_satellite(session, "c", AS_OF_UNIX_S)
    with store.read() as session:
        fleet = fleet_for_run(session, ["c", "b", "a", "unknown"])
    assert [(each.spacecraft.id, each.elements) for each in fleet] == [("a", None), ("b", elements())]


def test_a_removed_satellite_is_gone_and_can_be_registered_again_without_its_orbit(store: Store) -> None:
    with store.write() as session:
        put_satellite(session, spacecraft())
        put_orbit(session, "kestrel-1", elements(), "tle")
        delete_satellite(session, "kestrel-1", AS_OF_UNIX_S)
    with store.read() as session, pytest.raises(NotFoundError):
        get_satellite(session, "kestrel-1")
    with store.write() as session:
        assert list_satellites(session) == []
        assert put_satellite(session, spacecraft())
        with pytest.raises(NotFoundError, match="no orbit yet"):
            current_orbit(session, "kestrel-1")
        assert len(orbit_history(session, "kestrel-1")) == 1


def test_a_history_of_orbits_pages_from_the_newest_and_ends_with_the_satellite(store: Store) -> None:
    with store.write() as session:
        put_satellite(session, spacecraft())
        for anomaly in range(5):
            put_orbit(session, "kestrel-1", elements(float(anomaly)), "tle")
    found: list[float] = []
    after: int | None = None
    with store.read() as session:
        while page := orbit_history(session, "kestrel-1", after, limit=2):
            found += [record.elements.mean_anomaly_deg for record in page]
            after = page[-1].change_seq
    assert found == [4.0, 3.0, 2.0, 1.0, 0.0]
    with store.write() as session:
        delete_satellite(session, "kestrel-1", AS_OF_UNIX_S)
        with pytest.raises(NotFoundError, match="there is no satellite"):
            orbit_history(session, "kestrel-1")
