"""The scheduled job on demand, and its record."""

from __future__ import annotations

import math
from typing import Annotated, Any, Literal

from fastapi import APIRouter, Path, Query
from pydantic import Field
from starlette.responses import Response

from app.api import docs
from app.api.bodies import OptionalJsonBody
from app.api.caching import json_response, reply
from app.api.deps import AskedNow, existing_id
from app.api.paging import Page, Pager
from app.api.problems import RETRY_S
from app.api.schemas import ItemsPage, RunDetail, RunOut, RunRequest
from app.api.times import optional_text, utc_text
from app.core.sky.times import parse_utc
from app.errors import FieldError, NotFoundError
from app.formats.satellite_schema import check_id
from app.formats.validation import validated
from app.store.runs import (
    RunRecord,
    RunSatelliteRecord,
    get_run,
    list_runs,
    queue_run,
    run_satellites,
)

router = APIRouter(prefix="/v1/runs", tags=["runs"])
RunId = Annotated[str, Path(description="The run's id.", examples=["run-20260810T000000Z-1f2e3d4c"])]
COUNTS = ("satellites_total", "satellites_done", "computed", "failed", "revisions_new")


class RunQuery(Page):
    """A page of the run's satellites."""

    state: Literal["pending", "computed", "failed"] | None = Field(
        default=None, description="Only satellites in this state."
    )


@router.post(
    "",
    status_code=202,
    response_model=RunOut,
    responses=docs.writing(
        "queued run",
        202,
        409,
        *docs.BODY_ERRORS,
        text="Queued; follow Location to see what becomes of it.",
    ),
    openapi_extra=docs.body("RunRequest", "run request", required=False),
)
def request_run(asked: AskedNow, document: OptionalJsonBody) -> Response:
    """Ask for a run. Without a body: all satellites, as of now."""
    wanted = validated(RunRequest, document, {})
    as_of_unix_s = (
        math.floor(asked.context.clock()) if wanted.as_of is None else parse_utc(wanted.as_of, "as_of")
    )
    ids = None if wanted.satellites is None else _checked(wanted.satellites)
    with asked.context.store.write() as session:
        try:
            run_id = queue_run(session, as_of_unix_s, ids, clock=asked.context.wall)
        except NotFoundError as unknown:
            raise FieldError("satellites", unknown.detail) from None
        record = get_run(session, run_id)
    headers = {"Location": f"/v1/runs/{run_id}", "Retry-After": RETRY_S}
    return json_response(_shown(record), 202, headers)


@router.get("", response_model=ItemsPage[RunOut], responses=docs.reading("runs", paged=True))
def read_runs(asked: AskedNow, page: Annotated[Page, Query()]) -> Response:
    """List the runs, the one asked for last first."""
    pager = Pager(asked.request, page, (int,))
    after = pager.after
    with asked.reading() as (session, tag):
        rows = list_runs(session, int(after[0]) if after else None, pager.fetch)
    shown, headers = pager.cut(rows, lambda row: (row.requested_seq,), _shown)
    return reply(shown, tag, headers)


@router.get("/{run_id}", response_model=RunDetail, responses=docs.reading("run", 404, paged=True))
def read_run(asked: AskedNow, run_id: RunId, query: Annotated[RunQuery, Query()]) -> Response:
    """Return a run with a page of its satellites: what became of each, and why."""
    pager = Pager(asked.request, query, (str,))
    after = pager.after
    with asked.reading() as (session, tag):
        record = get_run(session, existing_id(run_id, "run"))
        first = str(after[0]) if after else None
        rows = run_satellites(session, record.id, first, pager.fetch, query.state)
    satellites, headers = pager.cut(rows, lambda row: (row.satellite_id,), _satellite)
    return reply({**_shown(record), "satellites": satellites}, tag, headers)


def _checked(ids: list[str]) -> list[str]:
    for index, satellite_id in enumerate(ids):
        try:
            check_id(satellite_id)
        except ValueError as error:
            raise FieldError(f"satellites.{index}", str(error)) from None
    return ids


def _shown(run: RunRecord) -> dict[str, Any]:
    # The heartbeat is left out: it is no visible change, so that no tag would tell of it.
    return {
        "id": run.id,
        "state": run.state.value,
        "as_of": utc_text(run.as_of),
        "requested_at": utc_text(run.requested_at),
        "started_at": optional_text(run.started_at),
        "finished_at": optional_text(run.finished_at),
        **{name: getattr(run, name) for name in COUNTS},
        "reason": run.reason,
    }


def _satellite(row: RunSatelliteRecord) -> dict[str, Any]:
    return {"satellite": row.satellite_id, "state": row.state, "reason": row.reason}
