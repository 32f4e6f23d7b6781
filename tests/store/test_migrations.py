from __future__ import annotations

from collections.abc import Iterator
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import pytest
from alembic.autogenerate import compare_metadata
from alembic.migration import MigrationContext
from sqlalchemy import event, inspect, text

from app.errors import SettingsError
from app.settings import Settings, load_settings
from app.store.session import Store, open_store
from app.store.tables import Table
from tests.databases import PostgresqlTemplate


@pytest.fixture(params=["sqlite", "postgresql"])
def empty(request: pytest.FixtureRequest, tmp_path: Path) -> Iterator[Store]:
    """A database without any table."""
    if request.param == "sqlite":
        with open_store(load_settings(dir=tmp_path)) as store:
            yield store
        return
    server: PostgresqlTemplate = request.getfixturevalue("postgresql_template")
    with server.copy(template=False) as url, open_store(load_settings(database_url=str(url))) as store:
        yield store


def table_names(store: Store) -> set[str]:
    with store.engine.connect() as connection:
        return set(inspect(connection).get_table_names())


def test_up_down_up_leaves_the_tables_of_the_declarations(empty: Store) -> None:
    empty.migrate()
    empty.migrate("base")
    assert table_names(empty) == {"alembic_version"}
    empty.migrate()
    assert empty.at_head()
    with empty.engine.connect() as connection:
        assert compare_metadata(MigrationContext.configure(connection), Table.metadata) == []


def test_named_checks_of_the_migration_are_those_of_the_declarations(empty: Store) -> None:
    # Alembic compares no check constraints, so we do.
    empty.migrate()
    with empty.engine.connect() as connection:
        for table in Table.metadata.tables.values():
            made = {check["name"] for check in inspect(connection).get_check_constraints(table.name)}
            declared = {str(check.name) for check in table.constraints if str(check.name).startswith("ck_")}
            assert made == declared


def test_migrating_again_changes_nothing(store: Store) -> None:
    with store.write() as session:
        session.execute(text("UPDATE changes SET value = 7"))
    store.migrate()
    with store.read() as session:
        assert session.scalar(text("SELECT value FROM changes")) == 7


def test_two_migrations_at_once_both_end_well(empty: Store) -> None:
    with ThreadPoolExecutor(2) as pool:
        for future in [pool.submit(empty.migrate) for _ in range(2)]:
            future.result()
    assert empty.at_head()


def test_a_migration_that_breaks_leaves_nothing(empty: Store) -> None:
    def fail(_connection: object) -> None:
        raise OSError("the disk is full")

    event.listen(empty.engine, "commit", fail)
    with pytest.raises(OSError, match="disk is full"):
        empty.migrate()
    assert table_names(empty) == set()


def test_an_empty_database_is_told_to_migrate(empty: Store) -> None:
    assert not empty.at_head()
    with pytest.raises(SettingsError, match="run `stonechat migrate`"):
        empty.require_head()
    assert table_names(empty) == set()


def test_a_database_of_a_later_version_is_refused(store: Store, settings: Settings) -> None:
    with store.write() as session:
        session.execute(text("UPDATE alembic_version SET version_num = '9999'"))
    with pytest.raises(SettingsError, match="later version"):
        store.require_head()
