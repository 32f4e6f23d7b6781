"""A stream and its activity components, as frozen records."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from app.core.constants import ESCAPE_SPEED2_KM2_S2
from app.errors import FieldError

DEFAULT_SPREAD_DEG = 0.6  # per axis; Moorhead, Clements & Vida 2022 give 0.27-1.20 for twelve showers
DEFAULT_DENSITY_KG_M3 = 1000.0  # ECSS-E-ST-10-04C for streams (memory); published values 350-3000


@dataclass(frozen=True)
class Component:
    """ZHR = ``zhr_peak`` * 10^(-B |dlambda|), B before and after the peak (Jenniskens 1994)."""

    name: str
    solar_longitude_peak_deg: float
    zhr_peak: float
    b_rise_per_deg: float
    b_fall_per_deg: float

    def __post_init__(self) -> None:
        _within("solar_longitude_peak_deg", self.solar_longitude_peak_deg, 0.0, 360.0)
        _within("zhr_peak", self.zhr_peak, 0.0, 1e7)
        _within("b_rise_per_deg", self.b_rise_per_deg, 0.0, 1e4)
        _within("b_fall_per_deg", self.b_fall_per_deg, 0.0, 1e4)


@dataclass(frozen=True)
class Stream:
    """One meteoroid stream. Radiant (J2000, geocentric) at the peak of the first component, with linear drift.

    ``v_geocentric_km_s`` is the speed before the Earth's pull (v-infinity of the geometry).
    Outside ``start``..``end`` (solar longitude), where given, the rate is zero.
    """

    code: str
    name: str
    components: tuple[Component, ...]
    population_index_r: float
    v_geocentric_km_s: float
    radiant_ra_deg: float
    radiant_dec_deg: float
    drift_ra_deg_per_deg: float = 0.0
    drift_dec_deg_per_deg: float = 0.0
    start_solar_longitude_deg: float | None = None
    end_solar_longitude_deg: float | None = None
    bulk_density_kg_m3: float = DEFAULT_DENSITY_KG_M3
    radiant_spread_deg: float = DEFAULT_SPREAD_DEG

    def __post_init__(self) -> None:
        # Koschack & Rendtel's formula has no meaning at r <= 1.3.
        _within("population_index_r", self.population_index_r, 1.31, 6.0)
        _within("v_geocentric_km_s", self.v_geocentric_km_s, 1.0, 80.0)
        _within("radiant_ra_deg", self.radiant_ra_deg, -360.0, 720.0)
        _within("radiant_dec_deg", self.radiant_dec_deg, -90.0, 90.0)
        _within("drift_ra_deg_per_deg", self.drift_ra_deg_per_deg, -20.0, 20.0)
        _within("drift_dec_deg_per_deg", self.drift_dec_deg_per_deg, -20.0, 20.0)
        _within("bulk_density_kg_m3", self.bulk_density_kg_m3, 50.0, 8000.0)
        _within("radiant_spread_deg", self.radiant_spread_deg, 0.0, 10.0)
        for limit in ("start_solar_longitude_deg", "end_solar_longitude_deg"):
            if getattr(self, limit) is not None:
                _within(limit, getattr(self, limit), 0.0, 360.0)
        if (self.start_solar_longitude_deg is None) != (self.end_solar_longitude_deg is None):
            raise FieldError("start_solar_longitude_deg", "give both activity limits or neither")

    @property
    def peak_deg(self) -> float:
        """Solar longitude (degrees) of the component with the highest peak rate."""
        return max(self.components, key=lambda c: c.zhr_peak).solar_longitude_peak_deg

    @property
    def v_entry_km_s(self) -> float:
        """Speed at the top of the air, the Earth's pull included."""
        return math.sqrt(self.v_geocentric_km_s**2 + ESCAPE_SPEED2_KM2_S2)


@dataclass(frozen=True)
class CatalogueEntry:
    """A stream as catalogued: the usable ``stream`` or None, why it is off, and every value's origin.

    ``values``: rows of the table by component, each ``{column: {"value", "source", "provenance"}}``,
    named by ``component_names``. ``parent_body``: the same three fields, where one is known.
    """

    code: str
    name: str
    confidence: str
    enabled: bool
    why_off: str | None
    stream: Stream | None
    values: tuple[Mapping[str, Mapping[str, Any]], ...]
    notes: tuple[str, ...] = ()
    component_names: tuple[str, ...] = ()
    parent_body: Mapping[str, Any] | None = None


@dataclass(frozen=True)
class Catalogue:
    """All catalogued streams; ``digest`` (SHA-256 hex) names the exact table."""

    entries: tuple[CatalogueEntry, ...]
    digest: str
    streams: tuple[Stream, ...] = field(init=False)

    def __post_init__(self) -> None:
        on = tuple(e.stream for e in self.entries if e.enabled and e.stream is not None)
        object.__setattr__(self, "streams", on)


def _within(name: str, value: float, low: float, high: float) -> None:
    if not (math.isfinite(value) and low <= value <= high):
        raise FieldError(name, f"is {value!r}; it must lie between {low:g} and {high:g}")
