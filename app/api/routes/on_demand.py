"""Series of enhancement factors and lee windows, computed when asked for by the functions of a run."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Any, Literal

from fastapi import APIRouter, Query
from pydantic import Field
from starlette.responses import Response

from app.api import docs, series
from app.api.caching import reply
from app.api.deps import SOFTWARE, Asked, AskedNow, existing_id
from app.api.problems import NotOfferedError
from app.api.queries import Span
from app.api.routes.satellites import SatelliteId
from app.api.schemas import Enhancement, Windows
from app.api.times import unix_text
from app.core.advice.advisory import CAUTION
from app.errors import NotFoundError, OrbitError
from app.pipeline import Registered
from app.store.fleet import OrbitRecord, SatelliteRecord, current_orbit, get_satellite

router = APIRouter(prefix="/v1/satellites", tags=["on demand"])


class EnhancementQuery(Span):
    """What series to compute, and which part of it to show."""

    step_s: int = Field(default=60, ge=1, le=86_400, description="Seconds between samples.")
    criterion: str | None = Field(default=None, max_length=64, description="Only this criterion's label.")
    face: str | None = Field(default=None, max_length=64, description="Only this face.")


class WindowsQuery(Span):
    """Which windows to compute. ``attitude`` is not offered yet."""

    kind: Literal["lee", "attitude"] = Field(description="`lee`: the Earth hides every stream that matters.")


@dataclass(frozen=True)
class Subject:
    """A satellite with the orbit in use, as they are in the database now."""

    satellite: SatelliteRecord
    orbit: OrbitRecord

    @property
    def registered(self) -> Registered:
        return Registered(self.satellite.spacecraft, self.orbit.elements)


@router.get(
    "/{satellite_id}/enhancement",
    response_model=Enhancement,
    responses=docs.reading("enhancement", 404, 409),
)
def read_enhancement(
    asked: AskedNow, satellite_id: SatelliteId, query: Annotated[EnhancementQuery, Query()]
) -> Response:
    """Enhancement factors over time, per face and criterion, and what each stream adds."""
    subject, tag = _subject(asked, satellite_id)
    start, end = query.unix_s
    spacecraft = subject.satellite.spacecraft
    chosen = series.Chosen.checked(spacecraft, query.face, query.criterion)
    series.check_size(spacecraft, (end - start) / query.step_s)
    computed = asked.context.computations.series(
        asked.context.inputs(), subject.registered, start, end, float(query.step_s)
    )
    shown = series.shown(computed, chosen)
    return reply({"satellite": satellite_id, **shown, **_origin(asked, subject)}, tag)


@router.get("/{satellite_id}/windows", response_model=Windows, responses=docs.reading("windows", 404, 409))
def read_windows(
    asked: AskedNow, satellite_id: SatelliteId, query: Annotated[WindowsQuery, Query()]
) -> Response:
    """Windows that overlap the interval, each given whole."""
    if query.kind == "attitude":
        raise NotOfferedError("kind", "'attitude' is not yet offered; ask for 'lee'")
    subject, tag = _subject(asked, satellite_id)
    start, end = query.unix_s
    windows = asked.context.computations.lee_windows(asked.context.inputs(), subject.registered, start, end)
    return reply(
        {"satellite": satellite_id, "kind": "lee", "windows": windows, **_origin(asked, subject)}, tag
    )


def _subject(asked: Asked, satellite_id: str) -> tuple[Subject, str]:
    """Read satellite and orbit; the tag of what is computed from them follows from their change numbers."""
    with asked.context.store.read() as session:
        satellite = get_satellite(session, existing_id(satellite_id, "satellite"))
        try:
            orbit = current_orbit(session, satellite_id)
        except NotFoundError as missing:
            raise OrbitError(missing.detail) from None
    return Subject(satellite, orbit), asked.fresh_tag(satellite.change_seq, orbit.change_seq)


def _origin(asked: Asked, subject: Subject) -> dict[str, Any]:
    provenance = {
        "software": SOFTWARE,
        "catalogue_digest": asked.context.catalogue.digest,
        "mass_law": asked.context.settings.mass_law,
        "orbit_epoch": unix_text(subject.orbit.elements.epoch_unix_s),
        "orbit_source_format": subject.orbit.source_format,
    }
    return {"provenance": provenance, "caution": CAUTION}
