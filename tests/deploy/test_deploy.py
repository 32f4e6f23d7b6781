"""Deployment files against the program they deploy; what needs a container engine or systemd is not run here."""

from __future__ import annotations

import re
import tomllib

import pytest

from app.api.bodies import MAX_BODY_BYTES
from app.cli import DEFAULT_PORT, build_parser
from app.settings import PREFIX, Settings
from tests.deploy.deployment import (
    DEPLOY,
    DOCKERFILE,
    PROXY,
    ROOT,
    SERVICES,
    UNITS,
    compose,
    instructions,
    setting_names,
    shell_commands,
    unit,
    unit_commands,
)

PROGRAM = "/opt/stonechat/bin/stonechat"
SIZE = {"k": 2**10, "m": 2**20}


def test_every_variable_is_a_setting() -> None:
    known = {PREFIX + name.upper() for name in Settings.model_fields}
    named = list(setting_names())
    assert len(named) > 5
    assert [each for each in named if each[1] not in known] == []


def test_values_given_in_units_and_images_are_accepted() -> None:
    lines = (DEPLOY / "systemd" / "stonechat.env").read_text(encoding="utf-8").splitlines()
    pairs = [line.lstrip("#").split("=", 1) for line in lines if line.lstrip("#").startswith(PREFIX)]
    pairs += [["STONECHAT_DATABASE_URL", compose()["x-stonechat"]["environment"]["STONECHAT_DATABASE_URL"]]]
    values = {name.removeprefix(PREFIX).lower(): value for name, value in pairs}
    assert Settings.model_validate(values).database.database == "stonechat"


@pytest.mark.parametrize("service", ["migrate", "api"])
def test_compose_commands_exist(service: str) -> None:
    options = build_parser().parse_args(compose()["services"][service]["command"])
    assert options.module.startswith("app.commands.")


def test_compose_waits_for_what_a_service_needs() -> None:
    services = compose()["services"]
    assert services["migrate"]["depends_on"] == {"database": {"condition": "service_healthy"}}
    for name in ("api", "compute"):
        assert services[name]["depends_on"]["migrate"]["condition"] == "service_completed_successfully"


def test_compose_publishes_on_loopback_only() -> None:
    ports = [port for service in compose()["services"].values() for port in service.get("ports", [])]
    assert ports == [f"127.0.0.1:{DEFAULT_PORT}:{DEFAULT_PORT}"]


def test_compose_passwords_have_no_default() -> None:
    text = (DEPLOY / "compose.yaml").read_text(encoding="utf-8")
    assert all(":?" in each for each in re.findall(r"\$\{[^}]*PASSWORD[^}]*\}", text))


@pytest.mark.parametrize("name", ["compose.yaml", "README.md"])
def test_calls_in_shell_text_exist(name: str) -> None:
    calls = list(shell_commands((DEPLOY / name).read_text(encoding="utf-8")))
    assert calls
    for call in calls:
        build_parser().parse_args(call)


def test_image_copies_what_exists_and_what_the_wheel_needs() -> None:
    copied = {part.removeprefix("./") for each in instructions("COPY") for part in each[:-1]}
    copied = {part for part in copied if not part.startswith(("--from", "/opt"))}
    assert [part for part in copied if not (ROOT / part).exists() and part != "README.md"] == []
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))
    wheel = project["tool"]["hatch"]["build"]["targets"]["wheel"]
    needed = {
        *wheel["packages"],
        *wheel["force-include"],
        *project["project"]["license-files"],
        "pyproject.toml",
    }
    assert needed <= copied
    ignored = (DEPLOY / "Dockerfile.dockerignore").read_text(encoding="utf-8").split()
    assert copied <= {each.removeprefix("!") for each in ignored if each.startswith("!")}


def test_image_runs_without_root_and_tells_its_health() -> None:
    assert instructions("USER")[-1][0].split(":")[0] not in ("", "0", "root")
    assert [f"{DEFAULT_PORT}"] in instructions("EXPOSE")
    assert f"http://127.0.0.1:{DEFAULT_PORT}/readyz" in DOCKERFILE
    assert DOCKERFILE.count("\nFROM ") + DOCKERFILE.startswith("FROM ") == 2


def test_image_starts_an_existing_command() -> None:
    (entry,), (command,) = (
        re.findall(rf"^{name} \[(.*)\]$", DOCKERFILE, re.MULTILINE) for name in ("ENTRYPOINT", "CMD")
    )
    assert entry == '"stonechat"'
    options = build_parser().parse_args([each.strip().strip('"') for each in command.split(",")])
    assert (options.host, options.port) == ("0.0.0.0", DEFAULT_PORT)


@pytest.mark.parametrize("name", SERVICES)
def test_units_call_existing_commands(name: str) -> None:
    commands = list(unit_commands(name))
    assert commands
    for program, *arguments in commands:
        assert program == PROGRAM
        build_parser().parse_args(arguments)


def test_units_are_hardened_alike() -> None:
    kinds = (
        "Protect",
        "Private",
        "Restrict",
        "System",
        "NoNew",
        "Capability",
        "Lock",
        "State",
        "User",
        "UMask",
    )
    served, computed = (
        {key: value for key, value in unit(name)["Service"].items() if key.startswith(kinds)}
        for name in SERVICES
    )
    assert served == computed
    assert served["NoNewPrivileges"] == "yes"
    assert served["ProtectSystem"] == "strict"


def test_timer_starts_the_service_of_its_name() -> None:
    assert {"stonechat-compute.timer", "stonechat-compute.service", "stonechat.service"} <= set(UNITS)
    assert "Unit" not in unit("stonechat-compute.timer")["Timer"]
    assert unit("stonechat-compute.timer")["Install"]["WantedBy"] == "timers.target"
    assert unit("stonechat-compute.service")["Service"]["Type"] == "oneshot"


def test_runs_come_often_enough_to_stay_ready() -> None:
    every_s = float(compose()["services"]["compute"]["environment"]["COMPUTE_EVERY_S"])
    hours = re.search(r"00/(\d+):", unit("stonechat-compute.timer")["Timer"]["OnCalendar"])
    assert hours is not None
    assert 2 * max(every_s, float(hours[1]) * 3600) < Settings().ready_max_run_age_s


def test_proxy_blocks_are_closed() -> None:
    depth = 0
    for character in re.sub(r"#.*", "", PROXY):
        depth += (character == "{") - (character == "}")
        assert depth >= 0
    assert depth == 0
    statements = [line.strip() for line in re.sub(r"#.*", "", PROXY).splitlines()]
    assert [line for line in statements if line and line[-1] not in ";{}"] == []


def test_proxy_reaches_the_service_and_takes_what_it_takes() -> None:
    ports = [each[-1] for program in unit_commands("stonechat.service") if "serve" in (each := program)]
    assert ports == [str(DEFAULT_PORT)]
    assert f"server 127.0.0.1:{DEFAULT_PORT};" in PROXY
    size = re.search(r"client_max_body_size (\d+)([km]);", PROXY)
    assert size is not None
    assert int(size[1]) * SIZE[size[2]] == MAX_BODY_BYTES


def test_proxy_leaves_tags_strong_where_if_match_is_honoured() -> None:
    """A weak tag never satisfies If-Match (RFC 9110 section 13.1.1); compression makes tags weak."""
    block = re.search(r"location ~ (\S+) \{\s*gzip off;", PROXY)
    assert block is not None
    plain = re.compile(block[1])
    assert plain.search("/v1/satellites/marram")
    assert plain.search("/v1/satellites/marram/orbit")
    assert not plain.search("/v1/satellites")
    assert not plain.search("/v1/satellites/marram/enhancement")
