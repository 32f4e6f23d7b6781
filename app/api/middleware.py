"""The outermost layer, pure ASGI: HEAD, security headers, last resort for errors, counting."""

from __future__ import annotations

import logging
import time

from starlette.datastructures import MutableHeaders
from starlette.types import ASGIApp, Message, Receive, Scope, Send

from app.api.metrics import Metrics
from app.api.problems import failed

log = logging.getLogger(__name__)
SECURITY_HEADERS = {
    "X-Content-Type-Options": "nosniff",
    "Content-Security-Policy": "default-src 'none'; frame-ancestors 'none'",
    "Referrer-Policy": "no-referrer",
    "Cross-Origin-Resource-Policy": "same-origin",
}


class Outermost:
    """Wrap the application; what it does to one request is in ``_Exchange``."""

    def __init__(self, app: ASGIApp, metrics: Metrics) -> None:
        self.app, self.metrics = app, metrics

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Pass on what is not HTTP; answer the rest."""
        if scope["type"] != "http":
            await self.app(scope, receive, send)
            return
        await _Exchange(self, scope, send).answer(receive)


class _Exchange:
    """One request and its answer. HEAD is worked as a GET whose body is not sent (RFC 9110 section 9.3.2)."""

    def __init__(self, outer: Outermost, scope: Scope, send: Send) -> None:
        self.outer, self._send = outer, send
        self.method: str = scope["method"]
        self.is_head = self.method == "HEAD"
        self.scope = {**scope, "method": "GET"} if self.is_head else scope
        self.status: int | None = None

    async def answer(self, receive: Receive) -> None:
        started = time.perf_counter()
        try:
            await self.outer.app(self.scope, receive, self.send)
        except Exception:
            log.exception("%s %s failed", self.method, self.route)
            if self.status is not None:
                raise  # part of the answer is out: the server must break the connection off
            await failed()(self.scope, receive, self.send)
        finally:
            seconds = time.perf_counter() - started
            self.outer.metrics.observe(self.method, self.route, self.status or 500, seconds)

    @property
    def route(self) -> str:
        return str(getattr(self.scope.get("route"), "path_format", "unmatched"))

    async def send(self, message: Message) -> None:
        if message["type"] == "http.response.start":
            self.status = message["status"]
            headers = MutableHeaders(scope=message)
            for name, value in SECURITY_HEADERS.items():
                headers.setdefault(name, value)
        elif message["type"] == "http.response.body" and self.is_head:
            message = {**message, "body": b""}
        await self._send(message)
