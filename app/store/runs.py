"""Runs: asked for, started by one process at a time, kept alive by a heartbeat, published or failed."""

from __future__ import annotations

import secrets
from collections.abc import Sequence
from dataclasses import dataclass, fields
from datetime import datetime
from enum import StrEnum

from sqlalchemy import Select, delete, func, insert, literal, select, update
from sqlalchemy.orm import Session

from app.errors import ConflictError, NotFoundError
from app.store.changes import next_change
from app.store.clock import Clock, from_unix, utc_now
from app.store.session import UNSYNCHRONISED, Store
from app.store.tables import Body, Run, RunSatellite, Satellite
from app.store.text import canonical_json, read_list

LEASE_S = 120.0  # a run without a sign of life for longer is taken to be dead
SHOWN_IDS = 5


class RunState(StrEnum):
    """Where a run stands."""

    QUEUED = "queued"  # asked for; nobody computes it yet
    RUNNING = "running"  # one process computes it; nothing of it is visible
    PUBLISHED = "published"  # all of it became visible at once
    FAILED = "failed"  # nothing of it became visible; the reason says why


@dataclass(frozen=True)
class RunRecord:
    """One run. Counts are of satellites, ``revisions_new`` of advisory revisions it published."""

    id: str
    state: RunState
    as_of: datetime
    requested_at: datetime
    started_at: datetime | None
    finished_at: datetime | None
    heartbeat_at: datetime | None
    satellites_total: int
    satellites_done: int
    computed: int
    failed: int
    revisions_new: int
    reason: str | None
    requested_seq: int
    change_seq: int

    @property
    def as_of_unix_s(self) -> float:
        """The instant the run computes for, POSIX seconds."""
        return self.as_of.timestamp()


@dataclass(frozen=True)
class RunSatelliteRecord:
    """What became of one satellite: ``pending``, ``computed``, or ``failed`` with the reason."""

    satellite_id: str
    state: str
    reason: str | None


def queue_run(
    session: Session,
    as_of_unix_s: float,
    satellite_ids: Sequence[str] | None = None,
    *,
    clock: Clock = utc_now,
) -> str:
    """Ask for a run of these satellites (None: all) and return its id.

    Raises ``NotFoundError`` naming satellites that are not registered.
    """
    return _new_run(session, as_of_unix_s, satellite_ids, clock()).id


def start_run(
    store: Store,
    as_of_unix_s: float,
    satellite_ids: Sequence[str] | None = None,
    *,
    clock: Clock = utc_now,
    lease_s: float = LEASE_S,
) -> RunRecord:
    """Start a run at once, taking over from a dead one.

    Raises ``ConflictError`` when another run is running, ``NotFoundError`` for unknown satellites.
    """
    with store.write() as session:
        now = clock()
        holder = _live_holder(session, now, lease_s)
        if holder is not None:
            raise ConflictError(_busy(holder, now, lease_s))
        return _start(session, _new_run(session, as_of_unix_s, satellite_ids, now), now)


def claim_queued(store: Store, *, clock: Clock = utc_now, lease_s: float = LEASE_S) -> RunRecord | None:
    """Start the run that was asked for first; None when none waits or another one is running."""
    with store.read() as session:
        if _first_queued(session) is None:
            return None
    with store.write() as session:
        now = clock()
        row = _first_queued(session)
        if row is None or _live_holder(session, now, lease_s) is not None:
            return None
        return _start(session, row, now)


def heartbeat(store: Store, run_id: str, *, clock: Clock = utc_now) -> bool:
    """Show that the run is alive; False when it is not running any more.

    It is no visible change: the change counter stays.
    """
    with store.write() as session:
        statement = (
            update(Run)
            .where(Run.id == run_id, Run.state == "running")
            .values(heartbeat_at=clock())
            .returning(Run.id)
        )
        return session.scalar(statement, execution_options=UNSYNCHRONISED) is not None


def fail_run(store: Store, run_id: str, reason: str, *, clock: Clock = utc_now) -> None:
    """End a queued or running run without publishing anything, and drop what it staged."""
    with store.write() as session:
        row = _run(session, run_id)
        if row.state in ("queued", "running"):
            _fail(session, row, reason, clock())


def get_run(session: Session, run_id: str) -> RunRecord:
    """Return one run; ``NotFoundError`` when there is none."""
    return _record(_run(session, run_id))


def list_runs(session: Session, after: int | None = None, limit: int = 100) -> list[RunRecord]:
    """Return runs, the one asked for last first; ``after`` is the ``requested_seq`` to continue below."""
    statement = select(Run).order_by(Run.requested_seq.desc()).limit(limit)
    if after is not None:
        statement = statement.where(Run.requested_seq < after)
    return [_record(row) for row in session.scalars(statement)]


