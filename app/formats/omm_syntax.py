"""The four notations of an OMM -> messages of keyword and text; nothing is interpreted here.

CCSDS 502.0-B-3 sections 7 and 8 (KVN, XML); JSON and CSV carry the same keywords without nesting.
"""

from __future__ import annotations

import csv
import io
import re
from collections import Counter
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from xml.etree.ElementTree import Element, ParseError

from defusedxml.common import DefusedXmlException
from defusedxml.ElementTree import fromstring

from app.errors import FileError
from app.formats.strict_json import load_json
from app.formats.text import numbered_lines, shown

VERSION = "CCSDS_OMM_VERS"
KVN_VERSION_LINE = re.compile(r"CCSDS_([A-Z]{3})_VERS\b")
KVN_LINE = re.compile(r"\s*([A-Za-z][A-Za-z0-9_]*)\s*=(.*)")
OTHER_MESSAGE = "{} messages are not read by this version; give an OMM or TLE"
OEM_MESSAGE = "OEM ephemerides are not read by this version; give an OMM or TLE"


@dataclass(frozen=True)
class Message:
    """One OMM: ``label`` places it in its file ("object 2"); blank values are left out.

    ``complete``: the notation must spell out every mandatory keyword and knows no foreign ones.
    """

    label: str
    fields: dict[str, str]
    complete: bool


def other_message(kind: str) -> str:
    """Say that a CCSDS message of another kind ("OEM", "OPM") is not read."""
    return OEM_MESSAGE if kind.upper() == "OEM" else OTHER_MESSAGE.format(kind.upper())


def split_json(text: str, source: str) -> Iterator[Message | FileError]:
    """One object, or a list of objects."""
    document = load_json(text, source)
    objects = document if isinstance(document, list) else [document]
    if not objects:
        raise FileError(source, "JSON", "the list is empty; give at least one OMM object")
    for number, each in enumerate(objects, start=1):
        label = f"object {number}" if len(objects) > 1 else ""
        try:
            yield Message(label, json_fields(each, source, label), complete=False)
        except FileError as error:
            yield error


def json_fields(document: object, source: str, label: str = "") -> dict[str, str]:
    """Keyword and text of one OMM object; numbers become text that reads back the same, null is left out."""
    if not isinstance(document, dict):
        raise FileError(source, label or "JSON", f"is {shown(document)}; an OMM is an object of keywords")
    for keyword, value in document.items():
        if isinstance(value, bool | list | dict):
            where = ", ".join(filter(None, (label, shown(keyword))))
            raise FileError(source, where, f"is {shown(value)}; give a number or a string")
    return {key: str(value) for key, value in document.items() if value is not None and str(value).strip()}


def split_csv(text: str, source: str) -> Iterator[Message | FileError]:
    """A header row of keywords, then one row per message."""
    rows = csv.reader(io.StringIO(text, newline=""), strict=True)
    try:
        header = [cell.strip() for cell in next(rows)]
        _check_header(header, source)
        for row in rows:
            if any(cell.strip() for cell in row):
                yield _csv_message(header, row, rows.line_num, source)
    except csv.Error as error:
        yield FileError(source, f"line {rows.line_num}", f"is not CSV: {error}")


def _check_header(header: Sequence[str], source: str) -> None:
    for name, count in Counter(header).items():
        if count > 1:
            raise FileError(source, "line 1", f"the column {shown(name)} appears twice; keep one")


def _csv_message(header: list[str], row: list[str], line: int, source: str) -> Message | FileError:
    if len(row) != len(header):
        return FileError(source, f"line {line}", f"has {len(row)} values for {len(header)} columns")
    fields = {key: value for key, value in zip(header, row, strict=True) if value.strip()}
    return Message(f"line {line}", fields, complete=False)


