"""The table of streams: bytes -> checked rows, every value with its source. One row per activity component.

The column ``evidence`` holds, for every value of the row and for nothing else, ``column=SOURCE/provenance``,
separated by blanks. Sources joined by ``+`` stand for a value taken from them together, or from one of them where
it was not noted which. Provenance is ``read`` (seen in the publication or a transcription of it), ``memory``
(recollected) or ``computed``.
"""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any, NoReturn

from app.errors import CatalogueError, InputError

Value = dict[str, Any]  # {"value", "source", "provenance"}

TEXTS = ("code", "name", "component", "confidence", "parent_body", "evidence", "notes")
OF_COMPONENT = ("solar_longitude_peak_deg", "zhr_peak", "b_rise_per_deg", "b_fall_per_deg")
OF_STREAM = (
    "population_index_r",
    "v_geocentric_km_s",
    "v_entry_km_s",
    "radiant_ra_deg",
    "radiant_dec_deg",
    "drift_ra_deg_per_deg",
    "drift_dec_deg_per_deg",
    "start_solar_longitude_deg",
    "end_solar_longitude_deg",
    "bulk_density_kg_m3",
    "radiant_spread_deg",
)
NUMBERS = (*OF_COMPONENT, *OF_STREAM)
COLUMNS = (*TEXTS, *NUMBERS)
NEEDED_TEXTS = ("code", "name", "component")
NEEDED_NUMBERS = ("solar_longitude_peak_deg", "radiant_ra_deg", "radiant_dec_deg")
CONFIDENCE = ("A", "B", "C")
PROVENANCE = ("read", "memory", "computed")
OUTBURST = "outburst-branch"  # a component without annual level
CODE = re.compile(r"[A-Za-z0-9]{2,8}")  # it becomes part of advisory ids and addresses
NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d{1,3})?", re.ASCII)
SHOWN = 40  # characters of a wrong value that an error repeats


@dataclass(frozen=True)
class StreamRow:
    """A row as read: ``number`` as a spreadsheet counts, the texts, and ``values`` by numeric column."""

    number: int
    texts: Mapping[str, str]
    values: dict[str, Value]
    parent_body: Value | None

    @property
    def code(self) -> str:
        return self.texts["code"]

    @property
    def component(self) -> str:
        return self.texts["component"]

    @property
    def annual(self) -> bool:
        """Whether the component comes every year."""
        return self.component != OUTBURST

    def number_in(self, column: str) -> float | None:
        """The value of a numeric column, None where the row has none."""
        return self.values[column]["value"] if column in self.values else None

    def refuse(self, column: str, problem: str) -> NoReturn:
        """Raise ``CatalogueError`` about a column of this row."""
        raise CatalogueError(self.number, self.code[:SHOWN], column, problem)


def read_stream_table(data: bytes, sources: Mapping[str, str]) -> list[StreamRow]:
    """Read all rows; ``sources`` are the keys that evidence may name.

    Raises ``CatalogueError`` naming row and column of the first value that is wrong, ``InputError`` when the bytes
    are no comma-separated text.
    """
    rows = [_row(number, raw, sources) for number, raw in _table(data)]
    if not rows:
        raise CatalogueError(2, "table", "code", "there is no row; the table needs at least one stream")
    return rows


def _table(data: bytes) -> Iterator[tuple[int, dict[str, str]]]:
    lines = _lines(data)
    header = lines[0] if lines else []
    _check_header(header)
    for number, fields in enumerate(lines[1:], start=2):
        if not any(field.strip() for field in fields):
            continue
        if len(fields) != len(header):
            raise CatalogueError(
                number,
                fields[0][:SHOWN],
                "code",
                f"the row has {len(fields)} fields, the header {len(header)}",
            )
        yield number, dict(zip(header, (field.strip() for field in fields), strict=True))


def _lines(data: bytes) -> list[list[str]]:
    try:
        return list(csv.reader(io.StringIO(data.decode("utf-8-sig"), newline=""), strict=True))
    except (UnicodeDecodeError, csv.Error) as error:
        raise InputError(f"stream catalogue: is not comma-separated UTF-8 text: {error}") from None


def _check_header(header: list[str]) -> None:
    for column in header:
        if column not in COLUMNS:
            raise CatalogueError(1, "header", column[:SHOWN], "is no column of this table; remove it")
    for column in COLUMNS:
        if header.count(column) != 1:
            raise CatalogueError(1, "header", column, "must be there exactly once")


def _row(number: int, raw: Mapping[str, str], sources: Mapping[str, str]) -> StreamRow:
    row = StreamRow(number, {column: raw[column] for column in TEXTS}, {}, None)
    _check_texts(row)
    evidence = _evidence(row, sources)
    filled = [column for column in (*NUMBERS, "parent_body") if raw[column]]
    for column in filled:
        if column not in evidence:
            row.refuse("evidence", f"says nothing of {column}; add {column}=SOURCE/provenance")
    for column in evidence:
        if column not in filled:
            row.refuse("evidence", f"names {column[:SHOWN]}, which is empty or no column")
    for column in NEEDED_NUMBERS:
        if column not in filled:
            row.refuse(column, "is empty")
    for column in NUMBERS:
        if column in filled:
            row.values[column] = {"value": _number(row, column, raw[column]), **evidence[column]}
    parent = {"value": raw["parent_body"], **evidence["parent_body"]} if raw["parent_body"] else None
    return StreamRow(number, row.texts, row.values, parent)


def _number(row: StreamRow, column: str, text: str) -> float:
    if not NUMBER.fullmatch(text):
        row.refuse(column, f"'{text[:SHOWN]}' is not a number")
    return float(text)


def _check_texts(row: StreamRow) -> None:
    for column in NEEDED_TEXTS:
        if not row.texts[column]:
            row.refuse(column, "is empty")
    if not CODE.fullmatch(row.code):
        row.refuse("code", f"'{row.code[:SHOWN]}' must be 2 to 8 letters or digits, such as PER")
    if row.texts["confidence"] not in CONFIDENCE:
        row.refuse("confidence", f"is '{row.texts['confidence'][:SHOWN]}'; it must be A, B or C")


def _evidence(row: StreamRow, sources: Mapping[str, str]) -> dict[str, Value]:
    found: dict[str, Value] = {}
    for item in row.texts["evidence"].split():
        column, _, claim = item.partition("=")
        source, slash, provenance = claim.rpartition("/")
        if not slash or column in found:
            row.refuse("evidence", f"'{item[:SHOWN]}' must be column=SOURCE/provenance, once per column")
        if provenance not in PROVENANCE:
            row.refuse("evidence", f"provenance of {column[:SHOWN]} must be one of {', '.join(PROVENANCE)}")
        for key in source.split("+"):
            if key not in sources:
                row.refuse("evidence", f"source '{key[:SHOWN]}' of {column[:SHOWN]} is not in sources.csv")
        found[column] = {"source": source, "provenance": provenance}
    return found
