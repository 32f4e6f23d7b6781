"""A computed series -> the document that shows it, or the part of it that was asked for."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Self

import numpy as np
import numpy.typing as npt

from app.api.times import unix_text
from app.core.spacecraft.model import Spacecraft
from app.errors import FieldError
from app.formats.text import shown as quoted
from app.on_demand import Series

MOST_CELLS = 500_000  # (faces x criteria) x samples to compute: each holds one number per stream
MOST_NUMBERS = 1_000_000  # to send: about 20 MB
Floats = npt.NDArray[np.float64]


@dataclass(frozen=True)
class Chosen:
    """Which face and which criterion's label to show; None shows all."""

    face: str | None
    label: str | None

    @classmethod
    def checked(cls, spacecraft: Spacecraft, face: str | None, label: str | None) -> Self:
        """Make it; ``FieldError`` lists what the spacecraft has when the choice is none of it."""
        _require("face", face, [each.name for each in spacecraft.faces])
        of_face = [each for each in spacecraft.faces if face in (None, each.name)]
        _require("criterion", label, [c.label for each in of_face for c in each.criteria])
        return cls(face, label)

    def has(self, face: str, label: str) -> bool:
        """Say whether this row is to be shown."""
        return self.face in (None, face) and self.label in (None, label)


def check_size(spacecraft: Spacecraft, samples: float) -> None:
    """Refuse what would take too much memory, before it is computed."""
    rows = sum(len(face.criteria) for face in spacecraft.faces)
    if rows * samples > MOST_CELLS:
        most = MOST_CELLS // rows
        raise FieldError("step_s", f"asks for {samples:.0f} samples; this satellite's limit is {most}")


def shown(series: Series, chosen: Chosen) -> dict[str, Any]:
    """Write the series; ``FieldError`` when it is too long to send."""
    rows = [i for i, row in enumerate(series.rows) if chosen.has(*row)]
    labels = [i for i, label in enumerate(series.satellite_labels) if chosen.has(chosen.face or "", label)]
    numbers = (len(rows) + len(labels)) * (1 + len(series.stream_codes)) * len(series.unix_s)
    if numbers > MOST_NUMBERS:
        raise FieldError(
            "step_s", "the answer would be too long; ask for fewer samples, one face or one criterion"
        )
    return {
        "times": [unix_text(each) for each in series.unix_s],
        "streams": _streams(series),
        "whole": [
            _band(
                series.satellite_labels[i], series.satellite_factor[i], series.satellite_by_stream[i], series
            )
            for i in labels
        ],
        "faces": [_face(series, i) for i in rows],
    }


def _streams(series: Series) -> dict[str, Any]:
    return {
        code: {"zhr": zhr.tolist(), "sheltered": sheltered.tolist()}
        for code, zhr, sheltered in zip(series.stream_codes, series.zhr, series.sheltered, strict=True)
    }


def _face(series: Series, row: int) -> dict[str, Any]:
    face, label = series.rows[row]
    background = float(series.background_per_m2_s[row])
    band = _band(label, series.factor[row], series.by_stream[row], series)
    return {"face": face, "background_per_m2_s": background, **band}


def _band(label: str, factor: Floats, by_stream: Floats, series: Series) -> dict[str, Any]:
    parts = zip(series.stream_codes, by_stream, strict=True)
    added = {code: _numbers(values) for code, values in parts}
    return {"criterion": label, "low": None, "mid": _numbers(factor), "high": None, "by_stream": added}


def _numbers(values: Floats) -> list[float | None]:
    """A factor over a background of zero is no number; it is sent as null."""
    return [
        value if finite else None for value, finite in zip(values.tolist(), np.isfinite(values), strict=True)
    ]


def _require(field: str, given: str | None, known: list[str]) -> None:
    if given is not None and given not in known:
        names = ", ".join(dict.fromkeys(known))
        raise FieldError(field, f"is {quoted(given)}; this satellite has {names}")
