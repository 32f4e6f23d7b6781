"""``stonechat serve``."""

from __future__ import annotations

import argparse
import time
from collections.abc import Callable

import uvicorn

from app.api.app import create_app
from app.settings import Settings, load_settings
from app.store.session import Store, open_store


def run(options: argparse.Namespace) -> int:
    """Serve until told to stop."""
    settings = load_settings(dir=options.dir)
    with open_store(settings) as store:
        store.require_head()
        serve(settings, store, options.host, options.port)
    return 0


def serve(
    settings: Settings, store: Store, host: str, port: int, clock: Callable[[], float] = time.time
) -> None:
    """Run the server in this process. ``clock`` says what "now" means to a computation, POSIX seconds."""
    application = create_app(settings, store, work=True, clock=clock)
    uvicorn.run(application, host=host, port=port, log_level=settings.log_level, server_header=False)
