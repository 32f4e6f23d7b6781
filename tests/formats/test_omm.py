"""OMM in its four notations.

The message is figure G-7 of CCSDS 502.0-B-3 (annex G), its names replaced by invented ones.
"""

from __future__ import annotations

import csv
import io
import json

import pytest
from sgp4 import omm as reference
from sgp4.api import Satrec

from app.core.orbit.elements import MeanElements
from app.core.orbit.sgp4_records import satrec
from app.errors import FileError
from app.formats.omm import read_omm

KVN = """CCSDS_OMM_VERS = 3.0
COMMENT names are invented
CREATION_DATE = 2020-065T16:00:00
ORIGINATOR = EXAMPLE
MESSAGE_ID = OMM 202013719185
OBJECT_NAME = KESTREL 9
OBJECT_ID = 2026-025A
CENTER_NAME = EARTH
REF_FRAME = TEME
TIME_SYSTEM = UTC
MEAN_ELEMENT_THEORY = SGP/SGP4
EPOCH = 2020-064T10:34:41.4264
MEAN_MOTION = 1.00273272
ECCENTRICITY = 0.0005013
INCLINATION = 3.0539
RA_OF_ASC_NODE = 81.7939
ARG_OF_PERICENTER = 249.2363
MEAN_ANOMALY = 150.1602
GM = 398600.8
EPHEMERIS_TYPE = 0
CLASSIFICATION_TYPE = U
NORAD_CAT_ID = 23581
ELEMENT_SET_NO = 0925
REV_AT_EPOCH = 4316
BSTAR = 0.0001
MEAN_MOTION_DOT = -0.00000113
MEAN_MOTION_DDOT = 0.0
"""
FIELDS = dict(line.split(" = ") for line in KVN.splitlines() if "COMMENT" not in line)
# What the widely distributed JSON and CSV files leave out.
SHORT = {k: v for k, v in FIELDS.items() if k.split("_")[0] not in ("CCSDS", "CENTER", "REF", "TIME")}
SHORT.pop("MEAN_ELEMENT_THEORY")


def xml(fields: dict[str, str], version: str = "3.0") -> str:
    names = list(fields)
    header, body = names.index("OBJECT_NAME"), names.index("EPOCH")
    tle = names.index("EPHEMERIS_TYPE")

    def tags(chosen: list[str]) -> str:
        return "".join(f"<{name}>{fields[name]}</{name}>" for name in chosen if "VERS" not in name)

    return (
        f'<omm id="CCSDS_OMM_VERS" version="{version}">'
        f"<header><COMMENT>x</COMMENT>{tags(names[:header])}</header>"
        f"<body><segment><metadata>{tags(names[header:body])}</metadata><data>"
        f"<meanElements>{tags(names[body:tle])}</meanElements>"
        f"<tleParameters>{tags(names[tle:])}</tleParameters></data></segment></body></omm>"
    )


def csv_text(*rows: dict[str, str]) -> str:
    out = io.StringIO()
    writer = csv.DictWriter(out, rows[0])
    writer.writeheader()
    writer.writerows(rows)
    return out.getvalue()


def one(text: str, media: str | None = None) -> MeanElements | FileError:
    (result,) = read_omm(text.encode(), "kestrel.omm", media)
    return result


def error(text: str) -> FileError:
    result = one(text)
    assert isinstance(result, FileError)
    return result


EXPECTED = MeanElements(
    object_name="KESTREL 9",
    object_id="2026-025A",
    epoch_jd=2458912.5,  # 4 March 2020, day 64
    epoch_fraction=0.44075725,  # 38081.4264 s / 86400 s
    mean_motion_rev_per_day=1.00273272,
    eccentricity=0.0005013,
    inclination_deg=3.0539,
    raan_deg=81.7939,
    arg_perigee_deg=249.2363,
    mean_anomaly_deg=150.1602,
    bstar_per_earth_radius=0.0001,
    mean_motion_dot_rev_per_day2=-0.00000113,
)


