"""How far an orbit is trusted for a time-resolved plan."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from app.core.orbit.elements import SECONDS_PER_DAY, MeanElements


def trusted_count(elements: MeanElements, horizon_days: float, unix_s: npt.NDArray[np.float64]) -> int:
    """How many of the ascending instants (T,), from the first on, lie within the horizon of the epoch.

    None do when the first one lies further than the horizon before the epoch.
    """
    reach_s = horizon_days * SECONDS_PER_DAY
    if len(unix_s) == 0 or unix_s[0] < elements.epoch_unix_s - reach_s:
        return 0
    return int(np.searchsorted(unix_s, elements.epoch_unix_s + reach_s, side="right"))
