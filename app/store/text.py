"""Canonical JSON text: the same object always gives the same bytes."""

from __future__ import annotations

import json
from typing import Any


def canonical_json(document: object) -> str:
    """Write sorted keys, no blanks, ASCII only.

    Raises ``ValueError`` for NaN and infinities, ``TypeError`` for what JSON does not know (numpy integers).
    """
    return json.dumps(document, sort_keys=True, separators=(",", ":"), ensure_ascii=True, allow_nan=False)


def read_object(text: str) -> dict[str, Any]:
    """Read back an object written by ``canonical_json``."""
    document: dict[str, Any] = json.loads(text)
    return document


def read_list(text: str) -> list[str]:
    """Read back a list of texts written by ``canonical_json``."""
    document: list[str] = json.loads(text)
    return document
