"""Advisories as a printed outlook, 80 columns wide."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta, timezone
from typing import Any

from app.core.advice.advisory import CAUTION
from app.core.sky.times import format_utc, parse_utc

Advisory = dict[str, Any]
WIDTH = 80
DAY_S = 86400.0
ORDER = {"shelter": 0, "ready": 1, "steady": 2}
SHOWN_LABELS = ("penetration", "charge")


@dataclass(frozen=True)
class Satellite:
    """One satellite's result; ``failure`` says why it could not be computed."""

    id: str
    name: str
    failure: str | None
    advisories: tuple[Advisory, ...]


@dataclass(frozen=True)
class Scenario:
    """Whose outlook it is, as of when, in which local time, how far ahead."""

    operator: str
    as_of_unix_s: float
    utc_offset_hours: float
    outlook_days: float

    @property
    def zone(self) -> timezone:
        """The console's own time zone."""
        return timezone(timedelta(hours=self.utc_offset_hours))

    @property
    def zone_name(self) -> str:
        """How that zone is written."""
        return f"UTC{self.utc_offset_hours:+g}"

    def local(self, moment: str, form: str = "%a %d %b %H:%M") -> str:
        """A stored time as the console's clock shows it."""
        return datetime.fromtimestamp(parse_utc(moment), UTC).astimezone(self.zone).strftime(form)


def outlook_lines(scenario: Scenario, fleet: Iterable[Satellite]) -> Iterator[str]:
    """Lines of the outlook: a head, what to act on, each satellite's passages, the caution."""
    members = sorted(
        fleet, key=lambda m: (min((ORDER[a["level"]] for a in near(scenario, m)), default=3), m.id)
    )
    yield from _head(scenario)
    yield ""
    yield from _to_act_on(scenario, members)
    for member in members:
        yield ""
        yield from _satellite(scenario, member)
    yield ""
    yield from textwrap.wrap(f"CAUTION: {CAUTION}", WIDTH)


def near(scenario: Scenario, satellite: Satellite) -> list[Advisory]:
    """Advisories whose peak lies within the outlook's days, the most urgent first."""
    until = scenario.as_of_unix_s + scenario.outlook_days * DAY_S
    found = [a for a in satellite.advisories if parse_utc(a["peak_at"]) <= until]
    return sorted(found, key=lambda a: (ORDER[a["level"]], a["peak_at"]))


def _head(scenario: Scenario) -> Iterator[str]:
    yield f"Meteoroid outlook for {scenario.operator}"
    days = f"the next {scenario.outlook_days:g} days"
    yield f"As of {format_utc(scenario.as_of_unix_s)}, {days}. Local times are {scenario.zone_name}."
    yield ""
    text = (
        "Factor: how many times its everyday background a face's hazard reaches at the worst moment (1.00 = "
        "nothing added); the worst face is named. Impacts: expected from the stream / from the background, on the "
        "whole satellite while the passage lasts. Lee: windows in which the Earth hides the streams that matter; "
        "'later' = they come with the plan, once the orbit is fresh enough for the peak."
    )
    yield from textwrap.wrap(text, WIDTH)


def _to_act_on(scenario: Scenario, members: Sequence[Satellite]) -> Iterator[str]:
    urgent = [(m, a) for m in members for a in near(scenario, m) if a["level"] != "steady"]
    if not urgent:
        yield "Nothing to act on."
        return
    yield "To act on:"
    for member, advisory in urgent:
        span = f"{scenario.local(advisory['onset'])} to {scenario.local(advisory['end'])}"
        yield f"  {advisory['level'].upper():<8}{member.name:<12}{advisory['passage']:<10}{span}"


def _satellite(scenario: Scenario, satellite: Satellite) -> Iterator[str]:
    title = f"{satellite.name} ({satellite.id})"
    yield f"{title} {'-' * (WIDTH - len(title) - 1)}"
    if satellite.failure:
        reason = f"not computed: {satellite.failure}"
        yield from textwrap.wrap(reason, WIDTH, initial_indent="  ", subsequent_indent="  ")
        return
    advisories = near(scenario, satellite)
    if not advisories:
        yield "  no passage"
        return
    heads = [f"{label}" for label in SHOWN_LABELS]
    yield _row("level", "passage", "peak / lee", *heads)
    for each in advisories:
        yield from _passage(scenario, each)


def _passage(scenario: Scenario, advisory: Advisory) -> Iterator[str]:
    level = advisory["level"] if advisory["level"] == "steady" else advisory["level"].upper()
    factors = [_worst(advisory, label) for label in SHOWN_LABELS]
    yield _row(level, advisory["passage"], scenario.local(advisory["peak_at"]), *factors)
    impacts = [_impacts(advisory, label) for label in SHOWN_LABELS]
    yield _row("", "", _lee(advisory), *impacts)
    if advisory["level"] != "steady" and advisory["lee_windows"]:
        first = advisory["lee_windows"][0]
        span = f"{scenario.local(first['start'])} to {scenario.local(first['end'], '%H:%M')}"
        yield f"{'':<18}first lee {span}"


def _row(level: str, passage: str, when: str, *columns: str) -> str:
    return f"{level:<8}{passage:<10}{when:<22}{columns[0]:<20}{columns[1]}".rstrip()


def _worst(advisory: Advisory, label: str) -> str:
    """Largest factor of a criterion over the faces, with the face's name."""
    faces = [e for e in advisory["enhancement_peak"] if e["criterion"] == label]
    if not faces:
        return "-"
    worst = max(faces, key=lambda e: e["mid"])
    return f"{worst['mid']:.2f} {_short(worst['face'])}" if worst["mid"] >= 1.005 else f"{worst['mid']:.2f}"


def _short(name: str) -> str:
    return name if len(name) <= 10 else f"{name[:9]}~"


def _impacts(advisory: Advisory, label: str) -> str:
    values = [
        next((e["mid"] for e in advisory[field] if e["criterion"] == label), None)
        for field in ("expected_impacts", "background_impacts")
    ]
    return " / ".join("-" if value is None else f"{value:.1e}" for value in values)


def _lee(advisory: Advisory) -> str:
    windows = advisory["lee_windows"]
    if advisory["depth"] == "outlook":
        return "lee later"
    if not windows:
        return "lee none"
    minutes = sorted(round(w["duration_s"] / 60.0) for w in windows)
    length = f"{minutes[0]}" if minutes[0] == minutes[-1] else f"{minutes[0]}-{minutes[-1]}"
    return f"lee {len(windows)} x {length} min"
