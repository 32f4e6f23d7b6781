"""Instants on their way out: always UTC, always ending in Z."""

from __future__ import annotations

from datetime import UTC, datetime

from app.store.clock import from_unix


def utc_text(moment: datetime) -> str:
    """Write an aware datetime; decimals only when there are any."""
    return moment.astimezone(UTC).isoformat().replace("+00:00", "Z")


def unix_text(unix_s: float) -> str:
    """Write POSIX seconds."""
    return utc_text(from_unix(unix_s))


def optional_text(moment: datetime | None) -> str | None:
    """Write an instant that may be missing."""
    return None if moment is None else utc_text(moment)
