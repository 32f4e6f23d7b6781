"""Advisories as a printed outlook, 80 columns wide: what to act on first, the steady passages as tables."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable, Iterator, Sequence

from app.commands.outlook_rows import WIDTH, act_on_rows, cut, passage_block, steady_table
from app.commands.scenario import Satellite, Scenario
from app.core.advice.advisory import CAUTION
from app.core.sky.times import format_utc

LEGEND = (
    "Factor: how many times its everyday background the hazard on a face reaches at the worst moment (1.00 = nothing "
    "added), on the worst face. Impacts: expected of the stream / of the background, on the whole satellite from "
    "onset to end. Lee: the Earth hides every stream that matters; 'later': windows come with the plan, once the "
    "peak is within the days the orbit is trusted; until then figures are averages over the orbit. Each satellite "
    "has its own thresholds; here they are set low, so that an ordinary year shows all three levels."
)


def outlook_lines(scenario: Scenario, fleet: Iterable[Satellite]) -> Iterator[str]:
    """Lines of the outlook: head, caution, what to act on, each satellite's passages, the streams' names."""
    members = scenario.by_urgency(list(fleet))
    yield from _head(scenario)
    yield ""
    yield from act_on_rows(scenario, members)
    for member in members:
        yield ""
        yield from _satellite(scenario, member)
    yield ""
    yield from _names(scenario, members)


def _head(scenario: Scenario) -> Iterator[str]:
    yield f"Meteoroid outlook for {scenario.operator}"
    yield (
        f"As of {format_utc(scenario.as_of_unix_s)}, {scenario.outlook_days:g} days ahead. "
        f"Local times, {scenario.zone_name}, unless with Z."
    )
    yield ""
    yield from textwrap.wrap(f"CAUTION: {CAUTION}", WIDTH)
    yield ""
    yield from textwrap.wrap(LEGEND, WIDTH)


def _satellite(scenario: Scenario, satellite: Satellite) -> Iterator[str]:
    title = satellite.name if satellite.name == satellite.id else f"{satellite.name} ({satellite.id})"
    policy = satellite.policy
    thresholds = f"ready at {policy.ready_at:g}, shelter at {policy.shelter_at:g}"
    yield f"== {cut(title, WIDTH - 8 - len(thresholds))}, {thresholds} ".ljust(WIDTH, "=")
    if satellite.failure:
        yield from textwrap.wrap(f"not computed: {satellite.failure}", WIDTH)
        return
    urgent, near = scenario.urgent(satellite), scenario.near(satellite)
    if not near:
        yield "No passage."
    for advisory in urgent:
        yield from passage_block(scenario, satellite, advisory)
    yield from steady_table(scenario, [each for each in near if each not in urgent])


def _names(scenario: Scenario, members: Sequence[Satellite]) -> Iterator[str]:
    near = [each for member in members for each in scenario.near(member)]
    names = {each["stream"]: each["stream_name"] for each in near}
    if names:
        text = "; ".join(f"{code} {names[code]}" for code in sorted(names))
        yield from textwrap.wrap(f"Streams: {text}.", WIDTH)
    if any(scenario.is_past_maximum(each) for each in near):
        yield "* This stream's maximum is over; the time is the worst that is still to come."
