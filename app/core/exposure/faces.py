"""Hazard rates on faces: flux of particles above the critical mass, by criterion, face, stream and instant."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

from app.core.exposure.damage import critical_mass
from app.core.exposure.focusing import Focusing, focus, relative_velocity
from app.core.spacecraft.attitude import body_axes, body_normals, body_outward, dot, in_axes
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
class Response:
    """Flux above a criterion's critical mass = ``gain`` n/n_inf speed^``power``, (S, 1) each, per unit ZHR.

    With ``normal_speed`` the speed is the one along the face's normal and ``power`` includes the flux's own.
    """

    gain: Floats
    power: Floats
    normal_speed: bool


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

    @cached_property
    def _responses(self) -> dict[Criterion, Response]:
        return {}

    def response(self, criterion: Criterion) -> Response:
        """How these streams act through a criterion; worked out once."""
        if criterion not in self._responses:
            self._responses[criterion] = _response(criterion, self)
        return self._responses[criterion]

    def subset(self, indices: Sequence[int]) -> StreamSet:
        """The same, with some of the streams only."""
        return StreamSet(tuple(self.streams[i] for i in indices), self.law)


def _response(criterion: Criterion, streams: StreamSet) -> Response:
    limits = [critical_mass(criterion, s.bulk_density_kg_m3) for s in streams.streams]
    at_1_km_s = np.array([limit.at_1_km_s_g for limit in limits])
    slope = np.array([limit.speed_exponent for limit in limits])
    law = streams.flux_law
    gain = law.at_1_g * at_1_km_s**-law.exponent
    power = slope * law.exponent + (1.0 if limits[0].normal_speed else 0.0)
    return Response(gain[:, None] / streams.v_inf_km_s, power[:, None], limits[0].normal_speed)


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


def hazard_rates(
    spacecraft: Spacecraft,
    streams: StreamSet,
    downstream: Floats,
    places: Places,
    zhr: Floats | None = None,
) -> Floats:
    """Hazard rate per m2 of face and second, (C, S, T), at rates ``zhr`` (S, T), or per unit ZHR without them.

    C runs over ``criterion_rows(spacecraft)``; ``downstream`` (3, S, T) GCRF. The flux on a face is
    n max(0, -u.normal), u the particle velocity relative to the satellite; particles above the critical mass
    at that speed and angle count. Zero where the Earth shelters.
    """
    instants = downstream.shape[-1]
    rates = np.empty((len(criterion_rows(spacecraft)), len(streams.streams), instants))
    for start in range(0, instants, BLOCK):
        part = slice(start, start + BLOCK)
        block = downstream[..., part], places.block(part), None if zhr is None else zhr[..., part]
        _fill_block(rates[..., part], spacecraft, streams, *block)
    return rates


def _fill_block(
    rates: Floats,
    spacecraft: Spacecraft,
    streams: StreamSet,
    downstream: Floats,
    places: Places,
    zhr: Floats | None,
) -> None:
    axes = body_axes(spacecraft.attitude, places.r_km, places.v_km_s, places.sun_km)
    # In body axes a face's normal is three plain numbers (or one, on a box), the same at every instant.
    normals = body_normals(spacecraft, axes, places.r_km, places.sun_km)
    flow, satellite = in_axes(axes, downstream), in_axes(axes, places.v_km_s)
    outward = body_outward(spacecraft.attitude, axes, places.r_km)
    distance = np.sqrt(np.einsum("k...,k...->...", places.r_km, places.r_km))
    focused = focus(dot(flow, outward), distance, streams.v_inf_km_s, streams.spread_deg)
    for number, branch in enumerate(focused.branches):
        velocity = relative_velocity(branch, focused.q, streams.v_inf_km_s, flow, outward, satellite)
        density = branch.density_ratio if zhr is None else branch.density_ratio * zhr
        put_flux(rates, spacecraft, streams, density, velocity, normals, add=number > 0)


def put_flux(
    rates: Floats,
    spacecraft: Spacecraft,
    streams: StreamSet,
    density: Floats,
    velocity: Floats,
    normals: Sequence[Floats],
    add: bool,
) -> None:
    """Write one branch's hazard into ``rates`` (C, S, T), or add it.

    ``density``: n/n_inf, times ZHR where wanted, (S, T). ``velocity``: (3, S, T) km/s relative to the satellite,
    in the same axes as ``normals``: one array a face, (3,) or (3, ...) that broadcasts against (S, T).
    """
    weights: dict[Criterion, Floats] = {}
    speed2 = np.square(velocity[0])
    speed2 += np.square(velocity[1])
    speed2 += np.square(velocity[2])
    rows = iter(enumerate(criterion_rows(spacecraft)))
    for face_index, face in enumerate(spacecraft.faces):
        inward = _inward_speed(velocity, normals[face_index])
        for _ in face.criteria:
            index, row = next(rows)
            assert row.face == face_index
            harm = streams.response(row.criterion)
            if row.criterion not in weights:  # faces share the part that does not look at the normal
                weights[row.criterion] = harm.gain * density
                if not harm.normal_speed:
                    weights[row.criterion] *= _power(speed2, 0.5 * harm.power)
            flux = _power(inward, harm.power) if harm.normal_speed else inward
            if add:
                rates[index] += flux * weights[row.criterion]
            else:
                np.multiply(flux, weights[row.criterion], out=rates[index])


def _inward_speed(velocity: Floats, normal: Floats) -> Floats:
    """max(0, -u.n), (S, T), km/s."""
    inward = dot(velocity, -normal)
    np.maximum(inward, 0.0, out=inward)
    return inward


def _power(base: Floats, exponent: Floats) -> Floats:
    """base ** exponent for base >= 0; an exponent of zero costs nothing."""
    if not exponent.any():
        return np.ones_like(base)
    result: Floats = np.power(base, exponent)
    return result
