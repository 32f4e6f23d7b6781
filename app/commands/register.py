"""The registered satellites, and which of them an orbit file means."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass

from sqlalchemy.orm import Session

from app.core.orbit.elements import MeanElements
from app.core.spacecraft.model import Spacecraft
from app.store.fleet import list_satellites

PAGE = 1000


@dataclass(frozen=True)
class Register:
    """Satellites by id. ``called``: ids of the satellites that go by a name or id, in small letters."""

    satellites: dict[str, Spacecraft]
    called: dict[str, set[str]]

    def owners(self, elements: MeanElements) -> list[str]:
        """Ids of the satellites whose id or name is the orbit's object name or object id; one, if all is well."""
        labels = (elements.object_name, elements.object_id)
        found: set[str] = set()
        for label in labels:
            found |= self.called.get(label.strip().casefold(), set())
        return sorted(found)


def read_register(session: Session) -> Register:
    """Read all registered satellites."""
    satellites: dict[str, Spacecraft] = {}
    called: dict[str, set[str]] = defaultdict(set)
    last: str | None = None
    while page := list_satellites(session, after=last, limit=PAGE):
        for record in page:
            satellites[record.id] = record.spacecraft
            for label in (record.id, record.spacecraft.name):
                called[label.strip().casefold()].add(record.id)
        last = page[-1].id
    return Register(satellites, dict(called))
