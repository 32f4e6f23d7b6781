"""Read published advisories. Nothing here sees a run that is not published."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime
from typing import Any

from sqlalchemy import Select, select, tuple_
from sqlalchemy.orm import Session

from app.errors import NotFoundError
from app.store.tables import Body, Revision
from app.store.text import read_object


@dataclass(frozen=True)
class AdvisoryRecord:
    """One revision. ``body`` is the whole document, with ``revision``, ``changes`` and today's ``status``."""

    id: str
    revision: int
    status: str  # current, superseded or withdrawn
    satellite: str
    stream: str
    level: str
    change_seq: int
    changed_at: datetime
    body: dict[str, Any]


@dataclass(frozen=True)
class AdvisoryFilter:
    """What a list shall hold; None does not filter. ``changed_since`` is inclusive."""

    satellite: str | None = None
    stream: str | None = None
    level: str | None = None
    status: str | None = None
    changed_since: datetime | None = None


def get_advisory(session: Session, advisory_id: str) -> AdvisoryRecord:
    """Return the latest revision; ``NotFoundError`` when there is no such advisory."""
    statement = _select().where(Revision.advisory_id == advisory_id, Revision.status != "superseded")
    row = session.execute(statement).one_or_none()
    if row is None:
        raise NotFoundError(f"there is no advisory '{advisory_id}'")
    return _record(*row)


def revisions(session: Session, advisory_id: str, after: int = 0, limit: int = 100) -> list[AdvisoryRecord]:
    """Return an advisory's revisions in order, those numbered above ``after``.

    Raises ``NotFoundError`` when there is no such advisory.
    """
    get_advisory(session, advisory_id)
    statement = (
        _select()
        .where(Revision.advisory_id == advisory_id, Revision.revision > after)
        .order_by(Revision.revision)
        .limit(limit)
    )
    return [_record(*row) for row in session.execute(statement)]


def list_advisories(
    session: Session,
    wanted: AdvisoryFilter = AdvisoryFilter(),
    after: tuple[int, str] | None = None,
    limit: int = 100,
) -> list[AdvisoryRecord]:
    """Return the latest revision of each advisory, in the order in which they changed.

    ``after``: (change_seq, id) of the last one of the page before. An advisory that changes between two
    pages moves to the end, so that reading on never misses a change.
    """
    order = (Revision.change_seq, Revision.advisory_id)
    statement = _filtered(wanted).where(Revision.status != "superseded").order_by(*order).limit(limit)
    if after is not None:
        statement = statement.where(tuple_(*order) > tuple_(*after))
    return [_record(*row) for row in session.execute(statement)]


def _filtered(wanted: AdvisoryFilter) -> Select[Revision, str]:
    statement = _select()
    equal = (
        (Revision.satellite_id, wanted.satellite),
        (Revision.stream, wanted.stream),
        (Revision.level, wanted.level),
        (Revision.status, wanted.status),
    )
    for column, value in equal:
        if value is not None:
            statement = statement.where(column == value)
    if wanted.changed_since is not None:
        # Later changes have later times, so that the first one tells where to start reading. By the time alone,
        # a poll that finds nothing would walk through everything.
        since = (Revision.status != "superseded") & (Revision.changed_at >= wanted.changed_since)
        by_time = Revision.changed_at, Revision.change_seq
        first = select(Revision.change_seq).where(since).order_by(*by_time).limit(1).scalar_subquery()
        statement = statement.where(Revision.change_seq >= first)
    return statement


def _select() -> Select[Revision, str]:
    same = (Body.advisory_id == Revision.advisory_id) & (Body.revision == Revision.revision)
    return select(Revision, Body.body).join(Body, same)


def _record(row: Revision, body: str) -> AdvisoryRecord:
    return AdvisoryRecord(
        id=row.advisory_id,
        revision=row.revision,
        status=row.status,
        satellite=row.satellite_id,
        stream=row.stream,
        level=row.level,
        change_seq=row.change_seq,
        changed_at=row.changed_at,
        body={**read_object(body), "status": row.status},
    )
