"""The lines of a printed outlook that hold figures."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Sequence

from app.commands.scenario import Advisory, Satellite, Scenario
from app.core.sky.times import parse_utc

WIDTH = 80
LABELS = ("penetration", "charge")
NAMED_FROM = 1.05  # in the tables of steady passages a worst face is named from this factor up
STEADY_HEADS = (
    "steady   peak          penetration          charge               lee windows",
    "                       factor impacts       factor impacts       near the peak",
)


def act_on_rows(scenario: Scenario, members: Sequence[Satellite]) -> Iterator[str]:
    """One row for each passage that asks for something."""
    found = [(member, each) for member in members for each in scenario.urgent(member)]
    if not found:
        yield "Nothing to act on."
        return
    yield "To act on:"
    for member, each in found:
        name = cut(member.name, 18)
        span = scenario.span(each["onset"], each["end"])
        yield f"  {each['level'].upper():<8} {name:<18} {each['passage']:<9} {span}"


def passage_block(scenario: Scenario, satellite: Satellite, advisory: Advisory) -> Iterator[str]:
    """All there is to say about one passage that asks for something."""
    yield f"{advisory['level'].upper()}  {advisory['passage']} {advisory['stream_name']}"
    yield f"  peak     {_peak(scenario, advisory)}"
    yield f"  lasts    {scenario.span(advisory['onset'], advisory['end'])}"
    for label in _labels(advisory):
        worst = worst_face(advisory, label)
        if worst is not None:
            factor = f"{cut(label, 12)} {factor_text(worst[0])} on {cut(worst[1], 22)}"
            yield f"  factor   {factor:<42}impacts {_impacts(advisory, label)}"
    yield from textwrap.wrap(
        _lee(scenario, satellite, advisory), WIDTH, initial_indent="  lee      ", subsequent_indent=" " * 11
    )


def steady_table(scenario: Scenario, advisories: Sequence[Advisory]) -> Iterator[str]:
    """A row for each steady passage."""
    if advisories:
        yield from STEADY_HEADS
    for each in advisories:
        mark = "*" if scenario.is_past_maximum(each) else " "
        when = scenario.local(each["peak_at"], "%d %b %H:%M")
        columns = "  ".join(_figures(each, label) for label in LABELS)
        yield f"{each['passage']:<8} {when}{mark} {columns} {_lee_count(each)}".rstrip()
        named = [
            f"{label} {worst[1]}"
            for label in LABELS
            if (worst := worst_face(each, label)) is not None and worst[0] >= NAMED_FROM
        ]
        if named:
            yield cut(f"         worst face: {', '.join(named)}", WIDTH)


def _labels(advisory: Advisory) -> list[str]:
    """Criteria of the advisory, the two of the tables first: any of them may have raised the level."""
    own = dict.fromkeys(e["criterion"] for e in advisory["enhancement_peak"])
    return [*LABELS, *(label for label in own if label not in LABELS)]


def worst_face(advisory: Advisory, label: str) -> tuple[float, str] | None:
    """Largest factor of a criterion and the face it is on; None when no face has the criterion."""
    found = [(e["mid"], e["face"]) for e in advisory["enhancement_peak"] if e["criterion"] == label]
    return max(found, key=lambda each: each[0]) if found else None


def factor_text(factor: float) -> str:
    """A factor in at most seven characters, five below 100,000."""
    if factor < 99.995:
        return f"{factor:.2f}"
    return f"{factor:.0f}" if factor < 99_999.5 else f"{factor:.1e}"


def _peak(scenario: Scenario, advisory: Advisory) -> str:
    past = " *" if scenario.is_past_maximum(advisory) else ""
    where = f"{advisory['peak_at']}, solar longitude {advisory['peak_solar_longitude_deg']:.2f}"
    return f"{scenario.local(advisory['peak_at'])}{past} ({where})"


def _figures(advisory: Advisory, label: str) -> str:
    worst = worst_face(advisory, label)
    return f"{'-':<19}" if worst is None else f"{factor_text(worst[0]):<5} {_impacts(advisory, label):<13}"


def _impacts(advisory: Advisory, label: str) -> str:
    values = [
        next(e["mid"] for e in advisory[field] if e["criterion"] == label)
        for field in ("expected_impacts", "background_impacts")
    ]
    return "/".join(f"{value:.1e}".replace("e-0", "e-").replace("e+0", "e+") for value in values)


def _lee_count(advisory: Advisory) -> str:
    if advisory["depth"] == "outlook":
        return "later"
    return f"{len(advisory['lee_windows'])} x {_minutes(advisory)}" if advisory["lee_windows"] else "none"


def _minutes(advisory: Advisory) -> str:
    minutes = sorted(round(window["duration_s"] / 60.0) for window in advisory["lee_windows"])
    return f"{minutes[0]} min" if minutes[0] == minutes[-1] else f"{minutes[0]}-{minutes[-1]} min"


def _lee(scenario: Scenario, satellite: Satellite, advisory: Advisory) -> str:
    windows = advisory["lee_windows"]
    if advisory["depth"] == "outlook":
        return "later: windows come with the plan, once the peak is within the time the orbit is trusted"
    if not windows:
        looked = scenario.span(advisory["lee_windows_from"], advisory["lee_windows_until"])
        minutes = f"{satellite.policy.min_lee_s / 60.0:g} min"
        return f"none from {looked}: the Earth never hides every stream that matters for {minutes} or more"
    peak = parse_utc(advisory["peak_at"])
    nearest = min(windows, key=lambda w: abs(parse_utc(w["start"]) - peak))
    first, last = windows[0], windows[-1]
    hidden = ", ".join(first["streams"])
    return (
        f"{len(windows)} windows of {_minutes(advisory)} (hidden: {hidden}); first "
        f"{scenario.span(first['start'], first['end'])}; nearest to the peak "
        f"{scenario.span(nearest['start'], nearest['end'])}; last {scenario.span(last['start'], last['end'])}"
    )


def cut(text: str, width: int) -> str:
    """A text in at most so many characters."""
    return text if len(text) <= width else f"{text[: width - 3]}..."
