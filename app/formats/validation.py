"""Pydantic's findings -> our one-line ``FieldError`` with a dotted path."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any, TypeVar

from pydantic import BaseModel, ValidationError

from app.errors import FieldError
from app.formats.text import shown

Model = TypeVar("Model", bound=BaseModel)
ALLOWED_SHOWN = 12
MODEL_TYPE = re.compile(r"a valid dictionary or instance of \w+")


def validated(model: type[Model], data: object, parts: Mapping[str, type[BaseModel]]) -> Model:
    """Make a ``model`` of ``data``; ``FieldError`` gives the path of the first wrong field and its remedy.

    ``parts``: the models nested in ``model`` by dotted path without indices ("faces.criteria.charge"), to
    name the fields allowed where an unknown one stands.
    """
    try:
        return model.model_validate(data)
    except ValidationError as error:
        first = error.errors(include_url=False)[0]
        nested: dict[str, type[BaseModel]] = {"": model, **parts}
        raise FieldError(_path(first["loc"], nested), _problem(dict(first), nested)) from None


def _place(location: tuple[int | str, ...]) -> str:
    return ".".join(part for part in location if isinstance(part, str))


def _path(location: tuple[int | str, ...], nested: Mapping[str, type[BaseModel]]) -> str:
    """Leave out the union tags, which pydantic puts after the index of a list."""
    kept = [
        str(part) if isinstance(part, int) or part.isprintable() else shown(part)
        for i, part in enumerate(location)
        if not (i and isinstance(location[i - 1], int) and _place(location[: i + 1]) in nested)
    ]
    return ".".join(kept)[:200] or "document"


def _problem(error: dict[str, Any], nested: Mapping[str, type[BaseModel]]) -> str:
    kind, message = error["type"], str(error["msg"])
    if kind == "missing":
        return "is missing"
    if kind == "extra_forbidden":
        model = nested.get(_place(error["loc"][:-1]))
        names = [f.alias or name for name, f in model.model_fields.items()][:ALLOWED_SHOWN] if model else []
        return f"is no field here; allowed are {', '.join(names)}"
    if kind in ("union_tag_invalid", "union_tag_not_found"):
        tags = [place.rpartition(".")[2] for place in nested if place.startswith(_place(error["loc"]) + ".")]
        return f"needs a kind; choose one of {', '.join(tags)}"
    if kind == "value_error":
        return message.removeprefix("Value error, ")
    wanted = MODEL_TYPE.sub("an object", message).replace("Input should", "it should")
    wanted = wanted.replace("List should", "it should").replace(" after validation", "")
    return f"is {shown(error['input'])}; {wanted}"
