"""The shell loop that stands in for a timer in the compose file, with a stand-in for the program."""

from __future__ import annotations

import signal
import subprocess
import time
from pathlib import Path

from tests.deploy.deployment import compose

PATIENCE_S = 30.0


def start(folder: Path, stand_in: str) -> subprocess.Popen[bytes]:
    """Run the loop; ``stand_in`` is the shell text of a program called stonechat."""
    program = folder / "stonechat"
    program.write_text(f"#!/bin/sh\n{stand_in}\n", encoding="utf-8")
    program.chmod(0o755)
    service = compose()["services"]["compute"]
    script = service["command"][0].replace("$$", "$")  # as compose does
    environment = {"PATH": f"{folder}:/usr/bin:/bin", "COMPUTE_EVERY_S": "0.05"}
    return subprocess.Popen([*service["entrypoint"], script], cwd=folder, env=environment)


def wait_for_lines(path: Path, count: int) -> list[str]:
    end = time.monotonic() + PATIENCE_S
    while time.monotonic() < end:
        lines = path.read_text(encoding="utf-8").splitlines() if path.exists() else []
        if len(lines) >= count:
            return lines
        time.sleep(0.02)
    raise AssertionError(f"{path} has no {count} lines yet")


def test_runs_again_after_a_failure_and_ends_when_told(tmp_path: Path) -> None:
    loop = start(tmp_path, 'echo "$@" >> calls; exit 1')
    assert wait_for_lines(tmp_path / "calls", 3)[:3] == ["compute"] * 3
    loop.send_signal(signal.SIGTERM)
    assert loop.wait(PATIENCE_S) == 0


def test_a_run_under_way_is_told_to_stop(tmp_path: Path) -> None:
    loop = start(
        tmp_path, "trap 'kill $!; echo told >> calls; exit 143' TERM\necho begun >> calls\nsleep 60 & wait $!"
    )
    wait_for_lines(tmp_path / "calls", 1)
    loop.send_signal(signal.SIGTERM)
    assert loop.wait(PATIENCE_S) == 0
    assert wait_for_lines(tmp_path / "calls", 2) == ["begun", "told"]
