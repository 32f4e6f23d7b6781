"""Is it alive, is it ready, what has it done; and the description of the API."""

from __future__ import annotations

import logging
import math
from datetime import datetime
from typing import Any

from fastapi import APIRouter
from prometheus_client.exposition import choose_encoder
from sqlalchemy.exc import SQLAlchemyError
from starlette.responses import Response

from app.api import docs
from app.api.caching import json_response
from app.api.deps import AskedNow, Context
from app.api.problems import NOT_READY, RETRY_S, problem
from app.api.schemas import Alive, Ready
from app.errors import SettingsError
from app.store.changes import current_change
from app.store.readiness import Freshness, freshness

log = logging.getLogger(__name__)
router = APIRouter(tags=["operation"])
NO_STORE = {"Cache-Control": "no-store"}
ALIVE = docs.writing("alive", 200, text="Alive.")
TEXT = {"text/plain": {"schema": {"type": "string"}, "example": "stonechat_database_up 1.0\n"}}
DESCRIPTION = {"application/json": {"schema": {"type": "object"}, "example": {"openapi": "3.1.0"}}}


@router.get("/livez", response_model=Alive, responses=ALIVE)
async def alive() -> Response:
    """Answer; nothing is looked at."""
    return json_response({"status": "alive"}, headers=NO_STORE)


@router.get("/readyz", response_model=Ready, responses=docs.writing("ready", 200, 503, text="Ready."))
def ready(asked: AskedNow) -> Response:
    """Check that the database answers, has the newest schema, and holds a run that is young enough."""
    context = asked.context
    try:
        context.store.require_head()
        with context.store.read() as session:
            found = freshness(session)
    except SettingsError as error:
        return _not_ready(error.detail)
    except SQLAlchemyError as error:
        log.error("the database cannot be used: %s", error)
        return _not_ready("the database cannot be reached; the server's log says why")
    late = _late(found, context)
    return _not_ready(late) if late else json_response(_ready(found, context.wall()), headers=NO_STORE)


@router.get(
    "/metrics",
    response_class=Response,
    responses={200: {"description": "Counters.", "content": TEXT}, **docs.problems()},
)
def metrics(asked: AskedNow) -> Response:
    """Give counters in the Prometheus text format, or as OpenMetrics when asked to."""
    context = asked.context
    _look(context)
    encode, media_type = choose_encoder(asked.request.headers.get("accept", ""))
    headers = {**NO_STORE, "Content-Type": media_type}
    return Response(encode(context.metrics.registry), headers=headers)


@router.get(
    "/openapi.json",
    response_class=Response,
    responses={200: {"description": "The description.", "content": DESCRIPTION}, **docs.problems()},
)
async def description(asked: AskedNow) -> Response:
    """Describe this API (OpenAPI 3.1)."""
    return json_response(asked.request.app.state.openapi, headers={"Cache-Control": "no-cache"})


def _late(found: Freshness, context: Context) -> str | None:
    limit_s, now = context.settings.ready_max_run_age_s, context.wall()
    if found.published_at is not None and _age_s(found.published_at, now) > limit_s:
        age_s = _age_s(found.published_at, now)
        return f"the newest run was published {age_s:.0f} s ago, more than {limit_s:.0f} s; see to the job"
    if found.waiting_since is not None and _age_s(found.waiting_since, now) > limit_s:
        return "no run has been published yet although satellites are registered; run `stonechat compute`"
    return None


def _ready(found: Freshness, now: datetime) -> dict[str, Any]:
    age_s = None if found.published_at is None else _age_s(found.published_at, now)
    return {
        "status": "ready",
        "schema": "newest",
        "published_run": found.run_id,
        "published_run_age_s": age_s,
        "published_run_failed": found.failed,
    }


def _not_ready(detail: str) -> Response:
    return problem(NOT_READY, detail, {"Retry-After": RETRY_S})


def _age_s(moment: datetime, now: datetime) -> float:
    return (now - moment).total_seconds()


def _look(context: Context) -> None:
    """Bring the gauges up to date; a database that does not answer is one of the things they show."""
    shown = context.metrics
    try:
        with context.store.read() as session:
            change, found = current_change(session), freshness(session)
    except SQLAlchemyError as error:
        log.error("the database cannot be used: %s", error)
        shown.database_up.set(0)
        return
    published_at = found.published_at
    shown.database_up.set(1)
    shown.change.set(change)
    shown.run_age_s.set(math.nan if published_at is None else _age_s(published_at, context.wall()))
