from __future__ import annotations

from collections.abc import Callable
from typing import Any

from fastapi import FastAPI
from starlette.testclient import TestClient

from app.api import examples
from app.core.advice.advisory import CAUTION
from app.errors import OrbitError
from app.trial import run_trial
from tests.api.harness import CATALOGUE, FAKES, is_problem


def test_a_trial_is_answered_with_the_caution(client: TestClient) -> None:
    answer = client.post("/v1/trials", json=examples.TRIAL_REQUEST)
    assert answer.status_code == 200
    assert answer.json() == {"states": examples.TRIAL["states"], "caution": CAUTION}


def test_the_real_trial_over_http_is_the_trial_itself(make: Callable[..., FastAPI]) -> None:
    client = TestClient(make(computations=type(FAKES)(FAKES.series, FAKES.lee_windows, run_trial)))
    answer = client.post("/v1/trials", json=examples.TRIAL_REQUEST)
    assert answer.status_code == 200, answer.text
    assert answer.json()["states"] == run_trial(examples.TRIAL_REQUEST, CATALOGUE, "jvb")["states"]
    wrong = client.post("/v1/trials", json={**examples.TRIAL_REQUEST, "frame": "ITRF"})
    assert is_problem(wrong, 422, field="frame")


def test_an_orbit_that_fails_is_a_field_of_the_trial(make: Callable[..., FastAPI]) -> None:
    def decayed(*_: Any) -> dict[str, Any]:
        raise OrbitError("the satellite has decayed")

    client = TestClient(make(computations=type(FAKES)(FAKES.series, FAKES.lee_windows, decayed)))
    assert is_problem(client.post("/v1/trials", json={}), 422, field="orbit")