def latest_published(session: Session) -> RunRecord | None:
    """Return the run that was published last, None before the first."""
    statement = select(Run).where(Run.state == "published").order_by(Run.change_seq.desc()).limit(1)
    row = session.scalars(statement).one_or_none()
    return None if row is None else _record(row)


def run_satellites(
    session: Session, run_id: str, after: str | None = None, limit: int = 100, state: str | None = None
) -> list[RunSatelliteRecord]:
    """Return a run's satellites by id, those after ``after``, only those in ``state`` if given."""
    statement = (
        select(RunSatellite)
        .where(RunSatellite.run_id == run_id)
        .order_by(RunSatellite.satellite_id)
        .limit(limit)
    )
    if after is not None:
        statement = statement.where(RunSatellite.satellite_id > after)
    if state is not None:
        statement = statement.where(RunSatellite.state == state)
    return [RunSatelliteRecord(r.satellite_id, r.state, r.reason) for r in session.scalars(statement)]


def _new_run(
    session: Session, as_of_unix_s: float, satellite_ids: Sequence[str] | None, now: datetime
) -> Run:
    selection = None if satellite_ids is None else sorted(set(satellite_ids))
    _require_registered(session, selection or ())
    as_of, change_seq = from_unix(as_of_unix_s), next_change(session)
    row = Run(
        id=f"run-{as_of:%Y%m%dT%H%M%SZ}-{secrets.token_hex(4)}",
        requested_seq=change_seq,
        change_seq=change_seq,
        state="queued",
        as_of=as_of,
        selection=None if selection is None else canonical_json(selection),
        requested_at=now,
    )
    session.add(row)
    session.flush()
    return row


def _require_registered(session: Session, ids: Sequence[str]) -> None:
    known = set(session.scalars(_registered().where(Satellite.id.in_(ids)))) if ids else set()
    unknown = [satellite_id for satellite_id in ids if satellite_id not in known]
    if unknown:
        more = f" and {len(unknown) - SHOWN_IDS} more" if len(unknown) > SHOWN_IDS else ""
        raise NotFoundError(f"there is no satellite {', '.join(map(repr, unknown[:SHOWN_IDS]))}{more}")


def _start(session: Session, row: Run, now: datetime) -> RunRecord:
    row.change_seq = next_change(session)
    row.state, row.started_at, row.heartbeat_at = "running", now, now
    session.flush()
    members = select(literal(row.id), Satellite.id, literal("pending")).where(
        Satellite.status == "registered"
    )
    if row.selection is not None:
        members = members.where(Satellite.id.in_(read_list(row.selection)))
    session.execute(insert(RunSatellite).from_select(["run_id", "satellite_id", "state"], members))
    rows = select(func.count()).where(RunSatellite.run_id == row.id)
    row.satellites_total = session.scalars(rows).one()
    session.flush()
    return _record(row)


def _fail(session: Session, row: Run, reason: str, now: datetime) -> None:
    row.change_seq = next_change(session)
    row.state, row.reason, row.finished_at = "failed", reason, now
    session.flush()
    # Bodies of a run that was never published are only referred to by its staged rows, which go with them.
    session.execute(delete(Body).where(Body.run_id == row.id), execution_options=UNSYNCHRONISED)


def _live_holder(session: Session, now: datetime, lease_s: float) -> Run | None:
    """Return the running run, or fail it when its process has died and return None."""
    row = session.scalars(select(Run).where(Run.state == "running")).one_or_none()
    if row is None or _silent_s(row, now) <= lease_s:
        return row
    _fail(session, row, f"its process gave no sign of life for {_silent_s(row, now):.0f} s", now)
    return None


def _silent_s(row: Run, now: datetime) -> float:
    return (now - (row.heartbeat_at or now)).total_seconds()


def _busy(row: Run, now: datetime, lease_s: float) -> str:
    wait_s = lease_s - _silent_s(row, now)
    return (
        f"run {row.id} is under way ({row.satellites_done} of {row.satellites_total} satellites); "
        f"wait for it. If its process has died, the next run takes over in {max(wait_s, 0.0):.0f} s"
    )


def _first_queued(session: Session) -> Run | None:
    statement = select(Run).where(Run.state == "queued").order_by(Run.requested_seq).limit(1)
    return session.scalars(statement).one_or_none()


def _registered() -> Select[str]:
    return select(Satellite.id).where(Satellite.status == "registered")


def _run(session: Session, run_id: str) -> Run:
    row = session.get(Run, run_id)
    if row is None:
        raise NotFoundError(f"there is no run '{run_id}'")
    return row


def _record(row: Run) -> RunRecord:
    values = {each.name: getattr(row, each.name) for each in fields(RunRecord)}
    return RunRecord(**{**values, "state": RunState(row.state)})
