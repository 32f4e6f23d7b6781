"""Enhancement factors of faces and of the whole satellite, and which of them raise a level."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from app.core.exposure.faces import criterion_rows
from app.core.spacecraft.model import Spacecraft
from app.errors import OrbitError

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True)
class Baseline:
    """A spacecraft's everyday hazard: what every factor is relative to.

    ``background_per_m2_s`` (C,) by (face, criterion) row; ``area_m2`` (C,); ``labels``: L criterion labels in
    order of appearance; ``of_label`` (L, C) is 1 where the row carries the label. ``sensitive`` (C,).
    """

    spacecraft: Spacecraft
    background_per_m2_s: Floats
    area_m2: Floats
    labels: tuple[str, ...]
    of_label: Floats
    sensitive: npt.NDArray[np.bool_]

    @property
    def label_weights(self) -> Floats:
        """(L, C) such that impacts per second by label = weights @ rates."""
        return self.of_label * self.area_m2

    @property
    def label_background_per_s(self) -> Floats:
        """Background impacts per second on the whole satellite, (L,)."""
        total: Floats = self.label_weights @ self.background_per_m2_s
        return total

    def row_excess(self, rates: Floats) -> Floats:
        """Factor minus one of each row for rates (C, ...): what the streams add."""
        return rates / self.background_per_m2_s.reshape(-1, *([1] * (rates.ndim - 1)))

    def satellite_excess(self, rates: Floats) -> Floats:
        """Factor minus one of the satellite by label, (L, ...), for rates (C, ...)."""
        added = np.tensordot(self.label_weights, rates, axes=1)
        return added / self.label_background_per_s.reshape(-1, *([1] * (rates.ndim - 1)))

    def trigger_excess(self, rates: Floats) -> Floats:
        """What may raise a level, (L + sensitive rows, ...): satellite by label, then each sensitive row."""
        return np.concatenate([self.satellite_excess(rates), self.row_excess(rates)[self.sensitive]])

    def trigger_impacts_per_s(self, rates: Floats) -> Floats:
        """Impacts per second behind each trigger, in the order of ``trigger_excess``."""
        whole = np.tensordot(self.label_weights, rates, axes=1)
        area = self.area_m2[self.sensitive].reshape(-1, *([1] * (rates.ndim - 1)))
        return np.concatenate([whole, area * rates[self.sensitive]])


def baseline(spacecraft: Spacecraft, background_per_m2_s: Floats) -> Baseline:
    """Make the baseline. ``OrbitError`` when a face has no background to compare with."""
    rows = criterion_rows(spacecraft)
    for row, rate in zip(rows, background_per_m2_s, strict=True):
        if not rate > 0.0:
            face = spacecraft.faces[row.face].name
            raise OrbitError(
                f"face '{face}', {row.criterion.label}: no background reaches it, so no factor exists"
            )
    labels = tuple(dict.fromkeys(row.criterion.label for row in rows))
    return Baseline(
        spacecraft,
        background_per_m2_s,
        np.array([spacecraft.faces[row.face].area_m2 for row in rows]),
        labels,
        np.array([[float(row.criterion.label == label) for row in rows] for label in labels]),
        np.array([spacecraft.faces[row.face].sensitive for row in rows]),
    )