@pytest.mark.parametrize(
    "text",
    [
        KVN,
        KVN.replace("\n", "\r\n"),
        "\ufeff" + KVN,
        KVN.replace("3.0", "2.0", 1).replace("3.0539", "3.0539 [deg]").replace("0.0001\n", "1e-4 [1/ER]\n"),
        KVN.replace("2020-064T10:34:41.4264", "2020-03-04T10:34:41.42640000Z"),
        KVN.replace("MEAN_MOTION_DDOT = 0.0\n", ""),
        xml(FIELDS),
        f"<?xml version='1.0' encoding='UTF-8'?>\n<ndm><MESSAGE_ID>1</MESSAGE_ID>{xml(FIELDS, '2.0')}</ndm>",
        xml(FIELDS).replace("<INCLINATION>", '<INCLINATION units="deg">'),
        json.dumps(FIELDS),
        json.dumps(
            [{**SHORT, "MEAN_MOTION": 1.00273272, "NORAD_CAT_ID": 23581, "PERIOD": 1436.1, "NOTE": None}]
        ),
        csv_text(FIELDS),
        csv_text({**SHORT, "PERIOD": "1436.1"}),
    ],
)
def test_every_notation_gives_the_same_elements(text: str):
    assert one(text) == EXPECTED


def test_agrees_with_the_sgp4_packages_own_omm_reader():
    text = xml({**FIELDS, "EPOCH": "2020-03-04T10:34:41.426400"})
    theirs, ours = Satrec(), satrec(EXPECTED)
    reference.initialize(theirs, next(reference.parse_xml(io.StringIO(f"<ndm>{text}</ndm>"))))
    assert one(text) == EXPECTED
    for name in ("bstar", "ndot", "nddot", "ecco", "argpo", "inclo", "mo", "no_kozai", "nodeo", "jdsatepoch"):
        assert getattr(ours, name) == pytest.approx(getattr(theirs, name), rel=1e-14, abs=0.0)
    assert ours.jdsatepochF == pytest.approx(theirs.jdsatepochF, abs=1e-11)  # theirs is one float: 1 us


def test_absent_optional_keywords_mean_zero_and_unknown_id_means_none():
    wanted = {k: v for k, v in SHORT.items() if not k.startswith(("BSTAR", "MEAN_MOTION_D", "REV", "GM"))}
    result = one(json.dumps({**wanted, "OBJECT_ID": "UNKNOWN"}))
    assert isinstance(result, MeanElements)
    assert (result.object_id, result.bstar_per_earth_radius) == ("", 0.0)


@pytest.mark.parametrize(
    ("keyword", "value", "says"),
    [
        ("CCSDS_OMM_VERS", "1.0", "versions 2.0 and 3.0 are read"),
        ("CENTER_NAME", "MARS", "only EARTH is read"),
        ("REF_FRAME", "EME2000", "only TEME is read"),
        ("TIME_SYSTEM", "TAI", "only UTC is read"),
        ("MEAN_ELEMENT_THEORY", "SGP4-XP", "only SGP4 is read"),
        ("EPHEMERIS_TYPE", "4", "only SGP4 elements (0 or 2)"),
        ("EPOCH", "2020-02-30T00:00:00", "no calendar date"),
        ("EPOCH", "2020-03-04T10:34:41+01:00", "no other offset"),
        ("ECCENTRICITY", "1.2", "must lie between"),
        ("ECCENTRICITY", "0,0005", "give a finite decimal number"),
        ("INCLINATION", "0.05 [rad]", "give it in [deg]"),
        ("MEAN_MOTION", "NaN", "give a finite decimal number"),
        ("MEAN_MOTION", "1e999", "give a finite decimal number"),
        ("MEAN_MOTION", "0", "must lie between"),
        ("MEAN_ANOMALY", "1_0", "give a finite decimal number"),
        ("RA_OF_ASC_NODE", "3600", "must lie between -360 and 360"),
        ("OBJECT_NAME", "x" * 65, "a name has 1 to 64"),
    ],
)
@pytest.mark.parametrize("notation", ["kvn", "xml", "json"])
def test_wrong_value_is_refused_by_keyword(keyword: str, value: str, says: str, notation: str):
    fields = {**FIELDS, keyword: value}
    kvn = "\n".join(f"{k} = {v}" for k, v in fields.items())
    texts = {"kvn": kvn, "xml": xml(fields, fields["CCSDS_OMM_VERS"]), "json": json.dumps(fields)}
    refused = error(texts[notation])
    assert refused.where == keyword
    assert says in refused.problem


ELEMENTS = ["OBJECT_NAME", "OBJECT_ID", "EPOCH", "MEAN_MOTION", "ECCENTRICITY", "INCLINATION", "MEAN_ANOMALY"]
FRAME = ["CCSDS_OMM_VERS", "CENTER_NAME", "REF_FRAME", "TIME_SYSTEM", "MEAN_ELEMENT_THEORY"]


