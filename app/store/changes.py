"""The change counter: every transaction that alters something visible takes the next number."""

from __future__ import annotations

from sqlalchemy import select, update
from sqlalchemy.orm import Session

from app.store.session import UNSYNCHRONISED
from app.store.tables import Changes


def current_change(session: Session) -> int:
    """Return how many visible changes there have been: one indexed read, the source of every ``ETag``."""
    return session.scalars(select(Changes.value).where(Changes.id == 1)).one()


def next_change(session: Session) -> int:
    """Take the next number. Writers take turns (see ``session``), so numbers are in order of commit.

    A reader that continues after the last number it saw can therefore never miss a change.
    """
    statement = update(Changes).values(value=Changes.value + 1).returning(Changes.value)
    return session.scalars(statement, execution_options=UNSYNCHRONISED).one()
