"""The wall clock as a seam: it dates rows and leases, and never enters a computation."""

from __future__ import annotations

from collections.abc import Callable
from datetime import UTC, datetime

Clock = Callable[[], datetime]


def utc_now() -> datetime:
    """Return the present instant, aware, UTC."""
    return datetime.now(UTC)


def from_unix(unix_s: float) -> datetime:
    """Turn POSIX seconds into an aware UTC datetime, to the microsecond."""
    return datetime.fromtimestamp(float(unix_s), UTC)
