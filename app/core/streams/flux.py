"""From a visual rate to a flux above any mass, at infinity.

Three steps: Koschack & Rendtel (1990) give the flux of meteors brighter than magnitude 6.5 at the top of
the air; dividing by the focusing of a zenith radiant there gives the flux at infinity; a named
magnitude-mass-speed law carries it to other masses through magnitude, F(>m) = F(6.5) r^(M(m) - 6.5).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from app.core.constants import ESCAPE_SPEED2_KM2_S2
from app.core.streams.model import Stream
from app.errors import FieldError

Floats = npt.NDArray[np.float64]
VISUAL_LIMIT = 6.5  # magnitude to which a ZHR refers
TRUSTED_R = (1.8, 3.5)  # range in which form A is stated to hold


@dataclass(frozen=True)
class MassLaw:
    """M = ``zero`` - ``speed`` log10(v_entry km/s) - ``mass`` log10(m g), absolute magnitude M."""

    name: str
    source: str
    zero: float
    speed: float
    mass: float

    def magnitude(self, mass_g: npt.ArrayLike, v_entry_km_s: npt.ArrayLike) -> Floats:
        """Absolute magnitude of a meteoroid; arguments broadcast."""
        bright: Floats = self.zero - self.speed * np.log10(v_entry_km_s) - self.mass * np.log10(mass_g)
        return bright

    def mass_g(self, magnitude: npt.ArrayLike, v_entry_km_s: npt.ArrayLike) -> Floats:
        """Mass in grams of a meteoroid of that absolute magnitude and entry speed."""
        log_mass = (self.zero - self.speed * np.log10(v_entry_km_s) - np.asarray(magnitude)) / self.mass
        mass: Floats = 10.0**log_mass
        return mass

    def exponent(self, population_index_r: npt.ArrayLike) -> Floats:
        """x in F(>m) ~ m^-x that goes with r under this law (mass index minus one)."""
        slope: Floats = self.mass * np.log10(population_index_r)
        return slope


MASS_LAWS = {
    "jvb": MassLaw(
        "jvb",
        "Jacchia, Verniani & Briggs 1967 with Verniani's luminous efficiency, short form of Peterson 1999",
        zero=11.59,
        speed=8.75,
        mass=2.25,
    ),
    # 2.5 log m = 64.09 - 10 log v[cm/s] - M; 10 log10(1e5) = 50 turns cm/s into km/s.
    "verniani": MassLaw("verniani", "Verniani 1973", zero=14.09, speed=10.0, mass=2.5),
}


def mass_law(name: str) -> MassLaw:
    """Look up a magnitude-mass-speed law; ``FieldError`` lists the known names."""
    if name not in MASS_LAWS:
        raise FieldError("mass_law", f"'{name}' is not known; choose one of {', '.join(MASS_LAWS)}")
    return MASS_LAWS[name]


def flux_per_m2_s_at_air(zhr: npt.ArrayLike, population_index_r: npt.ArrayLike) -> Floats:
    """Flux of meteors brighter than 6.5 through a plate facing the radiant, m^-2 s^-1, at 100 km.

    Form A of Koschack & Rendtel 1990 (WGN 18, 44 and 119): ZHR c(r)/37200 per km2 and hour,
    c(r) = (13.1 r - 16.5)(r - 1.3)^0.748. Stated for 1.8 <= r <= 3.5; meaningless at r <= 1.3.
    """
    r = np.asarray(population_index_r, dtype=float)
    correction = (13.1 * r - 16.5) * (r - 1.3) ** 0.748
    flux: Floats = np.asarray(zhr) * correction / 37200.0 / 1e6 / 3600.0
    return flux


def zenith_focusing(v_inf_km_s: npt.ArrayLike) -> Floats:
    """Flux at the top of the air over flux at infinity for a zenith radiant: (1 + q)^2/4, q = v_entry/v_inf."""
    ratio = np.sqrt(1.0 + ESCAPE_SPEED2_KM2_S2 / np.square(v_inf_km_s))
    factor: Floats = (1.0 + ratio) ** 2 / 4.0
    return factor


@dataclass(frozen=True)
class PowerLaw:
    """Flux at infinity above a mass: ``at_1_g`` * zhr * (m/g)^-``exponent``, each (S,), per m2 and s."""

    at_1_g: Floats
    exponent: Floats

    def flux_per_m2_s(self, zhr: npt.ArrayLike, mass_g: npt.ArrayLike) -> Floats:
        """Flux at infinity of particles of ``mass_g`` or more; arguments broadcast against (S,)."""
        flux: Floats = self.at_1_g * np.asarray(zhr) * np.asarray(mass_g) ** -self.exponent
        return flux


def power_law(streams: list[Stream] | tuple[Stream, ...], law: MassLaw) -> PowerLaw:
    """Flux law of S streams per unit ZHR. Entry speed goes into the mass law, geocentric into focusing."""
    r = np.array([s.population_index_r for s in streams])
    v_inf = np.array([s.v_geocentric_km_s for s in streams])
    v_entry = np.array([s.v_entry_km_s for s in streams])
    visual = flux_per_m2_s_at_air(1.0, r) / zenith_focusing(v_inf)
    return PowerLaw(visual * r ** (law.magnitude(1.0, v_entry) - VISUAL_LIMIT), law.exponent(r))
