"""Two-line sets: what is read, and that every wrong column is refused by line with a remedy.

The set below is invented. Its columns follow Spacetrack Report No. 3; the published sets are read in
tests/published/test_sgp4_verification.py.
"""

from __future__ import annotations

from datetime import UTC, datetime

import pytest
from hypothesis import given
from hypothesis import strategies as st
from sgp4.api import WGS72, Satrec
from sgp4.exporter import export_tle

from app.core.orbit.elements import MeanElements
from app.core.orbit.sgp4_records import satrec
from app.errors import FileError
from app.formats.tle import checksum, read_tle

ONE = "1 99001U 26012B   26224.87851851  .00002182 -12345-7 -44063-4 0  999"
TWO = "2 99001  51.6412 348.7242 0006703 331.7664  19.3264 15.50103472 4136"


def sealed(line: str) -> str:
    """Append the right checksum, so that a test meets the mistake it means to."""
    return line + str(checksum(line))


def one_error(text: str) -> FileError:
    (result,) = read_tle(text, "kestrel.tle")
    assert isinstance(result, FileError)
    return result


def changed(line: str, first_column: int, text: str) -> str:
    return line[: first_column - 1] + text + line[first_column - 1 + len(text) :]


def test_every_field_is_read_with_its_unit():
    (result,) = read_tle(f"KESTREL 1\r\n{sealed(ONE)}\r\n{sealed(TWO)}\r\n", "kestrel.tle")
    assert isinstance(result, MeanElements)
    assert (result.object_name, result.object_id) == ("KESTREL 1", "2026-012B")
    assert (result.epoch_jd, result.epoch_fraction) == (2461264.5, 0.87851851)  # 12 August 2026
    assert result.epoch_unix_s == pytest.approx(
        datetime(2026, 8, 12, 21, 5, 4, tzinfo=UTC).timestamp(), abs=1.0
    )
    assert result.bstar_per_earth_radius == -0.44063e-4
    assert result.mean_motion_dot_rev_per_day2 == 0.00002182
    assert result.mean_motion_ddot_rev_per_day3 == -0.12345e-7
    assert (result.inclination_deg, result.raan_deg, result.eccentricity) == (51.6412, 348.7242, 0.0006703)
    assert (result.arg_perigee_deg, result.mean_anomaly_deg) == (331.7664, 19.3264)
    assert result.mean_motion_rev_per_day == 15.50103472


def test_two_line_set_is_named_by_its_catalogue_number_alpha_5_included():
    one, two = (changed(line, 3, "T0042") for line in (ONE, TWO))
    (result,) = read_tle(f"{sealed(one)}\n{sealed(two)}", "kestrel.tle")
    assert isinstance(result, MeanElements)
    assert result.object_name == "T0042"


@pytest.mark.parametrize("name", ["0 KESTREL 1", "KESTREL 1   ", "# a comment\n\nKESTREL 1"])
def test_name_line_forms(name: str):
    (result,) = read_tle(f"{name}\n{sealed(ONE)}\n{sealed(TWO)}", "kestrel.tle")
    assert isinstance(result, MeanElements)
    assert result.object_name == "KESTREL 1"


def test_blank_designator_and_twentieth_century_epoch():
    one = changed(changed(ONE, 10, " " * 8), 19, "57")
    (result,) = read_tle(f"{sealed(one)}\n{sealed(TWO)}", "kestrel.tle")
    assert isinstance(result, MeanElements)
    assert result.object_id == ""
    assert result.epoch_jd == 2436062.5  # 12 August 1957


@given(first=st.integers(0, 99_999), dot=st.sampled_from(["-.00000001", " .12345678", "+.00002000"]))
def test_reads_the_same_numbers_as_the_reference_reader(first: int, dot: str):
    one = changed(changed(ONE, 55, f"{first:05d}"), 34, dot)
    (result,) = read_tle(f"{sealed(one)}\n{sealed(TWO)}", "kestrel.tle")
    assert isinstance(result, MeanElements)
    reference = Satrec.twoline2rv(sealed(one), sealed(TWO), WGS72)
    ours = satrec(result)
    for name in (
        "bstar",
        "ndot",
        "nddot",
        "ecco",
        "argpo",
        "inclo",
        "mo",
        "no_kozai",
        "nodeo",
        "jdsatepochF",
    ):
        assert getattr(ours, name) == pytest.approx(getattr(reference, name), rel=1e-14, abs=0.0)


