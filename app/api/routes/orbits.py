"""Orbits: any format in, an OMM out."""

from __future__ import annotations

import re
from collections.abc import Sequence
from contextlib import suppress
from typing import Any

from fastapi import APIRouter
from sqlalchemy.orm import Session
from starlette.responses import Response

from app.api import docs, examples
from app.api.bodies import SOURCE, RawBody, content_type
from app.api.caching import check_preconditions, json_response, reply
from app.api.deps import Asked, AskedNow, existing_id
from app.api.problems import UnsupportedMediaTypeError
from app.api.routes.satellites import SatelliteId
from app.api.schemas import OrbitOut
from app.api.times import unix_text, utc_text
from app.core.orbit.elements import SECONDS_PER_DAY, MeanElements
from app.errors import FileError, NotFoundError
from app.formats.omm import sniff
from app.formats.orbit import NOTATIONS, omm_object, read_orbits
from app.formats.satellite_schema import ID_PATTERN
from app.formats.text import decode
from app.store.fleet import OrbitRecord, current_orbit, get_satellite, put_orbit

router = APIRouter(prefix="/v1/satellites", tags=["register"])
OMM_SCHEMA = {"$ref": docs.TEMPLATE.format(model="Omm")}
TEXT_SCHEMA = {"type": "string"}
BODY = {
    "requestBody": {
        "required": True,
        "description": "Exactly one element set. text/plain is looked at: OMM in KVN, or a two-line element set.",
        "content": {
            "application/json": {"schema": OMM_SCHEMA, docs.EXAMPLE: "omm"},
            "application/xml": {"schema": TEXT_SCHEMA, "example": examples.OMM_XML},
            "text/csv": {"schema": TEXT_SCHEMA, "example": examples.OMM_CSV},
            "text/plain": {"schema": TEXT_SCHEMA, "example": examples.OMM_KVN},
        },
    }
}
TYPE_PLACE = "content type"  # where ``read_orbits`` refuses a media type


@router.get("/{satellite_id}/orbit", response_model=OrbitOut, responses=docs.reading("orbit", 404))
def read_orbit(asked: AskedNow, satellite_id: SatelliteId) -> Response:
    """Return the orbit in use as an OMM, with its epoch, and its age at the last full hour."""
    with asked.context.store.read() as session:
        record = current_orbit(session, existing_id(satellite_id, "satellite"))
    hour_unix_s = asked.context.hour_unix_s()
    return reply(_shown(record, hour_unix_s), asked.fresh_tag(record.change_seq, hour_unix_s))


@router.put(
    "/{satellite_id}/orbit",
    response_model=OrbitOut,
    responses=docs.writing("orbit", 200, 404, 409, 412, *docs.BODY_ERRORS, text="This orbit is in use."),
    openapi_extra=BODY,
)
def write_orbit(asked: AskedNow, satellite_id: SatelliteId, data: RawBody) -> Response:
    """Give the satellite its newest orbit. Earlier ones are kept."""
    elements = _one(data, content_type(asked.request))
    source_format = _format(data, content_type(asked.request))
    satellite_id = existing_id(satellite_id, "satellite")
    hour_unix_s = asked.context.hour_unix_s()
    with asked.context.store.write() as session:
        check_preconditions(asked.request, _current_tag(asked, session, satellite_id, hour_unix_s))
        _check_owner(session, satellite_id, elements)
        notes = _notes(session, satellite_id, elements)
        put_orbit(session, satellite_id, elements, source_format, clock=asked.context.wall)
        record = current_orbit(session, satellite_id)
    return json_response(_shown(record, hour_unix_s, notes))


def _check_owner(session: Session, satellite_id: str, elements: MeanElements) -> None:
    """Refuse a set that names another registered satellite: it was sent to the wrong address."""
    for keyword, text in (("OBJECT_NAME", elements.object_name), ("OBJECT_ID", elements.object_id)):
        other = text.casefold()
        if other == satellite_id or not re.fullmatch(ID_PATTERN, other):
            continue
        with suppress(NotFoundError):
            get_satellite(session, other)
            raise FileError(
                SOURCE, keyword, f"is '{text}': that is satellite '{other}', not '{satellite_id}'"
            )


def _notes(session: Session, satellite_id: str, elements: MeanElements) -> list[str]:
    """What to look at twice before trusting the new orbit."""
    with suppress(NotFoundError):
        before = current_orbit(session, satellite_id).elements
        if elements.epoch_unix_s < before.epoch_unix_s:
            former = unix_text(before.epoch_unix_s)
            return [
                f"This orbit is older than the one it replaces, of {former}; send that one again to go back."
            ]
    return []


def _one(data: bytes, media_type: str | None) -> MeanElements:
    found = read_orbits(data, SOURCE, media_type)
    for each in found:
        if isinstance(each, FileError):
            raise (
                UnsupportedMediaTypeError(f"Content-Type {each.problem}")
                if each.where == TYPE_PLACE
                else each
            )
    sets = [each for each in found if isinstance(each, MeanElements)]
    if len(sets) != 1:
        raise FileError(SOURCE, "file", f"holds {len(sets)} element sets; send exactly one")
    return sets[0]


def _format(data: bytes, media_type: str | None) -> str:
    essence = (media_type or "").partition(";")[0].strip().lower()
    named = NOTATIONS.get(essence) or essence.rpartition("+")[2] if essence else None
    kind = named if named in ("json", "xml", "csv") else sniff(decode(data, SOURCE))
    return f"omm-{kind}" if kind else "tle"


def _shown(record: OrbitRecord, hour_unix_s: float, notes: Sequence[str] = ()) -> dict[str, Any]:
    epoch_unix_s = record.elements.epoch_unix_s
    return {
        "satellite": record.satellite_id,
        "source_format": record.source_format,
        "received_at": utc_text(record.received_at),
        "epoch": unix_text(epoch_unix_s),
        "age_days": round((hour_unix_s - epoch_unix_s) / SECONDS_PER_DAY, 3),
        "as_of": unix_text(hour_unix_s),
        "omm": omm_object(record.elements),
        "notes": list(notes),
    }


def _current_tag(asked: Asked, session: Session, satellite_id: str, hour_unix_s: float) -> str | None:
    record: OrbitRecord | None = None
    with suppress(NotFoundError):
        record = current_orbit(session, satellite_id)
    return None if record is None else asked.tag(record.change_seq, hour_unix_s)
