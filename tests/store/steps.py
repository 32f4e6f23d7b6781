"""Steps that tests of the store share: a register, whole runs, and everything a reader can see."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import UTC, datetime, timedelta
from typing import Any

from sqlalchemy import func, select

from app.jobs.chunk import failed
from app.pipeline import SatelliteResult
from app.store.advisories import list_advisories
from app.store.fleet import put_orbit, put_satellite
from app.store.runs import RunRecord, start_run
from app.store.session import Store
from app.store.staging import publish, stage
from app.store.tables import Body, Revision, Staged
from tests.samples import AS_OF_UNIX_S, elements, spacecraft


class Wall:
    """A wall clock that moves when told to."""

    def __init__(self) -> None:
        self.now = datetime(2026, 8, 10, 6, 0, tzinfo=UTC)

    def __call__(self) -> datetime:
        return self.now

    def wait_s(self, seconds: float) -> None:
        self.now += timedelta(seconds=seconds)


def register(store: Store, *satellite_ids: str) -> None:
    with store.write() as session:
        for satellite_id in satellite_ids:
            put_satellite(session, spacecraft(satellite_id))
            put_orbit(session, satellite_id, elements(), "tle")


def computed(satellite_id: str, *bodies: dict[str, Any]) -> SatelliteResult:
    return SatelliteResult(satellite_id, "computed", None, bodies)


def whole_run(
    store: Store, *results: SatelliteResult, as_of_unix_s: float = AS_OF_UNIX_S, **more: Any
) -> RunRecord:
    """Publish a run over the satellites of these results."""
    run = start_run(store, as_of_unix_s, [result.satellite_id for result in results], **more)
    stage(store, run, results)
    return publish(store, run, **more)


def visible(store: Store) -> list[tuple[str, int, str, str]]:
    """Id, revision, status and level of every advisory's latest revision, by id."""
    with store.read() as session:
        records = list_advisories(session, limit=10_000)
    return sorted((each.id, each.revision, each.status, each.level) for each in records)


def row_counts(store: Store) -> dict[str, int]:
    with store.read() as session:
        return {
            table.__tablename__: session.scalars(select(func.count()).select_from(table)).one()
            for table in (Body, Staged, Revision)
        }


def broken(satellite_ids: Sequence[str]) -> list[SatelliteResult]:
    return [failed(each, "its orbit has decayed") for each in satellite_ids]
