"""Register, orbits, runs, advisory revisions, the change counter.

Revises: nothing
"""

from __future__ import annotations

import sqlalchemy as sa
from alembic import op

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None

TABLES = ("staged", "revisions", "bodies", "run_satellites", "runs", "orbits", "satellites", "changes")
KEY = sa.Text().with_variant(sa.Text(collation="C"), "postgresql")
SEQUENCE = sa.BigInteger().with_variant(sa.Integer(), "sqlite")
INSTANT = sa.DateTime(timezone=True)
REFUSALS = (
    ("bodies_update", "UPDATE ON bodies", None),
    ("revisions_delete", "DELETE ON revisions", None),
    (
        "revisions_update",
        "UPDATE OF advisory_id, revision, satellite_id, run_id, stream, passage, level, depth, ends_at, "
        "change_seq, changed_at ON revisions",
        None,
    ),
    ("revisions_status", "UPDATE OF status ON revisions", "NEW.status <> 'superseded'"),
)


def upgrade() -> None:
    """Make everything, and the counter's one row."""
    _changes()
    _register()
    _runs()
    _bodies()
    _staged()
    _revisions()
    _refuse_edits()


def downgrade() -> None:
    """Drop everything."""
    for table in TABLES:
        op.drop_table(table)
    if _on_postgresql():
        op.execute("DROP FUNCTION stonechat_refuse_edit()")


