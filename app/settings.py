"""STONECHAT_* environment variables -> one frozen object."""

from __future__ import annotations

import os
from collections.abc import Iterator
from pathlib import Path
from typing import Any, Literal, Self

from pydantic import Field, ValidationError, field_validator, model_validator
from pydantic_settings import BaseSettings, SettingsConfigDict
from sqlalchemy.engine import URL, make_url
from sqlalchemy.exc import ArgumentError

from app.errors import SettingsError

PREFIX = "STONECHAT_"
TEST_PREFIX = "STONECHAT_TEST_"  # read by the test suite, never by the program
SQLITE_FILE = "stonechat.sqlite"
DRIVERS = ("sqlite", "postgresql+psycopg")


class Settings(BaseSettings):
    """What an operator may set; each field is the variable ``STONECHAT_<FIELD>``."""

    model_config = SettingsConfigDict(
        env_prefix=PREFIX, frozen=True, extra="forbid", env_ignore_empty=True, hide_input_in_errors=True
    )

    dir: Path = Path()
    database_url: str = Field(default="", repr=False)  # may carry a password
    connections: int = Field(default=20, ge=2, le=1000)
    workers: int = Field(default_factory=lambda: os.cpu_count() or 1, ge=0, le=1024)
    executor: Literal["serial", "processes"] = "processes"
    mass_law: Literal["jvb", "verniani"] = "jvb"
    horizon_low_days: float = Field(default=7.0, gt=0.0, le=60.0)
    horizon_high_days: float = Field(default=14.0, gt=0.0, le=120.0)
    outlook_days: float = Field(default=400.0, gt=0.0, le=800.0)
    log_level: Literal["debug", "info", "warning", "error"] = "info"
    ready_max_run_age_s: float = Field(default=172_800.0, gt=0.0)

    @field_validator("database_url")
    @classmethod
    def _known_database(cls, text: str) -> str:
        if not text:
            return text
        url = _url(text)
        if url.drivername not in DRIVERS:
            raise ValueError("must begin with sqlite:/// or postgresql+psycopg://")
        if "%00" in text:  # the driver would take what stands before it for the whole
            raise ValueError("must not hold %00")
        if url.drivername == "sqlite":
            _check_sqlite(url)
        if any("password" in name for name in url.query):
            raise ValueError("must not carry a password after '?', where it would be shown; use PGPASSWORD")
        return text

    @field_validator("dir", "database_url")
    @classmethod
    def _utf_8(cls, value: Path | str) -> Path | str:
        try:
            str(value).encode("utf-8")
        except UnicodeEncodeError:
            raise ValueError("is not UTF-8; use another name") from None
        return value

    @model_validator(mode="after")
    def _horizons_inside_outlook(self) -> Self:
        if max(self.horizon_low_days, self.horizon_high_days) > self.outlook_days:
            raise ValueError("the two horizons must not be longer than STONECHAT_OUTLOOK_DAYS")
        return self

    @property
    def database(self) -> URL:
        """The database to use: ``database_url``, else an SQLite file in ``dir``."""
        if self.database_url:
            return _url(self.database_url)
        return URL.create("sqlite", database=str(self.dir / SQLITE_FILE))


def load_settings(**overrides: Any) -> Settings:
    """Read the environment; ``overrides`` (from options; None means not given) win.

    Raises ``SettingsError`` naming every variable that is unknown or wrong, never its value.
    """
    given = {name: value for name, value in overrides.items() if value is not None}
    problems = list(_unknown_variables())
    if problems:
        raise SettingsError("; ".join(problems))
    try:
        return Settings(**given)
    except ValidationError as error:
        raise SettingsError("; ".join(_problems(error))) from None


def _unknown_variables() -> Iterator[str]:
    known = {PREFIX + name.upper() for name in Settings.model_fields}
    for name in sorted(os.environ):
        upper = name.upper()
        if upper.startswith(PREFIX) and not upper.startswith(TEST_PREFIX) and upper not in known:
            yield f"{name}: no such setting; the settings are {', '.join(sorted(known))}"


def _problems(error: ValidationError) -> Iterator[str]:
    for each in error.errors(include_url=False, include_context=False):
        name = PREFIX + str(each["loc"][0]).upper() if each["loc"] else "settings"
        yield f"{name}: {each['msg'].removeprefix('Value error, ')}"


def _check_sqlite(url: URL) -> None:
    if url.database in (None, "", ":memory:"):
        raise ValueError("must name a file, such as sqlite:////var/lib/stonechat/stonechat.sqlite")
    if url.query:
        raise ValueError("takes no options after '?' with sqlite; leave them out")


def _url(text: str) -> URL:
    try:
        return make_url(text)
    except (ArgumentError, ValueError):
        raise ValueError("is not a database URL such as postgresql+psycopg://user@host/name") from None
