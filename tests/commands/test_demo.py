"""The demo's folder, its scenario, and the levels it shows."""

from __future__ import annotations

from pathlib import Path

import pytest

from app.cli import main
from app.commands.demo import MARK, demo_files
from app.core.spacecraft.model import AttitudeLawKind
from app.formats.fleet import read_fleet
from app.formats.orbit import read_orbits
from app.resources import resource_dir
from app.settings import SQLITE_FILE

DATA = resource_dir("data_demo")


def test_scenario_is_read_from_its_file() -> None:
    scenario = demo_files(DATA).scenario
    assert "invented" in scenario.operator
    assert scenario.as_of_unix_s == 1_786_341_600.0  # 2026-08-10T06:00:00Z
    assert scenario.maxima_deg["PER"] == pytest.approx(140.0, abs=0.5)


def test_fleet_covers_the_regimes_and_attitude_laws() -> None:
    fleet = read_fleet((DATA / "fleet.toml").read_bytes(), "fleet.toml")
    assert fleet.refused == []
    assert len(fleet.satellites) >= 7
    assert {craft.attitude.kind for craft, _ in fleet.satellites} == set(AttitudeLawKind)


def test_orbits_come_in_every_notation_and_are_days_old_at_most() -> None:
    files = demo_files(DATA)
    paths = [path for path in files.paths if path.name != "fleet.toml"]
    assert {path.suffix for path in paths} == {".json", ".xml", ".kvn", ".csv"}
    for path in paths:
        for elements in read_orbits(path.read_bytes(), path.name):
            assert 0.0 < files.scenario.as_of_unix_s - elements.epoch_unix_s < 2.0 * 86_400.0


def test_a_database_of_the_users_is_never_replaced(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / SQLITE_FILE).write_bytes(b"precious")
    assert main(["demo", "--once", "--dir", str(tmp_path)]) == 1
    assert "was not made by the demo" in capsys.readouterr().err
    assert (tmp_path / SQLITE_FILE).read_bytes() == b"precious"


def test_a_folder_is_kept_and_its_demo_made_anew(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    folder = tmp_path / "kept"
    folder.mkdir()
    (folder / SQLITE_FILE).write_bytes(b"left by a demo that was killed")
    (folder / MARK).touch()
    assert main(["demo", "--once", "--dir", str(folder)]) == 0
    assert (folder / SQLITE_FILE).read_bytes().startswith(b"SQLite format 3")
    shown = capsys.readouterr().out
    assert {"SHELTER", "READY", "steady"} <= set(shown.split())
