"""What the repository holds and what travels inside the wheel."""

from __future__ import annotations

import subprocess
import tomllib
from pathlib import Path

import pytest

from app.resources import resource_dir

ROOT = Path(__file__).parents[1]
TOP = {
    *("pyproject.toml", "README.md", "DEVELOPERS.md", "LICENSE"),
    *("app", "migrations", "tests", "data_demo", "deploy"),
}


def test_nothing_else_lies_at_the_top() -> None:
    listed = subprocess.run(["git", "ls-files"], cwd=ROOT, capture_output=True, text=True, check=True).stdout
    top = {name.split("/")[0] for name in listed.splitlines()}
    assert {name for name in top if not name.startswith(".")} == TOP


def test_what_is_shipped_beside_the_code_is_where_the_code_looks() -> None:
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))
    shipped = project["tool"]["hatch"]["build"]["targets"]["wheel"]["force-include"]
    assert shipped == {"migrations": "app/_migrations", "data_demo": "app/_data_demo"}
    assert project["project"]["scripts"] == {"stonechat": "app.cli:main"}


@pytest.mark.parametrize(("name", "holds"), [("migrations", "env.py"), ("data_demo", "fleet.toml")])
def test_it_is_found(name: str, holds: str) -> None:
    assert (resource_dir(name) / holds).is_file()
