"""Reading the table of streams: every refusal names the row and the column to mend."""

from __future__ import annotations

import pickle
from contextlib import suppress

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.errors import CatalogueError, InputError
from app.formats.stream_table import COLUMNS, read_stream_table
from tests.stream_tables import SOURCES, row, table

FULL = "solar_longitude_peak_deg=LIST/read radiant_ra_deg=LIST/read radiant_dec_deg=LIST/read"
BARE = dict.fromkeys(
    ("zhr_peak", "b_rise_per_deg", "b_fall_per_deg", "population_index_r", "v_geocentric_km_s"), ""
)


def refused(data: bytes) -> CatalogueError:
    with pytest.raises(CatalogueError) as caught:
        read_stream_table(data, SOURCES)
    return caught.value


@pytest.mark.parametrize(
    ("changes", "column", "says"),
    [
        ({"code": ""}, "code", "empty"),
        ({"code": "A/B"}, "code", "letters or digits"),
        ({"name": " "}, "name", "empty"),
        ({"component": ""}, "component", "empty"),
        ({"confidence": "D"}, "confidence", "A, B or C"),
        ({"confidence": "a"}, "confidence", "A, B or C"),
        ({"solar_longitude_peak_deg": ""}, "solar_longitude_peak_deg", "empty"),
        ({"radiant_ra_deg": ""}, "radiant_ra_deg", "empty"),
        ({"radiant_dec_deg": ""}, "radiant_dec_deg", "empty"),
        ({"zhr_peak": "ten"}, "zhr_peak", "'ten' is not a number"),
        ({"zhr_peak": "nan"}, "zhr_peak", "not a number"),
        ({"zhr_peak": "1_0"}, "zhr_peak", "not a number"),
        ({"population_index_r": "2,5"}, "population_index_r", "not a number"),
        ({"evidence": FULL}, "evidence", "says nothing of zhr_peak"),
        ({**BARE, "evidence": f"{FULL} zhr_peak=LIST/read"}, "evidence", "names zhr_peak"),
        ({**BARE, "evidence": f"{FULL} colour=LIST/read"}, "evidence", "names colour"),
        ({**BARE, "evidence": f"{FULL} radiant_ra_deg=BOOK/read"}, "evidence", "once per column"),
        ({**BARE, "evidence": "radiant_ra_deg=LIST"}, "evidence", "column=SOURCE/provenance"),
        ({**BARE, "evidence": "radiant_ra_deg=LIST/guessed"}, "evidence", "read, memory, computed"),
        ({**BARE, "evidence": "radiant_ra_deg=OTHER/read"}, "evidence", "'OTHER' of radiant_ra_deg"),
        ({**BARE, "evidence": "radiant_ra_deg=LIST+/read"}, "evidence", "source '' of radiant_ra_deg"),
        ({"parent_body": "1P", "evidence": FULL, **BARE}, "evidence", "says nothing of parent_body"),
    ],
)
def test_a_wrong_field_is_named_with_its_row(changes: dict[str, str], column: str, says: str):
    error = refused(table(row(code="XYZ"), row(**changes)))
    assert (error.row, error.column) == (3, column)
    assert says in error.problem
    assert f"row 3 ({error.code}), column {column}" in str(error)


@pytest.mark.parametrize("missing", COLUMNS)
def test_every_column_is_needed(missing: str):
    header = tuple(column for column in COLUMNS if column != missing)
    error = refused(table(row(), header=header))
    assert (error.row, error.column) == (1, missing)


def test_a_column_twice_or_unknown_is_refused():
    assert refused(table(row(), header=(*COLUMNS, "zhr_peak"))).column == "zhr_peak"
    assert refused(table({**row(), "colour": "red"}, header=(*COLUMNS, "colour"))).column == "colour"


def test_a_row_of_another_length_is_refused():
    for wrong in (b"DEF,delta Examplids\n", table(row(code="DEF")).splitlines()[1] + b",more\n"):
        error = refused(table(row()) + wrong)
        assert (error.row, error.code) == (3, "DEF")
        assert f"the header {len(COLUMNS)}" in error.problem


@pytest.mark.parametrize("data", [b"", b"\n", table()])
def test_a_table_without_streams_is_refused(data: bytes):
    assert refused(data).row in (1, 2)


@pytest.mark.parametrize("data", [b"\xff\xfe", table(row()) + b'"never closed', b"code\x00" * 40_000])
def test_what_is_no_table_is_refused(data: bytes):
    with pytest.raises(InputError):
        read_stream_table(data, SOURCES)


def test_rows_are_counted_as_a_spreadsheet_counts_them():
    gap = table(row()) + b"\n" + table(row(code="DEF", zhr_peak="x")).splitlines()[1]
    assert refused(gap).row == 4


def test_a_byte_order_mark_and_windows_line_ends_are_read():
    plain = table(row(), row(component="background", notes="one\nline and another"))
    changed = b"\xef\xbb\xbf" + plain.replace(b"\n", b"\r\n")
    assert len(read_stream_table(changed, SOURCES)) == len(read_stream_table(plain, SOURCES)) == 2


def test_a_value_keeps_its_source_and_provenance():
    evidence = row()["evidence"].replace("zhr_peak=LIST/read", "zhr_peak=LIST+BOOK/computed")
    (read,) = read_stream_table(table(row(evidence=evidence)), SOURCES)
    assert read.values["zhr_peak"] == {"value": 10.0, "source": "LIST+BOOK", "provenance": "computed"}
    assert read.values["population_index_r"] == {"value": 2.5, "source": "LIST", "provenance": "read"}
    assert "v_entry_km_s" not in read.values


def test_the_error_crosses_a_process_border():
    error = refused(table(row(zhr_peak="x")))
    assert str(pickle.loads(pickle.dumps(error))) == str(error)


@given(st.binary(max_size=300))
def test_any_bytes_are_rows_or_an_input_error(data: bytes):
    with suppress(InputError):  # any other error fails the test
        assert read_stream_table(data, SOURCES)
