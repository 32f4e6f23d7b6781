"""How a route describes itself in the OpenAPI document: its answers, its problems, its request body.

Examples are given by name. The framework drops every null of a description, also of an example, where null
means something; so ``openapi`` puts the examples in afterwards.
"""

from __future__ import annotations

from typing import Any

from app.api.problems import KINDS, MEDIA_TYPE, NOT_READY, BodyTooLargeError, Kind, PreconditionError
from app.api.problems import UnsupportedMediaTypeError as WrongMediaType
from app.errors import ConflictError, FieldError, NotFoundError

EXAMPLE = "x-example"  # the name of a sample, until ``openapi`` puts the sample in its place
TEMPLATE = "#/components/schemas/{model}"
SAMPLES: dict[int, tuple[Kind, str, dict[str, str]]] = {
    404: (KINDS[NotFoundError], "there is no satellite 'kestrel-9'", {}),
    409: (KINDS[ConflictError], "the database is busy (database is locked); try again", {}),
    412: (KINDS[PreconditionError], "If-Match does not hold: the object changed; read it again", {}),
    413: (KINDS[BodyTooLargeError], "the body is larger than 1048576 bytes; send less at a time", {}),
    415: (KINDS[WrongMediaType], "Content-Type is 'text/html'; send application/json", {}),
    422: (KINDS[FieldError], "to: must lie after 'from'", {"field": "to"}),
    503: (NOT_READY, "the database has no tables yet; run `stonechat migrate`", {}),
}
TAG = {"description": "Strong entity tag.", "schema": {"type": "string"}}
LINK = {
    "description": 'Address of the next page, rel="next"; absent on the last.',
    "schema": {"type": "string"},
}
BODY_ERRORS = (413, 415, 422)


def reading(example: str, *errors: int, paged: bool = False) -> dict[int | str, dict[str, Any]]:
    """Describe the answers of a GET under ``/v1``."""
    headers = {"ETag": TAG, **({"Link": LINK} if paged else {})}
    found: dict[int | str, dict[str, Any]] = {
        200: {"content": sample(example), "headers": headers},
        304: {"description": "What If-None-Match names is current.", "headers": {"ETag": TAG}},
    }
    return {**found, **problems(*errors, 422)}


def writing(
    example: str | None, status: int, *errors: int, text: str = "Done."
) -> dict[int | str, dict[str, Any]]:
    """Describe the answers of a call that changes or computes something."""
    content = {"content": sample(example)} if example is not None else {}
    return {status: {"description": text, **content}, **problems(*errors)}


def problems(*statuses: int) -> dict[int | str, dict[str, Any]]:
    """Describe problems, each with an example; any other status is a problem too."""
    found: dict[int | str, dict[str, Any]] = {status: _problem(*SAMPLES[status]) for status in statuses}
    return {**found, "default": {"description": "Any other problem.", "content": {MEDIA_TYPE: _schema()}}}


def body(schema: str, example: str, required: bool = True) -> dict[str, Any]:
    """Describe a JSON request body by the name of its schema."""
    reference = {"schema": {"$ref": TEMPLATE.format(model=schema)}, EXAMPLE: example}
    return {"requestBody": {"required": required, "content": {"application/json": reference}}}


def sample(example: str) -> dict[str, Any]:
    """Describe a JSON body by its example alone; the framework adds the schema."""
    return {"application/json": {EXAMPLE: example}}


def _problem(kind: Kind, detail: str, more: dict[str, str]) -> dict[str, Any]:
    example = {"type": f"/problems/{kind.slug}", "title": kind.title, "status": kind.status, "detail": detail}
    content = {MEDIA_TYPE: {**_schema(), "example": {**example, **more}}}
    return {"description": kind.title, "content": content}


def _schema() -> dict[str, Any]:
    return {"schema": {"$ref": TEMPLATE.format(model="Problem")}}
