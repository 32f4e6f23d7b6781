"""What a printed outlook is about: whose fleet, as of when, in which local time, with which results."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import UTC, datetime, timedelta, timezone
from typing import Any

from app.core.sky.bodies import wrap_deg
from app.core.sky.longitude import MEAN_SOLAR_MOTION_DEG_PER_S
from app.core.sky.times import parse_utc
from app.core.spacecraft.model import Policy

Advisory = dict[str, Any]
DAY_S = 86400.0
ORDER = {"shelter": 0, "ready": 1, "steady": 2}
MARGIN_DEG = 0.2  # a few hours: the Sun's motion is not quite even


@dataclass(frozen=True)
class Satellite:
    """One satellite's result; ``failure`` says why it could not be computed.

    ``policy``: its operator's own thresholds.
    """

    id: str
    name: str
    policy: Policy
    failure: str | None
    advisories: tuple[Advisory, ...]


@dataclass(frozen=True)
class Scenario:
    """``utc_offset_hours``: of the console. ``maxima_deg``: solar longitude of each stream's own maximum."""

    operator: str
    as_of_unix_s: float
    utc_offset_hours: float
    outlook_days: float
    maxima_deg: dict[str, float]

    @property
    def zone_name(self) -> str:
        """How the console's time zone is written."""
        return f"UTC{self.utc_offset_hours:+g}"

    def local(self, moment: str, form: str = "%a %d %b %H:%M") -> str:
        """A stored time as the console's clock shows it."""
        zone = timezone(timedelta(hours=self.utc_offset_hours))
        return datetime.fromtimestamp(parse_utc(moment), UTC).astimezone(zone).strftime(form)

    def span(self, start: str, end: str) -> str:
        """Two local times; the second without its date when that is the same."""
        same_day = self.local(start, "%d %b") == self.local(end, "%d %b")
        return f"{self.local(start)} to {self.local(end, '%H:%M') if same_day else self.local(end)}"

    def is_past_maximum(self, advisory: Advisory) -> bool:
        """Whether the stream's own maximum is over, so that the advisory's peak is the worst still to come."""
        beyond_deg = wrap_deg(advisory["peak_solar_longitude_deg"] - self.maxima_deg[advisory["stream"]])
        ahead_s = parse_utc(advisory["peak_at"]) - self.as_of_unix_s
        return float(beyond_deg) > ahead_s * MEAN_SOLAR_MOTION_DEG_PER_S + MARGIN_DEG

    def near(self, satellite: Satellite) -> list[Advisory]:
        """Advisories whose peak lies within the outlook's days, in the order of their peaks."""
        until = self.as_of_unix_s + self.outlook_days * DAY_S
        found = [a for a in satellite.advisories if parse_utc(a["peak_at"]) <= until]
        return sorted(found, key=lambda a: (a["peak_at"], a["id"]))

    def urgent(self, satellite: Satellite) -> list[Advisory]:
        """Those of them that ask for something, the most urgent first."""
        found = [a for a in self.near(satellite) if a["level"] != "steady"]
        return sorted(found, key=lambda a: ORDER[a["level"]])

    def by_urgency(self, fleet: list[Satellite]) -> list[Satellite]:
        """Satellites without a result first, then those to shelter, those to make ready, the steady ones."""

        def rank(member: Satellite) -> tuple[int, str]:
            levels = [ORDER[a["level"]] for a in self.near(member)]
            return -1 if member.failure else min(levels, default=len(ORDER)), member.id

        return sorted(fleet, key=rank)
