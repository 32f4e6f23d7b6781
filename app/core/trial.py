"""A trial: what a given attitude would meet at given states. Pure; the same physics as a run."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from app.core.advice.advisory import CAUTION, band
from app.core.constants import BLOCKING_RADIUS_KM
from app.core.exposure.background import background_rates, orbit_background
from app.core.exposure.faces import Places, StreamSet, criterion_rows, hazard_rates, stream_focusing
from app.core.exposure.focusing import Focusing, relative_velocity
from app.core.orbit.averaging import osculating_ellipse
from app.core.sky.times import TimeGrid, format_utc
from app.core.spacecraft.attitude import unit
from app.core.spacecraft.model import AttitudeLawKind, CriterionKind, Spacecraft
from app.core.streams.activity import StreamState, stream_state
from app.core.streams.flux import VISUAL_LIMIT, MassLaw
from app.core.streams.model import Stream
from app.core.streams.sporadic import analytic_speeds
from app.errors import FieldError, OrbitError

Floats = npt.NDArray[np.float64]
MOST_VALUES = 500_000  # rows x streams x states: an answer of some 15 MB
FARTHEST_KM, FASTEST_KM_S = 2e6, 100.0
LEAST_TURN = 1e-9  # |r x v| / |r||v| below which a state has no orbit plane


@dataclass(frozen=True)
class Trial:
    """``r_km``, ``v_km_s`` (3, T) GCRF at ``unix_s`` (T,). ``own_streams``: not the catalogue's."""

    spacecraft: Spacecraft
    streams: tuple[Stream, ...]
    own_streams: bool
    unix_s: Floats
    r_km: Floats
    v_km_s: Floats


def assess_trial(trial: Trial, law: MassLaw) -> dict[str, Any]:
    """Assess every state; the answer follows the order of the request. Raises ``FieldError``."""
    _check_states(trial)
    grid = TimeGrid(trial.unix_s)
    trial, state = _active(trial, grid)
    rows = criterion_rows(trial.spacecraft)
    if len(rows) * len(trial.streams) * len(grid) > MOST_VALUES:
        raise FieldError("states", "the answer would be too large; give fewer states, streams or faces")
    streams = StreamSet(trial.streams, law)
    places = Places(trial.r_km, trial.v_km_s, grid.sun_km.T)
    background, notes = _background(trial, places)
    fluxes = hazard_rates(trial.spacecraft, streams, state.downstream, places, state.zhr)
    focused = stream_focusing(streams, state.downstream, trial.r_km)
    arrivals = _Arrivals(trial, streams, state, focused)
    if focused.capped.any():
        notes.append("Near the anti-radiant axis the Earth's lens is limited by the radiant's own spread.")
    return {
        "states": [
            {
                "t": format_utc_precise(trial.unix_s[i]),
                "streams": list(arrivals.at(i)),
                "faces": list(_faces(trial, fluxes[..., i], background)),
            }
            for i in range(len(grid))
        ],
        "mass_law": law.name,
        "notes": notes,
        "caution": CAUTION,
    }


def format_utc_precise(unix_s: float) -> str:
    """ISO 8601 UTC with Z, with microseconds where the instant has them."""
    whole, fraction = divmod(round(float(unix_s) * 1e6), 1_000_000)
    text = format_utc(whole)
    return f"{text[:-1]}.{fraction:06d}Z" if fraction else text


def _check_states(trial: Trial) -> None:
    distance = np.sqrt(np.einsum("kt,kt->t", trial.r_km, trial.r_km))
    speed = np.sqrt(np.einsum("kt,kt->t", trial.v_km_s, trial.v_km_s))
    _refuse(
        (
            distance < BLOCKING_RADIUS_KM,
            "r_km",
            f"lies inside {BLOCKING_RADIUS_KM:.0f} km, the top of the air",
        ),
        (distance > FARTHEST_KM, "r_km", f"lies beyond {FARTHEST_KM:.0f} km; the Earth's frame ends there"),
        (speed > FASTEST_KM_S, "v_km_s", f"is faster than {FASTEST_KM_S:.0f} km/s; is it in m/s?"),
    )
    if trial.spacecraft.attitude.kind is not AttitudeLawKind.INERTIAL:
        turn = np.linalg.norm(np.cross(trial.r_km, trial.v_km_s, axis=0), axis=0)
        undefined = "there is no orbit plane and this attitude law is undefined; use 'inertial'"
        _refuse((turn <= LEAST_TURN * distance * speed, "v_km_s", f"lies along r_km, so {undefined}"))


def _refuse(*problems: tuple[npt.NDArray[np.bool_], str, str]) -> None:
    """Raise the first problem that some state (T,) has: (which states, field, what to mend)."""
    for bad, field, problem in problems:
        if bad.any():
            raise FieldError(f"states.{int(np.argmax(bad))}.{field}", problem)


