"""What the deployment files say, taken apart."""

from __future__ import annotations

import configparser
import re
import shlex
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import yaml

ROOT = Path(__file__).resolve().parents[2]
DEPLOY = ROOT / "deploy"
DOCKERFILE = (DEPLOY / "Dockerfile").read_text(encoding="utf-8")
PROXY = (DEPLOY / "nginx" / "stonechat.conf").read_text(encoding="utf-8")
UNITS = sorted(path.name for path in (DEPLOY / "systemd").glob("stonechat*.*") if path.suffix != ".env")
SERVICES = ["stonechat.service", "stonechat-compute.service"]


def compose() -> dict[str, Any]:
    document: dict[str, Any] = yaml.safe_load((DEPLOY / "compose.yaml").read_text(encoding="utf-8"))
    return document


def instructions(name: str) -> list[list[str]]:
    """Arguments of each Dockerfile instruction called ``name``, continuation lines joined."""
    joined = re.sub(r"\\\n\s*", "", DOCKERFILE)
    return [shlex.split(line)[1:] for line in joined.splitlines() if line.split(" ")[0] == name]


def unit(name: str) -> configparser.ConfigParser:
    """A systemd unit; a key given twice is an error of ours."""
    parser = configparser.ConfigParser(interpolation=None, delimiters=("=",), comment_prefixes=("#",))
    parser.optionxform = str
    parser.read_string((DEPLOY / "systemd" / name).read_text(encoding="utf-8"))
    return parser


def unit_commands(name: str) -> Iterator[list[str]]:
    for key, value in unit(name)["Service"].items():
        if key.startswith("Exec"):
            yield shlex.split(value)


def shell_commands(text: str) -> Iterator[list[str]]:
    """Each call of stonechat in a shell text."""
    for found in re.finditer(r"stonechat ((?:load|compute|serve|migrate|trial|demo)\b[^&\n'`]*)", text):
        yield shlex.split(found[1], comments=True)


def setting_names() -> Iterator[tuple[str, str]]:
    """(file, STONECHAT_ variable) for every variable that a deployment file names."""
    for path in sorted(DEPLOY.rglob("*")):
        if path.is_file():
            for name in re.findall(r"\bSTONECHAT_[A-Z_]+\b", path.read_text(encoding="utf-8")):
                yield str(path.relative_to(ROOT)), name
