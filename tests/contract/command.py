"""The command as a user meets it: a process of its own, in a folder of its own, without settings."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path
from typing import Any

ROOT = Path(__file__).resolve().parents[2]
PATIENCE_S = 120.0
COMMAND = [sys.executable, "-m", "app.cli"]
Done = subprocess.CompletedProcess[str]


def environment(**more: str) -> dict[str, str]:
    kept = {name: value for name, value in os.environ.items() if not name.upper().startswith("STONECHAT_")}
    return {**kept, "PYTHONPATH": str(ROOT), **more}


def run(folder: Path, *arguments: str, given: str | None = None, **more: str) -> Done:
    """Run to the end; ``given`` is its standard input, ``more`` are environment variables."""
    return subprocess.run(
        [*COMMAND, *arguments],
        cwd=folder,
        env=environment(**more),
        input=given,
        capture_output=True,
        text=True,
        timeout=PATIENCE_S,
        check=False,
    )


def start(folder: Path, *arguments: str, errors: int = subprocess.PIPE, **more: str) -> subprocess.Popen[str]:
    """Start a process that signals can be sent to; ``errors`` is where its standard error goes."""
    return subprocess.Popen(
        [*COMMAND, *arguments],
        cwd=folder,
        env=environment(**more),
        stdout=subprocess.PIPE,
        stderr=errors,
        text=True,
    )


def is_refusal(done: Done) -> bool:
    """Whether it ended with status 1 and a one-line reason."""
    lines = done.stderr.splitlines()
    return done.returncode == 1 and len(lines) == 1 and lines[0].startswith("stonechat: ")


def write(folder: Path, document: Any, name: str = "given.json") -> str:
    """Write a JSON document or a text into the folder; return its name."""
    text = document if isinstance(document, str) else json.dumps(document)
    (folder / name).write_text(text, encoding="utf-8")
    return name
