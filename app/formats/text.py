"""Bytes -> text, lines and quoted values, shared by every reader."""

from __future__ import annotations

import re

from app.errors import FileError

MAX_BYTES = 64 * 2**20  # about 100,000 JSON element sets with every keyword
MAX_NAME_LENGTH = 64
SHOWN_LENGTH = 40


def decode(data: bytes, source: str, limit: int = MAX_BYTES) -> str:
    """Decode UTF-8 (a byte-order mark is dropped); ``FileError`` when empty, too big or not UTF-8."""
    if len(data) > limit:
        raise FileError(source, "size", f"is {len(data)} bytes, the limit is {limit}; split the file")
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise FileError(source, f"byte {error.start + 1}", "is not UTF-8; save the file as UTF-8") from None
    if not text.strip():
        raise FileError(source, "line 1", "the file is empty")
    return text


def numbered_lines(text: str) -> list[tuple[int, str]]:
    """Split at CR LF, LF or CR only, so that line numbers agree with an editor's; counts from 1."""
    return list(enumerate(re.split(r"\r\n|\n|\r", text), start=1))


def shown(value: object) -> str:
    """Quote a foreign value for a one-line message: short and printable, whatever is in it."""
    if value is None or isinstance(value, dict | list):
        return "null" if value is None else "an object" if isinstance(value, dict) else "a list"
    text = str(value)
    short = text if len(text) <= SHOWN_LENGTH else text[: SHOWN_LENGTH - 3] + "..."
    return short if isinstance(value, int | float) else repr(short)


def name_problem(text: str) -> str | None:
    """Say why ``text`` cannot be a name; None when it can."""
    if not text.isprintable():
        return f"{shown(text)} has control characters; use printable ones"
    if not 1 <= len(text) <= MAX_NAME_LENGTH:
        return f"has {len(text)} characters; a name has 1 to {MAX_NAME_LENGTH}"
    return None
