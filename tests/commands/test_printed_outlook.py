"""The printed outlook, from advisories made up here."""

from __future__ import annotations

from typing import Any

from app.commands.outlook import outlook_lines
from app.commands.scenario import Satellite, Scenario
from app.core.advice.advisory import CAUTION
from app.core.sky.times import parse_utc
from app.core.spacecraft.model import Policy
from tests.samples import band, body

WIDTH = 80
SCENARIO = Scenario("Wren (invented)", parse_utc("2026-08-10T06:00:00Z"), 2.0, 60.0, {"PER": 140.0})
WINDOWS = [
    {"start": "2026-08-12T20:00:00Z", "end": "2026-08-12T20:33:00Z", "duration_s": 1980, "streams": ["PER"]},
    {"start": "2026-08-13T01:30:00Z", "end": "2026-08-13T02:04:00Z", "duration_s": 2040, "streams": ["PER"]},
    {"start": "2026-08-13T21:50:00Z", "end": "2026-08-13T22:24:00Z", "duration_s": 2040, "streams": ["PER"]},
]


def advisory(satellite: str = "a", level: str = "ready", **more: Any) -> dict[str, Any]:
    def peaks(label: str, front: float, back: float) -> list[dict[str, Any]]:
        faces = (("front", front), ("back", back))
        return [{"criterion": label, "face": name, "sensitive": True, **band(mid)} for name, mid in faces]

    return body(
        satellite,
        level=level,
        **{
            "peak_solar_longitude_deg": 140.01,
            "enhancement_peak": [*peaks("penetration", 1.02, 1.1), *peaks("charge", 1.71, 1.3)],
            "expected_impacts": [{"criterion": k, **band(2.5e-5)} for k in ("penetration", "charge")],
            "background_impacts": [{"criterion": k, **band(6.8e-3)} for k in ("penetration", "charge")],
            "lee_windows": WINDOWS,
            "lee_windows_from": "2026-08-12T00:00:00Z",
            "lee_windows_until": "2026-08-14T00:00:00Z",
            **more,
        },
    )


def satellite(
    satellite_id: str, *bodies: dict[str, Any], name: str = "", failure: str | None = None
) -> Satellite:
    return Satellite(
        satellite_id,
        name or satellite_id,
        Policy(ready_at=1.25, shelter_at=1.6, min_lee_s=600.0),
        failure,
        bodies,
    )


def lines(*fleet: Satellite) -> list[str]:
    found = list(outlook_lines(SCENARIO, fleet))
    assert max(len(line) for line in found) <= WIDTH
    return found


def text(*fleet: Satellite) -> str:
    return " ".join(" ".join(lines(*fleet)).split())


def test_shows_the_caution_whatever_there_is_to_say() -> None:
    assert CAUTION in text()
    assert CAUTION in text(satellite("a", advisory()))


def test_an_urgent_passage_tells_all() -> None:
    shown = text(satellite("a", advisory(level="shelter")))
    assert "SHELTER a PER-2026 Tue 11 Aug 02:00 to Sat 15 Aug 02:00" in shown
    assert "peak Thu 13 Aug 04:00 (2026-08-13T02:00:00Z, solar longitude 140.01)" in shown
    assert "factor penetration 1.10 on back impacts 2.5e-5/6.8e-3" in shown
    assert "factor charge 1.71 on front impacts 2.5e-5/6.8e-3" in shown


def test_lee_windows_are_counted_and_the_nearest_named() -> None:
    shown = text(satellite("a", advisory()))
    assert "3 windows of 33-34 min (hidden: PER)" in shown
    assert "first Wed 12 Aug 22:00 to 22:33" in shown
    assert "nearest to the peak Thu 13 Aug 03:30 to 04:04" in shown
    assert "last Thu 13 Aug 23:50 to Fri 14 Aug 00:24" in shown


def test_says_why_there_is_no_lee_window() -> None:
    never = text(satellite("a", advisory(lee_windows=[])))
    assert "none from Wed 12 Aug 02:00 to Fri 14 Aug 02:00: the Earth never hides" in never
    assert "for 10 min or more" in never
    later = advisory(lee_windows=[], lee_windows_from=None, lee_windows_until=None, depth="outlook")
    assert "later: windows come with the plan" in text(satellite("a", later))


def test_a_steady_passage_is_one_row_that_names_a_face_worth_naming() -> None:
    shown = lines(satellite("a", advisory(level="steady")))
    (row,) = (line for line in shown if line.startswith("PER-2026"))
    assert (
        " ".join(row.split()) == "PER-2026 13 Aug 04:00 1.10 2.5e-5/6.8e-3 1.71 2.5e-5/6.8e-3 3 x 33-34 min"
    )
    assert shown[shown.index(row) + 1].strip() == "worst face: penetration back, charge front"
    assert "Nothing to act on." in shown


def test_satellites_come_in_the_order_of_urgency() -> None:
    fleet = (
        satellite("a", advisory("a", "steady")),
        satellite("b", advisory("b", "ready")),
        satellite("c", failure="its orbit has decayed"),
        satellite("d", advisory("d", "shelter")),
        satellite("e"),
    )
    titles = [line.strip("= ").split(",")[0] for line in lines(*fleet) if line.startswith("== ")]
    assert titles == ["c", "d", "b", "a", "e"]
    assert "not computed: its orbit has decayed" in text(*fleet)


def test_what_peaks_later_is_left_for_later() -> None:
    shown = text(satellite("a", advisory(peak_at="2026-12-14T02:00:00Z")))
    assert "No passage." in shown
    assert "PER" not in shown


def test_a_stream_past_its_maximum_is_marked() -> None:
    soon = "2026-08-10T08:00:00Z"  # hardly after the clock: the maximum, a degree before, is over
    shown = text(satellite("a", advisory(level="steady", peak_at=soon, peak_solar_longitude_deg=141.0)))
    assert "10 Aug 10:00* 1.10" in shown
    assert "* This stream's maximum is over" in shown
    assert "*" not in text(satellite("a", advisory()))


def test_a_worst_time_after_a_maximum_still_to_come_is_not_marked() -> None:
    shown = text(satellite("a", advisory(level="steady", peak_solar_longitude_deg=141.0)))
    assert "13 Aug 04:00 1.10" in shown  # the helper folds runs of blanks
    assert "*" not in shown


def test_solar_longitude_is_compared_across_zero() -> None:
    scenario = Scenario("Wren", parse_utc("2026-08-13T01:00:00Z"), 0.0, 60.0, {"PER": 359.8})
    assert scenario.is_past_maximum(advisory(peak_solar_longitude_deg=0.9))
    assert not scenario.is_past_maximum(advisory(peak_solar_longitude_deg=358.0))


def test_long_names_and_other_criteria_fit() -> None:
    long = "x" * 64
    peaks = [{"criterion": "charge", "face": long, "sensitive": True, **band(123456.0)}]
    for level in ("steady", "ready"):
        found = text(satellite(long, advisory(level=level, enhancement_peak=peaks), name=f"{long[:63]}y"))
        assert "penetration 1" not in found
        assert "1.2e+05" in found
    lines(satellite("a", name="name of several words " * 3, failure=long * 3))
