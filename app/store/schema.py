"""The schema's version: Alembic driven from inside, over a connection that is already in a transaction."""

from __future__ import annotations

from alembic import command
from alembic.config import Config
from alembic.runtime.migration import MigrationContext
from alembic.script import ScriptDirectory
from sqlalchemy import Connection

from app.resources import resource_dir


def migrate(connection: Connection, to: str = "head") -> None:
    """Upgrade (or, to an earlier revision or "base", downgrade) inside the connection's transaction."""
    config = _config()
    config.attributes["connection"] = connection
    if _is_behind(connection, to):
        command.upgrade(config, to)
    else:
        command.downgrade(config, to)


def problem(connection: Connection) -> str | None:
    """Return None when the schema is the newest, else one line saying what to do."""
    present = set(MigrationContext.configure(connection).get_current_heads())
    scripts = ScriptDirectory.from_config(_config())
    if present == set(scripts.get_heads()):
        return None
    if not present:
        return "the database has no tables yet; run `stonechat migrate`"
    if present <= {script.revision for script in scripts.walk_revisions()}:
        return "the database is of an earlier version; run `stonechat migrate`"
    return "the database was made by a later version of stonechat; install that version"


def _is_behind(connection: Connection, to: str) -> bool:
    if to in ("head", "base"):
        return to == "head"
    present = MigrationContext.configure(connection).get_current_revision()
    return present is None or present < to  # our revision names sort by age: 0001, 0002, ...


def _config() -> Config:
    config = Config()
    # Alembic would read a percent sign of the path as the start of an interpolation.
    config.set_main_option("script_location", str(resource_dir("migrations")).replace("%", "%%"))
    config.set_main_option("path_separator", "os")
    return config
