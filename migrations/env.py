"""Alembic's entry: runs the migrations over the connection that ``app.store.schema`` hands in."""

from __future__ import annotations

from alembic import context

from app.store.tables import Table

connection = context.config.attributes["connection"]
context.configure(connection=connection, target_metadata=Table.metadata, render_as_batch=True)
with context.begin_transaction():
    context.run_migrations()
