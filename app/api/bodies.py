"""Read request bodies: size first, media type next, then strict JSON."""

from __future__ import annotations

import re
from collections.abc import Iterable
from typing import Annotated

from fastapi import Depends, Request

from app.api.problems import BodyTooLargeError, UnsupportedMediaTypeError
from app.errors import FileError
from app.formats.strict_json import load_json
from app.formats.text import decode, shown

MAX_BODY_BYTES = 2**20
MAX_DEPTH = 20  # a trial, the deepest document, has 6 levels
SOURCE = "body"
JSON_TYPE = re.compile(r"application/([a-z0-9.-]+\+)?json")


async def raw_body(request: Request) -> bytes:
    """Return the body's bytes; ``BodyTooLargeError`` as soon as there are too many."""
    declared = request.headers.get("content-length", "")
    if declared.isdecimal() and len(declared) < 20 and int(declared) > MAX_BODY_BYTES:
        raise _too_large()
    data = bytearray()
    async for part in request.stream():
        data += part
        if len(data) > MAX_BODY_BYTES:
            raise _too_large()
    return bytes(data)


RawBody = Annotated[bytes, Depends(raw_body)]


def json_body(request: Request, data: RawBody) -> object:
    """Return the parsed body; ``FileError`` says where it is no JSON."""
    _require_json(request)
    document = load_json(decode(data, SOURCE), SOURCE)
    _refuse_deep(document)
    return document


def optional_json_body(request: Request, data: RawBody) -> object:
    """Return the parsed body, an empty object when there is none."""
    return json_body(request, data) if data else {}


JsonBody = Annotated[object, Depends(json_body)]
OptionalJsonBody = Annotated[object, Depends(optional_json_body)]


def content_type(request: Request) -> str | None:
    """Return the media type as sent."""
    return request.headers.get("content-type")


def _require_json(request: Request) -> None:
    given = content_type(request) or ""
    if not JSON_TYPE.fullmatch(given.partition(";")[0].strip().lower()):
        raise UnsupportedMediaTypeError(f"Content-Type is {shown(given)}; send application/json")


def _refuse_deep(document: object) -> None:
    """Refuse nesting that no document here needs; walking through it could exhaust the stack further on."""
    level = [document]
    for _ in range(MAX_DEPTH):
        level = [part for each in level for part in _parts(each)]
    if level:
        raise FileError(SOURCE, "JSON", f"is nested more than {MAX_DEPTH} levels deep; flatten it")


def _parts(value: object) -> Iterable[object]:
    return value.values() if isinstance(value, dict) else value if isinstance(value, list) else ()


def _too_large() -> BodyTooLargeError:
    return BodyTooLargeError(f"the body is larger than {MAX_BODY_BYTES} bytes; send less at a time")
