"""The tables, as typed declarative classes. Enumerations are text with a named check."""

from __future__ import annotations

from datetime import UTC, datetime
from typing import Any

from sqlalchemy import (
    BigInteger,
    CheckConstraint,
    DateTime,
    Dialect,
    ForeignKey,
    ForeignKeyConstraint,
    Index,
    Integer,
    MetaData,
    Text,
    TypeDecorator,
    text,
)
from sqlalchemy.orm import DeclarativeBase, Mapped, mapped_column

NAMING = {
    "ix": "ix_%(table_name)s_%(column_0_N_name)s",
    "uq": "uq_%(table_name)s_%(column_0_N_name)s",
    "ck": "ck_%(table_name)s_%(constraint_name)s",
    "fk": "fk_%(table_name)s_%(column_0_N_name)s_%(referred_table_name)s",
    "pk": "pk_%(table_name)s",
}
# Byte order on both databases, so that a key page continues at the same row; SQLite compares bytes anyway.
Key = Text().with_variant(Text(collation="C"), "postgresql")
Sequence = BigInteger().with_variant(Integer, "sqlite")
LATEST = text("status <> 'superseded'")


class UtcDateTime(TypeDecorator[datetime]):
    """An instant: refuses naive datetimes, stores UTC, gives back aware UTC."""

    impl = DateTime(timezone=True)
    cache_ok = True

    def process_bind_param(self, value: datetime | None, dialect: Dialect) -> datetime | None:
        """Convert to UTC; SQLite keeps no offset, so it gets a naive text in UTC."""
        if value is None:
            return None
        if value.tzinfo is None:
            raise ValueError("a datetime without time zone cannot be stored")
        moment = value.astimezone(UTC)
        return moment.replace(tzinfo=None) if dialect.name == "sqlite" else moment

    def process_result_value(self, value: datetime | None, dialect: Dialect) -> datetime | None:
        """Give back aware UTC whatever the driver or the session's time zone says."""
        if value is None:
            return None
        return value.replace(tzinfo=UTC) if value.tzinfo is None else value.astimezone(UTC)


class Table(DeclarativeBase):
    """Base of all tables."""

    metadata = MetaData(naming_convention=NAMING)
    type_annotation_map = {datetime: UtcDateTime, str: Text}  # noqa: RUF012  (read by SQLAlchemy as is)


def one_of(column: str, *values: str) -> CheckConstraint:
    """Check that a text column holds one of these words; named after the column."""
    words = ", ".join(f"'{value}'" for value in values)
    return CheckConstraint(f"{column} IN ({words})", name=column)


def latest_index(name: str, *columns: str, unique: bool = False) -> Index:
    """Index only the latest revision of each advisory (the one not superseded)."""
    return Index(name, *columns, unique=unique, sqlite_where=LATEST, postgresql_where=LATEST)


class Changes(Table):
    """One row: how many visible changes there have been. Every ``ETag`` comes from it."""

    __tablename__ = "changes"
    __table_args__ = (CheckConstraint("id = 1", name="one_row"),)
    id: Mapped[int] = mapped_column(Integer, primary_key=True, autoincrement=False)
    value: Mapped[int] = mapped_column(Sequence)


class Satellite(Table):
    """A satellite of the register; a removed one stays, because advisories refer to it."""

    __tablename__ = "satellites"
    __table_args__ = (one_of("status", "registered", "removed"),)
    id: Mapped[str] = mapped_column(Key, primary_key=True)
    status: Mapped[str]
    body: Mapped[str]
    change_seq: Mapped[int] = mapped_column(Sequence)
    changed_at: Mapped[datetime]


class Orbit(Table):
    """An orbit as it was given; the newest of a registered satellite is current."""

    __tablename__ = "orbits"
    __table_args__ = (
        one_of("status", "current", "superseded"),
        Index(
            "uq_orbits_current",
            "satellite_id",
            unique=True,
            sqlite_where=text("status = 'current'"),
            postgresql_where=text("status = 'current'"),
        ),
        Index(None, "satellite_id", "change_seq"),
    )
    id: Mapped[int] = mapped_column(Sequence, primary_key=True)
    satellite_id: Mapped[str] = mapped_column(Key, ForeignKey("satellites.id"))
    status: Mapped[str]
    source_format: Mapped[str]
    epoch: Mapped[datetime]
    body: Mapped[str]
    change_seq: Mapped[int] = mapped_column(Sequence)
    received_at: Mapped[datetime]


