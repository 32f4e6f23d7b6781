"""README tells the truth: its commands, settings, examples and routes exist and work as shown."""

from __future__ import annotations

import json
import re
from pathlib import Path

import pytest

from app.api.app import create_app
from app.catalogue_file import load_catalogue
from app.cli import build_parser
from app.formats.fleet import read_fleet
from app.settings import PREFIX, Settings, load_settings
from app.store.session import open_store
from app.trial import run_trial

README = (Path(__file__).parents[1] / "README.md").read_text(encoding="utf-8")


def block(language: str, containing: str) -> str:
    """The one fenced block of a language that holds a text."""
    blocks = re.findall(rf"```{language}\n(.*?)```", README, flags=re.DOTALL)
    (found,) = (each for each in blocks if containing in each)
    return found


@pytest.mark.parametrize("name", ["demo", "test"])
def test_each_of_the_two_commands_is_one_line_that_needs_only_python(name: str) -> None:
    (command,) = re.findall(rf"<!-- {name} command -->\n```sh\n(.*)\n```", README)
    assert command.startswith("python3 -m venv .venv && .venv/bin/pip install ")


def test_every_command_shown_is_one_of_ours() -> None:
    shown = set(re.findall(r"stonechat (demo|load|compute|trial|serve|migrate)\b", README))
    help_text = build_parser().format_help()
    assert shown == {"demo", "load", "compute", "trial", "serve", "migrate"}
    assert all(command in help_text for command in shown)


def test_the_table_of_settings_is_complete_and_its_defaults_are_the_real_ones() -> None:
    table = README[README.index("## Settings") : README.index("`deploy/` holds")]
    assert set(re.findall(rf"`{PREFIX}([A-Z_]+)`", table)) == {name.upper() for name in Settings.model_fields}
    rows = [
        [cell.strip() for cell in line.split("|")[1:3]] for line in table.splitlines() if f"`{PREFIX}" in line
    ]
    shown = {
        name.lower(): default
        for names, defaults in rows
        for name, default in zip(re.findall(rf"{PREFIX}([A-Z_]+)", names), defaults.split(", "), strict=True)
    }
    real = {name: field.default for name, field in Settings.model_fields.items()}
    for name in (
        "connections",
        "horizon_low_days",
        "horizon_high_days",
        "outlook_days",
        "ready_max_run_age_s",
    ):
        assert float(shown[name]) == real[name], name
    for name in ("executor", "mass_law", "log_level"):
        assert shown[name].strip("`") == real[name], name


def test_the_trial_shown_gives_an_answer() -> None:
    answer = run_trial(json.loads(block("json", '"states"')), load_catalogue(), "jvb")
    (state,) = answer["states"]
    assert "PER" in [stream["code"] for stream in state["streams"]]
    assert state["faces"][0]["criteria"][0]["enhancement"]["mid"] > 1.0


def test_the_fleet_file_shown_is_read() -> None:
    fleet = read_fleet(block("toml", "[[satellites]]").encode(), "README.md")
    assert fleet.refused == []
    assert [spacecraft.id for spacecraft, _ in fleet.satellites] == ["kite-1"]


def test_every_call_listed_is_in_the_api(tmp_path: Path) -> None:
    with open_store(load_settings(dir=tmp_path)) as store:
        store.migrate()
        paths = create_app(load_settings(dir=tmp_path), store).state.openapi["paths"]
    known = {re.sub(r"\{\w+\}", "{}", path) for path in paths}
    table = README[README.index("| call | gives |") : README.index("An advisory gets a new revision")]
    rows = [line.split("|")[1] for line in table.splitlines() if line.startswith("| `")]
    calls = [call for row in rows for call in re.findall(r"(/[a-z.{}/]+)", row)]
    assert len(calls) > 15
    elsewhere = {"/livez", "/readyz", "/metrics", "/openapi.json", "/v"}  # the last from "not under /v1"
    missing = [c for c in calls if c not in elsewhere and re.sub(r"\{\w+\}", "{}", f"/v1{c}") not in known]
    assert missing == []
