"""Two-line element sets: strict columns and checksums first, numbers after.

The column layout is the one NORAD distributes (Hoots & Roehrich 1980, Spacetrack Report No. 3, and
Vallado et al. 2006, AIAA 2006-6753, appendix B); catalogue numbers may be in the Alpha-5 form.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass

from app.core.orbit.elements import MeanElements
from app.errors import FieldError, FileError
from app.formats import epoch
from app.formats.text import name_problem, numbered_lines, shown

LINE_LENGTH = 69
SGP4_EPHEMERIS_TYPES = ("", "0", "2")  # 4 is SGP4-XP, a different theory (CCSDS 502.0-B-3, 4.2.4.7)


@dataclass(frozen=True)
class Column:
    """One field of a line: first and last column (from 1), what must stand there, and an example."""

    name: str
    first: int
    last: int
    pattern: str
    example: str

    def of(self, line: str) -> str:
        """Cut the field out of ``line``."""
        return line[self.first - 1 : self.last]


CATALOGUE = Column("catalogue number", 3, 7, r" *[0-9]+|[A-HJ-NP-Z][0-9]{4}", "25544")
CLASSIFICATION = Column("classification", 8, 8, r"[UCS ]", "U")
DESIGNATOR = Column("international designator", 10, 17, r"[0-9]{5}[A-Z]{1,3} *| {8}", "98067A  ")
EPOCH = Column("epoch", 19, 32, r"[0-9]{5}\.[0-9]{8}", "26224.87851851")
MOTION_DOT = Column("mean motion derivative", 34, 43, r"[ +-]\.[0-9]{8}", " .00000023")
MOTION_DDOT = Column("second derivative", 45, 52, r"[ +-][0-9]{5}[+-][0-9]", " 00000-0")
BSTAR = Column("drag term", 54, 61, r"[ +-][0-9]{5}[+-][0-9]", " 28098-4")
EPHEMERIS_TYPE = Column("ephemeris type", 63, 63, r"[0-9 ]", "0")
SET_NUMBER = Column("element set number", 65, 68, r" *[0-9]*", " 999")
INCLINATION = Column("inclination", 9, 16, r" *[0-9]{1,3}\.[0-9]{4}", " 51.6412")
NODE = Column("right ascension of the node", 18, 25, r" *[0-9]{1,3}\.[0-9]{4}", "348.7242")
ECCENTRICITY = Column("eccentricity", 27, 33, r"[0-9]{7}", "0006703")
PERIGEE = Column("argument of perigee", 35, 42, r" *[0-9]{1,3}\.[0-9]{4}", "331.7664")
ANOMALY = Column("mean anomaly", 44, 51, r" *[0-9]{1,3}\.[0-9]{4}", " 19.3264")
MOTION = Column("mean motion", 53, 63, r" ?[0-9]{1,2}\.[0-9]{8}", "15.50103472")
REVOLUTION = Column("revolution number", 64, 68, r" *[0-9]*", "41366")
CHECKSUM = Column("checksum", 69, 69, r"[0-9]", "7")

COLUMNS = {
    "1": (
        *(CATALOGUE, CLASSIFICATION, DESIGNATOR, EPOCH, MOTION_DOT, MOTION_DDOT, BSTAR),
        *(EPHEMERIS_TYPE, SET_NUMBER, CHECKSUM),
    ),
    "2": (CATALOGUE, INCLINATION, NODE, ECCENTRICITY, PERIGEE, ANOMALY, MOTION, REVOLUTION, CHECKSUM),
}
COLUMN_OF_FIELD = {
    "mean_motion_rev_per_day": MOTION,
    "eccentricity": ECCENTRICITY,
    "inclination_deg": INCLINATION,
    "bstar_per_earth_radius": BSTAR,
}


@dataclass(frozen=True)
class Line:
    """A line that is not blank and no comment, with its number in the file."""

    number: int
    text: str

    @property
    def kind(self) -> str:
        """``1`` or ``2`` for an element line, ``name`` for anything else."""
        return self.text[0] if self.text[:2] in ("1 ", "2 ") else "name"


@dataclass(frozen=True)
class Reader:
    """What every check of one file shares."""

    source: str
    text_after_column_69: bool

    def refuse(self, line: Line, problem: str) -> FileError:
        """Make the error of ``line``."""
        return FileError(self.source, f"line {line.number}", problem)


def read_tle(text: str, source: str, *, text_after_column_69: bool = False) -> list[MeanElements | FileError]:
    """Read two- or three-line sets in file order; a malformed set becomes a ``FileError``.

    Blank lines and lines starting with ``#`` are skipped. A set without a name line is named by its
    catalogue number. ``text_after_column_69`` ignores what follows the checksum (the published SGP4
    verification file keeps its test times there); otherwise it is refused.
    """
    lines = [Line(number, line) for number, line in numbered_lines(text) if not _is_skipped(line)]
    if not any(line.kind != "name" for line in lines):
        problem = "holds no element set; its two lines start with '1 ' and '2 '"
        return [FileError(source, f"line {lines[0].number if lines else 1}", problem)]
    return list(_sets(Reader(source, text_after_column_69), lines))


def checksum(line: str) -> int:
    """Checksum of columns 1 to 68: digits added up, each minus sign counting 1, modulo 10."""
    return sum(int(c) if c in "0123456789" else c == "-" for c in line[: LINE_LENGTH - 1]) % 10


def _is_skipped(line: str) -> bool:
    return not line.strip() or line.startswith("#")


def _sets(reader: Reader, lines: list[Line]) -> Iterator[MeanElements | FileError]:
    position = 0
    while position < len(lines):
        named = lines[position].kind == "name"
        group = lines[position : position + (3 if named else 2)]
        kinds = [line.kind for line in group]
        if kinds[-2:] == ["1", "2"] and len(group) == (3 if named else 2):
            position += len(group)
            yield _one_set(reader, group)
        else:
            stray = _stray_length(kinds)
            position += stray
            yield _stray(reader, group[stray - 1])


def _stray_length(kinds: list[str]) -> int:
    # A name and a line 1 without their line 2 are one mistake, not two.
    return 2 if kinds[:2] == ["name", "1"] else 1


def _stray(reader: Reader, line: Line) -> FileError:
    problems = {
        "1": "line 1 of a set is not followed by its line 2",
        "2": "line 2 of a set has no line 1 right before it",
        "name": f"{shown(line.text.rstrip())} is no element line and no name with two element lines after it",
    }
    return reader.refuse(line, problems[line.kind])


def _one_set(reader: Reader, group: list[Line]) -> MeanElements | FileError:
    first, second = group[-2:]
    try:
        for line in (first, second):
            _check_line(reader, line)
        _check_pair(reader, first, second)
        name = _name(reader, group[0]) if len(group) == 3 else CATALOGUE.of(first.text).strip()
        return _elements(reader, name, first, second)
    except FileError as error:
        return error


def _check_line(reader: Reader, line: Line) -> None:
    text = line.text.rstrip()
    if len(text) < LINE_LENGTH:
        raise reader.refuse(line, f"ends at column {len(text)}; an element line has {LINE_LENGTH} columns")
    if len(text) > LINE_LENGTH and not reader.text_after_column_69:
        extra = shown(text[LINE_LENGTH:].strip())
        raise reader.refuse(line, f"has {extra} after column {LINE_LENGTH}; remove it")
    _check_columns(reader, line)
    found, right = int(CHECKSUM.of(text)), checksum(text)
    if found != right:
        remedy = "a character was changed on the way, fetch the set again"
        raise reader.refuse(
            line, f"its checksum (column 69) is {found}, the line adds up to {right}; {remedy}"
        )


def _check_columns(reader: Reader, line: Line) -> None:
    gaps = set(range(2, LINE_LENGTH + 1))
    for column in COLUMNS[line.kind]:
        gaps -= set(range(column.first, column.last + 1))
        if not re.fullmatch(column.pattern, column.of(line.text)):
            where = f"the {column.name} (columns {column.first}-{column.last})"
            remedy = f"it looks like {column.example!r}"
            raise reader.refuse(line, f"{where} is {shown(column.of(line.text))}; {remedy}")
    for gap in sorted(gaps):
        if line.text[gap - 1] != " ":
            raise reader.refuse(line, f"column {gap} is {shown(line.text[gap - 1])}; it must be blank")


def _check_pair(reader: Reader, first: Line, second: Line) -> None:
    numbers = [CATALOGUE.of(line.text).strip().lstrip("0") for line in (first, second)]
    if numbers[0] != numbers[1]:
        problem = f"its catalogue number is {numbers[1]}, that of line {first.number} is {numbers[0]}"
        raise reader.refuse(second, f"{problem}; the two lines belong to different sets")
    kind = EPHEMERIS_TYPE.of(first.text).strip()
    if kind not in SGP4_EPHEMERIS_TYPES:
        problem = f"its ephemeris type (column 63) is {kind}; only SGP4 elements (0, 2 or blank) are read"
        raise reader.refuse(first, problem)
    for column in (NODE, PERIGEE, ANOMALY):
        if float(column.of(second.text)) > 360.0:
            problem = f"the {column.name} is {column.of(second.text).strip()}; it must be 0 to 360 degrees"
            raise reader.refuse(second, problem)


def _name(reader: Reader, line: Line) -> str:
    name = line.text.removeprefix("0 ").strip()
    problem = name_problem(name)
    if problem:
        raise reader.refuse(line, f"the object's name {problem}")
    return name


def _elements(reader: Reader, name: str, first: Line, second: Line) -> MeanElements:
    try:
        epoch_jd, epoch_fraction = _epoch(EPOCH.of(first.text))
        return MeanElements(
            object_name=name,
            object_id=_object_id(DESIGNATOR.of(first.text)),
            epoch_jd=epoch_jd,
            epoch_fraction=epoch_fraction,
            mean_motion_rev_per_day=float(MOTION.of(second.text)),
            eccentricity=float(f"0.{ECCENTRICITY.of(second.text)}"),
            inclination_deg=float(INCLINATION.of(second.text)),
            raan_deg=float(NODE.of(second.text)),
            arg_perigee_deg=float(PERIGEE.of(second.text)),
            mean_anomaly_deg=float(ANOMALY.of(second.text)),
            bstar_per_earth_radius=_implied_decimal(BSTAR.of(first.text)),
            mean_motion_dot_rev_per_day2=float(MOTION_DOT.of(first.text)),
            mean_motion_ddot_rev_per_day3=_implied_decimal(MOTION_DDOT.of(first.text)),
        )
    except FieldError as error:
        column = COLUMN_OF_FIELD[error.field]
        line = first if column in COLUMNS["1"] else second
        raise reader.refuse(line, f"the {column.name} {error.problem}") from None
    except ValueError as error:
        raise reader.refuse(first, f"the epoch: {error}") from None


def _epoch(field: str) -> tuple[float, float]:
    return epoch.parse_year_and_day(int(field[:2]), field[2:])


def _object_id(field: str) -> str:
    if not field.strip():
        return ""
    return f"{epoch.full_year(int(field[:2]))}-{field[2:].strip()}"


def _implied_decimal(field: str) -> float:
    return float(f"{field[0].strip()}0.{field[1:6]}e{field[6:]}")
