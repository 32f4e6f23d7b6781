"""Constants of the exposure physics. Elements of SGP4 keep their own (WGS-72) set in ``orbit``."""

from __future__ import annotations

MU_EARTH_KM3_S2 = 398600.4418  # IERS Conventions (2010), table 1.1
EARTH_RADIUS_KM = 6378.0  # as used by ECSS-E-ST-10-04C for shielding
AIR_HEIGHT_KM = 100.0  # ECSS-E-ST-10-04C: height below which the air stops meteoroids
BLOCKING_RADIUS_KM = EARTH_RADIUS_KM + AIR_HEIGHT_KM
ESCAPE_SPEED2_KM2_S2 = 2.0 * MU_EARTH_KM3_S2 / BLOCKING_RADIUS_KM  # at the top of the air: 123.063
JULIAN_YEAR_S = 3.15576e7
