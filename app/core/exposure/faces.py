"""Hazard rates on faces: flux of particles above the critical mass, by criterion, face, stream and instant."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

from app.core.exposure.damage import critical_mass
from app.core.exposure.focusing import Focusing, focus, relative_velocity
from app.core.spacecraft.attitude import body_axes, face_normals, unit
from app.core.spacecraft.model import Criterion, Spacecraft
from app.core.streams.flux import MassLaw, PowerLaw, power_law
from app.core.streams.model import Stream

Floats = npt.NDArray[np.float64]
BLOCK = 1440  # instants worked on at once: ten streams of them still fit the second-level cache


@dataclass(frozen=True)
class Row:
    """One criterion of one face; the rows of a spacecraft run face by face in its own order."""

    face: int
    criterion: Criterion


def criterion_rows(spacecraft: Spacecraft) -> tuple[Row, ...]:
    """All (face, criterion) pairs of a spacecraft, C of them."""
    return tuple(Row(i, c) for i, face in enumerate(spacecraft.faces) for c in face.criteria)


@dataclass(frozen=True)
class StreamSet:
    """S streams with what the exposure needs of them; arrays (S, 1)."""

    streams: tuple[Stream, ...]
    law: MassLaw

    @cached_property
    def v_inf_km_s(self) -> Floats:
        """Geocentric speed (S, 1)."""
        return np.array([[s.v_geocentric_km_s] for s in self.streams])

    @cached_property
    def spread_deg(self) -> Floats:
        """Radiant spread per axis (S, 1)."""
        return np.array([[s.radiant_spread_deg] for s in self.streams])

    @cached_property
    def flux_law(self) -> PowerLaw:
        """Flux at infinity above 1 g per unit ZHR, and its exponent, (S,) each."""
        return power_law(self.streams, self.law)

    def subset(self, indices: Sequence[int]) -> StreamSet:
        """The same, with some of the streams only."""
        return StreamSet(tuple(self.streams[i] for i in indices), self.law)


@dataclass(frozen=True)
class Places:
    """Where a satellite is and what surrounds it. Vector components first.

    ``r_km``, ``v_km_s``, ``sun_km``: (3, T), or (3, S, T) when every stream has instants of its own. GCRF.
    """

    r_km: Floats
    v_km_s: Floats
    sun_km: Floats

    def block(self, part: slice) -> Places:
        """The same for a slice of the instants."""
        return Places(self.r_km[..., part], self.v_km_s[..., part], self.sun_km[..., part])


def stream_focusing(streams: StreamSet, downstream: Floats, r_km: Floats) -> Focusing:
    """Focusing of S streams at T places; ``downstream`` (3, S, T), ``r_km`` (3, T) or (3, S, T)."""
    distance = np.sqrt(np.einsum("k...,k...->...", r_km, r_km))
    pattern = "kst,kst->st" if r_km.ndim == 3 else "kst,kt->st"
    return focus(
        np.einsum(pattern, downstream, r_km) / distance, distance, streams.v_inf_km_s, streams.spread_deg
    )


def hazard_rates(spacecraft: Spacecraft, streams: StreamSet, downstream: Floats, places: Places) -> Floats:
    """Hazard rate per unit ZHR, per m2 of face and second, (C, S, T).

    C runs over ``criterion_rows(spacecraft)``. Multiply by the ZHR of each stream (S, T). The flux on a face
    is n max(0, -u.normal), u the particle velocity relative to the satellite; particles above the critical
    mass at that speed and angle count. Zero where the Earth shelters.
    """
    instants = downstream.shape[-1]
    rates = np.zeros((len(criterion_rows(spacecraft)), len(streams.streams), instants))
    for start in range(0, instants, BLOCK):
        part = slice(start, start + BLOCK)
        _add_block(rates[..., part], spacecraft, streams, downstream[..., part], places.block(part))
    return rates


def _add_block(
    rates: Floats, spacecraft: Spacecraft, streams: StreamSet, downstream: Floats, places: Places
) -> None:
    focused = stream_focusing(streams, downstream, places.r_km)
    axes = body_axes(spacecraft.attitude, places.r_km, places.v_km_s, places.sun_km)
    normals = face_normals(spacecraft, axes, places.r_km, places.sun_km)
    half = 0.5 * streams.v_inf_km_s
    outward = unit(places.r_km)
    outward = outward if outward.ndim == 3 else outward[:, None, :]
    slow, fast = half * (downstream + outward), half * (downstream - outward)
    for branch in focused.branches:
        velocity = relative_velocity(branch, focused.q, slow, fast, places.v_km_s)
        density = branch.density_ratio / streams.v_inf_km_s
        add_flux(rates, spacecraft, streams, density, velocity, normals)


def add_flux(
    rates: Floats,
    spacecraft: Spacecraft,
    streams: StreamSet,
    density: Floats,
    velocity: Floats,
    normals: Floats,
) -> None:
    """Add one branch's hazard to ``rates`` (C, S, T).

    ``density``: n/n_inf / v_inf, (S, T), s/km. ``velocity``: (3, S, T) km/s. ``normals``: (F, 3, T) or (F, 3, S, T).
    """
    weights: dict[Criterion, Floats] = {}
    speed2 = np.einsum("kst,kst->st", velocity, velocity)
    rows = iter(enumerate(criterion_rows(spacecraft)))
    for face_index, face in enumerate(spacecraft.faces):
        inward = _inward_speed(velocity, normals[face_index])
        for _ in face.criteria:
            index, row = next(rows)
            assert row.face == face_index
            gain, power, normal_speed = _above_critical(row.criterion, streams)
            if normal_speed:
                rates[index] += gain * density * _power(inward, power)
                continue
            if row.criterion not in weights:  # faces share the speed-dependent part
                weights[row.criterion] = gain * density * _power(speed2, 0.5 * power)
            rates[index] += inward * weights[row.criterion]


def _inward_speed(velocity: Floats, normal: Floats) -> Floats:
    """max(0, -u.n), (S, T), km/s, for ``normal`` (3, T) or (3, S, T)."""
    inward = velocity[0] * normal[0]
    inward += velocity[1] * normal[1]
    inward += velocity[2] * normal[2]
    np.negative(inward, out=inward)
    return np.maximum(inward, 0.0, out=inward)


def _above_critical(criterion: Criterion, streams: StreamSet) -> tuple[Floats, Floats, bool]:
    """Coefficient (S, 1) and exponent (S, 1) of speed in the flux above the critical mass.

    For a criterion that looks at the normal speed the exponent includes the one power of it in the flux.
    """
    limits = [critical_mass(criterion, s.bulk_density_kg_m3) for s in streams.streams]
    at_1_km_s = np.array([limit.at_1_km_s_g for limit in limits])
    slope = np.array([limit.speed_exponent for limit in limits])
    law = streams.flux_law
    gain = law.at_1_g * at_1_km_s**-law.exponent
    power = slope * law.exponent + (1.0 if limits[0].normal_speed else 0.0)
    return gain[:, None], power[:, None], limits[0].normal_speed


def _power(base: Floats, exponent: Floats) -> Floats:
    """base ** exponent for base >= 0; an exponent of zero costs nothing."""
    if not exponent.any():
        return np.ones_like(base)
    result: Floats = np.power(base, exponent)
    return result
