"""Imports point one way: cli, api, commands, jobs -> store, formats, top-level modules -> core, and inside core too.

The arrows of the style page, read from the source; a new module without a layer fails until it has one.
"""

from __future__ import annotations

import ast
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent
# Layer of a module by its longest prefix, and the layers it may import from besides its own.
LAYERS: dict[str, tuple[str, set[str]]] = {}


def layer(name: str, prefixes: tuple[str, ...], may_import: set[str]) -> None:
    for prefix in prefixes:
        LAYERS[prefix] = (name, may_import)


layer("errors", ("app.errors",), set())
layer("package", ("app",), set())
layer("core.constants", ("app.core", "app.core.constants"), {"errors"})
layer("core.sky", ("app.core.sky",), {"core.constants", "errors"})
SKY = {"core.sky", "core.constants", "errors"}
layer("core.streams", ("app.core.streams",), SKY)
layer("core.orbit", ("app.core.orbit",), SKY)
layer("core.spacecraft", ("app.core.spacecraft",), SKY)
NOUNS = {"core.streams", "core.orbit", "core.spacecraft", *SKY}
layer("core.exposure", ("app.core.exposure",), NOUNS)
layer("core.run", ("app.core.run",), NOUNS)
layer("core.advice", ("app.core.advice",), {"core.exposure", "core.run", *NOUNS})
layer("core.trial", ("app.core.trial",), {"core.advice", "core.exposure", *NOUNS})
CORE = {name for name, _ in LAYERS.values() if name.startswith("core")}
layer("settings", ("app.settings", "app.resources"), {"errors"})
layer("formats", ("app.formats",), {"errors", *CORE})
PLAIN = {"formats", "settings", "errors", *CORE}
layer("pipeline", ("app.pipeline", "app.on_demand", "app.trial", "app.catalogue_file"), PLAIN)
layer("store", ("app.store",), PLAIN | {"pipeline", "package"})
INNER = {"store", "pipeline", "package", *PLAIN}
layer("jobs", ("app.jobs",), INNER)
layer("api", ("app.api",), {"jobs", *INNER})
layer("commands", ("app.commands",), {"api", "jobs", *INNER})
layer("cli", ("app.cli",), {"commands", "api", "jobs", *INNER})

CORE_LIBRARIES = {"numpy", "erfa", "sgp4"}
# A pure core reads no clock, file, network, environment or database.
IMPURE = {
    *(
        "time",
        "os",
        "io",
        "socket",
        "ssl",
        "http",
        "urllib",
        "subprocess",
        "threading",
        "multiprocessing",
        "asyncio",
    ),
    *(
        "pathlib",
        "shutil",
        "tempfile",
        "sqlite3",
        "random",
        "secrets",
        "uuid",
        "logging",
        "importlib",
        "concurrent",
    ),
}
CLOCKS = {"now", "utcnow", "today", "time", "time_ns"}  # of datetime, date and time


def module_of(path: Path, root: Path = ROOT) -> str:
    parts = path.relative_to(root).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


def layer_of(module: str) -> str:
    """Layer of a module; a part of the program that is in no layer has none."""
    if module == "app":
        return LAYERS["app"][0]
    prefixes = [p for p in LAYERS if p != "app" and (module == p or module.startswith(f"{p}."))]
    if not prefixes or (max(prefixes, key=len) == "app.core" and module != "app.core"):
        raise AssertionError(f"{module} is in no layer; give it one in tests/test_arrows.py")
    return LAYERS[max(prefixes, key=len)][0]


def allowed(name: str) -> set[str]:
    return {name}.union(*(may for own, may in LAYERS.values() if own == name))


