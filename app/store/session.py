"""One ``Store`` per process: the engine, and the two kinds of transaction.

A reading transaction sees one unmoving state of the database. A writing transaction is alone: SQLite's BEGIN
IMMEDIATE and a PostgreSQL advisory lock give the same promise on both, so that no read-then-write loses an
update and no two writers can deadlock. Writing transactions are therefore kept short.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any, Self

from psycopg.errors import LockNotAvailable
from sqlalchemy import Connection, Engine, create_engine, event, text
from sqlalchemy.engine import URL
from sqlalchemy.exc import DBAPIError, OperationalError
from sqlalchemy.orm import Session
from sqlalchemy.pool import PoolResetState

from app.errors import ConflictError, SettingsError
from app.settings import Settings
from app.store import schema

WRITER_LOCK = 0x53746F6E65  # any fixed number: the key of the advisory lock that makes writers take turns
WAIT_MS = 5_000
PRAGMAS = (f"busy_timeout={WAIT_MS}", "journal_mode=WAL", "synchronous=NORMAL", "foreign_keys=ON")
# A client that hangs inside a transaction would hold the writers' lock for ever; the server ends it.
IDLE_MS = 60_000
# Execution option of bulk statements: the session holds none of the rows they touch.
UNSYNCHRONISED = {"synchronize_session": False}


class Store:
    """An open database. ``read()`` and ``write()`` give sessions; ``close()`` returns every connection."""

    def __init__(self, engine: Engine) -> None:
        self.engine = engine
        self._writer = engine.execution_options(stonechat_write=True)
        self._reader = engine
        if engine.dialect.name == "postgresql":
            self._reader = engine.execution_options(
                isolation_level="REPEATABLE READ", postgresql_readonly=True
            )

    @contextmanager
    def read(self) -> Iterator[Session]:
        """Give a session on one snapshot; whatever it changes is thrown away."""
        with Session(self._reader, expire_on_commit=False) as session:
            yield session

    @contextmanager
    def write(self) -> Iterator[Session]:
        """Give the only writing session: commit at the end, roll back on an error.

        Raises ``ConflictError`` when other writers keep the database busy for too long, and SQLAlchemy's
        ``OperationalError`` when it cannot be reached.
        """
        with Session(self._writer, expire_on_commit=False) as session:
            try:
                session.connection()
            except OperationalError as error:
                if not _is_busy(error):
                    raise
                raise ConflictError(f"the database is busy ({_first_line(error)}); try again") from error
            yield session
            session.commit()

    def migrate(self, to: str = "head") -> None:
        """Bring the schema to a revision (newest by default, "base" is empty), whole or not at all."""
        with self._writer.begin() as connection:
            schema.migrate(connection, to)

    def at_head(self) -> bool:
        """Say whether the schema is the one this version needs."""
        with self._reader.connect() as connection:
            return schema.problem(connection) is None

    def require_head(self) -> None:
        """Raise ``SettingsError`` saying what to do when the schema is not the one this version needs."""
        with self._reader.connect() as connection:
            problem = schema.problem(connection)
        if problem:
            raise SettingsError(problem)

    def close(self) -> None:
        """Close every connection."""
        self.engine.dispose()

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()


def open_store(settings: Settings, create: bool = True) -> Store:
    """Connect. Raises ``SettingsError`` when the database cannot be reached; changes nothing in it.

    An SQLite file that does not exist is made, or without ``create`` refused.
    """
    url = settings.database
    if url.get_backend_name() == "sqlite":
        _require_folder(url)
        if not create and not Path(url.database or "").exists():
            raise SettingsError(
                f"there is no database {Path(url.database or '').resolve()}; name its folder with --dir, or make "
                "it with `stonechat migrate`"
            )
    engine = create_engine(url, pool_size=settings.connections, max_overflow=0, pool_pre_ping=True)
    event.listen(
        engine, "connect", _prepare_sqlite if engine.dialect.name == "sqlite" else _prepare_postgresql
    )
    event.listen(engine, "begin", _begin)
    event.listen(engine, "reset", _leave_no_transaction)
    try:
        with engine.connect() as connection:
            connection.execute(text("SELECT 1"))
    except DBAPIError as error:
        engine.dispose()
        raise SettingsError(f"cannot use the database {url!r}: {_first_line(error)}") from error
    return Store(engine)


def _require_folder(url: URL) -> None:
    folder = Path(url.database or "").resolve().parent
    if not folder.is_dir():
        raise SettingsError(
            f"the folder {folder} does not exist; make it, or set STONECHAT_DIR or STONECHAT_DATABASE_URL"
        )


def _prepare_sqlite(connection: Any, _record: object) -> None:
    connection.isolation_level = None  # the driver shall begin nothing by itself; _begin does
    for pragma in PRAGMAS:
        connection.execute(f"PRAGMA {pragma}").close()


def _prepare_postgresql(connection: Any, _record: object) -> None:
    connection.execute(f"SET lock_timeout = {WAIT_MS}")
    connection.execute(f"SET idle_in_transaction_session_timeout = {IDLE_MS}")
    connection.commit()


def _begin(connection: Connection) -> None:
    writing = connection.get_execution_options().get("stonechat_write", False)
    if connection.dialect.name == "sqlite":
        connection.exec_driver_sql("BEGIN IMMEDIATE" if writing else "BEGIN")
    elif writing:
        connection.exec_driver_sql(f"SELECT pg_advisory_xact_lock({WRITER_LOCK})")


def _leave_no_transaction(connection: Any, _record: object, state: PoolResetState) -> None:
    # A COMMIT that fails (a full disk) leaves its transaction open. SQLAlchemy takes it for ended and puts the
    # connection back into the pool, where it would keep every other writer out.
    if not state.terminate_only:
        connection.rollback()


def _is_busy(error: OperationalError) -> bool:
    """Say whether a wait for the other writers ended without a turn."""
    if isinstance(error.orig, sqlite3.OperationalError):
        return error.orig.sqlite_errorcode & 0xFF == sqlite3.SQLITE_BUSY  # the rest of the code says how
    return isinstance(error.orig, LockNotAvailable)


def _first_line(error: DBAPIError) -> str:
    lines = str(error.orig).strip().splitlines()
    return lines[0] if lines else type(error.orig).__name__
