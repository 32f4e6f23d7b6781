"""What every route works with: one ``Context`` per application, one ``Asked`` per request."""

from __future__ import annotations

import hashlib
import math
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from functools import cached_property
from typing import Annotated, Any

from fastapi import Depends, Request
from sqlalchemy.orm import Session

from app import __version__
from app.api.caching import refuse_unchanged, strong_tag
from app.api.metrics import Metrics
from app.core.streams.model import Catalogue
from app.errors import NotFoundError
from app.jobs.run import inputs_at
from app.on_demand import Series
from app.pipeline import Registered, RunInputs
from app.settings import Settings
from app.store.changes import current_change
from app.store.clock import Clock
from app.store.session import Store

SOFTWARE = f"stonechat {__version__}"
ON_DEMAND = "on demand"
AGE_STEP_S = 3_600.0  # ages are given as of the last full hour, so that an answer can be kept until then
COMPUTED_FROM = ("horizon_low_days", "horizon_high_days", "outlook_days", "mass_law")
MAX_ID = 200


@dataclass(frozen=True)
class Computations:
    """What is computed when asked for; tests pass others."""

    series: Callable[[RunInputs, Registered, float, float, float], Series]
    lee_windows: Callable[[RunInputs, Registered, float, float], list[dict[str, Any]]]
    trial: Callable[[object, Catalogue, str], dict[str, Any]]


@dataclass(frozen=True)
class Context:
    """What all requests share. ``clock``: the default ``as_of``, POSIX seconds; ``wall`` dates rows."""

    settings: Settings
    store: Store
    catalogue: Catalogue
    computations: Computations
    clock: Callable[[], float]
    wall: Clock
    metrics: Metrics

    @cached_property
    def edition(self) -> str:
        """Name everything besides the database and the request that an answer depends on."""
        chosen = [f"{name}={getattr(self.settings, name)!r}" for name in COMPUTED_FROM]
        return hashlib.sha256("\n".join([SOFTWARE, self.catalogue.digest, *chosen]).encode()).hexdigest()

    def inputs(self) -> RunInputs:
        """Return what a computation on demand depends on besides the satellite."""
        return inputs_at(self.settings, self.catalogue, self.hour_unix_s(), ON_DEMAND)

    def hour_unix_s(self) -> float:
        """Return the last full hour of the clock."""
        return math.floor(self.clock() / AGE_STEP_S) * AGE_STEP_S


@dataclass(frozen=True)
class Asked:
    """A request together with the application's context."""

    request: Request
    context: Context

    def tag(self, *parts: object) -> str:
        """Name the representation at this address that ``parts`` (a change number, a date) determine."""
        scope = self.request.scope  # not the request's URL, which is put together with the client's Host
        address = scope["path"], scope["query_string"].decode("latin-1")
        return strong_tag(self.context.edition, *address, *map(str, parts))

    def fresh_tag(self, *parts: object) -> str:
        """Return the tag; ``NotModified`` ends the request when the client holds this representation."""
        tag = self.tag(*parts)
        refuse_unchanged(self.request, tag)
        return tag

    @contextmanager
    def reading(self) -> Iterator[tuple[Session, str]]:
        """Give a snapshot of the database and its tag, from one indexed read."""
        with self.context.store.read() as session:
            yield session, self.fresh_tag(current_change(session))


async def asked(request: Request) -> Asked:
    """Put request and context together."""
    return Asked(request, request.app.state.context)


AskedNow = Annotated[Asked, Depends(asked)]


def existing_id(text: str, noun: str) -> str:
    """Return an id that could be one; ``NotFoundError`` for what no database needs to be asked about."""
    if not (text.isascii() and text.isprintable() and len(text) <= MAX_ID):
        raise NotFoundError(f"there is no {noun} of this name")
    return text