def _active(trial: Trial, grid: TimeGrid) -> tuple[Trial, StreamState]:
    """Leave out catalogued streams that are not active at any state, unless none is; a request's own all stay."""
    if not trial.streams:
        raise FieldError("streams", "the catalogue has no active stream; give streams of your own")
    state = stream_state(trial.streams, grid.solar_longitude_deg)
    kept = np.flatnonzero(state.zhr.max(axis=1) > 0.0)
    if trial.own_streams or len(kept) in (0, len(trial.streams)):
        return trial, state
    streams = tuple(trial.streams[i] for i in kept)
    fewer = Trial(trial.spacecraft, streams, False, trial.unix_s, trial.r_km, trial.v_km_s)
    return fewer, StreamState(state.zhr[kept], state.downstream[:, kept])


def _background(trial: Trial, places: Places) -> tuple[Floats, list[str]]:
    """Averaged over the osculating orbit of the first state; at that state itself when it has none."""
    speeds = analytic_speeds()
    try:
        ellipse = osculating_ellipse(trial.r_km[:, 0], trial.v_km_s[:, 0])
    except OrbitError as reason:
        here = places.block(slice(0, 1))
        rates = background_rates(trial.spacecraft, here, np.ones(1), speeds)
        return rates, [f"The background is that of the first state alone: {reason.detail}."]
    return orbit_background(trial.spacecraft, ellipse, places.sun_km[:, 0], speeds), []


class _Arrivals:
    """What of each stream reaches each state, seen from the satellite."""

    def __init__(self, trial: Trial, streams: StreamSet, state: StreamState, focused: Focusing) -> None:
        self.streams, self.state = streams, state
        # Wherever anything arrives the plus branch does, and it is the denser one.
        self.velocity = relative_velocity(
            focused.branches[0],
            focused.q,
            streams.v_inf_km_s,
            state.downstream,
            unit(trial.r_km),
            trial.v_km_s,
        )
        self.density = sum((branch.density_ratio for branch in focused.branches), np.zeros(focused.q.shape))
        self.min_mass_g = _reference_mass_g(trial.spacecraft, streams)
        self.flux = streams.flux_law.flux_per_m2_s(state.zhr.T, self.min_mass_g).T

    def at(self, i: int) -> Iterator[dict[str, Any]]:
        for s, stream in enumerate(self.streams.streams):
            velocity, density = self.velocity[:, s, i], float(self.density[s, i])
            speed = float(np.linalg.norm(velocity))
            arrives = density > 0.0
            yield {
                "code": stream.code,
                "zhr": float(self.state.zhr[s, i]),
                "flux_at_infinity_per_m2_s": float(self.flux[s, i]),
                "min_mass_g": float(self.min_mass_g[s]),
                "sheltered": not arrives,
                "density_ratio": density,
                "speed_km_s": speed if arrives else None,
                "from_direction": [float(-x / speed) for x in velocity] if arrives else None,
            }


def _reference_mass_g(spacecraft: Spacecraft, streams: StreamSet) -> Floats:
    """Mass above which the flux at infinity is stated, (S,): the request's smallest, else magnitude 6.5."""
    asked = [
        r.criterion.threshold for r in criterion_rows(spacecraft) if r.criterion.kind is CriterionKind.MASS
    ]
    if asked:
        return np.full(len(streams.streams), min(asked))
    return streams.law.mass_g(VISUAL_LIMIT, [s.v_entry_km_s for s in streams.streams])


def _faces(trial: Trial, fluxes: Floats, background: Floats) -> Iterator[dict[str, Any]]:
    """Faces of one state; ``fluxes`` (C, S)."""
    rows = criterion_rows(trial.spacecraft)
    for f, face in enumerate(trial.spacecraft.faces):
        own = [i for i, row in enumerate(rows) if row.face == f]
        yield {
            "name": face.name,
            "criteria": [
                {
                    "kind": rows[i].criterion.kind.value,
                    "label": rows[i].criterion.label,
                    "stream_flux_per_m2_s": {
                        s.code: float(v) for s, v in zip(trial.streams, fluxes[i], strict=True)
                    },
                    "background_flux_per_m2_s": float(background[i]),
                    "enhancement": _factor(fluxes[i], float(background[i])),
                }
                for i in own
            ],
        }


def _factor(fluxes: Floats, background: float) -> dict[str, float | None]:
    if background <= 0.0:  # nothing to compare with: a factor does not exist
        return {"low": None, "mid": None, "high": None}
    return {**band(1.0), "mid": 1.0 + float(fluxes.sum()) / background}
