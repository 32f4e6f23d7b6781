"""Mean elements -> the compiled propagator's record."""

from __future__ import annotations

import math

from sgp4.api import WGS72, Satrec

from app.core.orbit.elements import MeanElements

EPOCH_ORIGIN_JD = 2433281.5  # 1949-12-31 00:00 UTC, where sgp4init counts its days from
MINUTES_PER_DAY = 1440.0
RAD_PER_MIN = 2.0 * math.pi / MINUTES_PER_DAY  # of one revolution per day
CATALOGUE_NUMBER = 0  # the propagator only carries it along


def satrec(elements: MeanElements) -> Satrec:
    """Make the SGP4 record of ``elements``: WGS-72 constants, operation mode 'i'.

    Angles go in as radians, the Kozai mean motion as rad/min and its TLE derivatives as rad/min^2 and
    rad/min^3 (Vallado et al. 2006, AIAA 2006-6753). ``sgp4init`` takes the epoch as one float, which only
    sets the Sun, Moon and sidereal angle at epoch. It is summed as the published program sums it: 40 us
    coarse, worth 4 mm for the worst verification set, and then in step with every other user of that
    program. The record's split epoch, which times are measured from, is set exactly afterwards. Not
    picklable, not thread-safe: build it in the worker. A decayed or impossible orbit is not refused here;
    propagating the record gives SGP4's error code.
    """
    record = Satrec()
    record.sgp4init(
        WGS72,
        "i",
        CATALOGUE_NUMBER,
        (elements.epoch_jd + elements.epoch_fraction) - EPOCH_ORIGIN_JD,
        elements.bstar_per_earth_radius,
        elements.mean_motion_dot_rev_per_day2 * RAD_PER_MIN / MINUTES_PER_DAY,
        elements.mean_motion_ddot_rev_per_day3 * RAD_PER_MIN / MINUTES_PER_DAY**2,
        elements.eccentricity,
        math.radians(elements.arg_perigee_deg),
        math.radians(elements.inclination_deg),
        math.radians(elements.mean_anomaly_deg),
        elements.mean_motion_rev_per_day * RAD_PER_MIN,
        math.radians(elements.raan_deg),
    )
    record.jdsatepoch = elements.epoch_jd
    record.jdsatepochF = elements.epoch_fraction
    return record
