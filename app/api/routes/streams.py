"""The stream catalogue, every value with its source."""

from __future__ import annotations

from typing import Annotated, Any

from fastapi import APIRouter, Path, Query
from starlette.responses import Response

from app.api import docs
from app.api.caching import reply
from app.api.deps import AskedNow
from app.api.paging import Page, Pager
from app.api.schemas import ItemsPage, StreamOut
from app.catalogue_file import entry_document
from app.core.streams.model import CatalogueEntry
from app.errors import NotFoundError
from app.formats.text import shown as quoted

router = APIRouter(prefix="/v1/streams", tags=["catalogue"])
StreamCode = Annotated[str, Path(description="The stream's code.", examples=["PER"])]


@router.get(
    "",
    response_model=ItemsPage[StreamOut],
    responses=docs.reading("streams", paged=True),
)
def read_streams(asked: AskedNow, page: Annotated[Page, Query()]) -> Response:
    """List the catalogued streams by code, those that are off included."""
    pager = Pager(asked.request, page, (str,))
    after, tag = pager.after, asked.fresh_tag()
    catalogue = asked.context.catalogue
    entries = sorted(catalogue.entries, key=lambda entry: entry.code)
    rows = [entry for entry in entries if after is None or entry.code > str(after[0])]
    shown, headers = pager.cut(rows, lambda row: (row.code,), lambda row: _shown(row, catalogue.digest))
    return reply(shown, tag, headers)


@router.get("/{code}", response_model=StreamOut, responses=docs.reading("stream", 404))
def read_stream(asked: AskedNow, code: StreamCode) -> Response:
    """Return one stream."""
    catalogue = asked.context.catalogue
    for entry in catalogue.entries:
        if entry.code == code:
            return reply(_shown(entry, catalogue.digest), asked.fresh_tag())
    raise NotFoundError(f"there is no stream {quoted(code)}; GET /v1/streams lists the codes, such as PER")


def _shown(entry: CatalogueEntry, digest: str) -> dict[str, Any]:
    return {**entry_document(entry), "catalogue_digest": digest}
