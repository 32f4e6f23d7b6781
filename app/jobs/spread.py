"""Spread chunks over an executor, and find the one satellite that breaks a chunk.

A chunk that raises is halved until the culprit stands alone. A worker that dies takes every chunk in flight
with it, guilty or not; those are then tried one at a time, each in a fresh pool if need be.
"""

from __future__ import annotations

import logging
from collections import deque
from collections.abc import Callable, Iterable, Iterator, Sequence
from concurrent.futures import FIRST_COMPLETED, BrokenExecutor, Executor, Future, wait
from contextlib import AbstractContextManager

from app.jobs.chunk import failed
from app.pipeline import Registered, SatelliteResult

log = logging.getLogger(__name__)
Chunk = Sequence[Registered]
Task = Callable[[Chunk], list[SatelliteResult]]
Pool = Callable[[], AbstractContextManager[Executor]]
Results = list[SatelliteResult]


def spread(task: Task, chunks: Iterable[Chunk], pool: Pool, window: int) -> Iterator[Results]:
    """Yield the results of each chunk as it is done; every satellite comes back exactly once.

    ``task`` must be picklable. At most ``window`` chunks are loaded and in flight at a time.
    """
    source = iter(chunks)
    suspects: deque[Chunk] = deque()
    finished = False
    while not finished:
        lost: list[Chunk] = []
        with pool() as executor:
            yield from _one_at_a_time(task, suspects, executor)
            if not suspects:
                yield from _in_flight(task, source, executor, window, lost)
                finished = not lost
        suspects.extend(lost)


def _in_flight(
    task: Task, source: Iterator[Chunk], executor: Executor, window: int, lost: list[Chunk]
) -> Iterator[Results]:
    """Keep the executor busy until the source ends, or it breaks: then ``lost`` holds what was in flight."""
    flying: dict[Future[Results], Chunk] = {}
    retry: deque[Chunk] = deque()
    while True:
        while len(flying) < window and not lost:
            chunk = retry.popleft() if retry else next(source, None)
            if chunk is None:
                break
            _submit(executor, task, chunk, flying, lost)
        if not flying:
            lost.extend(retry)
            return
        done, _ = wait(flying, return_when=FIRST_COMPLETED)
        for future in done:
            chunk = flying.pop(future)
            error = future.exception()
            if error is None:
                yield future.result()
            elif isinstance(error, BrokenExecutor):
                lost.append(chunk)
            else:
                yield from _halve(chunk, error, retry)


def _one_at_a_time(task: Task, suspects: deque[Chunk], executor: Executor) -> Iterator[Results]:
    """Try suspects alone until none is left or the executor breaks, which proves the one that ran guilty."""
    while suspects:
        chunk = suspects.popleft()
        try:
            future = executor.submit(task, chunk)
        except BrokenExecutor:  # a worker died while it had nothing to do
            suspects.appendleft(chunk)
            return
        error = future.exception()
        if error is None:
            yield future.result()
            continue
        yield from _halve(chunk, error, suspects)
        if isinstance(error, BrokenExecutor):
            return


def _submit(
    executor: Executor, task: Task, chunk: Chunk, flying: dict[Future[Results], Chunk], lost: list[Chunk]
) -> None:
    try:
        flying[executor.submit(task, chunk)] = chunk
    except BrokenExecutor:
        lost.append(chunk)


def _halve(chunk: Chunk, error: BaseException, queue: deque[Chunk]) -> Iterator[Results]:
    """Put both halves back; a single satellite is given up and comes back as failed."""
    log.warning("a chunk of %d satellites failed: %s", len(chunk), _reason(error))
    if len(chunk) == 1:
        yield [failed(chunk[0].spacecraft.id, _reason(error))]
        return
    middle = len(chunk) // 2
    queue.extendleft((chunk[middle:], chunk[:middle]))


def _reason(error: BaseException) -> str:
    if isinstance(error, BrokenExecutor):
        return "its worker process died while computing it"
    return f"{type(error).__name__}: {error}"
