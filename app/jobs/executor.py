"""Where chunks are computed: in this process, or in worker processes."""

from __future__ import annotations

import os
import threading
from collections.abc import Callable, Iterator
from concurrent.futures import Executor, Future, ProcessPoolExecutor
from contextlib import contextmanager
from multiprocessing import forkserver, get_context, parent_process
from typing import ParamSpec, TypeVar

from app.settings import Settings

P = ParamSpec("P")
T = TypeVar("T")
# Each worker has a core of its own; more threads in its matrix products would only fight for it.
THREADS = ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS", "VECLIB_MAXIMUM_THREADS")
ONE_THREAD = dict.fromkeys(THREADS, "1")
PRELOADED = ["app.jobs.chunk", "app.pipeline"]  # imported once, before the workers are forked


class SerialExecutor(Executor):
    """Compute at once, in the calling thread; a submitted call's future is done when it is returned."""

    def submit(self, fn: Callable[P, T], /, *args: P.args, **kwargs: P.kwargs) -> Future[T]:
        """Call ``fn`` now and keep its result or its error in the future."""
        future: Future[T] = Future()
        try:
            future.set_result(fn(*args, **kwargs))
        except Exception as error:  # noqa: BLE001  (handed on: result() raises it)
            future.set_exception(error)
        return future


@contextmanager
def executor(settings: Settings) -> Iterator[Executor]:
    """Give the executor that the settings ask for; its workers are gone at the end."""
    pool = SerialExecutor() if in_process(settings) else _processes(settings.workers)
    try:
        yield pool
    finally:
        pool.shutdown(wait=True, cancel_futures=True)


def in_process(settings: Settings) -> bool:
    """Say whether chunks are computed in this process."""
    return settings.executor == "serial" or settings.workers == 0


def _processes(workers: int) -> ProcessPoolExecutor:
    # Workers inherit the fork server's environment, so it is started with ours changed, once per process.
    before = {name: os.environ.get(name) for name in ONE_THREAD}
    os.environ.update(ONE_THREAD)
    try:
        forkserver.set_forkserver_preload(PRELOADED)
        forkserver.ensure_running()
    finally:
        _restore(before)
    context = get_context("forkserver")
    return ProcessPoolExecutor(workers, mp_context=context, initializer=_leave_with_parent)


def _restore(variables: dict[str, str | None]) -> None:
    for name, value in variables.items():
        if value is None:
            del os.environ[name]
        else:
            os.environ[name] = value


def _leave_with_parent() -> None:
    """End this worker when its parent is killed; it would wait for work for ever otherwise."""
    parent = parent_process()
    if parent is None:
        return

    def wait() -> None:
        parent.join()
        os._exit(1)

    threading.Thread(target=wait, name="leave-with-parent", daemon=True).start()
