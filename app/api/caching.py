"""Strong entity tags and conditional requests (RFC 9110 sections 8.8.3 and 13)."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping

from fastapi import Request
from starlette.responses import Response

from app.api.problems import PreconditionError

HEADERS = {"Cache-Control": "private, no-cache", "Vary": "Authorization"}
TAG_DIGITS = 32


class NotModified(Exception):  # no error: it ends a GET early, before its body is made
    """The client holds the current representation already."""

    def __init__(self, tag: str) -> None:
        self.tag = tag
        super().__init__(tag)


def strong_tag(*parts: str) -> str:
    """Name a representation by everything it depends on."""
    text = "\n".join(parts).encode("utf-8", "surrogatepass")
    return f'"{hashlib.sha256(text).hexdigest()[:TAG_DIGITS]}"'


def refuse_unchanged(request: Request, tag: str) -> None:
    """Raise ``NotModified`` when If-None-Match holds this tag (weak comparison)."""
    given = _given(request, "if-none-match")
    if given is not None and ("*" in given or tag in [each.removeprefix("W/") for each in given]):
        raise NotModified(tag)


def check_preconditions(request: Request, tag: str | None) -> None:
    """Raise ``PreconditionError`` unless If-Match and If-None-Match allow a change.

    ``tag``: of the current representation, None when there is none.
    """
    wanted, unwanted = _given(request, "if-match"), _given(request, "if-none-match")
    if wanted is not None and (tag is None or not {"*", tag} & set(wanted)):
        raise PreconditionError("If-Match does not hold: the object changed or is not there; read it again")
    held = {each.removeprefix("W/") for each in unwanted or ()}
    if tag is not None and {"*", tag} & held:
        raise PreconditionError("If-None-Match does not hold: the object is there already")


def reply(document: object, tag: str, headers: Mapping[str, str] | None = None) -> Response:
    """Answer a GET: the document with its tag and how it may be kept."""
    return json_response(document, headers={**HEADERS, "ETag": tag, **(headers or {})})


def not_modified(tag: str) -> Response:
    """Answer 304, with the headers that a 200 would have had."""
    return Response(status_code=304, headers={**HEADERS, "ETag": tag})


def json_response(document: object, status: int = 200, headers: Mapping[str, str] | None = None) -> Response:
    """Write JSON; raises ``ValueError`` rather than send a number that is not finite."""
    content = json.dumps(document, allow_nan=False, separators=(",", ":")).encode()
    return Response(content, status, dict(headers or {}), media_type="application/json")


def _given(request: Request, name: str) -> list[str] | None:
    lines = request.headers.getlist(name)
    return [part.strip() for part in ",".join(lines).split(",")] if lines else None
