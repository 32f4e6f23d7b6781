"""One scheduled run: claim, compute chunk by chunk, stage, publish."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from functools import partial

from app import __version__
from app.catalogue_file import load_catalogue
from app.core.orbit.elements import SECONDS_PER_DAY
from app.core.streams.model import Catalogue
from app.jobs.chunk import Compute, chunk_size, compute_chunk
from app.jobs.executor import executor, in_process
from app.jobs.heartbeat import Heartbeat
from app.jobs.spread import spread
from app.pipeline import Registered, RunInputs, compute_satellites
from app.settings import Settings
from app.store.clock import Clock, utc_now
from app.store.fleet import fleet_for_run
from app.store.runs import LEASE_S, RunRecord, fail_run, run_satellites, start_run
from app.store.session import Store
from app.store.staging import publish, stage

Progress = Callable[[int, int], None]
MOST_SATELLITES = 1_000_000


@dataclass(frozen=True)
class Seams:
    """What tests replace: the computation (picklable), the catalogue, the wall clock, the lease's length."""

    compute: Compute = compute_satellites
    catalogue: Callable[[], Catalogue] = load_catalogue
    clock: Clock = utc_now
    lease_s: float = LEASE_S


REAL = Seams()


def run_once(
    store: Store,
    settings: Settings,
    as_of_unix_s: float,
    satellite_ids: Sequence[str] | None = None,
    progress: Progress | None = None,
    *,
    seams: Seams = REAL,
) -> RunRecord:
    """Compute the fleet (or some of it) as of an instant and publish the result, whole or not at all.

    ``progress`` is called with (satellites done, satellites in all). Raises ``ConflictError`` when another
    run is under way or has taken over, ``NotFoundError`` for unknown satellites; a failed run records why.
    """
    run = start_run(store, as_of_unix_s, satellite_ids, clock=seams.clock, lease_s=seams.lease_s)
    return perform(store, settings, run, progress, seams=seams)


def perform(
    store: Store,
    settings: Settings,
    run: RunRecord,
    progress: Progress | None = None,
    *,
    seams: Seams = REAL,
) -> RunRecord:
    """Compute and publish a run that has been started; an error marks it failed and is raised."""
    try:
        with Heartbeat(store, run.id, seams.lease_s, seams.clock):
            _compute(store, settings, run, progress or _silent, seams)
            return publish(store, run, clock=seams.clock)
    except BaseException as error:  # also Ctrl-C: the database shall not wait for the lease to end
        fail_run(store, run.id, f"{type(error).__name__}: {error}".rstrip(": "), clock=seams.clock)
        raise


def _compute(store: Store, settings: Settings, run: RunRecord, progress: Progress, seams: Seams) -> None:
    inputs = run_inputs(settings, run, seams.catalogue())
    looked_until_unix_s = inputs.as_of_unix_s + inputs.outlook_days * SECONDS_PER_DAY
    task = partial(compute_chunk, seams.compute, inputs)
    chunks = _chunks(store, run)
    window = 1 if in_process(settings) else settings.workers + 2
    progress(0, run.satellites_total)
    for results in spread(task, chunks, partial(executor, settings), window):
        staged = stage(store, run, results, looked_until_unix_s=looked_until_unix_s)
        progress(staged.satellites_done, run.satellites_total)


def run_inputs(settings: Settings, run: RunRecord, catalogue: Catalogue) -> RunInputs:
    """Return everything the computation of a run depends on, besides the satellites."""
    return inputs_at(settings, catalogue, run.as_of_unix_s, run.id)


def inputs_at(settings: Settings, catalogue: Catalogue, as_of_unix_s: float, run_id: str) -> RunInputs:
    """Return the same for any computation: a run, or an answer computed when asked for."""
    return RunInputs(
        as_of_unix_s=as_of_unix_s,
        horizon_low_days=settings.horizon_low_days,
        horizon_high_days=settings.horizon_high_days,
        outlook_days=settings.outlook_days,
        mass_law=settings.mass_law,
        run_id=run_id,
        software=f"stonechat {__version__}",
        catalogue=catalogue,
    )


def _chunks(store: Store, run: RunRecord) -> Iterator[list[Registered]]:
    """Load the run's satellites a chunk at a time; those removed meanwhile are left out."""
    with store.read() as session:
        ids = [each.satellite_id for each in run_satellites(session, run.id, limit=MOST_SATELLITES)]
    size = chunk_size(len(ids))
    for start in range(0, len(ids), size):
        with store.read() as session:
            members = fleet_for_run(session, ids[start : start + size])
        if members:
            yield [Registered(spacecraft=each.spacecraft, elements=each.elements) for each in members]


def _silent(_done: int, _total: int) -> None:
    """Show nothing."""
