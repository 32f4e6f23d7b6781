"""Epochs: CCSDS time strings and TLE year and day of year -> split UTC Julian dates, and back."""

from __future__ import annotations

import re
from datetime import date, timedelta
from decimal import Decimal
from fractions import Fraction

JULIAN_DATE_OF_ORDINAL_0 = 1721424.5  # date.toordinal() + this = Julian date of that day's 00:00
SECONDS_PER_DAY = 86400
YEARS = range(1957, 2200)  # the first satellite's year; SGP4 elements of other years are typing errors
FRACTION_DIGITS = 18  # of the day, as read: far finer than the float that keeps it

# CCSDS 502.0-B-3 section 7.5.10: calendar or day-of-year form, any decimals, optional Z.
CCSDS_TIME = re.compile(
    r"(?P<year>[0-9]{4})-(?:(?P<month>[0-9]{2})-(?P<day>[0-9]{2})|(?P<doy>[0-9]{3}))"
    r"T(?P<hour>[0-9]{2}):(?P<minute>[0-9]{2}):(?P<second>[0-9]{2}(?:\.[0-9]{0,30})?)Z?"
)
FORMS = "2026-08-12T21:05:33.25Z or 2026-224T21:05:33.25Z (UTC, no other offset)"


def parse_ccsds(text: str) -> tuple[float, float]:
    """Read a CCSDS time; return (Julian date of its midnight, fraction of the day).

    Raises ``ValueError`` with a sentence saying what is wrong and which forms are taken.
    """
    found = CCSDS_TIME.fullmatch(text.strip())
    if not found:
        raise ValueError(f"is not a time this reader knows; write it like {FORMS}")
    year = int(found["year"])
    day = _day_of_year(year, int(found["doy"])) if found["doy"] else _calendar(year, found)
    return _julian_date(day), _day_fraction(found)


def parse_year_and_day(two_digit_year: int, day_of_year: str) -> tuple[float, float]:
    """Read the epoch columns of a TLE: 57 to 99 are 19xx, 00 to 56 are 20xx; day 1 is 1 January.

    Returns (Julian date of the midnight, fraction of the day); raises ``ValueError`` as ``parse_ccsds`` does.
    """
    year = full_year(two_digit_year)
    whole, _, decimals = day_of_year.partition(".")
    return _julian_date(_day_of_year(year, int(whole))), float(f"0.{decimals or 0}")


def full_year(two_digit_year: int) -> int:
    """Turn a TLE's two-digit year into four digits."""
    return two_digit_year + (1900 if two_digit_year >= 57 else 2000)


def format_ccsds(epoch_jd: float, epoch_fraction: float) -> str:
    """Write a CCSDS calendar time with ``Z``, in the fewest decimals that read back to the same epoch."""
    midnight = date.fromordinal(round(epoch_jd - JULIAN_DATE_OF_ORDINAL_0))
    seconds = Decimal(epoch_fraction) * SECONDS_PER_DAY
    for digits in range(FRACTION_DIGITS):
        text = _time_of_day(midnight, round(seconds, digits))
        if parse_ccsds(text) == (epoch_jd, epoch_fraction):
            break
    return text


def _time_of_day(midnight: date, seconds: Decimal) -> str:
    days, rest = divmod(seconds, SECONDS_PER_DAY)
    minutes, second = divmod(rest, 60)
    hour, minute = divmod(int(minutes), 60)
    whole, _, decimals = format(second, "f").partition(".")
    tail = f".{decimals}" if decimals else ""
    return f"{midnight + timedelta(days=int(days))}T{hour:02d}:{minute:02d}:{int(whole):02d}{tail}Z"


def _calendar(year: int, found: re.Match[str]) -> date:
    _check_year(year)
    try:
        return date(year, int(found["month"]), int(found["day"]))
    except ValueError:
        raise ValueError(f"{found['year']}-{found['month']}-{found['day']} is no calendar date") from None


def _day_of_year(year: int, day: int) -> date:
    _check_year(year)
    last = (date(year + 1, 1, 1) - date(year, 1, 1)).days
    if not 1 <= day <= last:
        raise ValueError(f"day {day} of {year} does not exist; days run from 1 to {last}")
    return date(year, 1, 1) + timedelta(days=day - 1)


def _check_year(year: int) -> None:
    if year not in YEARS:
        raise ValueError(f"the year {year} is outside {YEARS[0]} to {YEARS[-1]}")


def _day_fraction(found: re.Match[str]) -> float:
    hour, minute, second = int(found["hour"]), int(found["minute"]), Fraction(found["second"].rstrip("."))
    if hour > 23 or minute > 59 or second >= 60:
        raise ValueError("is no time of day; hours run to 23, minutes and seconds to 59 (no leap second)")
    return float((hour * 3600 + minute * 60 + second) / SECONDS_PER_DAY)


def _julian_date(day: date) -> float:
    return day.toordinal() + JULIAN_DATE_OF_ORDINAL_0
