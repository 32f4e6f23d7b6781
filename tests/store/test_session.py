from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor
from datetime import UTC, datetime, timedelta, timezone
from pathlib import Path

import pytest
from sqlalchemy import event, select, text
from sqlalchemy.exc import OperationalError, StatementError

from app.errors import ConflictError
from app.settings import Settings, load_settings
from app.store.changes import current_change, next_change
from app.store.fleet import get_satellite, put_satellite
from app.store.session import Store, open_store
from app.store.tables import Satellite
from tests.samples import spacecraft

WRITERS, WRITES = 8, 20


def test_sqlite_is_set_up_as_designed(store: Store) -> None:
    if store.engine.dialect.name != "sqlite":
        pytest.skip("about SQLite")
    names = ("journal_mode", "synchronous", "foreign_keys", "busy_timeout")
    with store.read() as session:
        found = [session.scalar(text(f"PRAGMA {name}")) for name in names]
    assert found == ["wal", 1, 1, 5000]  # sqlite.org/pragma.html: synchronous 1 is NORMAL


def test_a_writing_transaction_begins_immediate(store: Store) -> None:
    if store.engine.dialect.name != "sqlite":
        pytest.skip("about SQLite")
    seen: list[str] = []
    event.listen(store.engine, "before_cursor_execute", lambda *args: seen.append(args[2]))
    with store.write():
        pass
    with store.read() as session:
        session.execute(text("SELECT 1"))
    assert [statement for statement in seen if "BEGIN" in statement] == ["BEGIN IMMEDIATE", "BEGIN"]


def test_an_error_rolls_everything_back(store: Store) -> None:
    def write_and_break() -> None:
        with store.write() as session:
            put_satellite(session, spacecraft())
            raise OSError("the disk is full")

    with pytest.raises(OSError, match="disk"):
        write_and_break()
    with store.read() as session:
        assert session.scalars(select(Satellite)).all() == []
        assert current_change(session) == 0


def test_a_reader_sees_one_unmoving_state(store: Store) -> None:
    with store.read() as reader:
        assert current_change(reader) == 0
        with store.write() as writer:
            next_change(writer)
        assert current_change(reader) == 0
    with store.read() as reader:
        assert current_change(reader) == 1


def test_a_writer_that_waits_too_long_is_told_so(store: Store) -> None:
    hurry = "PRAGMA busy_timeout = 50" if store.engine.dialect.name == "sqlite" else "SET lock_timeout = 50"

    @event.listens_for(store.engine, "checkout")
    def shorten(connection, _record, _proxy) -> None:  # type: ignore[no-untyped-def]
        connection.execute(hurry).close()
        connection.commit()

    with store.write(), pytest.raises(ConflictError, match="busy"), store.write():
        pass


def test_a_commit_that_fails_leaves_the_database_to_the_next_writer(store: Store) -> None:
    failures = iter([OSError("the disk is full")])

    def strike(_connection: object) -> None:
        error = next(failures, None)
        if error is not None:
            raise error

    event.listen(store.engine, "commit", strike)
    with pytest.raises(OSError, match="disk"), store.write() as session:
        put_satellite(session, spacecraft("lost"))
    with store.write() as session:
        put_satellite(session, spacecraft("kept"))
    with store.read() as session:
        assert session.scalars(select(Satellite.id)).all() == ["kept"]


def test_a_database_that_is_gone_is_not_called_busy(tmp_path: Path) -> None:
    settings = load_settings(dir=tmp_path)
    with open_store(settings) as store:
        store.close()
        for file in tmp_path.iterdir():
            file.unlink()
        (tmp_path / "stonechat.sqlite").mkdir()
        with pytest.raises(OperationalError, match="unable to open"), store.write():
            pass


def test_eight_writers_lose_no_update(store: Store) -> None:
    with store.write() as session:
        put_satellite(session, spacecraft(name="0"))

    def add_one(_: int) -> None:
        with store.write() as session:
            count = int(get_satellite(session, "kestrel-1").spacecraft.name)
            put_satellite(session, spacecraft(name=str(count + 1)))

    with ThreadPoolExecutor(WRITERS) as pool:
        list(pool.map(add_one, range(WRITERS * WRITES)))
    with store.read() as session:
        assert get_satellite(session, "kestrel-1").spacecraft.name == str(WRITERS * WRITES)
        assert current_change(session) == 1 + WRITERS * WRITES


def test_times_come_back_as_utc_and_naive_ones_are_refused(store: Store) -> None:
    two_hours_east = timezone(timedelta(hours=2))
    with store.write() as session:
        put_satellite(
            session, spacecraft(), clock=lambda: datetime(2026, 8, 10, 2, 0, 0, 123456, two_hours_east)
        )
    with store.read() as session:
        stored = get_satellite(session, "kestrel-1").changed_at
    assert stored == datetime(2026, 8, 10, 0, 0, 0, 123456, UTC)
    assert stored.utcoffset() == timedelta(0)
    with pytest.raises(StatementError, match="without time zone"), store.write() as session:
        put_satellite(session, spacecraft("other"), clock=lambda: datetime(2026, 8, 10))


def test_two_stores_share_one_database(store: Store, settings: Settings) -> None:
    with open_store(settings) as other, other.write() as session:
        put_satellite(session, spacecraft())
    with store.read() as session:
        assert get_satellite(session, "kestrel-1").id == "kestrel-1"
