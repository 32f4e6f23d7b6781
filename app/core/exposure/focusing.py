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
    smallest: Floats = np.maximum(np.sin(theta / 2.0), SMALLEST_HALF_SINE)
    return smallest


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
    cap_s2 = np.square(half_sine_cap(spread_deg))
    s2 = 0.5 - 0.5 * cos_theta
    capped = s2 < cap_s2
    np.clip(s2, cap_s2, 1.0, out=s2)
    s = np.sqrt(s2)
    w = (2.0 * pull) * (1.0 / r_km)
    w += s2
    np.sqrt(w, out=w)
    total, product, c2 = s + w, s * w, np.subtract(1.0, s2, out=s2)
    reach = np.sqrt(c2)
    reach *= r_km
    miss = total * reach
    miss *= -1.0 / graze_km
    miss += 1.0
    margin = np.minimum(c2 - product, miss, out=miss)
    branches: tuple[Branch, ...] = (Branch(1.0, _density_ratio(total, product, margin > 0.0)),)
    # |b| of the minus branch is largest on the axis, sqrt(2 a r). Where even that is below grazing, as in every
    # low orbit, the branch is dark, and leaving it out halves the work that follows.
    if np.any(2.0 * pull * np.max(r_km) >= np.square(graze_km)):
        difference = w - s
        stopped = reach * difference < graze_km
        if not stopped.all():
            branches = *branches, Branch(-1.0, _density_ratio(difference, product, stopped))
    return Focusing(np.divide(w, s, out=w), branches, margin, capped)


def _density_ratio(sum_or_difference: Floats, product: Floats, stopped: npt.NDArray[np.bool_]) -> Floats:
    """(q +- 1)^2 / (4 q) with q = w/s, from w +- s, which is overwritten, and w s; zero where stopped."""
    density = np.square(sum_or_difference, out=sum_or_difference)
    density /= product
    density *= 0.25
    np.copyto(density, 0.0, where=stopped)
    return density


def relative_velocity(
    branch: Branch,
    q: Floats,
    v_inf_km_s: Floats,
    downstream: Floats,
    outward: Floats,
    v_km_s: Floats,
) -> Floats:
    """Particle velocity relative to the satellite, (3, S, T), km/s, all vectors in the same axes.

    ``downstream`` (3, S, T) and ``outward`` = r/|r| are unit vectors. ``outward`` and the satellite's velocity
    ``v_km_s`` are (3,), (3, T) or (3, S, T). ``q`` (S, T), ``v_inf_km_s`` (S, 1).
    """
    along = (0.5 * v_inf_km_s) * (1.0 + branch.sign * q)
    up = v_inf_km_s - along
    velocity = np.empty(downstream.shape)
    for axis in range(3):
        np.multiply(along, downstream[axis], out=velocity[axis])
        if np.any(outward[axis]):
            velocity[axis] += up * outward[axis]
        velocity[axis] -= v_km_s[axis]
    return velocity
