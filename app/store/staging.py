"""From results to published revisions.

While a run computes, each chunk's new revisions are staged: written, but in a table no reader looks at. To
publish is then one short transaction that moves the small rows over; the bodies stay where they are. A run
that dies leaves staged rows only, which the next run throws away.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from datetime import datetime
from typing import Any, Protocol

from sqlalchemy import delete, func, insert, literal, or_, select, update
from sqlalchemy.orm import Session

from app.core.sky.times import parse_utc
from app.errors import ConflictError
from app.store.changes import next_change
from app.store.clock import Clock, from_unix, utc_now
from app.store.drafts import REMOVED, Draft, Head, drafts, withdrawals
from app.store.runs import RunRecord, get_run
from app.store.session import UNSYNCHRONISED, Store
from app.store.tables import REVISION_COLUMNS, Body, Revision, Run, RunSatellite, Staged
from app.store.text import canonical_json, read_object

REMOVED_MEANWHILE = "removed from the register during the run"


class Result(Protocol):
    """What became of one satellite; ``advisories`` are JSON objects as the core makes them."""

    @property
    def satellite_id(self) -> str: ...
    @property
    def state(self) -> str: ...
    @property
    def reason(self) -> str | None: ...
    @property
    def advisories(self) -> Sequence[dict[str, Any]]: ...


def stage(
    store: Store, run: RunRecord, results: Sequence[Result], *, looked_until_unix_s: float = math.inf
) -> RunRecord:
    """Write one chunk's new revisions under the run, invisible, and return the run with its progress.

    ``looked_until_unix_s``: advisories that begin later were not looked for, and stay as they are.
    Raises ``ConflictError`` when the run is no longer running (another one took over).
    """
    span = run.as_of_unix_s, looked_until_unix_s
    with store.read() as session:
        prepared = [(result, _drafts(session, result, *span)) for result in results]
    with store.write() as session:
        # First of all: what was prepared for a run that lost its place may collide with its successor's.
        _require_running(session, run.id)
        for result, revisions in prepared:
            if _settle(session, run.id, result):
                _insert(session, Staged, result.satellite_id, run.id, revisions)
        row = session.get_one(Run, run.id)
        row.satellites_done = _count(session, run.id, "computed", "failed")
        session.flush()
        return get_run(session, run.id)


def publish(store: Store, run: RunRecord, *, clock: Clock = utc_now) -> RunRecord:
    """Make everything the run staged visible, in one transaction.

    Raises ``ConflictError`` when the run is no longer running.
    """
    with store.write() as session:
        if _count(session, run.id, "pending"):
            raise RuntimeError(f"run {run.id} was to be published before all its satellites were computed")
        now = clock()
        change_seq = _require_running(
            session,
            run.id,
            state="published",
            finished_at=now,
            computed=_count(session, run.id, "computed"),
            failed=_count(session, run.id, "failed"),
            revisions_new=_staged_count(session, run.id),
        )
        _move(session, run.id, change_seq, _after_all_others(session, now))
        return get_run(session, run.id)


def drop_satellite(
    session: Session, satellite_id: str, as_of_unix_s: float, change_seq: int, now: datetime
) -> None:
    """Withdraw a removed satellite's advisories, and make a run under way forget it."""
    session.execute(
        update(RunSatellite)
        .where(RunSatellite.satellite_id == satellite_id, RunSatellite.run_id.in_(_running()))
        .values(state="failed", reason=REMOVED_MEANWHILE)
    )
    staged = select(Staged.revision).where(
        Staged.satellite_id == satellite_id,
        Staged.advisory_id == Body.advisory_id,
        Staged.revision == Body.revision,
    )
    session.execute(delete(Body).where(staged.exists()), execution_options=UNSYNCHRONISED)
    heads = [head for _, head in _heads(session, satellite_id, as_of_unix_s, [])]
    revisions = withdrawals(heads, as_of_unix_s, REMOVED)
    _supersede(session, [draft.advisory_id for draft in revisions])
    extra = {"change_seq": change_seq, "changed_at": _after_all_others(session, now)}
    _insert(session, Revision, satellite_id, None, revisions, extra)


def _running() -> Any:
    return select(Run.id).where(Run.state == "running")


def _drafts(session: Session, result: Result, as_of_unix_s: float, looked_until_unix_s: float) -> list[Draft]:
    if result.state != "computed":
        return []
    ids = [body["id"] for body in result.advisories]
    heads = dict(_heads(session, result.satellite_id, as_of_unix_s, ids))
    return drafts(heads, result.advisories, as_of_unix_s, looked_until_unix_s)


