"""The register."""

from __future__ import annotations

from contextlib import suppress
from typing import Annotated

from fastapi import APIRouter, Path, Query
from sqlalchemy.orm import Session
from starlette.responses import Response

from app.api import docs
from app.api.bodies import JsonBody
from app.api.caching import check_preconditions, json_response, reply
from app.api.deps import Asked, AskedNow, existing_id
from app.api.paging import Page, Pager
from app.api.schemas import ItemsPage
from app.errors import NotFoundError
from app.formats.satellite import PARTS, SatelliteIn, from_spacecraft, to_spacecraft
from app.formats.validation import validated
from app.store.fleet import SatelliteRecord, delete_satellite, get_satellite, list_satellites, put_satellite

router = APIRouter(prefix="/v1/satellites", tags=["register"])
SatelliteId = Annotated[str, Path(description="The satellite's id.", examples=["kestrel-1"])]


@router.get(
    "",
    response_model=ItemsPage[SatelliteIn],
    responses=docs.reading("satellites", paged=True),
)
def read_satellites(asked: AskedNow, page: Annotated[Page, Query()]) -> Response:
    """List the registered satellites by id."""
    pager = Pager(asked.request, page, (str,))
    after = pager.after
    with asked.reading() as (session, tag):
        rows = list_satellites(session, str(after[0]) if after else None, pager.fetch)
    shown, headers = pager.cut(rows, lambda row: (row.id,), lambda row: from_spacecraft(row.spacecraft))
    return reply(shown, tag, headers)


@router.get("/{satellite_id}", response_model=SatelliteIn, responses=docs.reading("satellite", 404))
def read_satellite(asked: AskedNow, satellite_id: SatelliteId) -> Response:
    """Return a satellite as ``PUT`` takes it, every default spelt out."""
    with asked.context.store.read() as session:
        record = get_satellite(session, existing_id(satellite_id, "satellite"))
    return reply(from_spacecraft(record.spacecraft), asked.fresh_tag(record.change_seq))


@router.put(
    "/{satellite_id}",
    response_model=SatelliteIn,
    responses={
        201: {"description": "Registered.", "model": SatelliteIn, "content": docs.sample("satellite")},
        **docs.writing("satellite", 200, 409, 412, *docs.BODY_ERRORS, text="Replaced."),
    },
    openapi_extra=docs.body("SatelliteIn", "satellite"),
)
def write_satellite(asked: AskedNow, satellite_id: SatelliteId, document: JsonBody) -> Response:
    """Register or replace a satellite. If-Match and If-None-Match: * are honoured."""
    spacecraft = to_spacecraft(validated(SatelliteIn, document, PARTS), satellite_id)
    with asked.context.store.write() as session:
        check_preconditions(asked.request, current_tag(asked, session, satellite_id))
        created = put_satellite(session, spacecraft, clock=asked.context.wall)
    headers = {"Location": f"/v1/satellites/{spacecraft.id}"} if created else {}
    return json_response(from_spacecraft(spacecraft), 201 if created else 200, headers)


@router.delete("/{satellite_id}", status_code=204, responses=docs.writing(None, 204, 404, 409, 412, 422))
def remove_satellite(asked: AskedNow, satellite_id: SatelliteId) -> Response:
    """Take a satellite off the register; its advisories that have not ended are withdrawn."""
    satellite_id = existing_id(satellite_id, "satellite")
    context = asked.context
    with context.store.write() as session:
        get_satellite(session, satellite_id)
        check_preconditions(asked.request, current_tag(asked, session, satellite_id))
        delete_satellite(session, satellite_id, context.clock(), clock=context.wall)
    return Response(status_code=204)


def current_tag(asked: Asked, session: Session, satellite_id: str) -> str | None:
    """Return the tag that a GET of this satellite gives now; None while it is not registered."""
    record: SatelliteRecord | None = None
    with suppress(NotFoundError):
        record = get_satellite(session, satellite_id)
    return None if record is None else asked.tag(record.change_seq)
