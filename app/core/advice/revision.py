"""When an advisory is worth a new revision, and what to say has moved.

A revision appears only when something an operator would act on has moved: the level, a peak factor by more
than 10 %, a time by more than 10 minutes, a window. What already lies in the past at ``as_of`` is history and
moves nothing. Everything here works on the advisory's own JSON form, so that the rule can be read beside it.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

from app.core.sky.times import format_utc, parse_utc

Body = Mapping[str, Any]
Change = dict[str, str]
FACTOR_CHANGE = 0.10
TIME_CHANGE_S = 600.0
COVERAGE_CHANGE_S = 86400.0
DEPTH_CAUSES = {
    (
        "outlook",
        "plan",
    ): "the plan, which looks at each minute where only the average over the orbit was known",
    ("plan", "outlook"): "an orbit no longer trusted for the peak: an average over the orbit is no all-clear",
}
PROVENANCE_CAUSES = {
    "orbit_epoch": "a new orbit",
    "catalogue_digest": "another stream catalogue",
    "mass_law": "another mass law",
    "software": "another version of the program",
}
TIMES = {"onset": "onset", "peak_at": "peak", "end": "end"}


def first() -> list[Change]:
    """Say that there was no earlier revision."""
    return [{"what": "new", "text": "First advisory for this passage."}]


def again() -> list[Change]:
    """Say that the passage was withdrawn and is found once more."""
    return [{"what": "new", "text": "This passage was withdrawn; the newest computation finds it again."}]


def changes(previous: Body, new: Body, as_of_unix_s: float) -> list[Change]:
    """List what has moved since ``previous``; empty when a new revision would only be noise."""
    return [
        *_level(previous, new),
        *_factors(previous, new, as_of_unix_s),
        *_times(previous, new, as_of_unix_s),
        *_windows(previous, new, as_of_unix_s),
    ]


def causes(previous: Body, new: Body) -> list[Change]:
    """Say why something moved, as far as the two revisions tell; empty when only time has passed."""
    found = [DEPTH_CAUSES[pair]] if (pair := (previous["depth"], new["depth"])) in DEPTH_CAUSES else []
    before, after = previous["provenance"], new["provenance"]
    found += [
        f"{cause} ({after[field]})"
        for field, cause in PROVENANCE_CAUSES.items()
        if field in after and before.get(field) != after[field]
    ]
    return [{"what": "cause", "text": f"Because of {'; '.join(found)}."}] if found else []


def withdrawal(previous: Body, as_of_unix_s: float, reason: str) -> dict[str, Any]:
    """Turn the latest revision into its withdrawal: nothing is left to act on."""
    text = "Withdrawn: this advisory no longer holds; return to routine operations unless another one stands."
    return {
        **previous,
        "issued_at": format_utc(as_of_unix_s),
        "level": "steady",
        "lee_windows": [],
        "safe_attitude_windows": [],
        "actions": [text],
        "changes": [{"what": "withdrawn", "text": reason}],
    }


def _level(previous: Body, new: Body) -> Iterator[Change]:
    if previous["level"] != new["level"]:
        yield {"what": "level", "text": f"Level went from {previous['level']} to {new['level']}."}


def _factors(previous: Body, new: Body, as_of_unix_s: float) -> Iterator[Change]:
    if _past(previous["peak_at"], as_of_unix_s):
        return
    before, after = _peaks(previous), _peaks(new)
    for key in dict.fromkeys([*before, *after]):
        if key not in before or key not in after:
            verb = "appeared" if key in after else "disappeared"
            yield {"what": "peak_factor", "text": f"Peak factor for {key} {verb}."}
        elif abs(after[key] - before[key]) > FACTOR_CHANGE * before[key]:
            yield {
                "what": "peak_factor",
                "text": f"Peak factor for {key} went from {before[key]:.2f} to {after[key]:.2f}.",
            }


def _peaks(body: Body) -> dict[str, float]:
    whole = {f"{e['criterion']} on the satellite": e["mid"] for e in body["satellite_enhancement_peak"]}
    faces = {f"{e['criterion']} on face '{e['face']}'": e["mid"] for e in body["enhancement_peak"]}
    return whole | faces


def _times(previous: Body, new: Body, as_of_unix_s: float) -> Iterator[Change]:
    for field, name in TIMES.items():
        moved_s = parse_utc(new[field]) - parse_utc(previous[field])
        if abs(moved_s) > TIME_CHANGE_S and not _past(previous[field], as_of_unix_s):
            yield {
                "what": field,
                "text": f"The {name} moved by {moved_s / 60.0:+.0f} min, from {previous[field]} to {new[field]}.",
            }


def _windows(previous: Body, new: Body, as_of_unix_s: float) -> Iterator[Change]:
    """Compare lee windows where both revisions looked for them, and say when the new one looked further.

    A longer look counts when it is the first one, when it reaches the end of the passage, or else once it is
    a day longer: the plan's horizon moves on with every run.
    """
    before, after = _cover(previous), _cover(new)
    both = max(before[0], after[0], as_of_unix_s), min(before[1], after[1])
    lost = _unmatched(previous, new, both)
    gained = _unmatched(new, previous, both)
    if lost or gained:
        yield {
            "what": "lee_windows",
            "text": f"Lee windows moved: {len(lost)} of the former ones no longer hold, {len(gained)} are new.",
        }
    added = [w for w in _lee(new) if w[0] >= max(before[1], as_of_unix_s)]
    if added and _looks_further(before[1], after[1], parse_utc(new["end"])):
        until = format_utc(after[1])
        yield {
            "what": "lee_windows",
            "text": f"{len(added)} lee windows were added; they now reach to {until}.",
        }


def _looks_further(before_unix_s: float, after_unix_s: float, end_unix_s: float) -> bool:
    longer_s = after_unix_s - before_unix_s
    return longer_s >= COVERAGE_CHANGE_S or (longer_s > TIME_CHANGE_S and after_unix_s >= end_unix_s)


def _cover(body: Body) -> tuple[float, float]:
    """Where lee windows were looked for; nowhere at outlook depth."""
    if body["lee_windows_from"] is None:
        return float("-inf"), float("-inf")
    return parse_utc(body["lee_windows_from"]), parse_utc(body["lee_windows_until"])


def _lee(body: Body) -> list[tuple[float, float]]:
    return [(parse_utc(w["start"]), parse_utc(w["end"])) for w in body["lee_windows"]]


def _unmatched(one: Body, other: Body, between: tuple[float, float]) -> list[tuple[float, float]]:
    """Windows of ``one`` well inside a span that have no counterpart in ``other``, which saw that span too."""
    low, high = between[0] + TIME_CHANGE_S, between[1] - TIME_CHANGE_S
    counterparts = _lee(other)
    return [
        w
        for w in _lee(one)
        if low <= w[0]
        and w[1] <= high
        and not any(max(abs(w[0] - c[0]), abs(w[1] - c[1])) <= TIME_CHANGE_S for c in counterparts)
    ]


def _past(moment: str, as_of_unix_s: float) -> bool:
    return parse_utc(moment) <= as_of_unix_s
