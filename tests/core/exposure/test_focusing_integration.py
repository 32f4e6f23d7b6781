"""Focusing against direct numerical integration: trajectories and flux tubes from far away, by scipy's DOP853.

A particle starts 1e11 km upstream with a given impact parameter, moving along the stream. Its equations of motion
are integrated together with those of two neighbours (first variations across the stream). Where it ends, the
neighbours span an area; the stream is denser by the area they spanned at the start over that, times the ratio of
speeds. Nothing of the closed solution enters, apart from the choice of which particles to send.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy.integrate import solve_ivp
from scipy.spatial.transform import Rotation

from app.core.constants import BLOCKING_RADIUS_KM, MU_EARTH_KM3_S2
from app.core.exposure.focusing import Branch, Focusing, focus, relative_velocity

one_millionth = 1e-6
# How far along its direction a particle is met that almost fell through the centre: a hair of impact parameter
# moves that a lot. The comparison itself is made where it was met.
one_ten_thousandth = 1e-4
# The stream is already focused by about a/D = 3e-8 (11 km/s) where the particles start.
START_KM = 1e11
ANYWHERE, NEAR_AXIS = 36, 24


@dataclass(frozen=True)
class Arrival:
    """End of one integrated trajectory, GCRF: place, velocity, density over that at infinity, lowest point so far."""

    r_km: np.ndarray
    v_km_s: np.ndarray
    density_ratio: float
    lowest_km: float


def motion(_: float, state: np.ndarray) -> np.ndarray:
    """Rates of position, velocity, and of two variations of both."""
    x, v, dx, dv = state[:3], state[3:6], state[6:12].reshape(2, 3), state[12:].reshape(2, 3)
    inverse3 = (x @ x) ** -1.5
    pull = -MU_EARTH_KM3_S2 * inverse3
    tide = pull * (dx - 3.0 * (dx @ x)[:, None] * x / (x @ x))
    return np.concatenate([v, pull * x, dv.ravel(), tide.ravel()])


def arrival(v_inf_km_s: float, impact_km: float, theta_rad: float) -> Arrival:
    """Send one particle along +z, its impact parameter along x, until it stands at ``theta_rad`` from +z to +x."""
    state = np.zeros(18)
    state[0], state[2] = impact_km, -START_KM
    # The Earth has pulled all the way from infinity to here.
    state[5] = np.sqrt(v_inf_km_s**2 + 2.0 * MU_EARTH_KM3_S2 / START_KM)
    state[6], state[10] = 1.0, 1.0

    def crossing(_: float, y: np.ndarray) -> float:
        return float((np.cos(theta_rad) * y[0] - np.sin(theta_rad) * y[2]) / np.sqrt(y[:3] @ y[:3]))

    def perigee(_: float, y: np.ndarray) -> float:
        return float(y[:3] @ y[3:6])

    # One that passes on the far side swings through the axis first.
    crossing.terminal, crossing.direction = True, -np.sign(impact_km)
    tight = {"method": "DOP853", "rtol": 1e-12, "atol": 1e-11}
    done = solve_ivp(motion, (0.0, 1.01 * START_KM / v_inf_km_s), state, events=(crossing, perigee), **tight)
    assert done.status == 1
    # The place is wherever an integration to that time ends, without the interpolation of the event.
    last = solve_ivp(motion, (done.t[-3], done.t[-1]), done.y[:, -3], **tight).y[:, -1]
    area = np.cross(last[6:9], last[9:12]) @ last[3:6]
    lowest = [float(np.linalg.norm(y[:3])) for y in done.y_events[1]]
    return Arrival(
        last[:3], last[3:6], v_inf_km_s / abs(area), min(lowest, default=float(np.linalg.norm(last[:3])))
    )


@dataclass(frozen=True)
class Case:
    """A random place in a random stream."""

    v_inf_km_s: float
    r_km: float
    theta_rad: float
    turn: Rotation

    def focused(self, cos_theta: float, r_km: float, radius_km: float) -> Focusing:
        one = {"r_km": np.array([[r_km]]), "v_inf_km_s": np.array([[self.v_inf_km_s]])}
        return focus(np.array([[cos_theta]]), spread_deg=np.zeros((1, 1)), radius_km=radius_km, **one)


def cases() -> list[Case]:
    """Places anywhere around the Earth, and places so near the axis, so far out, that both branches may arrive."""
    rng = np.random.default_rng(20260810)
    anywhere = (
        np.exp(rng.uniform(np.log(6500.0), np.log(400_000.0), ANYWHERE)),
        rng.uniform(11.2, 72.0, ANYWHERE),
    )
    near_axis = rng.uniform(20_000.0, 400_000.0, NEAR_AXIS), rng.uniform(11.2, 40.0, NEAR_AXIS)
    r_km, speed = np.concatenate([anywhere, near_axis], axis=1)
    wide = np.arccos(rng.uniform(-0.98, 0.9995, ANYWHERE))
    theta = np.concatenate([wide, np.radians(rng.uniform(0.3, 8.0, NEAR_AXIS))])
    turns = Rotation.from_quat(rng.normal(size=(len(theta), 4)))
    return [
        Case(float(v), float(r), float(t), q) for v, r, t, q in zip(speed, r_km, theta, turns, strict=True)
    ]


def velocity_of(
    case: Case, branch: Branch, found: Focusing, flow: np.ndarray, outward: np.ndarray
) -> np.ndarray:
    speed = np.array([[case.v_inf_km_s]])
    args = (flow[:, None, None], outward[:, None, None], np.zeros(3))
    return relative_velocity(branch, found.q, speed, *args)[:, 0, 0]


@pytest.mark.parametrize("sign", [1.0, -1.0], ids=["plus", "minus"])
@pytest.mark.parametrize(
    "case", cases(), ids=lambda c: f"v{c.v_inf_km_s:.1f}-r{c.r_km:.0f}-theta{np.degrees(c.theta_rad):.1f}"
)
def test_density_velocity_and_shelter(case: Case, sign: float):
    # 1. Which particle to send: the closed solution proposes an impact parameter ...
    flow, place = np.array([0.0, 0.0, 1.0]), np.array([np.sin(case.theta_rad), 0.0, np.cos(case.theta_rad)])
    proposed = case.focused(np.cos(case.theta_rad), case.r_km, radius_km=1e-6)
    branch = next(b for b in proposed.branches if b.sign == sign)
    velocity = velocity_of(case, branch, proposed, flow, place)
    impact_km = -case.r_km * np.cross(place, velocity)[1] / case.v_inf_km_s
    # 2. ... and the integration says where it really goes.
    there = arrival(case.v_inf_km_s, impact_km, case.theta_rad)
    assert_allclose(there.r_km, case.r_km * place, rtol=0.0, atol=one_ten_thousandth * case.r_km)
    r_km = np.linalg.norm(there.r_km)
    outward = there.r_km / r_km
    # 3. The closed solution at that very place, in axes turned at random.
    bare = case.focused(outward @ flow, r_km, radius_km=1e-6)
    branch = next(b for b in bare.branches if b.sign == sign)
    assert_allclose(branch.density_ratio[0, 0], there.density_ratio, rtol=one_millionth)
    found = velocity_of(case, branch, bare, case.turn.apply(flow), case.turn.apply(outward))
    speed = np.linalg.norm(there.v_km_s)
    assert_allclose(found, case.turn.apply(there.v_km_s), atol=one_millionth * speed)
    # 4. Blocked means: it would have come up through the Earth.
    seen = case.focused(outward @ flow, r_km, radius_km=BLOCKING_RADIUS_KM)
    density = sum(b.density_ratio[0, 0] for b in seen.branches if b.sign == sign)
    assert (density == 0.0) == (there.lowest_km < BLOCKING_RADIUS_KM)


def test_the_cases_hold_open_and_blocked_places_of_both_branches():
    seen = [c.focused(np.cos(c.theta_rad), c.r_km, BLOCKING_RADIUS_KM) for c in cases()]
    lit = [sum(b.density_ratio[0, 0] > 0.0 for b in one.branches) for one in seen]
    assert len(lit) >= 50
    assert min(lit.count(number) for number in (0, 1, 2)) >= 3
