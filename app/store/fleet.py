"""The register: satellites and their orbits."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

from sqlalchemy import Select, select, update
from sqlalchemy.orm import Session

from app.core.orbit.elements import MeanElements
from app.core.spacecraft.model import Spacecraft
from app.errors import NotFoundError
from app.formats.orbit import elements_from_dict, elements_to_dict
from app.formats.satellite import from_spacecraft, parse_spacecraft
from app.store.changes import next_change
from app.store.clock import Clock, from_unix, utc_now
from app.store.staging import drop_satellite
from app.store.tables import Orbit, Satellite
from app.store.text import canonical_json, read_object


@dataclass(frozen=True)
class SatelliteRecord:
    """A registered satellite, with the change that made it what it is."""

    id: str
    spacecraft: Spacecraft
    change_seq: int
    changed_at: datetime


@dataclass(frozen=True)
class OrbitRecord:
    """An orbit as received. ``change_seq`` counts visible changes of the whole database."""

    satellite_id: str
    elements: MeanElements
    source_format: str
    change_seq: int
    received_at: datetime


@dataclass(frozen=True)
class FleetMember:
    """What a run needs of one satellite; ``elements`` is None while it has no orbit."""

    spacecraft: Spacecraft
    elements: MeanElements | None


def put_satellite(session: Session, spacecraft: Spacecraft, *, clock: Clock = utc_now) -> bool:
    """Register or replace a satellite; return True when it was not registered before.

    The same satellite again changes nothing, not even the change counter.
    """
    body = canonical_json(from_spacecraft(spacecraft))
    row = session.get(Satellite, spacecraft.id)
    created = row is None or row.status == "removed"
    if row is not None and (row.status, row.body) == ("registered", body):
        return False
    change_seq = next_change(session)
    session.merge(
        Satellite(id=spacecraft.id, status="registered", body=body, change_seq=change_seq, changed_at=clock())
    )
    session.flush()
    return created


def get_satellite(session: Session, satellite_id: str) -> SatelliteRecord:
    """Return a registered satellite; ``NotFoundError`` when there is none."""
    return _record(_registered(session, satellite_id))


def was_ever_registered(session: Session, satellite_id: str) -> bool:
    """Say whether there is, or was, a satellite of this id."""
    return session.get(Satellite, satellite_id) is not None


def list_satellites(session: Session, after: str | None = None, limit: int = 100) -> list[SatelliteRecord]:
    """Return registered satellites by id, from the first one after ``after``."""
    statement = select(Satellite).where(Satellite.status == "registered").order_by(Satellite.id).limit(limit)
    if after is not None:
        statement = statement.where(Satellite.id > after)
    return [_record(row) for row in session.scalars(statement)]


def delete_satellite(
    session: Session, satellite_id: str, as_of_unix_s: float, *, clock: Clock = utc_now
) -> None:
    """Take a satellite off the register. Its history stays; advisories that have not ended are withdrawn.

    A run under way drops what it computed for it. Raises ``NotFoundError`` when it is not registered.
    """
    row = _registered(session, satellite_id)
    change_seq, now = next_change(session), clock()
    row.status, row.change_seq, row.changed_at = "removed", change_seq, now
    session.flush()
    _supersede_orbit(session, satellite_id)
    drop_satellite(session, satellite_id, as_of_unix_s, change_seq, now)


def put_orbit(
    session: Session, satellite_id: str, elements: MeanElements, source_format: str, *, clock: Clock = utc_now
) -> bool:
    """Make this the satellite's current orbit; return False when it already was.

    Earlier orbits are kept. Raises ``NotFoundError`` when the satellite is not registered.
    """
    _registered(session, satellite_id)
    body = canonical_json(elements_to_dict(elements))
    current = session.scalars(_current_orbit(satellite_id)).one_or_none()
    if current is not None and current.body == body:
        return False
    _supersede_orbit(session, satellite_id)
    session.add(
        Orbit(
            satellite_id=satellite_id,
            status="current",
            source_format=source_format,
            epoch=from_unix(elements.epoch_unix_s),
            body=body,
            change_seq=next_change(session),
            received_at=clock(),
        )
    )
    session.flush()
    return True


def current_orbit(session: Session, satellite_id: str) -> OrbitRecord:
    """Return the orbit in use. ``NotFoundError`` when the satellite is not registered or has none yet."""
    _registered(session, satellite_id)
    row = session.scalars(_current_orbit(satellite_id)).one_or_none()
    if row is None:
        raise NotFoundError(f"satellite '{satellite_id}' has no orbit yet; give it an OMM or TLE")
    return _orbit_record(row)


def orbit_history(
    session: Session, satellite_id: str, after: int | None = None, limit: int = 100
) -> list[OrbitRecord]:
    """Return a satellite's orbits, also superseded ones, the newest first.

    ``after``: the ``change_seq`` of the last one of the page before. Raises ``NotFoundError`` when the
    satellite is not registered.
    """
    _registered(session, satellite_id)
    statement = select(Orbit).where(Orbit.satellite_id == satellite_id).limit(limit)
    statement = statement.order_by(Orbit.change_seq.desc())
    if after is not None:
        statement = statement.where(Orbit.change_seq < after)
    return [_orbit_record(row) for row in session.scalars(statement)]


def fleet_for_run(session: Session, satellite_ids: Sequence[str]) -> list[FleetMember]:
    """Return those of the satellites that are registered now, by id, each with its current orbit."""
    is_current = (Orbit.satellite_id == Satellite.id) & (Orbit.status == "current")
    statement = (
        select(Satellite.body, Orbit.body)
        .outerjoin(Orbit, is_current)
        .where(Satellite.id.in_(satellite_ids), Satellite.status == "registered")
        .order_by(Satellite.id)
    )
    return [_member(spacecraft, orbit) for spacecraft, orbit in session.execute(statement)]


def _member(spacecraft: str, orbit: str | None) -> FleetMember:
    elements = None if orbit is None else elements_from_dict(read_object(orbit))
    return FleetMember(parse_spacecraft(read_object(spacecraft)), elements)


def _registered(session: Session, satellite_id: str) -> Satellite:
    row = session.get(Satellite, satellite_id)
    if row is None or row.status != "registered":
        raise NotFoundError(f"there is no satellite '{satellite_id}'")
    return row


def _record(row: Satellite) -> SatelliteRecord:
    return SatelliteRecord(row.id, parse_spacecraft(read_object(row.body)), row.change_seq, row.changed_at)


def _current_orbit(satellite_id: str) -> Select[Orbit]:
    return select(Orbit).where(Orbit.satellite_id == satellite_id, Orbit.status == "current")


def _supersede_orbit(session: Session, satellite_id: str) -> None:
    session.execute(
        update(Orbit)
        .where(Orbit.satellite_id == satellite_id, Orbit.status == "current")
        .values(status="superseded")
    )


def _orbit_record(row: Orbit) -> OrbitRecord:
    elements = elements_from_dict(read_object(row.body))
    return OrbitRecord(row.satellite_id, elements, row.source_format, row.change_seq, row.received_at)
