"""Any orbit file -> mean elements, and mean elements -> JSON for the store and for the API."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import asdict, fields
from typing import Any

from app.core.orbit.elements import MeanElements
from app.errors import FieldError, FileError
from app.formats import epoch
from app.formats.omm import NUMBERS, ONLY_VALUES, UNKNOWN, VERSIONS, read_omm, sniff
from app.formats.omm_syntax import VERSION
from app.formats.text import decode, name_problem, shown
from app.formats.tle import read_tle

NOTATIONS = {
    "application/json": "json",
    "application/xml": "xml",
    "text/xml": "xml",
    "text/csv": "csv",
    "text/plain": None,
    "application/octet-stream": None,
    "": None,
}
LARGEST = 1e300  # an integer beyond it would not become a float
TEXT_FIELDS = ("object_name", "object_id")


def read_orbits(data: bytes, source: str, content_type: str | None = None) -> list[MeanElements | FileError]:
    """Read an OMM file (JSON, XML, KVN, CSV) or TLE file in file order.

    ``content_type`` is an HTTP media type; ``text/plain``, ``application/octet-stream`` and None look at the
    text itself. Nothing is raised: whatever is refused is a ``FileError`` in the list.
    """
    try:
        media = _notation(source, content_type)
        text = decode(data, source)
    except FileError as error:
        return [error]
    if media or sniff(text):
        return read_omm(data, source, media)
    return read_tle(text, source)


def elements_to_dict(elements: MeanElements) -> dict[str, str | float]:
    """Turn elements into JSON that ``elements_from_dict`` reads back bit for bit."""
    return asdict(elements)


def elements_from_dict(data: Mapping[str, object]) -> MeanElements:
    """Read what ``elements_to_dict`` wrote; ``FieldError`` names a missing, unknown or wrong field."""
    names = [field.name for field in fields(MeanElements)]
    for name in [*names, *data]:
        if name not in names:
            raise FieldError(shown(name), "is no field of mean elements; remove it")
        if name not in data:
            raise FieldError(name, "is missing")
    values: dict[str, Any] = {
        name: _text_field(name, data[name]) if name in TEXT_FIELDS else _number_field(name, data[name])
        for name in names
    }
    return MeanElements(**values)


def omm_object(elements: MeanElements) -> dict[str, str | float]:
    """Write elements as an OMM in JSON form (CCSDS 502.0-B-3 keywords), which ``read_omm`` reads back."""
    return {
        VERSION: VERSIONS[-1],
        "OBJECT_NAME": elements.object_name,
        "OBJECT_ID": elements.object_id or UNKNOWN,
        **{keyword: accepted[0] for keyword, (accepted, _) in ONLY_VALUES.items()},
        "EPOCH": epoch.format_ccsds(elements.epoch_jd, elements.epoch_fraction),
        **{keyword: getattr(elements, number.field) for keyword, number in NUMBERS.items()},
    }


def _notation(source: str, content_type: str | None) -> str | None:
    essence = (content_type or "").partition(";")[0].strip().lower()
    suffix = re.search(r"\+(json|xml)$", essence)
    if suffix:
        return suffix[1]
    if essence not in NOTATIONS:
        known = ", ".join(filter(None, NOTATIONS))
        raise FileError(source, "content type", f"is {shown(essence)}; send one of {known}")
    return NOTATIONS[essence]


def _text_field(name: str, value: object) -> str:
    if not isinstance(value, str) or (value and name_problem(value)):
        raise FieldError(name, f"is {shown(value)}; it must be a printable text")
    return value


def _number_field(name: str, value: object) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float) or not abs(value) < LARGEST:
        raise FieldError(name, f"is {shown(value)}; it must be a finite number")
    return float(value)
