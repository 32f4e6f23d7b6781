"""The revision rule: level, peak factor by more than 10 %, a time by more than 10 minutes, a window."""

from __future__ import annotations

import json
from typing import Any

import pytest

from app.core.advice.revision import again, causes, changes, first, withdrawal
from app.core.sky.times import format_utc, parse_utc
from tests.samples import AS_OF_UNIX_S, DAY_S, band, body

MINUTE_S, HOUR_S = 60.0, 3600.0
PEAK_S = parse_utc(body("a")["peak_at"])


def at(offset_s: float, from_unix_s: float = PEAK_S) -> str:
    return format_utc(from_unix_s + offset_s)


def factors(face: float, whole: float = 1.5) -> dict[str, Any]:
    return {
        "enhancement_peak": [{"criterion": "mass", "face": "aperture", "sensitive": True, **band(face)}],
        "satellite_enhancement_peak": [{"criterion": "mass", **band(whole)}],
    }


def planned(hours: list[float], reach_h: float = 24.0, minutes: float = 30.0) -> dict[str, Any]:
    """Lee windows that begin at these hours after the peak, looked for from a day before it to ``reach_h`` after."""
    windows = [
        {
            "start": at(h * HOUR_S),
            "end": at(h * HOUR_S + minutes * MINUTE_S),
            "duration_s": minutes * MINUTE_S,
        }
        for h in hours
    ]
    return {
        "lee_windows": windows,
        "lee_windows_from": at(-DAY_S),
        "lee_windows_until": at(reach_h * HOUR_S),
    }


def moved(before: dict[str, Any], after: dict[str, Any], as_of_unix_s: float = AS_OF_UNIX_S) -> list[str]:
    return [change["what"] for change in changes(body("a", **before), body("a", **after), as_of_unix_s)]


def test_the_same_again_is_no_change() -> None:
    assert moved({}, {}) == []


def test_what_only_names_the_run_is_no_change() -> None:
    assert moved({}, {"issued_at": "2026-08-11T00:00:00Z", "provenance": {"run": "another"}}) == []


@pytest.mark.parametrize(("before", "after"), [("steady", "ready"), ("shelter", "ready")])
def test_a_level_that_rises_or_falls_is_a_change(before: str, after: str) -> None:
    found = changes(body("a", level=before), body("a", level=after), AS_OF_UNIX_S)
    assert found == [{"what": "level", "text": f"Level went from {before} to {after}."}]


@pytest.mark.parametrize(
    ("after", "found"), [(2.19, []), (2.21, ["peak_factor"]), (1.81, []), (1.79, ["peak_factor"])]
)
def test_a_peak_factor_counts_beyond_a_tenth(after: float, found: list[str]) -> None:
    assert moved(factors(2.0), factors(after)) == found
    assert moved(factors(1.0, whole=2.0), factors(1.0, whole=after)) == found


def test_a_peak_factor_is_named_with_its_criterion_and_face() -> None:
    (change,) = changes(body("a", **factors(2.0)), body("a", **factors(3.0)), AS_OF_UNIX_S)
    assert change["text"] == "Peak factor for mass on face 'aperture' went from 2.00 to 3.00."


def test_faces_that_come_and_go_are_changes() -> None:
    other = {**factors(2.0)["enhancement_peak"][0], "face": "radiator"}
    found = changes(body("a", **factors(2.0)), body("a", **factors(2.0) | {"enhancement_peak": [other]}), 0.0)
    assert [change["text"] for change in found] == [
        "Peak factor for mass on face 'aperture' disappeared.",
        "Peak factor for mass on face 'radiator' appeared.",
    ]


def test_a_factor_of_a_peak_that_is_over_is_history() -> None:
    assert moved(factors(2.0), factors(1.0), PEAK_S) == []
    assert moved(factors(2.0), factors(1.0), PEAK_S - 1.0) == ["peak_factor"]


@pytest.mark.parametrize("field", ["onset", "peak_at", "end"])
@pytest.mark.parametrize("sign", [1, -1])
def test_a_time_counts_beyond_ten_minutes(field: str, sign: int) -> None:
    start = parse_utc(body("a")[field])
    assert moved({}, {field: at(sign * 600.0, start)}) == []
    assert moved({}, {field: at(sign * 601.0, start)}) == [field]


def test_a_time_tells_by_how_much_it_moved() -> None:
    (change,) = changes(body("a"), body("a", onset="2026-08-10T23:30:00Z"), AS_OF_UNIX_S)
    assert change["text"] == "The onset moved by -30 min, from 2026-08-11T00:00:00Z to 2026-08-10T23:30:00Z."


