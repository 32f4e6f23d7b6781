"""One database, taken from empty to advisories through the commands in their order."""

from __future__ import annotations

import errno
import os
import pty
import termios
from pathlib import Path

import pytest

from tests.contract.command import Done, is_refusal, run, start, write

SERIAL = {"STONECHAT_EXECUTOR": "serial"}
SATELLITE = {
    "id": "kestrel-1",
    "faces": [{"name": "front", "normal": [1, 0, 0], "area_m2": 1.0}],
    "orbit": {
        "OBJECT_NAME": "KESTREL",
        "OBJECT_ID": "2026-900A",
        "EPOCH": "2026-08-09T18:00:00Z",
        "MEAN_MOTION": 15.0,
        "ECCENTRICITY": 0.001,
        "INCLINATION": 51.6,
        "RA_OF_ASC_NODE": 10.0,
        "ARG_OF_PERICENTER": 20.0,
        "MEAN_ANOMALY": 30.0,
    },
}


@pytest.fixture(scope="module")
def done(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Done]:
    folder = tmp_path_factory.mktemp("cli")
    wrong = {**SATELLITE, "id": "merlin-1", "orbit": {**SATELLITE["orbit"], "ECCENTRICITY": 1.2}}
    write(folder, {"satellites": [SATELLITE, wrong]}, "fleet.json")
    write(folder, {"satellites": [{**SATELLITE, "id": "plover", "orbit": None}]}, "bare.json")
    as_of = ("--as-of", "2026-08-10T06:00:00Z")
    calls = {
        "migrate": ("migrate",),
        "again": ("migrate",),
        "load": ("load", "fleet.json", "bare.json"),
        "compute": ("compute", *as_of),
        "unknown": ("compute", "--satellite", "nobody"),
        "repeat": ("compute", *as_of, "--satellite", "kestrel-1"),
    }
    return {name: run(folder, *call, **SERIAL) for name, call in calls.items()}


def test_migrate_says_what_it_did(done: dict[str, Done]) -> None:
    assert [done[name].returncode for name in ("migrate", "again")] == [0, 0]
    assert "now at the newest schema" in done["migrate"].stdout
    assert "already at the newest schema" in done["again"].stdout


def test_load_reports_both_sides_and_ends_with_1(done: dict[str, Done]) -> None:
    assert is_refusal(done["load"])
    assert "refused 1 of 4" in done["load"].stderr
    lines = done["load"].stdout.splitlines()
    assert lines[0] == "fleet.json: satellite 'kestrel-1' registered"
    assert [line for line in lines if line.startswith("refused: ")] == [
        line for line in lines if "satellites.1.orbit" in line and "ECCENTRICITY" in line
    ]


def test_compute_tells_the_outcome_and_marks_the_satellite_without_an_orbit(done: dict[str, Done]) -> None:
    assert (done["compute"].returncode, done["compute"].stderr) == (0, "")
    head, reason = done["compute"].stdout.splitlines()
    assert "published: 1 satellite computed, 1 failed" in head
    assert reason.strip().startswith("plover: ")


def test_compute_refuses_an_unknown_satellite_by_name(done: dict[str, Done]) -> None:
    assert is_refusal(done["unknown"])
    assert "'nobody'" in done["unknown"].stderr


def test_the_same_again_brings_no_new_revision(done: dict[str, Done]) -> None:
    assert "1 satellite computed, 0 failed, 0 new advisory revisions" in done["repeat"].stdout


def test_a_terminal_gets_a_progress_bar_and_a_file_does_not(done: dict[str, Done], tmp_path: Path) -> None:
    assert done["compute"].stderr == ""
    write(tmp_path, {"satellites": [SATELLITE]}, "fleet.json")
    for call in (("migrate",), ("load", "fleet.json")):
        assert run(tmp_path, *call).returncode == 0
    reader, terminal = pty.openpty()
    termios.tcsetwinsize(terminal, (24, 80))
    with start(tmp_path, "compute", "--as-of", "2026-08-10T06:00:00Z", errors=terminal, **SERIAL) as process:
        os.close(terminal)
        shown = read_terminal(reader)
    assert process.returncode == 0
    assert "satellite" in shown


def read_terminal(descriptor: int) -> str:
    """All that is written to a pseudo-terminal until its last writer has gone."""
    shown = b""
    try:
        while part := os.read(descriptor, 4096):
            shown += part
    except OSError as error:
        if error.errno != errno.EIO:  # what Linux says at the end
            raise
    os.close(descriptor)
    return shown.decode()
