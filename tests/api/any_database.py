"""What the contract tests share: an application that stays up for a module, and what every answer must be."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import ExitStack, contextmanager
from typing import Any

import pytest
from fastapi import FastAPI
from hypothesis import HealthCheck
from hypothesis import settings as profile
from starlette.testclient import TestClient

from app.api.app import REAL_COMPUTATIONS
from app.api.openapi import document
from app.api.routes import ROUTERS
from app.settings import load_settings
from app.store.session import open_store
from tests.api.harness import advisory, make_app, publish_advisories, put_orbit, put_satellite
from tests.databases import PostgresqlTemplate, SqliteTemplate

SATELLITE = "kestrel-1"
BOTH = ["sqlite", "postgresql"]
MANY = profile(
    max_examples=150,
    derandomize=True,
    deadline=None,
    suppress_health_check=[HealthCheck.too_slow, HealthCheck.function_scoped_fixture],
)


@contextmanager
def lasting_client(
    request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory
) -> Iterator[TestClient]:
    """Serve a satellite with its orbit and one advisory from a database of the kind ``request.param``."""
    with ExitStack() as stack:
        if request.param == "sqlite":
            sqlite: SqliteTemplate = request.getfixturevalue("sqlite_template")
            url = stack.enter_context(sqlite.copy(tmp_path_factory.mktemp("contract")))
        else:
            server: PostgresqlTemplate = request.getfixturevalue("postgresql_template")
            url = stack.enter_context(server.copy())
        text = url.render_as_string(hide_password=False)
        settings = load_settings(database_url=text, executor="serial", workers=0)
        store = stack.enter_context(open_store(settings))
        app = make_app(settings, store, computations=REAL_COMPUTATIONS)
        client = stack.enter_context(TestClient(app))
        put_satellite(client)
        put_orbit(client)
        publish_advisories(client, advisory())
        yield client


def described() -> dict[str, Any]:
    """The paths of the API with their calls, known before there is a database."""
    app = FastAPI()
    for router in ROUTERS:
        app.include_router(router)
    found: dict[str, Any] = document(app)["paths"]
    return found


def check(answer: Any) -> None:
    """No answer blames the server, and every refusal is a problem that says something."""
    assert answer.status_code < 500, answer.text
    assert answer.headers["x-content-type-options"] == "nosniff"
    if answer.status_code >= 400 and answer.request.method != "HEAD":
        body = answer.json()
        assert answer.headers["content-type"] == "application/problem+json"
        assert body["status"] == answer.status_code
        assert body["title"]
        assert body["detail"]
        assert "Traceback" not in answer.text
