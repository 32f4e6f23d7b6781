"""Orbit Mean-Elements Messages (CCSDS 502.0-B-3) in JSON, XML, KVN or CSV.

Syntax is ``omm_syntax``'s; here keywords become numbers. Only what SGP4 takes is read: EARTH, TEME, UTC,
SGP4. JSON and CSV as commonly distributed leave those four out, which then stand for themselves.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass

from app.core.orbit.elements import MeanElements
from app.errors import FieldError, FileError
from app.formats import epoch
from app.formats.omm_syntax import SPLITTERS, VERSION, Message
from app.formats.text import decode, name_problem, shown

VERSIONS = ("2.0", "3.0")
UNKNOWN = "UNKNOWN"  # the standard's word for an identifier nobody knows (table 4-2)
SGP4_EPHEMERIS_TYPES = ("0", "2")  # 4.2.4.7; 4 is SGP4-XP, a different theory

# keyword: (accepted values, what to do about another). SGP/SGP4 is the value of table 4-3 and annex G.
ONLY_VALUES = {
    "CENTER_NAME": (("EARTH",), "give elements about the Earth"),
    "REF_FRAME": (("TEME",), "SGP4 elements are in TEME of date; ask the provider for those"),
    "TIME_SYSTEM": (("UTC",), "give the epoch in UTC"),
    "MEAN_ELEMENT_THEORY": (("SGP4", "SGP/SGP4"), "ask the provider for SGP4 elements"),
}


@dataclass(frozen=True)
class Number:
    """A numeric keyword: the field it fills, its unit as the standard spells it, its range if any."""

    field: str
    unit: str
    limit: float = math.inf
    default: float | None = None


NUMBERS = {
    "MEAN_MOTION": Number("mean_motion_rev_per_day", "rev/day"),
    "ECCENTRICITY": Number("eccentricity", "n/a"),
    "INCLINATION": Number("inclination_deg", "deg"),
    "RA_OF_ASC_NODE": Number("raan_deg", "deg", limit=360.0),
    "ARG_OF_PERICENTER": Number("arg_perigee_deg", "deg", limit=360.0),
    "MEAN_ANOMALY": Number("mean_anomaly_deg", "deg", limit=360.0),
    "BSTAR": Number("bstar_per_earth_radius", "1/ER", default=0.0),
    "MEAN_MOTION_DOT": Number("mean_motion_dot_rev_per_day2", "rev/day**2", default=0.0),
    "MEAN_MOTION_DDOT": Number("mean_motion_ddot_rev_per_day3", "rev/day**3", default=0.0),
}
KEYWORD_OF_FIELD = {number.field: keyword for keyword, number in NUMBERS.items()}
CSV_HEADER = re.compile(r"\b(EPOCH|OBJECT_NAME|OBJECT_ID|MEAN_MOTION|ECCENTRICITY)\b")
DECIMAL = re.compile(r"([+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?)\s*(?:\[(.*)\])?")
UNIT_SPELLINGS = {"1/[earth radii]": "1/er", "1/earth radii": "1/er", "1/er": "1/er", "": "n/a"}

# Every keyword of tables 4-1 to 4-3: KVN and XML may hold no other (4.2.2.2, 4.2.3.2, 4.2.4.2).
KNOWN = re.compile(
    r"CCSDS_OMM_VERS|CLASSIFICATION|CREATION_DATE|ORIGINATOR|MESSAGE_ID"
    r"|OBJECT_NAME|OBJECT_ID|CENTER_NAME|REF_FRAME|REF_FRAME_EPOCH|TIME_SYSTEM|MEAN_ELEMENT_THEORY"
    r"|EPOCH|SEMI_MAJOR_AXIS|MEAN_MOTION|ECCENTRICITY|INCLINATION|RA_OF_ASC_NODE|ARG_OF_PERICENTER"
    r"|MEAN_ANOMALY|GM|MASS|SOLAR_RAD_AREA|SOLAR_RAD_COEFF|DRAG_AREA|DRAG_COEFF"
    r"|EPHEMERIS_TYPE|CLASSIFICATION_TYPE|NORAD_CAT_ID|ELEMENT_SET_NO|REV_AT_EPOCH|BSTAR|BTERM"
    r"|MEAN_MOTION_DOT|MEAN_MOTION_DDOT|AGOM|COV_REF_FRAME|C[XYZ](_DOT)?_[XYZ](_DOT)?|USER_DEFINED_\w+"
)


def read_omm(data: bytes, source: str, media: str | None = None) -> list[MeanElements | FileError]:
    """Read every message of a file in file order; a refused one becomes a ``FileError`` naming its keyword.

    ``media``: ``json``, ``xml``, ``kvn`` or ``csv``; None looks at the first characters.
    """
    try:
        text = decode(data, source)
        kind = media or sniff(text)
        if kind not in SPLITTERS:
            problem = "is neither JSON, XML, KVN (CCSDS_OMM_VERS = ...) nor CSV with a header of OMM keywords"
            raise FileError(source, "line 1", problem)
        return [_result(message, source) for message in SPLITTERS[kind](text, source)]
    except FileError as error:
        return [error]


def sniff(text: str) -> str | None:
    """Tell the notation of an OMM file from its beginning; None when it is none of the four."""
    lines = (line for line in text.splitlines() if line.strip() and line.split()[0] != "COMMENT")
    first = next(lines, "").strip()
    if first[:1] in ("{", "["):
        return "json"
    if first[:1] == "<":
        return "xml"
    if "," in first and CSV_HEADER.search(first) and "=" not in first:
        return "csv"
    return "kvn" if first.startswith("CCSDS_") else None


def elements(message: Message, source: str) -> MeanElements:
    """Make one message's elements; ``FileError`` names the keyword and what to mend."""
    return _Reading(message, source).elements()