class Run(Table):
    """One scheduled job. The database itself refuses a second running one."""

    __tablename__ = "runs"
    __table_args__ = (
        one_of("state", "queued", "running", "published", "failed"),
        CheckConstraint("state <> 'running' OR heartbeat_at IS NOT NULL", name="heartbeat"),
        Index(
            "uq_runs_running",
            "state",
            unique=True,
            sqlite_where=text("state = 'running'"),
            postgresql_where=text("state = 'running'"),
        ),
        Index(None, "state", "requested_seq"),
        Index(None, "state", "change_seq"),
    )
    id: Mapped[str] = mapped_column(Key, primary_key=True)
    requested_seq: Mapped[int] = mapped_column(Sequence, unique=True)
    state: Mapped[str]
    as_of: Mapped[datetime]
    selection: Mapped[str | None]  # JSON list of satellite ids; None is the whole register
    requested_at: Mapped[datetime]
    started_at: Mapped[datetime | None]
    finished_at: Mapped[datetime | None]
    heartbeat_at: Mapped[datetime | None]
    satellites_total: Mapped[int] = mapped_column(Integer, default=0)
    satellites_done: Mapped[int] = mapped_column(Integer, default=0)
    computed: Mapped[int] = mapped_column(Integer, default=0)
    failed: Mapped[int] = mapped_column(Integer, default=0)
    revisions_new: Mapped[int] = mapped_column(Integer, default=0)
    reason: Mapped[str | None]
    change_seq: Mapped[int] = mapped_column(Sequence)


class RunSatellite(Table):
    """What became of one satellite in one run."""

    __tablename__ = "run_satellites"
    __table_args__ = (one_of("state", "pending", "computed", "failed"), Index(None, "satellite_id"))
    run_id: Mapped[str] = mapped_column(Key, ForeignKey("runs.id"), primary_key=True)
    satellite_id: Mapped[str] = mapped_column(Key, ForeignKey("satellites.id"), primary_key=True)
    state: Mapped[str]
    reason: Mapped[str | None]


class Body(Table):
    """The text of one revision, written once while a run computes; a trigger refuses every update."""

    __tablename__ = "bodies"
    __table_args__ = (Index(None, "run_id"),)
    advisory_id: Mapped[str] = mapped_column(Key, primary_key=True)
    revision: Mapped[int] = mapped_column(Integer, primary_key=True, autoincrement=False)
    run_id: Mapped[str | None] = mapped_column(Key, ForeignKey("runs.id"))
    body: Mapped[str]


class RevisionColumns:
    """What is searched by; the same for a staged and for a published revision."""

    advisory_id: Mapped[str] = mapped_column(Key, primary_key=True)
    revision: Mapped[int] = mapped_column(Integer, primary_key=True, autoincrement=False)
    satellite_id: Mapped[str] = mapped_column(Key, ForeignKey("satellites.id"))
    run_id: Mapped[str | None] = mapped_column(Key, ForeignKey("runs.id"))
    status: Mapped[str]
    stream: Mapped[str]
    passage: Mapped[str]
    level: Mapped[str]
    depth: Mapped[str]
    ends_at: Mapped[datetime]


REVISION_COLUMNS = tuple(name for name in RevisionColumns.__annotations__)


def _revision_args(*more: Any, ondelete: str | None = None) -> tuple[Any, ...]:
    return (
        ForeignKeyConstraint(
            ["advisory_id", "revision"], ["bodies.advisory_id", "bodies.revision"], ondelete=ondelete
        ),
        one_of("level", "steady", "ready", "shelter"),
        one_of("depth", "outlook", "plan"),
        *more,
    )


class Staged(RevisionColumns, Table):
    """A revision of the run that is under way. Nobody sees it before the run is published."""

    __tablename__ = "staged"
    __table_args__ = _revision_args(
        one_of("status", "current", "withdrawn"),
        Index(None, "run_id"),
        Index(None, "satellite_id"),
        ondelete="CASCADE",
    )


class Revision(RevisionColumns, Table):
    """A published revision of an advisory. Only ``status`` ever changes, and only to superseded."""

    __tablename__ = "revisions"
    __table_args__ = _revision_args(
        one_of("status", "current", "superseded", "withdrawn"),
        latest_index("uq_revisions_latest", "advisory_id", unique=True),
        latest_index("ix_revisions_latest_change", "change_seq", "advisory_id"),
        latest_index("ix_revisions_latest_satellite", "satellite_id", "change_seq", "advisory_id"),
        latest_index("ix_revisions_latest_changed_at", "changed_at", "change_seq"),
        Index(None, "run_id"),
    )
    change_seq: Mapped[int] = mapped_column(Sequence)
    changed_at: Mapped[datetime]
