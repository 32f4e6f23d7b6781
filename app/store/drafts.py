"""Which new revisions a run's results call for: a pure rule, no database."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from app.core.advice import revision as rule
from app.core.sky.times import parse_utc

NO_LONGER = "The newest computation no longer finds this passage."
REMOVED = "The satellite was removed from the register."


@dataclass(frozen=True)
class Head:
    """The latest published revision of an advisory."""

    revision: int
    status: str  # current or withdrawn
    body: dict[str, Any]


@dataclass(frozen=True)
class Draft:
    """A revision to be published; ``body`` holds its number and its changes, not its status."""

    advisory_id: str
    revision: int
    status: str  # current or withdrawn
    body: dict[str, Any]


def drafts(
    heads: Mapping[str, Head],
    bodies: Sequence[dict[str, Any]],
    as_of_unix_s: float,
    looked_until_unix_s: float = math.inf,
) -> list[Draft]:
    """Compare what a run produced for one satellite with what is published for it.

    An advisory that is new, or comes back after a withdrawal, gets a revision; one that changed in a way an
    operator acts on gets a revision; one that is no longer produced and has not ended is withdrawn, unless
    it begins after ``looked_until_unix_s``, up to where the run looked: there it says nothing.
    """
    produced = {body["id"] for body in bodies}
    candidates = [_draft(heads.get(body["id"]), body, as_of_unix_s) for body in bodies]
    gone = [
        head
        for advisory_id, head in heads.items()
        if advisory_id not in produced and parse_utc(head.body["onset"], "onset") < looked_until_unix_s
    ]
    return [draft for draft in candidates if draft] + withdrawals(gone, as_of_unix_s, NO_LONGER)


def withdrawals(heads: Sequence[Head], as_of_unix_s: float, reason: str) -> list[Draft]:
    """Withdraw those advisories that are current and have not ended."""
    return [
        _numbered(head.revision + 1, "withdrawn", rule.withdrawal(head.body, as_of_unix_s, reason))
        for head in heads
        if head.status == "current" and parse_utc(head.body["end"], "end") > as_of_unix_s
    ]


def _draft(head: Head | None, body: dict[str, Any], as_of_unix_s: float) -> Draft | None:
    if head is None:
        return _numbered(1, "current", {**body, "changes": rule.first()})
    if head.status == "withdrawn":
        return _numbered(head.revision + 1, "current", {**body, "changes": rule.again()})
    changes = rule.changes(head.body, body, as_of_unix_s)
    if not changes:
        return None
    why = rule.causes(head.body, body)
    return _numbered(head.revision + 1, "current", {**body, "changes": [*changes, *why]})


def _numbered(number: int, status: str, body: dict[str, Any]) -> Draft:
    # The status is kept beside the body, never in it: the body is not edited when it is superseded.
    kept = {name: value for name, value in body.items() if name != "status"}
    return Draft(body["id"], number, status, {**kept, "revision": number})
