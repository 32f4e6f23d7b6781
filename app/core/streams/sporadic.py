"""The everyday background: interplanetary flux and its speed distribution."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
import numpy.typing as npt

from app.core.constants import ESCAPE_SPEED2_KM2_S2

Floats = npt.NDArray[np.float64]
SPORADIC_DENSITY_KG_M3 = 2500.0  # ECSS-E-ST-10-04C (memory)


def gruen_flux_per_m2_s(mass_g: npt.ArrayLike) -> Floats:
    """Flux of particles of ``mass_g`` or more on a randomly oriented single-sided plate at 1 au, m^-2 s^-1.

    Gruen, Zook, Fechtig & Giese 1985 (Icarus 62, 244), the terms as in ECSS-E-ST-10-04C 10.2.4.1.
    Isotropic, no Earth; the yearly mean of sporadics and streams together.
    """
    m = np.asarray(mass_g, dtype=float)
    large = (2.2e3 * m**0.306 + 15.0) ** -4.38
    medium = 1.3e-9 * (m + 1e11 * m**2 + 1e27 * m**4) ** -0.36
    small = 1.3e-16 * (m + 1e6 * m**2) ** -0.85
    flux: Floats = large + medium + small
    return flux


@dataclass(frozen=True)
class SpeedDistribution:
    """Share of the flux at the top of the air by entry speed: ``v_entry_km_s`` (K,), ``share`` (K,), sum 1."""

    source: str
    v_entry_km_s: Floats
    share: Floats

    @property
    def v_inf_km_s(self) -> Floats:
        """Speed before the Earth's pull (K,)."""
        squared: Floats = np.square(self.v_entry_km_s) - ESCAPE_SPEED2_KM2_S2
        return np.sqrt(np.maximum(squared, 0.0))

    @property
    def free_space_share(self) -> Floats:
        """Share of the flux in free space (K,), sum 1: weight v_inf^2 / v_entry^2, since flux grows as v^2."""
        weight = self.share * np.square(self.v_inf_km_s / self.v_entry_km_s)
        normalised: Floats = weight / weight.sum()
        return normalised


def analytic_density(v_entry_km_s: npt.ArrayLike) -> Floats:
    """Analytic speed distribution at 100 km, per km/s (Zook; NASA TM-4527, memory). Integrates to 1.0037."""
    v = np.asarray(v_entry_km_s, dtype=float)
    pieces = [
        ((v >= 11.1) & (v < 16.3), 0.112),
        ((v >= 55.0) & (v <= 72.2), 1.695e-4),
    ]
    tail = np.where((v >= 16.3) & (v < 55.0), 3.328e5 * v**-5.34, 0.0)
    return sum((np.where(inside, value, 0.0) for inside, value in pieces), tail)


@cache
def analytic_speeds() -> SpeedDistribution:
    """The analytic distribution on Gauss-Legendre nodes of its three pieces (its mean is 16.86 km/s)."""
    nodes, weights = zip(
        *(
            _gauss(low, high, count)
            for low, high, count in ((11.1, 16.3, 8), (16.3, 55.0, 12), (55.0, 72.2, 2))
        ),
        strict=True,
    )
    speed = np.concatenate(nodes)
    share = np.concatenate(weights) * analytic_density(speed)
    # The flat first piece starts a hair above the escape speed of 6478 km (11.0934 km/s): no v_inf is imaginary.
    return SpeedDistribution("analytic, NASA TM-4527 (memory)", speed, share / share.sum())


def _gauss(low: float, high: float, count: int) -> tuple[Floats, Floats]:
    x, w = np.polynomial.legendre.leggauss(count)
    return (low + high) / 2 + (high - low) / 2 * x, (high - low) / 2 * w
