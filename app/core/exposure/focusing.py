"""A collimated stream near a gravitating body: both branches of the two-body solution, and its shadow.

With w the unit vector of motion far away, r the position, theta the angle between them,
s = sin(theta/2), a = mu/v_inf^2 and q = sqrt(1 + 2a/(r s^2)), the two-body orbit equation
b^2 - b r sin(theta) - a r (1 + cos(theta)) = 0 (Opik 1951; Kessler 1972; Jones & Poole 2007) reduces to

    density   n/n_inf = (q +- 1)^2 / (4 q)
    velocity  v = v_inf/2 [ (1 +- q) w + (1 -+ q) r/|r| ]
    impact    |b| = r cos(theta/2) (w_ +- s),  w_ = q s

which keeps every digit near both ends of the axis. A particle is stopped when it would have had to come up
through the blocking sphere: it moves outward and |b| < R sqrt(1 + 2a/R). The minus branch always moves
outward (its radial speed is v_inf (cos^2(theta/2) + s w_)), and its |b| is the smaller of the two, so a place
is sheltered exactly where the plus branch is stopped.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from app.core.constants import BLOCKING_RADIUS_KM, MU_EARTH_KM3_S2

Floats = npt.NDArray[np.float64]
SMALLEST_HALF_SINE = 1e-9  # keeps the exact axis finite; 4e-4 arc seconds


@dataclass(frozen=True)
class Branch:
    """One family of arriving trajectories: ``density_ratio`` n/n_inf, 0 where stopped; ``sign`` +1 or -1."""

    sign: float
    density_ratio: Floats


@dataclass(frozen=True)
class Focusing:
    """Focused stream at S x T places. Arrays (S, T) unless said otherwise.

    ``q``: see the module's head. ``margin``: positive where sheltered, crossing zero at the edge of the shadow.
    ``capped``: within the radiant's own spread of the anti-radiant axis, where the collimated solution
    diverges and its value on the edge of that zone is used.
    """

    q: Floats
    branches: tuple[Branch, ...]
    margin: Floats
    capped: npt.NDArray[np.bool_]


def half_sine_cap(spread_deg: npt.ArrayLike) -> Floats:
    """Smallest sin(theta/2) at which the collimated density is still below the spread's on-axis average.

    A Gaussian radiant of ``spread_deg`` per axis gives sqrt(pi a/r)/sigma on the axis; the two collimated
    branches together give sqrt(2a/r)/theta; they are equal at theta = sigma sqrt(2/pi).
    """
    theta = np.radians(spread_deg) * np.sqrt(2.0 / np.pi)
    return np.maximum(np.sin(theta / 2.0), SMALLEST_HALF_SINE)


def focus(
    cos_theta: Floats,
    r_km: Floats,
    v_inf_km_s: Floats,
    spread_deg: Floats,
    mu_km3_s2: float = MU_EARTH_KM3_S2,
    radius_km: float = BLOCKING_RADIUS_KM,
) -> Focusing:
    """Solve both branches for streams (S, 1) at places (S, T) or (T,).

    ``cos_theta``: r.w/|r|, (S, T). ``spread_deg``: radiant spread per axis, (S, 1); 0 gives the bare solution.
    """
    pull = mu_km3_s2 / np.square(v_inf_km_s)
    graze_km = radius_km * np.sqrt(1.0 + 2.0 * pull / radius_km)
    true_s2 = np.clip(0.5 - 0.5 * cos_theta, 0.0, 1.0)
    cap = half_sine_cap(spread_deg)
    s2 = np.maximum(true_s2, np.square(cap))
    s = np.sqrt(s2)
    w = np.sqrt(s2 + 2.0 * pull / r_km)
    q = w / s
    margin = _shadow_margin(s, w, s2, r_km, graze_km)
    branches = _arriving(q, s, w, s2, r_km, graze_km, margin)
    return Focusing(q, branches, margin, true_s2 < np.square(cap))


def _shadow_margin(s: Floats, w: Floats, s2: Floats, r_km: Floats, graze_km: Floats) -> Floats:
    """Positive where the plus branch is stopped: outward motion and an impact parameter below grazing."""
    c2 = 1.0 - s2
    outward = c2 - s * w
    miss = 1.0 - r_km * np.sqrt(c2) * (s + w) / graze_km
    return np.minimum(outward, miss)


def _arriving(
    q: Floats, s: Floats, w: Floats, s2: Floats, r_km: Floats, graze_km: Floats, margin: Floats
) -> tuple[Branch, ...]:
    over_4q = 0.25 / q
    plus = Branch(1.0, np.where(margin > 0.0, 0.0, np.square(q + 1.0) * over_4q))
    impact_minus_km = r_km * np.sqrt(1.0 - s2) * (w - s)
    visible = impact_minus_km >= graze_km
    if not visible.any():  # always so in low orbits, where it halves the work that follows
        return (plus,)
    return plus, Branch(-1.0, np.where(visible, np.square(q - 1.0) * over_4q, 0.0))


def relative_velocity(branch: Branch, q: Floats, slow: Floats, fast: Floats, v_km_s: Floats) -> Floats:
    """Particle velocity relative to the satellite, (3, S, T), km/s.

    ``slow`` = v_inf/2 (w + r/|r|) and ``fast`` = v_inf/2 (w - r/|r|), each (3, S, T): the branch moves
    with slow + q fast or slow - q fast. ``v_km_s``: the satellite's velocity, (3, T) or (3, S, T).
    """
    satellite = v_km_s if v_km_s.ndim == slow.ndim else v_km_s[:, None, :]
    velocity: Floats = slow + (branch.sign * q) * fast - satellite
    return velocity
