"""An application over a database of its own, with invented computations and a clock that stands still."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest
from fastapi import FastAPI
from starlette.testclient import TestClient

from app.settings import Settings, load_settings
from app.store.session import Store, open_store
from tests.api.harness import make_app
from tests.databases import SqliteTemplate


@pytest.fixture
def sqlite_settings(sqlite_template: SqliteTemplate, tmp_path: Path) -> Iterator[Settings]:
    with sqlite_template.copy(tmp_path) as url:
        text = url.render_as_string(hide_password=False)
        yield load_settings(database_url=text, executor="serial", workers=0, connections=5)


@pytest.fixture
def sqlite_store(sqlite_settings: Settings) -> Iterator[Store]:
    with open_store(sqlite_settings) as opened:
        yield opened


@pytest.fixture
def make(sqlite_settings: Settings, sqlite_store: Store) -> Callable[..., FastAPI]:
    def make_one(**more: Any) -> FastAPI:
        return make_app(sqlite_settings, sqlite_store, **more)

    return make_one


@pytest.fixture
def client(make: Callable[..., FastAPI]) -> TestClient:
    """For what does not depend on the kind of database."""
    return TestClient(make())


@pytest.fixture
def both(settings: Settings, store: Store) -> TestClient:
    """Once on SQLite and once on PostgreSQL."""
    return TestClient(make_app(settings, store))