@pytest.mark.parametrize("keyword", ELEMENTS)
def test_missing_mandatory_keyword_is_named(keyword: str):
    rest = {k: v for k, v in FIELDS.items() if k != keyword}
    for text in (json.dumps(rest), csv_text(rest), "\n".join(f"{k} = {v}" for k, v in rest.items())):
        assert keyword in error(text).where
        assert "is missing" in error(text).problem


@pytest.mark.parametrize("keyword", FRAME[1:])
def test_kvn_and_xml_must_state_the_frame(keyword: str):
    rest = {k: v for k, v in FIELDS.items() if k != keyword}
    for text in (xml(rest), "\n".join(f"{k} = {v}" for k, v in rest.items())):
        assert error(text).where == keyword


def test_semi_major_axis_is_refused_with_the_remedy():
    refused = error(KVN.replace("MEAN_MOTION = 1.00273272", "SEMI_MAJOR_AXIS = 42164.2"))
    assert refused.where == "SEMI_MAJOR_AXIS"
    assert "give MEAN_MOTION" in refused.problem


def test_misspelt_optional_keyword_is_not_overlooked():
    assert error(KVN.replace("BSTAR", "B_STAR")).where == "'B_STAR'"
    assert one(KVN + "USER_DEFINED_MODEL = x\nCX_DOT_Y = 0.1\n") == EXPECTED


def test_a_bad_message_does_not_take_its_neighbours_along():
    bad = KVN.replace("3.0539", "181")
    results = read_omm(f"{KVN}\n{bad}\n{KVN}oops\n".encode(), "many.kvn")
    assert results[0] == EXPECTED
    assert [r.where for r in results if isinstance(r, FileError)] == [
        "message at line 29, INCLINATION",
        "line 84",
    ]
    rows = read_omm(csv_text(FIELDS, {**FIELDS, "INCLINATION": "181"}, FIELDS).encode(), "many.csv")
    assert [r.where for r in rows if isinstance(r, FileError)] == ["line 3, INCLINATION"]
    objects = read_omm(json.dumps([FIELDS, 7, {**FIELDS, "EPOCH": [1]}]).encode(), "many.json")
    assert [r.where for r in objects if isinstance(r, FileError)] == ["object 2", "object 3, 'EPOCH'"]


ENTITY = '<!DOCTYPE x [<!ENTITY a "aaaa">]>'


@pytest.mark.parametrize(
    ("data", "where", "says"),
    [
        (b"", "line 1", "empty"),
        (b" \n\t", "line 1", "empty"),
        (b"CCSDS_OMM_VERS = \xff", "byte 18", "UTF-8"),
        (b"[]", "JSON", "empty"),
        (b"[" * 100_000, "line 1", "nested too deeply"),
        (b'{"EPOCH": 1, "EPOCH": 2}', "JSON", "'EPOCH' appears twice"),
        (b'{"BSTAR": NaN}', "JSON", "NaN"),
        (b'{"BSTAR": -Infinity}', "JSON", "-Infinity"),
        (b'{"BSTAR": 1e400}', "JSON", "too large"),
        (b'{"BSTAR": ' + b"1" * 5000 + b"}", "JSON", "limit"),
        (b'{"OBJECT_NAME": "\\ud800"}', "JSON", "half a surrogate"),
        (b'{"EPOCH": ', "line 1", "is not JSON at column"),
        (b"<ndm>", "line 1", "is not XML"),
        (f"{ENTITY}<omm>&a;</omm>".encode(), "<!DOCTYPE>", "remove them"),
        (b"<ndm></ndm>", "<ndm>", "holds no <omm>"),
        (b"<ndm><opm/></ndm>", "<opm>", "OPM messages are not read"),
        (b"<html></html>", "<html>", "must be <omm>"),
        (b"CCSDS_OEM_VERS = 2.0\nMETA_START", "line 1", "OEM ephemerides are not read by this version"),
        (KVN.encode() + b"BSTAR = 1\n", "line 28, 'BSTAR'", "appears twice"),
        (b"EPOCH,EPOCH\n1,2", "line 1", "appears twice"),
        (b"EPOCH,BSTAR\n1", "line 2", "1 values for 2 columns"),
        (b'EPOCH,BSTAR\n"1,2', "line 2", "is not CSV"),
        (b"hello", "line 1", "is neither JSON, XML, KVN"),
    ],
)
def test_broken_files_are_refused_whole(data: bytes, where: str, says: str):
    (refused,) = read_omm(data, "broken.omm")
    assert isinstance(refused, FileError)
    assert (refused.source, refused.where) == ("broken.omm", where)
    assert says in refused.problem
