"""Observed outbursts: the published time of peak and the published solar longitude are the same instant.

``outbursts.csv`` names the publication of each row and whether it was read. In some rows one of the two was worked
out from the other: by the publication's authors, or when the table was made ("computed" in the notes). Those rows
check our sky against another ephemeris; the others (INDEPENDENT) check it against the observers' own pairs.
"""

from __future__ import annotations

from datetime import datetime

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.sky.bodies import wrap_deg
from app.core.sky.longitude import time_of_solar_longitude
from app.core.sky.times import TimeGrid
from tests.published.tables import rows

hundredth_of_a_degree = 0.01  # a quarter of an hour; published longitudes carry two or three decimals
# ERFA states its Earth for 1900 to 2100.
DATED = [
    row
    for row in rows("outbursts")
    if "T" in row["utc_peak"] and row["solar_longitude_deg"] and int(row["year"]) >= 1900
]
INDEPENDENT = [row for row in DATED if "computed" not in row["notes"]]


def unix_s(row: dict[str, str]) -> float:
    return datetime.fromisoformat(f"{row['utc_peak']}+00:00").timestamp()


def label(row: dict[str, str]) -> str:
    return f"{row['code']}-{row['utc_peak']}-{row['source']}"


@pytest.mark.parametrize("row", DATED, ids=label)
def test_solar_longitude_at_the_observed_peak(row: dict[str, str]):
    ours = TimeGrid(np.array([unix_s(row)])).solar_longitude_deg[0]
    published = float(row["solar_longitude_deg"])
    assert_allclose(wrap_deg(ours - published), 0.0, atol=hundredth_of_a_degree)


@pytest.mark.parametrize("row", INDEPENDENT, ids=label)
def test_time_of_the_published_longitude(row: dict[str, str]):
    quarter_of_an_hour_s = 900.0
    found = time_of_solar_longitude(float(row["solar_longitude_deg"]), unix_s(row) + 20 * 86400.0)
    assert_allclose(found, unix_s(row), rtol=0.0, atol=quarter_of_an_hour_s)


def test_enough_independent_pairs_are_checked():
    assert len({(row["code"], row["year"]) for row in INDEPENDENT}) >= 5
