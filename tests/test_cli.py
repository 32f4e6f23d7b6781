"""The command line's own work: dispatch, signals, and what becomes of errors."""

from __future__ import annotations

import importlib
import signal
import sqlite3
from pathlib import Path

import pytest

from app.cli import build_parser, main
from app.settings import SQLITE_FILE

CALLS = {
    "demo": ["demo", "--once"],
    "load": ["load", "a", "b"],
    "compute": ["compute", "--satellite", "a", "b", "--satellite", "c"],
    "trial": ["trial", "-"],
    "serve": ["serve", "--port", "1", "--host", "::1"],
    "migrate": ["migrate", "--dir", "x"],
}


@pytest.mark.parametrize("name", CALLS)
def test_every_command_has_its_module(name: str) -> None:
    options = build_parser().parse_args(CALLS[name])
    assert options.module == f"app.commands.{name}"
    assert callable(importlib.import_module(options.module).run)


def test_satellites_may_be_given_together_or_one_by_one() -> None:
    assert build_parser().parse_args(CALLS["compute"]).satellite == ["a", "b", "c"]


def test_times_are_utc_with_z() -> None:
    options = build_parser().parse_args(["compute", "--as-of", "2026-08-10T06:00:00Z"])
    assert options.as_of == 1_786_341_600.0


def test_a_signal_handler_of_the_caller_stays(tmp_path: Path) -> None:
    before = signal.getsignal(signal.SIGTERM)
    assert main(["migrate", "--dir", str(tmp_path)]) == 0
    assert signal.getsignal(signal.SIGTERM) is before


def test_a_damaged_database_is_one_line(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["migrate", "--dir", str(tmp_path)]) == 0
    with sqlite3.connect(tmp_path / SQLITE_FILE) as connection:
        connection.execute("DROP TABLE runs")
    connection.close()
    assert main(["compute", "--as-of", "2026-08-10T06:00:00Z", "--dir", str(tmp_path)]) == 1
    assert capsys.readouterr().err == "stonechat: the database failed: no such table: runs\n"


def test_a_database_of_a_later_version_is_left_alone(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["migrate", "--dir", str(tmp_path)]) == 0
    with sqlite3.connect(tmp_path / SQLITE_FILE) as connection:
        connection.execute("UPDATE alembic_version SET version_num = '9999'")
    connection.close()
    assert main(["migrate", "--dir", str(tmp_path)]) == 1
    assert "made by a later version" in capsys.readouterr().err
