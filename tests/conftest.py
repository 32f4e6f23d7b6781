"""Fixtures for everybody: ``store`` is an empty, migrated database, once on SQLite and once on PostgreSQL."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import ExitStack
from pathlib import Path

import pytest
from sqlalchemy.engine import URL

from app.settings import Settings, load_settings
from app.store.session import Store, open_store
from tests.databases import PostgresqlTemplate, SqliteTemplate, postgresql_server
from tests.nursery import Nursery, open_nursery


@pytest.fixture(scope="session")
def sqlite_template(tmp_path_factory: pytest.TempPathFactory) -> SqliteTemplate:
    return SqliteTemplate(tmp_path_factory.mktemp("template"))


@pytest.fixture(scope="session")
def postgresql_template() -> Iterator[PostgresqlTemplate]:
    with postgresql_server() as server:
        template = PostgresqlTemplate(server)
        yield template
        template.close()


@pytest.fixture(scope="session")
def nursery() -> Iterator[Nursery]:
    with open_nursery() as opened:
        yield opened


@pytest.fixture(params=["sqlite", "postgresql"])
def database_url(request: pytest.FixtureRequest, tmp_path: Path) -> Iterator[URL]:
    """A migrated database of its own for this test."""
    with ExitStack() as stack:
        if request.param == "sqlite":
            template: SqliteTemplate = request.getfixturevalue("sqlite_template")
            yield stack.enter_context(template.copy(tmp_path))
        else:
            server: PostgresqlTemplate = request.getfixturevalue("postgresql_template")
            yield stack.enter_context(server.copy())


@pytest.fixture
def settings(database_url: URL) -> Settings:
    """Settings for this test's database; everything is computed in this process."""
    text = database_url.render_as_string(hide_password=False)
    return load_settings(database_url=text, executor="serial", workers=0)


@pytest.fixture
def store(settings: Settings) -> Iterator[Store]:
    with open_store(settings) as opened:
        yield opened
