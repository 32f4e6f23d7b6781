"""Files named on the command line."""

from __future__ import annotations

import sys
from pathlib import Path

from app.formats.text import MAX_BYTES

STANDARD_INPUT = Path("-")


def read_file(path: Path) -> bytes:
    """Read a file, or standard input for ``-``; one byte more than the readers accept is enough to refuse it."""
    if path == STANDARD_INPUT:
        return sys.stdin.buffer.read(MAX_BYTES + 1)
    with path.open("rb") as file:
        return file.read(MAX_BYTES + 1)


def os_problem(error: OSError) -> str:
    """Say in one line what the system would not do, and to which file."""
    problem = error.strerror or str(error)
    return f"{error.filename}: {problem}" if error.filename is not None else problem


def printable(text: str) -> str:
    """Write line ends, and whatever else could steer a terminal, as escapes."""
    return "".join(each if each.isprintable() else ascii(each)[1:-1] for each in text)
