"""Chunks over an executor: everything comes back once, and only the culprit is given up."""

from __future__ import annotations

import threading
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import Executor, Future
from concurrent.futures.process import BrokenProcessPool
from contextlib import contextmanager
from functools import partial

import pytest

from app.core.run import Registered, SatelliteResult
from app.jobs.chunk import chunk_size, compute_chunk
from app.jobs.executor import SerialExecutor
from app.jobs.run import run_inputs
from app.jobs.spread import spread
from app.settings import Settings, load_settings
from app.store.runs import RunRecord, RunState
from tests.samples import CATALOGUE, FakeCompute, body, spacecraft
from tests.store.steps import Wall, computed


class DyingExecutor(Executor):
    """Breaks as a process pool does when a worker dies: all it has in flight is lost, and it takes no more."""

    def __init__(self, deadly: set[str]) -> None:
        self.deadly, self.broken, self.lock = deadly, False, threading.Lock()
        self.flying: list[tuple[Future[list[SatelliteResult]], Callable[[], list[SatelliteResult]]]] = []

    def submit(self, fn, /, *args, **kwargs):  # type: ignore[no-untyped-def]
        future: Future[list[SatelliteResult]] = Future()
        with self.lock:
            if self.broken:
                raise BrokenProcessPool
            self.broken = bool(self.deadly & {each.spacecraft.id for each in args[0]})
            self.flying.append((future, partial(fn, *args, **kwargs)))
        threading.Timer(0.005, self.land).start()
        return future

    def land(self) -> None:
        with self.lock:
            for future, call in self.flying:
                if self.broken:
                    future.set_exception(BrokenProcessPool("a worker died"))
                else:
                    future.set_result(call())
            self.flying.clear()


def fleet(*ids: str) -> list[Registered]:
    return [Registered(spacecraft(each), None) for each in ids]


def chunks_of(size: int, ids: Sequence[str]) -> list[list[Registered]]:
    return [fleet(*ids[start : start + size]) for start in range(0, len(ids), size)]


@pytest.fixture
def inputs():  # type: ignore[no-untyped-def]
    now = Wall()()
    run = RunRecord("run", RunState.RUNNING, now, now, now, None, now, 0, 0, 0, 0, 0, None, 1, 1)
    return run_inputs(load_settings(), run, CATALOGUE)


@contextmanager
def serial() -> Iterator[Executor]:
    yield SerialExecutor()


def outcomes(results: Iterator[list[SatelliteResult]]) -> dict[str, str]:
    found: dict[str, str] = {}
    for result in (each for chunk in results for each in chunk):
        assert result.satellite_id not in found
        found[result.satellite_id] = result.reason or result.state
    return found


IDS = [f"s{number:02d}" for number in range(23)]


@pytest.mark.parametrize("window", [1, 2, 50])
def test_every_satellite_comes_back_once(inputs, window: int) -> None:  # type: ignore[no-untyped-def]
    task = partial(compute_chunk, FakeCompute(), inputs)
    found = outcomes(spread(task, chunks_of(5, IDS), serial, window))
    assert found == dict.fromkeys(IDS, "computed")


def test_nothing_to_do_is_done() -> None:
    assert list(spread(lambda _: [], [], serial, 4)) == []


def test_what_raises_is_halved_until_the_culprits_stand_alone(inputs) -> None:  # type: ignore[no-untyped-def]
    task = partial(compute_chunk, FakeCompute(raising=("s03", "s04", "s20")), inputs)
    found = outcomes(spread(task, chunks_of(10, IDS), serial, 3))
    culprits = {each for each, outcome in found.items() if outcome != "computed"}
    assert culprits == {"s03", "s04", "s20"}
    assert found["s03"] == "ZeroDivisionError: no number for s03"
    assert found.keys() == set(IDS)


@pytest.mark.parametrize("window", [1, 4])
def test_a_worker_that_dies_costs_the_culprit_only(inputs, window: int) -> None:  # type: ignore[no-untyped-def]
    deadly, pools = {"s07", "s22"}, 0

    @contextmanager
    def pool() -> Iterator[Executor]:
        nonlocal pools
        pools += 1
        yield DyingExecutor(deadly)

    task = partial(compute_chunk, FakeCompute(), inputs)
    found = outcomes(spread(task, chunks_of(6, IDS), pool, window))
    assert {each for each, outcome in found.items() if outcome != "computed"} == deadly
    assert found["s07"] == "its worker process died while computing it"
    assert found.keys() == set(IDS)
    assert pools < 2 * len(IDS)


def test_chunks_are_loaded_only_when_there_is_room(inputs) -> None:  # type: ignore[no-untyped-def]
    loaded: list[int] = []

    def source() -> Iterator[list[Registered]]:
        for number, chunk in enumerate(chunks_of(2, IDS)):
            loaded.append(number)
            yield chunk

    results = spread(partial(compute_chunk, FakeCompute(), inputs), source(), serial, 3)
    next(results)
    assert len(loaded) == 3


def test_results_of_other_satellites_are_not_taken() -> None:
    def wrong(_inputs: object, satellites: Sequence[Registered]) -> list[SatelliteResult]:
        return [computed(each.spacecraft.id) for each in satellites][::-1]

    with pytest.raises(ValueError, match="one result for each satellite, in order"):
        compute_chunk(wrong, None, fleet("a", "b"))  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("bodies", "problem"),
    [
        ((body("a", peak_zhr=float("nan")),), "cannot be written as JSON"),
        ((body("b"),), "it is of another satellite, 'b'"),
        ((body("a"), body("a")), "it was produced twice"),
    ],
)
def test_what_cannot_be_stored_marks_its_satellite(bodies: tuple[dict, ...], problem: str) -> None:  # type: ignore[type-arg]
    def compute(_inputs: object, satellites: Sequence[Registered]) -> list[SatelliteResult]:
        return [computed("a", *bodies), computed("c", body("c"))]

    bad, good = compute_chunk(compute, None, fleet("a", "c"))  # type: ignore[arg-type]
    assert (bad.state, bad.advisories) == ("failed", ())
    assert bad.reason is not None
    assert problem in bad.reason
    assert (good.state, len(good.advisories)) == ("computed", 1)


@pytest.mark.parametrize(
    ("satellites", "size"), [(0, 20), (1, 20), (320, 20), (321, 21), (1600, 100), (10_000, 100)]
)
def test_chunks_share_work_and_spread_it(satellites: int, size: int) -> None:
    assert chunk_size(satellites) == size


def test_the_inputs_of_a_run_are_its_settings(settings: Settings) -> None:
    now = Wall()()
    run = RunRecord("run-7", RunState.RUNNING, now, now, now, None, now, 0, 0, 0, 0, 0, None, 1, 1)
    found = run_inputs(settings, run, CATALOGUE)
    assert (found.run_id, found.as_of_unix_s, found.catalogue) == ("run-7", now.timestamp(), CATALOGUE)
    assert (found.mass_law, found.outlook_days) == (settings.mass_law, settings.outlook_days)
    assert found.software.startswith("stonechat ")
