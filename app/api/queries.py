"""Query parameters: only the documented ones, each at most once; and the times among them."""

from __future__ import annotations

from typing import Annotated, Any

from fastapi import Request
from pydantic import BaseModel, ConfigDict, Field

from app.core.sky.times import parse_utc
from app.errors import FieldError
from app.formats.text import shown

Instant = Annotated[
    str,
    Field(
        max_length=40,
        json_schema_extra={"format": "date-time"},
        description="ISO 8601, UTC, ending in Z.",
    ),
]


class Span(BaseModel):
    """An interval of time; both ends are required."""

    model_config = ConfigDict(extra="forbid", allow_inf_nan=False)

    from_: Instant = Field(alias="from", examples=["2026-08-12T18:00:00Z"])
    to: Instant = Field(examples=["2026-08-13T06:00:00Z"])

    @property
    def unix_s(self) -> tuple[float, float]:
        """Both ends in POSIX seconds; ``FieldError`` when one is no time or they are in the wrong order."""
        start, end = parse_utc(self.from_, "from"), parse_utc(self.to, "to")
        if end <= start:
            raise FieldError("to", "must lie after 'from'")
        return start, end


async def known_query(request: Request) -> None:
    """Refuse a query parameter that this route does not document, or that is given twice."""
    pairs = request.query_params.multi_items()
    if not pairs:
        return
    allowed = request.app.state.parameters.get((request.scope["route"].path_format, request.method), ())
    seen: set[str] = set()
    for name, _ in pairs:
        if name not in allowed:
            choice = f"allowed are {', '.join(allowed)}" if allowed else "there are none"
            raise FieldError(_printable(name), f"is no query parameter here; {choice}")
        if name in seen:
            raise FieldError(name, "is given twice; give it once")
        seen.add(name)


def parameter_table(openapi: dict[str, Any]) -> dict[tuple[str, str], tuple[str, ...]]:
    """Return the documented query parameters by (path, method)."""
    return {
        (path, method.upper()): tuple(p["name"] for p in call.get("parameters", ()) if p["in"] == "query")
        for path, calls in openapi["paths"].items()
        for method, call in calls.items()
    }


def _printable(name: str) -> str:
    return name if name.isprintable() and 0 < len(name) <= 40 else shown(name)
