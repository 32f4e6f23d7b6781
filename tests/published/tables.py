"""The reference tables of ``tests/data/reference`` (their origin: ``SOURCES.md`` beside them)."""

from __future__ import annotations

import csv
from functools import cache
from pathlib import Path

import numpy as np

FOLDER = Path(__file__).parents[1] / "data" / "reference"


@cache
def rows(name: str) -> list[dict[str, str]]:
    """Rows of a table as text, by column name."""
    with (FOLDER / f"{name}.csv").open(newline="", encoding="utf-8") as file:
        return list(csv.DictReader(file))


def column(name: str, title: str) -> np.ndarray:
    """One column as numbers, NaN where blank."""
    return np.array([float(row[title]) if row[title] else np.nan for row in rows(name)])
