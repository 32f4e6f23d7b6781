"""Frame rotations through ERFA, without Earth-orientation data."""

from __future__ import annotations

from typing import Any

import erfa
import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]
SplitDate = tuple[Floats, Floats]


def true_of_date_from_gcrf(tt: SplitDate) -> Floats:
    """Bias, precession and nutation (IAU 2006/2000A): matrices (T, 3, 3) from GCRF to the equator of date."""
    matrices: Floats = erfa.pnm06a(*tt)
    return matrices


def teme_to_gcrf(utc: SplitDate, tt: SplitDate, true_of_date: Floats) -> Floats:
    """Return the matrices (T, 3, 3) that turn TEME-of-date vectors into GCRF, given ``true_of_date_from_gcrf``.

    TEME differs from the true equator and equinox of date by a turn about the pole through the difference
    between apparent sidereal time (IAU 2006/2000A) and the 1982 mean sidereal time SGP4 is defined with
    (Vallado et al. 2006, AIAA 2006-6753, appendix C). Both sidereal times turn at the same rate, so UT1
    cancels to 1e-9 rad and UTC stands in for it. Celestial pole offsets (under 1 mas, 3 cm) are neglected.
    """
    apparent = erfa.gst06(*utc, *tt, true_of_date)
    mean = erfa.gmst82(*utc)
    true_of_date_from_teme = _turn_about_pole(mean - apparent)
    rotation: Floats = np.swapaxes(true_of_date, -1, -2) @ true_of_date_from_teme
    return rotation


def _turn_about_pole(angle_rad: Floats) -> Floats:
    """Frame rotation about z by ``angle_rad`` (T,): (T, 3, 3), the sense of ERFA's rz."""
    matrix = np.zeros((*np.shape(angle_rad), 3, 3))
    cosine, sine = np.cos(angle_rad), np.sin(angle_rad)
    matrix[..., 0, 0] = matrix[..., 1, 1] = cosine
    matrix[..., 0, 1], matrix[..., 1, 0] = sine, -sine
    matrix[..., 2, 2] = 1.0
    return matrix


def rotate(matrices: Floats, vectors: Any) -> Floats:
    """Apply (T, 3, 3) to vectors (N, T, 3): (N, T, 3)."""
    rotated: Floats = np.einsum("tij,ntj->nti", matrices, vectors)
    return rotated
