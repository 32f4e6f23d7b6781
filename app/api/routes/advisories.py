"""Advisories and their revisions."""

from __future__ import annotations

from datetime import datetime
from typing import Annotated

from fastapi import APIRouter, Path, Query
from pydantic import Field
from sqlalchemy.orm import Session
from starlette.responses import Response

from app.api import docs
from app.api.caching import reply
from app.api.deps import Asked, AskedNow, existing_id
from app.api.paging import Page, Pager
from app.api.queries import Instant
from app.api.schemas import Advisory, ItemsPage, Level, Status
from app.core.sky.times import parse_utc
from app.errors import FieldError
from app.formats.text import shown
from app.store.advisories import AdvisoryFilter, AdvisoryRecord, get_advisory, list_advisories, revisions
from app.store.clock import from_unix
from app.store.fleet import was_ever_registered

router = APIRouter(prefix="/v1/advisories", tags=["advisories"])
AdvisoryId = Annotated[str, Path(description="Passage and satellite.", examples=["PER-2026.kestrel-1"])]
PLAIN = r"^[\x21-\x7e]{1,200}$"  # what an id may hold


class AdvisoryQuery(Page):
    """Filters; those not given do not filter."""

    satellite: str | None = Field(default=None, pattern=PLAIN, description="Of this satellite.")
    stream: str | None = Field(default=None, pattern=PLAIN, description="Of this stream's code.")
    level: Level | None = Field(default=None, description="At this level.")
    status: Status | None = Field(default=None, description="`current` or `withdrawn`.")
    changed_since: Instant | None = Field(default=None, description="Changed at this instant or later.")

    @property
    def wanted(self) -> AdvisoryFilter:
        return AdvisoryFilter(self.satellite, self.stream, self.level, self.status, self._since)

    @property
    def _since(self) -> datetime | None:
        since = self.changed_since
        return None if since is None else from_unix(parse_utc(since, "changed_since"))


@router.get(
    "",
    response_model=ItemsPage[Advisory],
    responses=docs.reading("advisories", paged=True),
)
def read_advisories(asked: AskedNow, query: Annotated[AdvisoryQuery, Query()]) -> Response:
    """List the latest revision of each advisory, in the order in which they changed."""
    pager = Pager(asked.request, query, (int, str))
    after, wanted = pager.after, query.wanted
    with asked.reading() as (session, tag):
        _check_names(asked, session, query)
        key = (int(after[0]), str(after[1])) if after else None
        rows = list_advisories(session, wanted, key, pager.fetch)
    shown, headers = pager.cut(rows, lambda row: (row.change_seq, row.id), _body)
    return reply(shown, tag, headers)


@router.get("/{advisory_id}", response_model=Advisory, responses=docs.reading("advisory", 404))
def read_advisory(asked: AskedNow, advisory_id: AdvisoryId) -> Response:
    """Return an advisory's latest revision."""
    with asked.reading() as (session, tag):
        record = get_advisory(session, existing_id(advisory_id, "advisory"))
    return reply(record.body, tag)


@router.get(
    "/{advisory_id}/revisions",
    response_model=ItemsPage[Advisory],
    responses=docs.reading("advisories", 404, paged=True),
)
def read_revisions(asked: AskedNow, advisory_id: AdvisoryId, page: Annotated[Page, Query()]) -> Response:
    """List an advisory's revisions, the first one first."""
    pager = Pager(asked.request, page, (int,))
    after = pager.after
    with asked.reading() as (session, tag):
        number = int(after[0]) if after else 0
        rows = revisions(session, existing_id(advisory_id, "advisory"), number, pager.fetch)
    shown, headers = pager.cut(rows, lambda row: (row.revision,), _body)
    return reply(shown, tag, headers)


def _check_names(asked: Asked, session: Session, query: AdvisoryQuery) -> None:
    """Refuse a name nobody bears: an empty list would look as if all were clear."""
    if query.satellite is not None and not was_ever_registered(session, query.satellite):
        raise FieldError(
            "satellite", f"there is no satellite {shown(query.satellite)}; GET /v1/satellites lists them"
        )
    codes = {entry.code for entry in asked.context.catalogue.entries}
    if query.stream is not None and query.stream not in codes:
        raise FieldError(
            "stream", f"there is no stream {shown(query.stream)}; GET /v1/streams lists the codes"
        )


def _body(record: AdvisoryRecord) -> dict[str, object]:
    return record.body
