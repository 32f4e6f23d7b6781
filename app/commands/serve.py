"""``stonechat serve``."""

from __future__ import annotations

import argparse
import logging
import socket
import time
from collections.abc import Callable

import uvicorn

from app.api.app import create_app
from app.errors import StonechatError
from app.settings import Settings, load_settings
from app.store.session import Store, open_store

BACKLOG = 2048
GRACE_S = 20  # for answers under way when the server is told to stop


def run(options: argparse.Namespace) -> int:
    """Serve until told to stop."""
    settings = load_settings(dir=options.dir)
    with open_store(settings, create=False) as store:
        store.require_head()
        with listen(options.host, options.port) as listener:
            print(f"Serving {address(listener)}; Ctrl-C ends it.", flush=True)
            serve(settings, store, listener)
    return 0


def listen(host: str, port: int) -> socket.socket:
    """Take the port. ``StonechatError`` when it cannot be had."""
    try:
        family, *_, where = socket.getaddrinfo(host, port, type=socket.SOCK_STREAM, flags=socket.AI_PASSIVE)[
            0
        ]
        return socket.create_server(where[:2], family=family, backlog=BACKLOG)
    except (OSError, UnicodeError) as error:  # the latter: a name that cannot be one of the DNS
        problem = getattr(error, "strerror", None) or str(error)
        remedy = "give a free port and an address of this machine"
        raise StonechatError(f"cannot listen on {host}, port {port}: {problem}; {remedy}") from None


def address(listener: socket.socket) -> str:
    """The URL at which a listener is reached."""
    host, port = listener.getsockname()[:2]
    return f"http://[{host}]:{port}" if ":" in host else f"http://{host}:{port}"


def serve(
    settings: Settings, store: Store, listener: socket.socket, clock: Callable[[], float] = time.time
) -> None:
    """Run the server in this process until Ctrl-C or SIGTERM.

    ``clock`` says what "now" means to a computation, POSIX seconds. Raises ``StonechatError`` when the server
    does not start.
    """
    logging.getLogger("app").setLevel(settings.log_level.upper())
    application = create_app(settings, store, work=True, clock=clock)
    config = uvicorn.Config(
        application,
        log_level=settings.log_level,
        server_header=False,
        timeout_graceful_shutdown=GRACE_S,
    )
    server = uvicorn.Server(config)
    try:
        server.run(sockets=[listener])
    except KeyboardInterrupt:  # the signal that ended the server, sent on once it has stopped
        return
    if not server.started:
        raise StonechatError("the server did not start; its log above says why")