def split_kvn(text: str, source: str) -> Iterator[Message | FileError]:
    """``KEYWORD = VALUE [unit]`` lines; each message starts at ``CCSDS_OMM_VERS``."""
    lines = [(number, line) for number, line in numbered_lines(text) if not _is_kvn_blank(line)]
    if not lines:
        raise FileError(source, "line 1", "holds only comments")
    starts = [i for i, (_, line) in enumerate(lines) if line.strip().startswith("CCSDS_")] or [0]
    if starts[0] != 0:
        starts.insert(0, 0)
    for start, stop in zip(starts, [*starts[1:], len(lines)], strict=True):
        label = f"message at line {lines[start][0]}" if len(starts) > 1 else ""
        try:
            yield Message(label, _kvn_fields(lines[start:stop], source), complete=True)
        except FileError as error:
            yield error


def _is_kvn_blank(line: str) -> bool:
    return not line.strip() or line.split()[0] == "COMMENT"


def _kvn_fields(lines: Sequence[tuple[int, str]], source: str) -> dict[str, str]:
    fields: dict[str, str] = {}
    head = KVN_VERSION_LINE.match(lines[0][1].strip())
    if head and head[1] != "OMM":
        raise FileError(source, f"line {lines[0][0]}", other_message(head[1]))
    for number, line in lines:
        found = KVN_LINE.fullmatch(line)
        if not found:
            raise FileError(source, f"line {number}", f"{shown(line.strip())} is not 'KEYWORD = VALUE'")
        _add(fields, found[1], found[2].strip(), source, f"line {number}")
    return fields


def split_xml(text: str, source: str) -> Iterator[Message | FileError]:
    """``<omm>`` alone or any number of them in ``<ndm>``; document type declarations are refused."""
    root = _xml_root(text, source)
    children = list(root) if _tag(root) == "ndm" else [root]
    messages = [child for child in children if _tag(child) not in ("COMMENT", "MESSAGE_ID")]
    if not messages:
        raise FileError(source, "<ndm>", "holds no <omm>")
    for number, element in enumerate(messages, start=1):
        label = f"message {number}" if len(messages) > 1 else ""
        try:
            yield Message(label, _xml_fields(element, source, label), complete=True)
        except FileError as error:
            yield error


def _xml_root(text: str, source: str) -> Element:
    try:
        root: Element = fromstring(text.lstrip(), forbid_dtd=True)
    except ParseError as error:
        raise FileError(source, f"line {error.position[0]}", f"is not XML: {error}") from None
    except DefusedXmlException:
        problem = "has a document type declaration or entities; remove them"
        raise FileError(source, "<!DOCTYPE>", problem) from None
    except ValueError as error:
        raise FileError(source, "line 1", f"is not XML: {error}") from None
    return root


def _xml_fields(element: Element, source: str, label: str) -> dict[str, str]:
    tag = _tag(element)
    where = ", ".join(filter(None, (label, f"<{tag}>"[:40])))
    if tag in ("oem", "opm", "ocm", "aem", "apm", "acm", "tdm", "cdm", "rdm"):
        raise FileError(source, where, other_message(tag))
    if tag != "omm":
        raise FileError(source, where, "is not an orbit message; it must be <omm>, alone or inside <ndm>")
    fields = {VERSION: element.get("version", "").strip()}
    for leaf in element.iter():
        if len(leaf) == 0 and _tag(leaf) not in ("COMMENT", "USER_DEFINED", "omm"):
            _add(fields, _tag(leaf), _xml_value(leaf), source, label)
    return fields


def _xml_value(leaf: Element) -> str:
    text, units = (leaf.text or "").strip(), leaf.get("units")
    return f"{text} [{units}]" if text and units else text


def _tag(element: Element) -> str:
    return str(element.tag).rpartition("}")[2]


def _add(fields: dict[str, str], keyword: str, value: str, source: str, place: str) -> None:
    if keyword in fields:
        where = ", ".join(filter(None, (place, shown(keyword))))
        raise FileError(source, where, "appears twice in one message; keep one")
    if value:
        fields[keyword] = value


SPLITTERS: dict[str, Callable[[str, str], Iterator[Message | FileError]]] = {
    "json": split_json,
    "xml": split_xml,
    "kvn": split_kvn,
    "csv": split_csv,
}
