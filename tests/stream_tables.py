"""Small invented stream tables, and the published values the real one is compared with."""

from __future__ import annotations

import csv
import io
from functools import cache
from pathlib import Path

from app.formats.stream_table import COLUMNS, NUMBERS

DATA = Path(__file__).parent / "data"  # streams_SOURCES.md tells where they come from
SOURCES = {"LIST": "An invented list", "BOOK": "An invented book"}
GOOD = {
    "code": "ABC",
    "name": "alpha Examplids",
    "component": "main",
    "confidence": "A",
    "solar_longitude_peak_deg": "100.0",
    "zhr_peak": "10",
    "b_rise_per_deg": "0.2",
    "b_fall_per_deg": "0.3",
    "population_index_r": "2.5",
    "v_geocentric_km_s": "40",
    "radiant_ra_deg": "15",
    "radiant_dec_deg": "-20",
}


def row(**changes: str) -> dict[str, str]:
    """A sound row with some fields changed; evidence is made for whatever is filled, unless it is given."""
    fields = {**dict.fromkeys(COLUMNS, ""), **GOOD, **changes}
    if "evidence" not in changes:
        told = [column for column in (*NUMBERS, "parent_body") if fields[column]]
        fields["evidence"] = " ".join(f"{column}=LIST/read" for column in told)
    return fields


def table(*rows: dict[str, str], header: tuple[str, ...] = COLUMNS) -> bytes:
    """The rows as a file."""
    text = io.StringIO()
    writer = csv.DictWriter(text, header, extrasaction="ignore", lineterminator="\n")
    writer.writeheader()
    writer.writerows(rows)
    return text.getvalue().encode()


@cache
def published() -> dict[tuple[str, str], dict[str, str]]:
    """Values by stream and source key (``MDC`` without its count), with the ranges the IAU list spans."""
    return _by_stream_and_source("streams_crosscheck.csv")


@cache
def solutions() -> dict[tuple[str, str], dict[str, str]]:
    """Single solutions of the IAU list by stream and source key."""
    return _by_stream_and_source("streams_solutions.csv")


def _by_stream_and_source(name: str) -> dict[tuple[str, str], dict[str, str]]:
    with (DATA / name).open(newline="", encoding="utf-8") as file:
        return {(each["code"], each["source"].split(" ")[0]): each for each in csv.DictReader(file)}