def _changes() -> None:
    changes = op.create_table(
        "changes",
        sa.Column("id", sa.Integer, autoincrement=False, nullable=False),
        sa.Column("value", SEQUENCE, nullable=False),
        sa.CheckConstraint("id = 1", name=op.f("ck_changes_one_row")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_changes")),
    )
    op.bulk_insert(changes, [{"id": 1, "value": 0}])


def _register() -> None:
    op.create_table(
        "satellites",
        sa.Column("id", KEY, nullable=False),
        _text("status"),
        _text("body"),
        sa.Column("change_seq", SEQUENCE, nullable=False),
        sa.Column("changed_at", INSTANT, nullable=False),
        _one_of("satellites", "status", "registered", "removed"),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_satellites")),
    )
    op.create_table(
        "orbits",
        sa.Column("id", SEQUENCE, nullable=False),
        sa.Column("satellite_id", KEY, nullable=False),
        _text("status"),
        _text("source_format"),
        sa.Column("epoch", INSTANT, nullable=False),
        _text("body"),
        sa.Column("change_seq", SEQUENCE, nullable=False),
        sa.Column("received_at", INSTANT, nullable=False),
        _one_of("orbits", "status", "current", "superseded"),
        _to("orbits", "satellite_id", "satellites"),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_orbits")),
    )
    op.create_index(op.f("ix_orbits_satellite_id_change_seq"), "orbits", ["satellite_id", "change_seq"])
    _partial_index("uq_orbits_current", "orbits", ["satellite_id"], "status = 'current'", unique=True)


def _runs() -> None:
    counts = ("satellites_total", "satellites_done", "computed", "failed", "revisions_new")
    op.create_table(
        "runs",
        sa.Column("id", KEY, nullable=False),
        sa.Column("requested_seq", SEQUENCE, nullable=False),
        _text("state"),
        sa.Column("as_of", INSTANT, nullable=False),
        _text("selection", nullable=True),
        sa.Column("requested_at", INSTANT, nullable=False),
        *(sa.Column(name, INSTANT, nullable=True) for name in ("started_at", "finished_at", "heartbeat_at")),
        *(sa.Column(name, sa.Integer, nullable=False) for name in counts),
        _text("reason", nullable=True),
        sa.Column("change_seq", SEQUENCE, nullable=False),
        _one_of("runs", "state", "queued", "running", "published", "failed"),
        sa.CheckConstraint("state <> 'running' OR heartbeat_at IS NOT NULL", name=op.f("ck_runs_heartbeat")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_runs")),
        sa.UniqueConstraint("requested_seq", name=op.f("uq_runs_requested_seq")),
    )
    op.create_index(op.f("ix_runs_state_requested_seq"), "runs", ["state", "requested_seq"])
    op.create_index(op.f("ix_runs_state_change_seq"), "runs", ["state", "change_seq"])
    _partial_index("uq_runs_running", "runs", ["state"], "state = 'running'", unique=True)
    op.create_table(
        "run_satellites",
        sa.Column("run_id", KEY, nullable=False),
        sa.Column("satellite_id", KEY, nullable=False),
        _text("state"),
        _text("reason", nullable=True),
        _one_of("run_satellites", "state", "pending", "computed", "failed"),
        _to("run_satellites", "run_id", "runs"),
        _to("run_satellites", "satellite_id", "satellites"),
        sa.PrimaryKeyConstraint("run_id", "satellite_id", name=op.f("pk_run_satellites")),
    )
    op.create_index(op.f("ix_run_satellites_satellite_id"), "run_satellites", ["satellite_id"])


def _bodies() -> None:
    op.create_table(
        "bodies",
        sa.Column("advisory_id", KEY, nullable=False),
        sa.Column("revision", sa.Integer, autoincrement=False, nullable=False),
        sa.Column("run_id", KEY, nullable=True),
        _text("body"),
        _to("bodies", "run_id", "runs"),
        sa.PrimaryKeyConstraint("advisory_id", "revision", name=op.f("pk_bodies")),
    )
    op.create_index(op.f("ix_bodies_run_id"), "bodies", ["run_id"])


def _staged() -> None:
    op.create_table(
        "staged",
        *_revision_columns("staged", ondelete="CASCADE"),
        _one_of("staged", "status", "current", "withdrawn"),
    )
    op.create_index(op.f("ix_staged_run_id"), "staged", ["run_id"])
    op.create_index(op.f("ix_staged_satellite_id"), "staged", ["satellite_id"])


def _revisions() -> None:
    op.create_table(
        "revisions",
        *_revision_columns("revisions"),
        sa.Column("change_seq", SEQUENCE, nullable=False),
        sa.Column("changed_at", INSTANT, nullable=False),
        _one_of("revisions", "status", "current", "superseded", "withdrawn"),
    )
    latest = "status <> 'superseded'"
    by_change = ["change_seq", "advisory_id"]
    _partial_index("uq_revisions_latest", "revisions", ["advisory_id"], latest, unique=True)
    _partial_index("ix_revisions_latest_change", "revisions", by_change, latest)
    _partial_index("ix_revisions_latest_satellite", "revisions", ["satellite_id", *by_change], latest)
    _partial_index("ix_revisions_latest_changed_at", "revisions", ["changed_at", "change_seq"], latest)
    op.create_index(op.f("ix_revisions_run_id"), "revisions", ["run_id"])


def _revision_columns(table: str, ondelete: str | None = None) -> list[sa.SchemaItem]:
    body = ["bodies.advisory_id", "bodies.revision"]
    return [
        sa.Column("advisory_id", KEY, nullable=False),
        sa.Column("revision", sa.Integer, autoincrement=False, nullable=False),
        sa.Column("satellite_id", KEY, nullable=False),
        sa.Column("run_id", KEY, nullable=True),
        *(_text(name) for name in ("status", "stream", "passage", "level", "depth")),
        sa.Column("ends_at", INSTANT, nullable=False),
        _one_of(table, "level", "steady", "ready", "shelter"),
        _one_of(table, "depth", "outlook", "plan"),
        sa.ForeignKeyConstraint(
            ["advisory_id", "revision"],
            body,
            name=op.f(f"fk_{table}_advisory_id_revision_bodies"),
            ondelete=ondelete,
        ),
        _to(table, "satellite_id", "satellites"),
        _to(table, "run_id", "runs"),
        sa.PrimaryKeyConstraint("advisory_id", "revision", name=op.f(f"pk_{table}")),
    ]


def _refuse_edits() -> None:
    if _on_postgresql():
        op.execute(
            "CREATE FUNCTION stonechat_refuse_edit() RETURNS trigger LANGUAGE plpgsql AS "
            "$$ BEGIN RAISE EXCEPTION 'a revision is never edited'; END $$"
        )
    for name, what, condition in REFUSALS:
        op.execute(_refusal(name, what, condition))


def _refusal(name: str, what: str, condition: str | None) -> str:
    when = f"WHEN ({condition}) " if condition else ""
    start = f"CREATE TRIGGER refuse_{name} BEFORE {what} FOR EACH ROW {when}"
    if _on_postgresql():
        return start + "EXECUTE FUNCTION stonechat_refuse_edit()"
    return start + "BEGIN SELECT RAISE(ABORT, 'a revision is never edited'); END"


def _text(name: str, nullable: bool = False) -> sa.Column[str]:
    return sa.Column(name, sa.Text, nullable=nullable)


def _one_of(table: str, column: str, *values: str) -> sa.CheckConstraint:
    words = ", ".join(f"'{value}'" for value in values)
    return sa.CheckConstraint(f"{column} IN ({words})", name=op.f(f"ck_{table}_{column}"))


def _to(table: str, column: str, target: str) -> sa.ForeignKeyConstraint:
    return sa.ForeignKeyConstraint([column], [f"{target}.id"], name=op.f(f"fk_{table}_{column}_{target}"))


def _partial_index(name: str, table: str, columns: list[str], where: str, unique: bool = False) -> None:
    condition = sa.text(where)
    op.create_index(name, table, columns, unique=unique, sqlite_where=condition, postgresql_where=condition)


def _on_postgresql() -> bool:
    return op.get_bind().dialect.name == "postgresql"
