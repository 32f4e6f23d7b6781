"""How fresh what is published is."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime

from sqlalchemy import func, select
from sqlalchemy.orm import Session

from app.store.runs import latest_published
from app.store.tables import Satellite


@dataclass(frozen=True)
class Freshness:
    """The run published last, and how many of its satellites failed.

    ``waiting_since``: while there is none, when the first satellite was given.
    """

    run_id: str | None
    failed: int
    published_at: datetime | None
    waiting_since: datetime | None


def freshness(session: Session) -> Freshness:
    """Look at the run published last; before the first, at how long satellites have been waiting for it."""
    run = latest_published(session)
    if run is not None:
        return Freshness(run.id, run.failed, run.finished_at, None)
    first = select(func.min(Satellite.changed_at)).where(Satellite.status == "registered")
    return Freshness(None, 0, None, session.scalars(first).one())
