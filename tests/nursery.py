"""Processes for tests that kill them or let them race: forked from one that has imported everything already.

Run as a program, it reads commands from its input, one JSON list a line: ``["start", function, *arguments]``
answers with the process id of a new process, ``["wait", pid]`` with its exit status (minus the signal).
"""

from __future__ import annotations

import importlib
import json
import os
import subprocess
import sys
import tempfile
import traceback
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

ROOT = Path(__file__).resolve().parent.parent
PRELOADED = ("tests.jobs.victims",)


class Nursery:
    """The tests' side. Functions are named ``module:function`` and take what JSON can carry."""

    def __init__(self, process: subprocess.Popen[str]) -> None:
        self.process = process

    def start(self, function: str, *arguments: Any) -> int:
        return self._ask("start", function, *arguments)

    def wait(self, pid: int) -> int:
        return self._ask("wait", pid)

    def run_all(self, function: str, arguments: list[tuple[Any, ...]]) -> list[int]:
        """Start one process for each tuple of arguments; return all exit statuses."""
        return [self.wait(pid) for pid in [self.start(function, *each) for each in arguments]]

    def _ask(self, *command: Any) -> int:
        assert self.process.stdin is not None
        assert self.process.stdout is not None
        self.process.stdin.write(json.dumps(command) + "\n")
        self.process.stdin.flush()
        return int(self.process.stdout.readline())


@contextmanager
def open_nursery() -> Iterator[Nursery]:
    """Start it; what killed processes leave in the folder for temporary files goes at the end."""
    command = [sys.executable, "-m", "tests.nursery"]
    pipes = {"stdin": subprocess.PIPE, "stdout": subprocess.PIPE}
    with tempfile.TemporaryDirectory(prefix="sc-nursery-", ignore_cleanup_errors=True) as folder:
        fixed = {"OPENBLAS_NUM_THREADS": "1", "PYTHONPATH": str(ROOT), "TMPDIR": folder}
        with subprocess.Popen(command, cwd=ROOT, env=os.environ | fixed, text=True, **pipes) as process:
            yield Nursery(process)


def serve() -> None:
    for module in PRELOADED:
        importlib.import_module(module)
    for line in sys.stdin:
        command, *arguments = json.loads(line)
        sys.stdout.write(f"{_start(*arguments) if command == 'start' else _wait(*arguments)}\n")
        sys.stdout.flush()


def _start(function: str, *arguments: Any) -> int:
    pid = os.fork()
    if pid:
        return pid
    status = 1
    try:
        module, name = function.split(":")
        getattr(importlib.import_module(module), name)(*arguments)
        status = 0
    except Exception:  # noqa: BLE001  (shown, and told by the exit status)
        traceback.print_exc()
    finally:
        os._exit(status)


def _wait(pid: int) -> int:
    return os.waitstatus_to_exitcode(os.waitpid(pid, 0)[1])


if __name__ == "__main__":
    serve()
