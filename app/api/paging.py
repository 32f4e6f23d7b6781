"""Keyset pages behind opaque cursors, with the next page's address in a ``Link`` header (RFC 8288)."""

from __future__ import annotations

import base64
import binascii
import hashlib
import json
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any, TypeVar
from urllib.parse import quote, urlencode

from fastapi import Request
from pydantic import BaseModel, ConfigDict, Field

from app.errors import FieldError

MAX_CURSOR = 400
MAX_INTEGER = 2**63 - 1
MAX_TEXT = 200
Key = tuple[int | str, ...]
Row = TypeVar("Row")


class Page(BaseModel):
    """The two query parameters of every list."""

    model_config = ConfigDict(extra="forbid")

    limit: int = Field(default=50, ge=1, le=200, description="At most this many items.")
    cursor: str | None = Field(
        default=None,
        max_length=MAX_CURSOR,
        description="`next_cursor` of the page before, with the same filters.",
    )


@dataclass(frozen=True)
class Pager:
    """Cursors of one list with one set of filters; a cursor of another list is refused."""

    request: Request
    page: Page
    kinds: tuple[type, ...]  # of the key's parts

    @property
    def after(self) -> Key | None:
        """The key to continue after; ``FieldError`` when the cursor is not one of this list."""
        if self.page.cursor is None:
            return None
        key = _decode(self.page.cursor, self._list_name)
        if key is None or [type(part) for part in key] != list(self.kinds) or not all(map(_sound, key)):
            raise FieldError("cursor", "is no cursor of this list and these filters; start again without one")
        return key

    @property
    def fetch(self) -> int:
        """How many rows to ask for: one more than shown tells whether a page follows."""
        return self.page.limit + 1

    def cut(
        self, rows: Sequence[Row], key: Callable[[Row], Key], show: Callable[[Row], Any]
    ) -> tuple[dict[str, Any], dict[str, str]]:
        """Return the page ``{"items", "next_cursor"}`` and its headers."""
        shown = rows[: self.page.limit]
        if len(rows) <= self.page.limit:
            return {"items": [show(row) for row in shown], "next_cursor": None}, {}
        cursor = _encode(self._list_name, key(shown[-1]))
        query = urlencode([*self._filters, ("limit", self.page.limit), ("cursor", cursor)])
        link = f'<{quote(self.request.scope["path"])}?{query}>; rel="next"'
        return {"items": [show(row) for row in shown], "next_cursor": cursor}, {"Link": link}

    @property
    def _filters(self) -> list[tuple[str, str]]:
        pairs = self.request.query_params.multi_items()
        return sorted(pair for pair in pairs if pair[0] not in ("limit", "cursor"))

    @property
    def _list_name(self) -> str:
        text = json.dumps([self.request.scope["path"], self._filters]).encode()
        return hashlib.sha256(text).hexdigest()[:8]


def _encode(list_name: str, key: Key) -> str:
    text = json.dumps([list_name, *key], separators=(",", ":")).encode()
    return base64.urlsafe_b64encode(text).decode().rstrip("=")


def _decode(cursor: str, list_name: str) -> Key | None:
    try:
        data = base64.b64decode(cursor + "=" * (-len(cursor) % 4), altchars=b"-_", validate=True)
        parts = json.loads(data.decode("ascii"))
    except (binascii.Error, ValueError, RecursionError):  # ValueError: not ASCII, not JSON
        return None
    return tuple(parts[1:]) if isinstance(parts, list) and parts[:1] == [list_name] else None


def _sound(part: int | str) -> bool:
    if isinstance(part, str):
        return part.isascii() and part.isprintable() and len(part) <= MAX_TEXT
    return 0 <= part <= MAX_INTEGER
