"""``stonechat migrate``."""

from __future__ import annotations

import argparse

from alembic.util import CommandError

from app.settings import load_settings
from app.store.session import Store, open_store


def run(options: argparse.Namespace) -> int:
    """Bring the database to the newest schema."""
    settings = load_settings(dir=options.dir)
    with open_store(settings) as store:
        already = store.at_head()
        if not already:
            _migrate(store)
    shown = settings.database.render_as_string(hide_password=True)
    print(f"{shown}: " + ("already at the newest schema" if already else "now at the newest schema"))
    return 0


def _migrate(store: Store) -> None:
    try:
        store.migrate()
    except CommandError:
        store.require_head()  # a database of a later version: says so
        raise
