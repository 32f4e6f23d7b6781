"""When the Sun stands at a given longitude."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from app.core.sky.bodies import wrap_deg
from app.core.sky.times import TimeGrid

Floats = npt.NDArray[np.float64]
MEAN_SOLAR_MOTION_DEG_PER_S = 360.0 / (365.25636 * 86400.0)  # sidereal year


def time_of_solar_longitude(longitude_deg: npt.ArrayLike, near_unix_s: npt.ArrayLike) -> Floats:
    """UTC POSIX seconds at which the Sun stands at ``longitude_deg``, the instant nearest ``near_unix_s``.

    Arguments broadcast. Fixed-point iteration on the mean motion; seven rounds leave under a millisecond.
    """
    target, moment = np.broadcast_arrays(
        np.asarray(longitude_deg, dtype=float), np.asarray(near_unix_s, dtype=float)
    )
    moment = moment.copy()
    for _ in range(7):
        here = TimeGrid(moment.ravel()).solar_longitude_deg.reshape(moment.shape)
        moment += wrap_deg(target - here) / MEAN_SOLAR_MOTION_DEG_PER_S
    return moment
