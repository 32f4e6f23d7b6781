"""A thread that computes the runs asked for over HTTP, one after the other."""

from __future__ import annotations

import logging
import threading

from sqlalchemy.exc import SQLAlchemyError

from app.errors import StonechatError
from app.jobs.run import REAL, Seams, perform
from app.settings import Settings
from app.store.runs import RunRecord, claim_queued
from app.store.session import Store

log = logging.getLogger(__name__)
POLL_S = 1.0


class Stopped(StonechatError):
    """The server was stopped while the run was under way; ask for it again."""


class QueueWorker:
    """Claim and compute queued runs between ``start()`` and ``stop()``.

    ``stop()`` gives up the run under way after its current chunk; that run is marked failed.
    """

    def __init__(
        self, store: Store, settings: Settings, *, seams: Seams = REAL, poll_s: float = POLL_S
    ) -> None:
        self.store, self.settings, self.seams, self.poll_s = store, settings, seams, poll_s
        self._end = threading.Event()
        self._thread: threading.Thread | None = None

    def start(self) -> None:
        """Begin to work through the queue."""
        if self._thread is not None:
            raise RuntimeError("the queue worker has been started already")
        self._thread = threading.Thread(target=self._work, name="queue", daemon=True)
        self._thread.start()

    def stop(self) -> None:
        """Finish, and wait until the thread has ended."""
        self._end.set()
        if self._thread is not None:
            self._thread.join()

    def _work(self) -> None:
        while not self._end.is_set():
            run = self._claim()
            if run is None:
                self._end.wait(self.poll_s)
            else:
                self._perform(run)

    def _claim(self) -> RunRecord | None:
        try:
            return claim_queued(self.store, clock=self.seams.clock, lease_s=self.seams.lease_s)
        except (StonechatError, SQLAlchemyError) as error:
            log.warning("the queue of runs cannot be read, will try again: %s", error)
            return None

    def _perform(self, run: RunRecord) -> None:
        try:
            perform(self.store, self.settings, run, self._continue, seams=self.seams)
        except Exception:  # the run's row says why; the thread must live on for the next one
            log.exception("run %s failed", run.id)

    def _continue(self, _done: int, _total: int) -> None:
        if self._end.is_set():
            raise Stopped
