"""The Sun as seen from the Earth's centre, and solar longitude (ERFA ``epv00``; no files)."""

from __future__ import annotations

from functools import cache

import erfa
import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]
SplitDate = tuple[Floats, Floats]
AU_KM = 149597870.7  # IAU 2012 Resolution B2
J2000 = 2451545.0


def sun_km(tdb: SplitDate) -> Floats:
    """Geocentric geometric position of the Sun (T, 3), km, GCRF axes (source: ERFA epv00, VSOP2000)."""
    heliocentric, _ = erfa.epv00(*tdb)
    position: Floats = -heliocentric["p"] * AU_KM
    return position


def ecliptic_longitude_deg(sun_km: Floats) -> Floats:
    """Geocentric geometric ecliptic longitude of the Sun (T,), degrees 0-360, equinox J2000.

    ``sun_km`` (T, 3) GCRF. Light time and aberration are left out, as the stream lists do within 0.006 degrees
    (8 minutes).
    """
    ecliptic = sun_km @ _ecliptic_from_gcrf().T
    longitude: Floats = np.degrees(np.arctan2(ecliptic[..., 1], ecliptic[..., 0])) % 360.0
    return longitude


def wrap_deg(angle_deg: npt.ArrayLike) -> Floats:
    """Bring angles into [-180, 180)."""
    wrapped: Floats = (np.asarray(angle_deg, dtype=float) + 180.0) % 360.0 - 180.0
    return wrapped


@cache
def _ecliptic_from_gcrf() -> Floats:
    matrix: Floats = erfa.ecm06(J2000, 0.0)
    return matrix
