"""``stonechat demo`` from an empty folder: what it prints, what it serves, what it leaves behind."""

from __future__ import annotations

import os
import re
import signal
import socket
import subprocess
from collections.abc import Iterator
from pathlib import Path

import httpx
import pytest

from app.core.advice.advisory import CAUTION
from tests.contract.command import PATIENCE_S, Done, run, start

WIDTH = 80
# Solar longitude (J2000) of the Perseids' yearly maximum: International Meteor Organization, Meteor Shower
# Calendar (140.0 to 140.1 degrees; from memory).
PERSEID_MAXIMUM_DEG = 140.0
HALF_DEGREE = 0.5


@pytest.fixture(scope="module")
def once(tmp_path_factory: pytest.TempPathFactory) -> Done:
    folder, temporary = tmp_path_factory.mktemp("empty"), tmp_path_factory.mktemp("temporary")
    done = run(folder, "demo", "--once", TMPDIR=str(temporary), COLUMNS="40", TZ="Pacific/Auckland")
    assert os.listdir(folder) == []
    assert os.listdir(temporary) == []
    return done


def section(text: str, satellite: str) -> str:
    return text.split(f"({satellite}), ready at")[1].split("\n== ")[0]


def test_it_ends_well_and_says_nothing_beside(once: Done) -> None:
    assert (once.returncode, once.stderr) == (0, "")


def test_it_is_readable_at_80_columns(once: Done) -> None:
    assert max(len(line) for line in once.stdout.splitlines()) <= WIDTH
    assert once.stdout.isascii()


def test_it_shows_every_level_the_caution_and_what_to_do_next(once: Done) -> None:
    assert {"SHELTER", "READY", "steady"} <= set(once.stdout.split())
    assert CAUTION in " ".join(once.stdout.split())
    assert (
        once.stdout.splitlines()[-1]
        .strip()
        .startswith("curl -s http://127.0.0.1:8750/v1/advisories/PER-2026.")
    )


def test_the_perseids_peak_where_they_should(once: Done) -> None:
    found = re.findall(r"PER-2026 Perseids\n.*\((2026-08-1\d)T.*solar longitude (\d+\.\d+)", once.stdout)
    assert len(found) >= 2
    for date, longitude in found:
        assert date in ("2026-08-12", "2026-08-13")
        assert float(longitude) == pytest.approx(PERSEID_MAXIMUM_DEG, abs=HALF_DEGREE)


def test_a_fast_stream_matters_more_electrically(once: Done) -> None:
    """Charge grows as speed to the power 3.48 (McBride & McDonnell 1999), and the Perseids are fast."""
    blocks = re.findall(r"penetration (\d+\.\d+) on .*\n.*charge (\d+\.\d+) on", once.stdout)
    assert blocks
    assert all(float(charge) > float(penetration) for penetration, charge in blocks)


def test_low_orbits_near_the_radiants_plane_have_lee_every_revolution(once: Done) -> None:
    """With 100 km of air the Earth spans 136 degrees as seen from 616 km, 38 % of a revolution of 97 minutes."""
    for satellite in ("sedge-a", "sedge-b", "sedge-c"):
        (row,) = re.findall(r"PER-2026 .*", section(once.stdout, satellite))
        count, minutes = re.findall(r"(\d+) x (\d+) min$", row)[0]
        assert 14 <= int(count) <= 17  # of half a day before to half a day after the peak
        assert 30 <= int(minutes) <= 37


def test_the_geostationary_satellite_is_told_that_it_has_no_lee(once: Done) -> None:
    assert "none from" in section(once.stdout, "tarn")
    assert "the Earth never hides every stream" in " ".join(section(once.stdout, "tarn").split())


def test_everyone_sees_the_same(once: Done, tmp_path: Path) -> None:
    elsewhere = {
        "PYTHONHASHSEED": "7",
        "LC_ALL": "C",
        "STONECHAT_MASS_LAW": "verniani",
        "STONECHAT_HORIZON_LOW_DAYS": "1",
        "STONECHAT_DATABASE_URL": "postgresql+psycopg://nobody@nowhere.invalid/none",
    }
    assert run(tmp_path, "demo", "--once", **elsewhere).stdout == once.stdout


def free_port() -> int:
    with socket.create_server(("127.0.0.1", 0)) as listener:
        port: int = listener.getsockname()[1]
    return port


@pytest.fixture(params=[signal.SIGINT, signal.SIGTERM])
def served(request: pytest.FixtureRequest, tmp_path: Path) -> Iterator[tuple[str, subprocess.Popen[str]]]:
    """A demo that serves, with its address; it is sent the signal and must then end well."""
    with start(tmp_path, "demo", "--port", str(free_port()), TMPDIR=str(tmp_path)) as process:
        yield address_of(process), process
        process.send_signal(request.param)
        _, errors = process.communicate(timeout=PATIENCE_S)
    assert process.returncode == 0
    assert "Traceback" not in errors
    assert os.listdir(tmp_path) == []


def address_of(process: subprocess.Popen[str]) -> str:
    """Read what the process prints until it names its address."""
    assert process.stdout is not None
    for line in process.stdout:
        found = re.match(r"Serving (http\S+) with the clock held", line)
        if found:
            return found[1]
    raise AssertionError("the demo ended before it served")


def test_it_serves_what_it_printed_and_leaves_nothing(served: tuple[str, subprocess.Popen[str]]) -> None:
    address, _ = served
    with httpx.Client(base_url=address, transport=httpx.HTTPTransport(retries=5)) as client:
        answer = client.get("/v1/advisories", params={"level": "shelter"})
        ready = client.get("/readyz")
    assert "PER-2026.fellwatch" in [item["id"] for item in answer.json()["items"]]
    assert ready.status_code == 200


def test_a_port_in_use_is_refused_before_anything_is_computed(tmp_path: Path) -> None:
    with socket.create_server(("127.0.0.1", 0)) as taken:
        done = run(tmp_path, "demo", "--port", str(taken.getsockname()[1]))
    assert (done.returncode, done.stdout) == (1, "")
    assert "cannot listen on 127.0.0.1" in done.stderr


def test_interrupted_while_it_computes_it_puts_its_folder_away(tmp_path: Path) -> None:
    temporary = tmp_path / "temporary"
    temporary.mkdir()
    process = start(tmp_path, "demo", "--once", TMPDIR=str(temporary))
    while process.poll() is None and not any(temporary.glob("*/stonechat.sqlite")):
        pass
    process.send_signal(signal.SIGINT)
    _, errors = process.communicate(timeout=PATIENCE_S)
    assert (process.returncode, errors) == (130, "stonechat: interrupted\n")
    assert os.listdir(temporary) == []


def test_readme_shows_what_is_printed(once: Done) -> None:
    readme = (Path(__file__).parents[2] / "README.md").read_text(encoding="utf-8")
    start = readme.index("```text\nTo act on:") + len("```text\n")
    assert readme[start : readme.index("```\n", start)] in once.stdout