def test_the_invented_set_is_what_the_reference_writer_writes():
    reference = Satrec.twoline2rv(sealed(ONE), sealed(TWO), WGS72)
    assert export_tle(reference) == (sealed(ONE), sealed(TWO))


@pytest.mark.parametrize(
    ("column", "text", "says"),
    [
        (3, "9900I", "catalogue number (columns 3-7)"),
        (8, "X", "classification (column"),
        (9, "x", "column 9 is 'x'; it must be blank"),
        (10, "2612B   ", "international designator"),
        (19, "26224,87851851", "the epoch (columns 19-32)"),
        (19, "26366.00000000", "day 366 of 2026 does not exist"),
        (19, "26000.00000000", "day 0 of 2026 does not exist"),
        (34, " 0.0000218", "mean motion derivative"),
        (54, " 0.00012 ", "drag term"),
        (63, "4", "ephemeris type (column 63) is 4; only SGP4"),
        (63, "x", "ephemeris type (columns"),
        (65, "9x", "element set number"),
    ],
)
def test_wrong_line_1_is_refused(column: int, text: str, says: str):
    error = one_error(f"{sealed(changed(ONE, column, text))}\n{sealed(TWO)}")
    assert error.where == "line 1"
    assert says in str(error)


@pytest.mark.parametrize(
    ("column", "text", "says"),
    [
        (3, "99002", "its catalogue number is 99002, that of line 1 is 99001"),
        (9, "181.0000", "inclination is 181.0; it must lie between"),
        (18, "360.0001", "right ascension of the node is 360.0001"),
        (27, "-006703", "eccentricity (columns 27-33)"),
        (53, " 0.00001000", "mean motion is 1e-05; it must lie between"),
        (53, "15.5010347x", "mean motion (columns 53-63)"),
        (61, "7.2", "mean motion"),
    ],
)
def test_wrong_line_2_is_refused(column: int, text: str, says: str):
    error = one_error(f"{sealed(ONE)}\n{sealed(changed(TWO, column, text))}")
    assert error.where == "line 2"
    assert says in str(error)


DIGITS = [column for column, character in enumerate(ONE, start=1) if character.isdigit() and column > 8]


@given(column=st.sampled_from(DIGITS), digit=st.sampled_from("0123456789"))
def test_any_changed_digit_is_caught_by_the_checksum(column: int, digit: str):
    damaged = changed(sealed(ONE), column, digit)
    read = isinstance(read_tle(f"{damaged}\n{sealed(TWO)}", "kestrel.tle")[0], MeanElements)
    assert read == (damaged == sealed(ONE))


@pytest.mark.parametrize(
    ("text", "where", "says"),
    [
        (f"{ONE}\n{sealed(TWO)}", "line 1", "ends at column 68; an element line has 69 columns"),
        (f"{sealed(ONE)} 12\n{sealed(TWO)}", "line 1", "has '12' after column 69; remove it"),
        (sealed(ONE), "line 1", "is not followed by its line 2"),
        (f"KESTREL 1\n{sealed(ONE)}\n", "line 2", "is not followed by its line 2"),
        (sealed(TWO), "line 1", "has no line 1 right before it"),
        (f"{sealed(ONE)}\n{sealed(TWO)}\nKESTREL 2\n", "line 3", "'KESTREL 2' is no element line"),
        (f"KES\tTREL\n{sealed(ONE)}\n{sealed(TWO)}", "line 1", "control characters"),
        ("\n\nhello\nworld", "line 3", "holds no element set"),
        ("", "line 1", "holds no element set"),
    ],
)
def test_wrong_arrangement_is_refused(text: str, where: str, says: str):
    error = read_tle(text, "kestrel.tle")[-1]
    assert isinstance(error, FileError)
    assert (error.source, error.where) == ("kestrel.tle", where)
    assert says in error.problem


def test_a_bad_set_does_not_take_its_neighbours_along():
    good = f"{sealed(ONE)}\n{sealed(TWO)}\n"
    results = read_tle(f"A\n{good}B\n{sealed(TWO)}\nC\n{good}", "kestrel.tle")
    assert [type(r) for r in results] == [MeanElements, FileError, FileError, MeanElements]
    assert [r.where for r in results if isinstance(r, FileError)] == ["line 4", "line 5"]
