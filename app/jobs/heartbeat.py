"""A thread that shows the database that this process still works on its run."""

from __future__ import annotations

import logging
import threading
from typing import Self

from sqlalchemy.exc import SQLAlchemyError

from app.errors import ConflictError
from app.store.clock import Clock
from app.store.runs import heartbeat
from app.store.session import Store

log = logging.getLogger(__name__)
BEATS_PER_LEASE = 6  # several may be missed, by a busy database, before the run is taken for dead


class Heartbeat:
    """Beat while the ``with`` block runs; stop early when the run has been taken over."""

    def __init__(self, store: Store, run_id: str, lease_s: float, clock: Clock) -> None:
        self.store, self.run_id, self.clock = store, run_id, clock
        self.interval_s = lease_s / BEATS_PER_LEASE
        self._end = threading.Event()
        self._thread = threading.Thread(target=self._beat, name=f"heartbeat {run_id}", daemon=True)

    def __enter__(self) -> Self:
        self._thread.start()
        return self

    def __exit__(self, *_: object) -> None:
        self._end.set()
        self._thread.join()

    def _beat(self) -> None:
        while not self._end.wait(self.interval_s):
            try:
                if not heartbeat(self.store, self.run_id, clock=self.clock):
                    return
            except (ConflictError, SQLAlchemyError) as error:
                log.warning("run %s could not show that it is alive, will try again: %s", self.run_id, error)
