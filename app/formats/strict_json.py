"""JSON without its ambiguities: no duplicate keys, no NaN or Infinity, no half characters."""

from __future__ import annotations

import json
import math
from typing import NoReturn

from app.errors import FileError
from app.formats.text import shown


def load_json(text: str, source: str) -> object:
    """Parse one JSON document; every refusal is a ``FileError`` with the line or the key."""
    try:
        document: object = json.loads(
            text, object_pairs_hook=_unique, parse_constant=_refuse_constant, parse_float=_finite
        )
        _refuse_half_characters(document, text)
    except json.JSONDecodeError as error:
        where = f"line {error.lineno}"
        raise FileError(source, where, f"is not JSON at column {error.colno}: {error.msg}") from None
    except RecursionError:
        raise FileError(source, "line 1", "the JSON is nested too deeply; flatten it") from None
    except ValueError as error:  # from the hooks below, or an integer of thousands of digits
        raise FileError(source, "JSON", str(error)) from None
    return document


def _unique(pairs: list[tuple[str, object]]) -> dict[str, object]:
    result: dict[str, object] = {}
    for key, value in pairs:
        if key in result:
            raise ValueError(f"the key {shown(key)} appears twice in one object; keep one")
        result[key] = value
    return result


def _refuse_constant(name: str) -> NoReturn:
    raise ValueError(f"{name} is no JSON number; give a finite one")


def _finite(text: str) -> float:
    value = float(text)
    if not math.isfinite(value):
        raise ValueError(f"the number {shown(text)} is too large; give a finite one")
    return value


def _refuse_half_characters(document: object, text: str) -> None:
    # "\ud800" alone is legal JSON and no Unicode text: it cannot be stored or sent on.
    if "\\ud" not in text and "\\uD" not in text:
        return
    try:
        json.dumps(document, ensure_ascii=False).encode("utf-8")
    except UnicodeEncodeError:
        raise ValueError("a string holds half a surrogate pair; write the character itself") from None