def test_an_onset_that_is_over_does_not_move_with_the_clock() -> None:
    onset = parse_utc(body("a")["onset"])
    assert moved({}, {"onset": at(DAY_S, onset)}, as_of_unix_s=onset + DAY_S) == []


def test_a_drift_in_small_steps_counts_once_it_has_added_up() -> None:
    # The comparison is always with what was published last, not with the run before.
    steps = [at(300.0 * step) for step in range(1, 4)]
    assert [moved({}, {"peak_at": step}) for step in steps] == [[], [], ["peak_at"]]


def test_windows_that_stay_within_ten_minutes_are_no_change() -> None:
    assert moved(planned([1.0, 2.5]), planned([1.1, 2.6])) == []


@pytest.mark.parametrize(
    ("before", "after", "text"),
    [
        ([1.0, 2.5], [1.0], "1 of the former ones no longer hold, 0 are new"),
        ([1.0], [1.0, 2.5], "0 of the former ones no longer hold, 1 are new"),
        ([1.0], [1.25], "1 of the former ones no longer hold, 1 are new"),
    ],
)
def test_windows_that_go_come_or_move_are_a_change(
    before: list[float], after: list[float], text: str
) -> None:
    found = changes(body("a", **planned(before)), body("a", **planned(after)), AS_OF_UNIX_S)
    assert [change["text"] for change in found] == [f"Lee windows moved: {text}."]


def test_windows_that_are_over_are_history() -> None:
    assert moved(planned([1.0, 5.0]), planned([5.0]), as_of_unix_s=PEAK_S + 2.0 * HOUR_S) == []


def test_the_first_windows_are_a_change_however_near_the_end() -> None:
    assert moved({}, planned([1.0], reach_h=5.0) | {"end": at(5.0 * HOUR_S)}) == ["end", "lee_windows"]
    assert moved({}, planned([1.0], reach_h=5.0)) == ["lee_windows"]


def test_a_plan_without_any_window_is_no_change() -> None:
    assert moved({}, planned([])) == []


def test_a_horizon_that_moves_on_counts_day_by_day_and_at_the_end() -> None:
    # The passage ends 46 hours after its peak.
    assert moved(planned([1.0], 4.0), planned([1.0, 6.0], 10.0)) == []
    assert moved(planned([1.0], 4.0), planned([1.0, 6.0], 28.0)) == ["lee_windows"]
    assert moved(planned([1.0], 40.0), planned([1.0, 41.0], 46.0)) == ["lee_windows"]
    assert moved(planned([1.0, 41.0], 46.0), planned([1.0, 41.0], 46.0)) == []


def test_a_plan_that_falls_back_to_an_outlook_withdraws_no_window() -> None:
    assert moved(planned([1.0]), {}) == []


def test_a_first_and_a_returning_advisory_say_so() -> None:
    assert [change["what"] for change in first() + again()] == ["new", "new"]
    assert first() != again()


def test_a_withdrawal_leaves_nothing_to_act_on_and_its_model_untouched() -> None:
    before = body("a", level="shelter", **planned([1.0]))
    copy = json.dumps(before)
    after = withdrawal(before, AS_OF_UNIX_S + 90.0, "The satellite was removed.")
    assert json.dumps(before) == copy
    assert (after["level"], after["lee_windows"], after["safe_attitude_windows"]) == ("steady", [], [])
    assert after["issued_at"] == "2026-08-10T00:01:30Z"
    assert after["changes"] == [{"what": "withdrawn", "text": "The satellite was removed."}]
    assert all(after[name] == before[name] for name in ("id", "onset", "peak_at", "end", "caution"))
    assert len(after["actions"]) == 1


def because(before: dict[str, Any], after: dict[str, Any]) -> str:
    return " ".join(change["text"] for change in causes(body("a", **before), body("a", **after)))


def test_a_cause_is_told_as_far_as_it_is_known() -> None:
    assert because({}, {}) == ""
    assert "the plan, which looks at each minute" in because({"depth": "outlook"}, {"depth": "plan"})
    assert "no all-clear" in because({"depth": "plan"}, {"depth": "outlook"})
    epoch = "2026-08-11T00:00:00Z"
    told = because({}, {"provenance": {"software": "stonechat", "orbit_epoch": epoch}})
    assert told == f"Because of a new orbit ({epoch})."
