"""Reading a stream catalogue: what is refused, what is derived, what is assumed."""

from __future__ import annotations

from contextlib import suppress

import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from app.catalogue_file import load_sources, read_catalogue
from app.core.streams.activity import stream_zhr
from app.core.streams.model import Catalogue
from app.errors import CatalogueError, InputError
from app.formats.stream_table import COLUMNS
from tests.stream_tables import SOURCES, row, table

LIMITS = {"start_solar_longitude_deg": "90", "end_solar_longitude_deg": "105"}
NO_SLOPES = {"b_rise_per_deg": "", "b_fall_per_deg": ""}
BRANCH = {"component": "outburst-branch", "zhr_peak": "", **NO_SLOPES}


def read(*rows: dict[str, str]) -> Catalogue:
    return read_catalogue(table(*rows), {**SOURCES, **load_sources()})


def refused(*rows: dict[str, str]) -> CatalogueError:
    with pytest.raises(CatalogueError) as caught:
        read(*rows)
    return caught.value


# What is refused


@pytest.mark.parametrize(
    ("column", "value"),
    [
        ("solar_longitude_peak_deg", "361"),
        ("zhr_peak", "-1"),
        ("zhr_peak", "1e999"),
        ("b_rise_per_deg", "-0.1"),
        ("b_fall_per_deg", "1e9"),
        ("population_index_r", "1.2"),
        ("population_index_r", "7"),
        ("v_geocentric_km_s", "0"),
        ("v_geocentric_km_s", "81"),
        ("v_entry_km_s", "11"),
        ("v_entry_km_s", "1e300"),
        ("radiant_ra_deg", "800"),
        ("radiant_dec_deg", "-91"),
        ("drift_ra_deg_per_deg", "30"),
        ("drift_dec_deg_per_deg", "-30"),
        ("bulk_density_kg_m3", "10"),
        ("radiant_spread_deg", "-1"),
    ],
)
# A stream that is off is judged like one that is on.
@pytest.mark.parametrize("state", [{}, {"confidence": "C"}, {"confidence": "B", "b_rise_per_deg": ""}])
def test_a_value_out_of_range_is_named_with_its_row(state: dict[str, str], column: str, value: str):
    error = refused(row(code="XYZ"), row(**{**state, column: value}))
    assert (error.row, error.code, error.column) == (3, "ABC", column)


@pytest.mark.parametrize("column", LIMITS)
def test_an_activity_limit_out_of_range(column: str):
    error = refused(row(**{**LIMITS, column: "400" if column.startswith("end") else "-10"}))
    assert error.column == column


@pytest.mark.parametrize("column", LIMITS)
def test_half_an_activity_limit_is_refused(column: str):
    assert refused(row(**{**LIMITS, column: ""})).column == column


def test_a_peak_outside_the_limits_is_refused():
    error = refused(row(**{**LIMITS, "end_solar_longitude_deg": "99"}))
    assert error.column == "solar_longitude_peak_deg"
    assert "outside the limits of activity 90 to 99" in error.problem


@pytest.mark.parametrize(
    "column", ["population_index_r", "v_geocentric_km_s", "radiant_ra_deg", "confidence"]
)
def test_components_of_a_stream_must_agree(column: str):
    error = refused(row(), row(component="background", **{column: "B" if column == "confidence" else "3"}))
    assert (error.row, error.column) == (3, column)


def test_one_component_may_not_leave_out_what_another_gives():
    error = refused(row(), row(component="background", population_index_r=""))
    assert error.problem == "is empty; the stream's first row has 2.5"


def test_the_name_is_the_same_in_every_row():
    assert refused(row(), row(component="background", name="beta Examplids")).column == "name"


def test_a_component_stands_once_wherever_the_rows_are():
    error = refused(row(), row(code="XYZ"), row())
    assert (error.row, error.column) == (4, "component")


def test_a_yearly_component_needs_a_rate_and_an_outburst_branch_has_none():
    assert refused(row(zhr_peak="")).column == "zhr_peak"
    assert refused(row(component="outburst-branch", **NO_SLOPES)).column == "zhr_peak"
    assert refused(row(**{**BRANCH, "b_fall_per_deg": "30"})).column == "b_fall_per_deg"


def test_a_stream_without_any_speed_is_refused():
    assert refused(row(v_geocentric_km_s="")).column == "v_geocentric_km_s"


def test_a_shipped_source_key_must_be_known():
    with pytest.raises(CatalogueError, match="source 'LIST'"):
        read_catalogue(table(row()))


@given(st.binary(max_size=200))
def test_any_bytes_are_a_catalogue_or_an_input_error(data: bytes):
    with suppress(InputError):  # any other error fails the test
        assert read_catalogue(data).entries


def outcome(*rows: dict[str, str]) -> Catalogue | CatalogueError:
    try:
        return read(*rows)
    except CatalogueError as error:
        return error


