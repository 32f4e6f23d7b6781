"""Make the application: settings and store in, an ASGI application out."""

from __future__ import annotations

import time
from collections.abc import AsyncIterator, Callable
from contextlib import AbstractAsyncContextManager, asynccontextmanager

import anyio.to_thread
from fastapi import Depends, FastAPI, Request
from starlette.middleware import Middleware
from starlette.responses import Response

from app import __version__, on_demand, trial
from app.api import problems
from app.api.caching import NotModified, not_modified
from app.api.deps import Computations, Context
from app.api.metrics import Metrics
from app.api.middleware import Outermost
from app.api.openapi import DESCRIPTION, document
from app.api.queries import known_query, parameter_table
from app.api.routes import ROUTERS
from app.core.streams.model import Catalogue
from app.jobs.queue import QueueWorker
from app.jobs.run import REAL, Seams
from app.settings import Settings
from app.store.clock import Clock, utc_now
from app.store.session import Store, open_store

REAL_COMPUTATIONS = Computations(on_demand.satellite_series, on_demand.lee_windows, trial.run_trial)
WORKER_CONNECTIONS = 2  # one to stage and publish, one for the sign of life


def create_app(
    settings: Settings,
    store: Store | None = None,
    *,
    work: bool = False,
    clock: Callable[[], float] = time.time,
    wall: Clock = utc_now,
    catalogue: Catalogue | None = None,
    computations: Computations = REAL_COMPUTATIONS,
    seams: Seams = REAL,
) -> FastAPI:
    """Make the API over a migrated database.

    A ``store`` that is given stays open at the end; without one the settings' database is opened and closed
    here. ``work``: also compute the runs asked for. ``clock``: what "now" means to a computation (POSIX
    seconds). Raises ``SettingsError`` when the database cannot be reached.
    """
    opened = store or open_store(settings)
    context = Context(settings, opened, catalogue or seams.catalogue(), computations, clock, wall, Metrics())
    worker = QueueWorker(opened, settings, seams=seams) if work else None
    app = FastAPI(
        title="Stonechat",
        version=__version__,
        description=DESCRIPTION,
        openapi_url=None,
        docs_url=None,
        redoc_url=None,
        redirect_slashes=False,
        dependencies=[Depends(known_query)],
        middleware=[Middleware(Outermost, metrics=context.metrics)],
        lifespan=_lifespan(context, worker, close=store is None),
    )
    _assemble(app, context)
    return app


def _assemble(app: FastAPI, context: Context) -> None:
    for router in ROUTERS:
        app.include_router(router)
    problems.install(app)
    app.add_exception_handler(NotModified, _on_not_modified)
    openapi = document(app)
    app.state.context, app.state.openapi = context, openapi
    app.state.parameters = parameter_table(openapi)
    app.state.methods = {path: _methods(calls) for path, calls in openapi["paths"].items()}


def _methods(calls: dict[str, object]) -> list[str]:
    names = {name.upper() for name in calls}
    return sorted(names | {"HEAD"} if "GET" in names else names)


async def _on_not_modified(_request: Request, found: Exception) -> Response:
    assert isinstance(found, NotModified)
    return not_modified(found.tag)


def _lifespan(
    context: Context, worker: QueueWorker | None, close: bool
) -> Callable[[FastAPI], AbstractAsyncContextManager[None]]:
    @asynccontextmanager
    async def lifespan(_app: FastAPI) -> AsyncIterator[None]:
        # A thread may hold one connection; more threads than connections would only wait for one.
        threads = max(1, context.settings.connections - WORKER_CONNECTIONS)
        anyio.to_thread.current_default_thread_limiter().total_tokens = threads
        if worker is not None:
            worker.start()
        try:
            yield
        finally:
            if worker is not None:
                await anyio.to_thread.run_sync(worker.stop)
            if close:
                context.store.close()

    return lifespan