def imports(source: str, module: str) -> Iterator[tuple[int, str]]:
    """Line and full name of everything imported, wherever in the file."""
    for node in ast.walk(ast.parse(source)):
        if isinstance(node, ast.Import):
            yield from ((node.lineno, alias.name) for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            if node.level:
                raise AssertionError(f"{module}, line {node.lineno}: relative import; write the full name")
            for alias in node.names:
                whole = f"{node.module}.{alias.name}"
                yield node.lineno, whole if is_module(whole) else str(node.module)


def is_module(name: str) -> bool:
    path = ROOT.joinpath(*name.split("."))
    return path.is_dir() or path.with_suffix(".py").exists()


def wrong_arrows(source: str, module: str) -> list[str]:
    """Every import that points against the arrows, in words."""
    own = layer_of(module)
    found = []
    for line, target in imports(source, module):
        if target.split(".")[0] == "app" and layer_of(target) not in allowed(own):
            found.append(f"{module}, line {line}: {own} -> {layer_of(target)} ({target})")
        elif own.startswith("core") and is_foreign(target):
            found.append(f"{module}, line {line}: {own} -> {target}")
    return found


def is_foreign(target: str) -> bool:
    """Whether the core may not know a library."""
    top = target.split(".")[0]
    if top in CORE_LIBRARIES or top == "app":
        return False
    return top not in sys.stdlib_module_names or top in IMPURE


def clock_readings(source: str, module: str) -> list[str]:
    return [
        f"{module}, line {node.lineno}: {ast.unparse(node)} reads the clock"
        for node in ast.walk(ast.parse(source))
        if isinstance(node, ast.Attribute)
        and node.attr in CLOCKS
        and isinstance(node.value, ast.Name)
        and node.value.id in ("datetime", "date", "time")
    ]


FILES = sorted(ROOT.joinpath("app").rglob("*.py"))
IN_CORE = [path for path in FILES if module_of(path).startswith("app.core")]


@pytest.mark.parametrize("path", FILES, ids=module_of)
def test_every_import_follows_the_arrows(path: Path):
    wrong = wrong_arrows(path.read_text("utf-8"), module_of(path))
    assert not wrong, "against the arrows:\n" + "\n".join(wrong)


@pytest.mark.parametrize("path", IN_CORE, ids=module_of)
def test_the_core_reads_no_clock_and_opens_no_file(path: Path):
    source = path.read_text("utf-8")
    assert clock_readings(source, module_of(path)) == []
    calls = [
        n for n in ast.walk(ast.parse(source)) if isinstance(n, ast.Call) and isinstance(n.func, ast.Name)
    ]
    assert not {"open", "input", "print", "eval", "exec", "__import__"} & {ast.unparse(n.func) for n in calls}


@pytest.mark.parametrize(
    ("module", "line", "arrow"),
    [
        ("app.core.sky.times", "from app.core.streams.model import Stream", "core.sky -> core.streams"),
        ("app.core.streams.flux", "from app.core.orbit import averaging", "core.streams -> core.orbit"),
        ("app.core.orbit.trust", "from app.core.exposure.faces import Row", "core.orbit -> core.exposure"),
        ("app.core.exposure.faces", "import app.core.advice.events", "core.exposure -> core.advice"),
        ("app.core.advice.plan", "from app.core.trial import Trial", "core.advice -> core.trial"),
        ("app.core.advice.plan", "from app.formats import omm", "core.advice -> formats"),
        ("app.core.run", "from app.settings import Settings", "core.run -> settings"),
        ("app.core.run", "import time", "core.run -> time"),
        ("app.core.run", "def f():\n    from os import environ", "core.run -> os"),
        ("app.core.run", "import socket", "core.run -> socket"),
        ("app.core.run", "from sqlalchemy import select", "core.run -> sqlalchemy"),
        ("app.core.run", "from pydantic import BaseModel", "core.run -> pydantic"),
        ("app.core.run", "import scipy.optimize", "core.run -> scipy"),
        ("app.formats.omm", "from app.store import session", "formats -> store"),
        ("app.formats.omm", "from app.pipeline import RunInputs", "formats -> pipeline"),
        ("app.pipeline", "from app.store.session import Store", "pipeline -> store"),
        ("app.store.runs", "from app.api.app import create_app", "store -> api"),
        ("app.store.runs", "from app.jobs.run import compute", "store -> jobs"),
        ("app.store.runs", "import app.cli", "store -> cli"),
        ("app.jobs.run", "from app.api import deps", "jobs -> api"),
        ("app.api.app", "from app.commands import serve", "api -> commands"),
        ("app.errors", "from app.core.run import RunInputs", "errors -> core.run"),
    ],
)
def test_a_wrong_arrow_is_shown(module: str, line: str, arrow: str):
    (wrong,) = wrong_arrows(f"import math\n{line}\n", module)
    assert wrong.startswith(f"{module}, line ")
    assert arrow in wrong


@pytest.mark.parametrize(
    ("module", "line"),
    [
        ("app.core.exposure.background", "from app.core.orbit.averaging import Ellipse"),
        ("app.store.drafts", "from app.core.advice.revision import changes"),
        ("app.core.trial", "from app.core.advice.advisory import CAUTION"),
        ("app.core.sky.bodies", "import erfa\nimport numpy as np\nfrom functools import cache"),
        ("app.cli", "from app.commands import serve"),
    ],
)
def test_a_right_arrow_is_not(module: str, line: str):
    assert wrong_arrows(line, module) == []


def test_a_clock_in_the_core_is_shown():
    found = clock_readings("from datetime import datetime, UTC\nx = datetime.now(UTC)\n", "app.core.run")
    assert found == ["app.core.run, line 2: datetime.now reads the clock"]


@pytest.mark.parametrize("module", ["app.pages", "app.core.notes"])
def test_a_module_without_a_layer_is_asked_for_one(module: str):
    with pytest.raises(AssertionError, match="is in no layer"):
        layer_of(module)
