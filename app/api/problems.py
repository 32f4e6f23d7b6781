"""Every error as ``application/problem+json`` (RFC 9457): one table, and the handlers that use it."""

from __future__ import annotations

import json
import logging
from collections.abc import Mapping
from dataclasses import dataclass
from http import HTTPStatus
from typing import Any

from fastapi import FastAPI, Request
from fastapi.exceptions import RequestValidationError
from sqlalchemy.exc import InterfaceError, OperationalError
from sqlalchemy.exc import TimeoutError as PoolTimeoutError
from starlette.exceptions import HTTPException
from starlette.responses import Response

from app.errors import (
    ConflictError,
    FieldError,
    FileError,
    InputError,
    NotFoundError,
    OrbitError,
    StonechatError,
)
from app.formats.text import shown

log = logging.getLogger(__name__)
MEDIA_TYPE = "application/problem+json"
RETRY_S = "5"


class UnsupportedMediaTypeError(InputError):
    """The body's media type is not read here."""


class BodyTooLargeError(InputError):
    """The body is too large."""


class PreconditionError(StonechatError):
    """The object is not in the state that If-Match or If-None-Match asks for; read it again."""


class NotOfferedError(FieldError):
    """A documented choice that this version does not offer yet."""


@dataclass(frozen=True)
class Kind:
    """A kind of problem: the last part of its type, its title and its HTTP status."""

    slug: str
    title: str
    status: int


KINDS: dict[type[Exception], Kind] = {
    InputError: Kind("input", "The input cannot be used", 400),
    FieldError: Kind("field", "A field is wrong", 422),
    NotOfferedError: Kind("not-offered", "Not offered yet", 422),
    FileError: Kind("file", "A line or keyword is wrong", 422),
    UnsupportedMediaTypeError: Kind("media-type", "This media type is not read here", 415),
    BodyTooLargeError: Kind("too-large", "The body is too large", 413),
    NotFoundError: Kind("not-found", "There is no such object", 404),
    ConflictError: Kind("conflict", "The object changed meanwhile, or is busy", 409),
    OrbitError: Kind("orbit", "The orbit cannot be used", 409),
    PreconditionError: Kind("precondition", "The precondition does not hold", 412),
    StonechatError: Kind("refused", "Refused", 400),
}
INTERNAL = Kind("internal", "Something failed in the server", 500)
UNAVAILABLE = Kind("unavailable", "The database cannot be reached", 503)
NOT_READY = Kind("not-ready", "Not ready", 503)


def problem(kind: Kind, detail: str, headers: Mapping[str, str] | None = None, **more: Any) -> Response:
    """Make the answer; ``more`` are extension members such as ``field``, those that are None left out."""
    members = {name: value for name, value in more.items() if value is not None}
    base = {"type": f"/problems/{kind.slug}", "title": kind.title, "status": kind.status, "detail": detail}
    content = json.dumps({**base, **members}, allow_nan=False).encode()
    fresh = {"Cache-Control": "no-store", **(headers or {})}
    return Response(content, status_code=kind.status, headers=fresh, media_type=MEDIA_TYPE)


def refused(error: StonechatError) -> Response:
    """Turn one of our errors into its problem."""
    kind = next(KINDS[each] for each in type(error).__mro__ if each in KINDS)
    if isinstance(error, FileError):
        return problem(kind, f"{error.where}: {error.problem}", where=error.where)
    return problem(kind, error.detail, field=getattr(error, "field", None))


def failed() -> Response:
    """Say that the server is to blame, and nothing about its insides."""
    return problem(
        INTERNAL, "The request was not completed. The server's log says why; report it if it recurs."
    )


def install(app: FastAPI) -> None:
    """Let every error, the framework's included, come out as a problem."""

    async def on_refusal(_request: Request, error: Exception) -> Response:
        assert isinstance(error, StonechatError)
        return refused(error)

    app.add_exception_handler(StonechatError, on_refusal)
    app.add_exception_handler(RequestValidationError, _on_validation)
    app.add_exception_handler(HTTPException, _on_framework)
    for unreachable in (OperationalError, InterfaceError, PoolTimeoutError):
        app.add_exception_handler(unreachable, _on_unreachable)


async def _on_validation(_request: Request, error: Exception) -> Response:
    assert isinstance(error, RequestValidationError)
    first = error.errors()[0]
    field = ".".join(str(part) for part in first["loc"][1:])[:200] or "request"
    return refused(FieldError(field, _sentence(first)))


def _sentence(first: Mapping[str, Any]) -> str:
    if first["type"] == "missing":
        return "is missing"
    if first["type"] == "extra_forbidden":
        return "is no query parameter here"
    wanted = str(first["msg"]).removeprefix("Value error, ")
    wanted = wanted.replace("Input should", "it should").replace("String should", "it should")
    return f"is {shown(first['input'])}; {wanted}"


async def _on_framework(request: Request, error: Exception) -> Response:
    assert isinstance(error, HTTPException)
    phrase = HTTPStatus(error.status_code).phrase
    kind = Kind(phrase.lower().replace(" ", "-"), phrase, error.status_code)
    headers = dict(error.headers or {})
    if error.status_code == 405:
        headers["Allow"] = ", ".join(request.app.state.methods[request.scope["route"].path_format])
        return problem(kind, f"{request.method} is not offered here; use {headers['Allow']}.", headers)
    if error.status_code == 404:
        return problem(KINDS[NotFoundError], "There is nothing at this address; see /openapi.json.", headers)
    return problem(kind, str(error.detail), headers)


async def _on_unreachable(_request: Request, error: Exception) -> Response:
    log.error("the database cannot be used: %s", error)
    detail = "The database cannot be reached or is overloaded; try again shortly."
    return problem(UNAVAILABLE, detail, {"Retry-After": RETRY_S})