def _heads(
    session: Session, satellite_id: str, as_of_unix_s: float, ids: Sequence[str]
) -> Iterable[tuple[str, Head]]:
    """The latest revisions a run may touch: those it produced, and those that have not ended."""
    statement = (
        select(Revision.advisory_id, Revision.revision, Revision.status, Body.body)
        .join(Body, (Body.advisory_id == Revision.advisory_id) & (Body.revision == Revision.revision))
        .where(Revision.satellite_id == satellite_id, Revision.status != "superseded")
        .where(or_(Revision.ends_at > from_unix(as_of_unix_s), Revision.advisory_id.in_(ids)))
        .order_by(Revision.advisory_id)
    )
    for advisory_id, number, status, body in session.execute(statement):
        yield advisory_id, Head(number, status, read_object(body))


def _settle(session: Session, run_id: str, result: Result) -> bool:
    """Note what became of the satellite; False when it was removed meanwhile, or never belonged."""
    statement = (
        update(RunSatellite)
        .where(RunSatellite.run_id == run_id, RunSatellite.satellite_id == result.satellite_id)
        .where(RunSatellite.state == "pending")
        .values(state=result.state, reason=result.reason)
        .returning(RunSatellite.satellite_id)
    )
    return session.scalar(statement, execution_options=UNSYNCHRONISED) is not None


def _insert(
    session: Session,
    table: type[Staged] | type[Revision],
    satellite_id: str,
    run_id: str | None,
    revisions: Sequence[Draft],
    extra: dict[str, Any] | None = None,
) -> None:
    if not revisions:
        return
    keys = [{"advisory_id": d.advisory_id, "revision": d.revision, "run_id": run_id} for d in revisions]
    session.execute(
        insert(Body), [{**k, "body": canonical_json(d.body)} for k, d in zip(keys, revisions, strict=True)]
    )
    owner = {"satellite_id": satellite_id, **(extra or {})}
    session.execute(
        insert(table), [{**k, **owner, **_columns(d)} for k, d in zip(keys, revisions, strict=True)]
    )


def _columns(draft: Draft) -> dict[str, Any]:
    columns = {name: draft.body[name] for name in ("stream", "passage", "level", "depth")}
    ends_at = from_unix(parse_utc(draft.body["end"], "end"))
    return {**columns, "status": draft.status, "ends_at": ends_at}


def _require_running(session: Session, run_id: str, **values: Any) -> int:
    change_seq = next_change(session)
    statement = (
        update(Run)
        .where(Run.id == run_id, Run.state == "running")
        .values(change_seq=change_seq, **values)
        .returning(Run.id)
    )
    if session.scalar(statement, execution_options=UNSYNCHRONISED) is None:
        raise ConflictError(f"run {run_id} is not running any more; another one took over")
    return change_seq


def _count(session: Session, run_id: str, *states: str) -> int:
    rows = select(func.count()).where(RunSatellite.run_id == run_id, RunSatellite.state.in_(states))
    return session.scalars(rows).one()


def _staged_count(session: Session, run_id: str) -> int:
    return session.scalars(select(func.count()).where(Staged.run_id == run_id)).one()


def _move(session: Session, run_id: str, change_seq: int, now: datetime) -> None:
    _supersede(session, select(Staged.advisory_id).where(Staged.run_id == run_id))
    columns = [getattr(Staged, name) for name in REVISION_COLUMNS]
    marks = [literal(change_seq, Revision.change_seq.type), literal(now, Revision.changed_at.type)]
    rows = select(*columns, *marks).where(Staged.run_id == run_id)
    session.execute(insert(Revision).from_select([*REVISION_COLUMNS, "change_seq", "changed_at"], rows))
    session.execute(delete(Staged).where(Staged.run_id == run_id), execution_options=UNSYNCHRONISED)


def _after_all_others(session: Session, now: datetime) -> datetime:
    """Never date a change before an earlier one, even if the clock was set back: a poll would miss it."""
    latest = session.scalar(select(func.max(Revision.changed_at)).where(Revision.status != "superseded"))
    return now if latest is None else max(now, latest)


def _supersede(session: Session, advisory_ids: Any) -> None:
    session.execute(
        update(Revision)
        .where(Revision.advisory_id.in_(advisory_ids), Revision.status != "superseded")
        .values(status="superseded"),
        execution_options=UNSYNCHRONISED,
    )
