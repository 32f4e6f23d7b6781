"""The OpenAPI document: the framework's, completed by the schemas of what is read and refused by ourselves."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from fastapi import FastAPI
from fastapi.openapi.utils import get_openapi
from pydantic.json_schema import models_json_schema

from app.api.docs import EXAMPLE, TEMPLATE
from app.api.examples import NAMED
from app.api.schemas import Omm, Problem, RunRequest
from app.core.advice.advisory import CAUTION
from app.formats.satellite import SatelliteIn
from app.formats.trial_schema import TrialIn

DESCRIPTION = (
    "How much a meteoroid-stream passage raises the impact hazard above the everyday background, satellite by "
    "satellite, when to act, and when the Earth gives shelter. Times are ISO 8601 in UTC and end in Z; physical "
    "quantities carry their unit in the field's name. Every error is a problem document (RFC 9457). Every GET "
    "answers HEAD; every GET under /v1 has a strong ETag and honours If-None-Match. " + CAUTION
)
BY_HAND = (SatelliteIn, RunRequest, TrialIn, Omm, Problem)


def document(app: FastAPI) -> dict[str, Any]:
    """Describe the application."""
    made = get_openapi(
        title=app.title,
        version=app.version,
        description=app.description,
        routes=app.routes,
        separate_input_output_schemas=False,
    )
    _, shapes = models_json_schema([(each, "validation") for each in BY_HAND], ref_template=TEMPLATE)
    schemas = made.setdefault("components", {}).setdefault("schemas", {})
    for name, schema in shapes["$defs"].items():
        schemas.setdefault(name, schema)
    for part in _contents(made):
        if EXAMPLE in part:
            part["example"] = NAMED[part.pop(EXAMPLE)]
    return made


def _contents(made: dict[str, Any]) -> Iterator[dict[str, Any]]:
    """Every described body, sent or answered."""
    for call in [call for calls in made["paths"].values() for call in calls.values()]:
        for described in (call.get("requestBody", {}), *call["responses"].values()):
            yield from described.get("content", {}).values()
