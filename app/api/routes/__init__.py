"""One router for each noun."""

from __future__ import annotations

from app.api.routes import advisories, on_demand, operation, orbits, runs, satellites, streams, trials

ROUTERS = (
    satellites.router,
    orbits.router,
    on_demand.router,
    advisories.router,
    streams.router,
    runs.router,
    trials.router,
    operation.router,
)