def _result(message: Message | FileError, source: str) -> MeanElements | FileError:
    if isinstance(message, FileError):
        return message
    try:
        return elements(message, source)
    except FileError as error:
        return error


@dataclass(frozen=True)
class _Reading:
    """One message under examination."""

    message: Message
    source: str

    def elements(self) -> MeanElements:
        self._check_frame_of_reference()
        self._check_keywords()
        name, object_id = self._name("OBJECT_NAME"), self._object_id()
        epoch_jd, epoch_fraction = self._epoch()
        numbers = {number.field: self._number(keyword) for keyword, number in NUMBERS.items()}
        try:
            return MeanElements(
                object_name=name,
                object_id=object_id,
                epoch_jd=epoch_jd,
                epoch_fraction=epoch_fraction,
                **numbers,
            )
        except FieldError as error:
            raise self._refuse(KEYWORD_OF_FIELD[error.field], error.problem) from None

    @property
    def _fields(self) -> Mapping[str, str]:
        return self.message.fields

    def _refuse(self, keyword: str, problem: str) -> FileError:
        where = f"{self.message.label}, {keyword}" if self.message.label else keyword
        return FileError(self.source, where, problem)

    def _text(self, keyword: str) -> str:
        if keyword not in self._fields:
            raise self._refuse(keyword, "is missing; an OMM must give it")
        return self._fields[keyword].strip()

    def _check_frame_of_reference(self) -> None:
        version = self._text(VERSION) if self.message.complete else self._fields.get(VERSION, VERSIONS[-1])
        if version.strip() not in VERSIONS:
            raise self._refuse(VERSION, f"is {shown(version)}; versions {' and '.join(VERSIONS)} are read")
        for keyword, (accepted, remedy) in ONLY_VALUES.items():
            value = self._text(keyword) if self.message.complete else self._fields.get(keyword, accepted[0])
            if value.strip().upper() not in accepted:
                raise self._refuse(keyword, f"is {shown(value)}; only {accepted[0]} is read, {remedy}")

    def _check_keywords(self) -> None:
        if "SEMI_MAJOR_AXIS" in self._fields:
            problem = "stands for MEAN_MOTION, which SGP4 needs; give MEAN_MOTION in rev/day instead"
            raise self._refuse("SEMI_MAJOR_AXIS", problem)
        kind = self._fields.get("EPHEMERIS_TYPE", SGP4_EPHEMERIS_TYPES[0]).strip()
        if kind not in SGP4_EPHEMERIS_TYPES:
            problem = f"is {shown(kind)}; only SGP4 elements (0 or 2) are read, ask the provider for those"
            raise self._refuse("EPHEMERIS_TYPE", problem)
        for keyword in self._fields if self.message.complete else ():
            if not KNOWN.fullmatch(keyword):
                raise self._refuse(shown(keyword), "is no OMM keyword; correct or remove it")

    def _name(self, keyword: str) -> str:
        name = self._text(keyword)
        problem = name_problem(name)
        if problem:
            raise self._refuse(keyword, problem)
        return name

    def _object_id(self) -> str:
        value = self._name("OBJECT_ID")
        return "" if value == UNKNOWN else value

    def _epoch(self) -> tuple[float, float]:
        text = self._text("EPOCH")
        try:
            return epoch.parse_ccsds(text)
        except ValueError as error:
            raise self._refuse("EPOCH", f"{shown(text)}: {error}") from None

    def _number(self, keyword: str) -> float:
        number = NUMBERS[keyword]
        if number.default is not None and keyword not in self._fields:
            return number.default
        text = self._text(keyword)
        found = DECIMAL.fullmatch(text)
        value = float(found[1]) if found else math.nan
        if not found or not math.isfinite(value):
            raise self._refuse(keyword, f"is {shown(text)}; give a finite decimal number")
        if found[2] is not None and _unit(found[2]) != number.unit.lower():
            raise self._refuse(keyword, f"has the unit {shown(found[2])}; give it in [{number.unit}]")
        if abs(value) > number.limit:
            problem = f"is {value!r}; it must lie between {-number.limit:g} and {number.limit:g}"
            raise self._refuse(keyword, problem)
        return value


def _unit(text: str) -> str:
    spelling = text.strip().lower().replace("^", "**")
    return UNIT_SPELLINGS.get(spelling, spelling)