@given(st.sampled_from(COLUMNS), st.text(max_size=12) | st.floats().map(str), st.booleans())
def test_any_text_in_any_field_is_a_catalogue_or_an_error_of_that_row(column: str, text: str, second: bool):
    changed = row(**{"component": "background", column: text})
    found = outcome(row(), changed) if second else outcome(changed)
    if isinstance(found, CatalogueError):
        assert 2 <= found.row <= 3
        assert found.column in COLUMNS
    else:
        assert found.entries


# What is derived or assumed


def test_confidence_decides_what_is_on():
    catalogue = read(row(code="AAA"), row(code="BBB", confidence="B"), row(code="CCC", confidence="C"))
    assert [each.code for each in catalogue.streams] == ["AAA", "BBB"]
    assert [each.why_off for each in catalogue.entries][:2] == [None, None]
    assert "confidence C" in str(catalogue.entries[2].why_off)


def test_slopes_come_from_the_limits_of_activity():
    (only,) = read(row(**NO_SLOPES, **LIMITS)).streams
    # 10 an hour at 100 falls to 1 at 90 and at 105: a decade in 10 and in 5 degrees.
    assert_allclose([only.components[0].b_rise_per_deg, only.components[0].b_fall_per_deg], [0.1, 0.2])
    assert_allclose(stream_zhr(only, [90.0, 105.0]), 1.0)


def test_slopes_come_from_limits_on_both_sides_of_zero():
    near = {
        "solar_longitude_peak_deg": "2",
        "start_solar_longitude_deg": "352",
        "end_solar_longitude_deg": "7",
    }
    (only,) = read(row(**NO_SLOPES, **near)).streams
    assert_allclose([only.components[0].b_rise_per_deg, only.components[0].b_fall_per_deg], [0.1, 0.2])


def test_a_published_slope_is_kept_beside_a_derived_one():
    (found,) = read(row(b_rise_per_deg="", **LIMITS)).entries
    assert found.values[0]["b_rise_per_deg"]["source"] == "LIMITS"
    assert found.values[0]["b_rise_per_deg"]["provenance"] == "computed"
    assert found.values[0]["b_fall_per_deg"] == {"value": 0.3, "source": "LIST", "provenance": "read"}


@pytest.mark.parametrize("changes", [NO_SLOPES, {**NO_SLOPES, **LIMITS, "zhr_peak": "1"}])
def test_without_slopes_and_usable_limits_a_stream_is_off(changes: dict[str, str]):
    (found,) = read(row(**changes)).entries
    assert not found.enabled
    assert found.stream is None
    assert "slope" in str(found.why_off)


def test_without_population_index_a_stream_is_off():
    (found,) = read(row(population_index_r="")).entries
    assert (found.enabled, found.why_off) == (False, "no published population index")


def test_an_outburst_branch_is_silent_and_leaves_the_yearly_component_alone():
    alone, both = read(row(code="AAA", **BRANCH), row(**BRANCH, radiant_ra_deg="99"), row()).entries
    assert (alone.enabled, alone.stream) == (False, None)
    assert "until a prediction" in str(alone.why_off)
    assert both.stream is not None
    assert [each.name for each in both.stream.components] == ["main"]
    assert both.stream.radiant_ra_deg == 15.0


def test_geocentric_speed_comes_from_the_entry_speed_only_where_it_is_missing():
    # 35.574 km/s at entry is 33.8 before the Earth's pull: the project's reference table of sqrt(v^2 - 123.063).
    (derived,) = read(row(v_geocentric_km_s="", v_entry_km_s="35.574")).entries
    assert_allclose(derived.values[0]["v_geocentric_km_s"]["value"], 33.8, atol=1e-3)
    assert derived.values[0]["v_geocentric_km_s"]["provenance"] == "computed"
    (kept,) = read(row(v_entry_km_s="20")).streams
    assert kept.v_geocentric_km_s == 40.0


def test_what_nobody_published_is_assumed_and_says_so():
    (found,) = read(row()).entries
    assumed = {k: v for k, v in found.values[0].items() if v["source"] != "LIST"}
    assert {k: v["value"] for k, v in assumed.items()} == {
        "drift_ra_deg_per_deg": 0.0,
        "drift_dec_deg_per_deg": 0.0,
        "bulk_density_kg_m3": 1000.0,  # ECSS-E-ST-10-04C for streams (memory)
        "radiant_spread_deg": 0.6,  # within 0.27 to 1.20, Moorhead, Clements & Vida 2022 (arXiv:2205.15423)
    }
    assert {v["source"] for v in assumed.values()} <= set(load_sources())


def test_notes_stand_once_with_the_parent_body():
    told = {"notes": "Seen in June", "parent_body": "a comet"}
    (found,) = read(row(**told), row(component="background", **told)).entries
    assert found.notes == ("Seen in June", "Parent body: a comet (LIST, read)")
