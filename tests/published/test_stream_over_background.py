"""A whole chain: an annual shower against the background."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from app.core.constants import BLOCKING_RADIUS_KM
from app.core.exposure.faces import Places, StreamSet, hazard_rates
from app.core.spacecraft.model import Criterion, CriterionKind
from app.core.streams.flux import MASS_LAWS
from app.core.streams.sporadic import gruen_flux_per_m2_s
from tests.published.probes import plates, stream

ENERGY_J = 100.0
SPORADIC_G = 5e-4  # carries 100 J at 20 km/s


@pytest.mark.case(50)
@pytest.mark.parametrize(("law", "expected"), [("jvb", 0.565), ("verniani", 2.39)])
def test_geminids_against_the_everyday_flux(law: str, expected: float):
    # Common practice: a strong annual shower can double the flux, so the ratio is between 0.3 and 3.
    # Peak of ZHR 150, r 2.6, v_g 33.8 (derived ratio 0.565, with Verniani's masses 2.39) on a face square to it
    # at the top of the air, under the radiant.
    streams = StreamSet((stream(2.6, 33.8, 150.0),), MASS_LAWS[law])
    under_the_radiant = np.array([[BLOCKING_RADIUS_KM], [0.0], [0.0]])
    places = Places(under_the_radiant, np.zeros((3, 1)), np.array([[0.0], [1.5e8], [0.0]]))
    downstream = np.array([-1.0, 0.0, 0.0]).reshape(3, 1, 1)
    face = plates([(1.0, 0.0, 0.0)], Criterion(CriterionKind.ENERGY, ENERGY_J))
    rates = hazard_rates(face, streams, downstream, places, np.array([[150.0]]))
    ratio = float(rates[0, 0, 0] / gruen_flux_per_m2_s(SPORADIC_G))
    three_digits = 3e-3
    assert_allclose(ratio, expected, rtol=three_digits)
    assert 0.3 < ratio < 3.0
