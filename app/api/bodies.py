"""Read request bodies: size first, media type next, then strict JSON."""

from __future__ import annotations

import re
from typing import Annotated

from fastapi import Depends, Request

from app.api.problems import BodyTooLargeError, UnsupportedMediaTypeError
from app.formats.strict_json import load_json
from app.formats.text import decode, shown

MAX_BODY_BYTES = 2**20
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
    return load_json(decode(data, SOURCE), SOURCE)


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


def _too_large() -> BodyTooLargeError:
    return BodyTooLargeError(f"the body is larger than {MAX_BODY_BYTES} bytes; send less at a time")
