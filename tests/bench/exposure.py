"""Measure speed and memory of the exposure; print one JSON object per line.

    python tests/bench/exposure.py            everything (some minutes)
    python tests/bench/exposure.py --fast     fewer satellites, the same lines

Nothing here passes or fails. ``exposure_over_sgp4``: time from mean elements to hazard rates on every face over
the time of the bare compiled SGP4 array call on the same epochs, in one process, median of alternating pairs;
the target is 3.0 or less. ``run_memory``: peak resident memory of a ``compute`` with its worker processes, 10-day
plan at 60 s; the target is 1 GiB or less. ``run_seconds_per_1000``: for information.
"""

from __future__ import annotations

import argparse
import json
import statistics
import sys
import tempfile
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import numpy as np
import psutil
from sgp4.api import SatrecArray

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from app.catalogue_file import load_catalogue
from app.core.exposure.faces import Places, StreamSet, hazard_rates
from app.core.orbit.elements import MeanElements
from app.core.orbit.sgp4_batch import propagate
from app.core.orbit.sgp4_records import satrec
from app.core.sky.times import TimeGrid, parse_utc, regular_grid
from app.core.spacecraft.model import Criterion, CriterionKind, Face, Policy, Spacecraft
from app.core.streams.activity import stream_state
from app.core.streams.flux import mass_law
from app.jobs.run import run_once
from app.settings import load_settings
from app.store.fleet import put_orbit, put_satellite
from app.store.session import open_store

AS_OF = "2026-08-10T06:00:00Z"
DAY = 1440  # epochs a minute apart
STREAMS = 10
PAIRS = 5
BATCH = 10
NORMALS = {
    "+x": (1, 0, 0),
    "-x": (-1, 0, 0),
    "+y": (0, 1, 0),
    "-y": (0, -1, 0),
    "+z": (0, 0, 1),
    "-z": (0, 0, -1),
}


def main() -> None:
    """Print the lines."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--fast", action="store_true", help="fewer satellites")
    fast = parser.parse_args().fast
    show(exposure_over_sgp4(300 if fast else 1000))
    for line in run_lines(60 if fast else 1000):
        show(line)


def show(line: dict[str, object]) -> None:
    """Print one line at once."""
    print(json.dumps(line), flush=True)


def exposure_over_sgp4(satellites: int) -> dict[str, object]:
    """Ratio of the exposure's time to that of bare SGP4."""
    fleet = elements(satellites)
    start = parse_utc(AS_OF)
    bare, full = [], []
    for _ in range(PAIRS):
        bare.append(bare_seconds(fleet, regular_grid(start, start + 60.0 * (DAY - 1), 60.0)))
        full.append(exposure_seconds(fleet, regular_grid(start, start + 60.0 * (DAY - 1), 60.0)))
    ratios = [f / b for f, b in zip(full, bare, strict=True)]
    return {
        "line": "exposure_over_sgp4",
        "value": round(statistics.median(ratios), 3),
        "target_at_most": 3.0,
        "satellites": satellites,
        "epochs": DAY,
        "streams": STREAMS,
        "faces": len(NORMALS),
        "pairs": [round(r, 3) for r in ratios],
        "sgp4_s": round(statistics.median(bare), 3),
        "exposure_s": round(statistics.median(full), 3),
    }


def bare_seconds(fleet: list[MeanElements], grid: TimeGrid) -> float:
    """Time of the compiled propagator alone, records and dates made ready before."""
    array, (day, fraction) = SatrecArray([satrec(each) for each in fleet]), grid.utc
    started = time.perf_counter()
    array.sgp4(day, fraction)
    return time.perf_counter() - started


def exposure_seconds(fleet: list[MeanElements], grid: TimeGrid) -> float:
    """Time from elements to hazard rates on every face, frames and stream states included."""
    spacecraft = cube("bench", 1)
    active = StreamSet(strongest(), mass_law("jvb"))
    started = time.perf_counter()
    state = stream_state(active.streams, grid.solar_longitude_deg)
    checksum = 0.0
    for first in range(0, len(fleet), BATCH):
        ephemeris = propagate(fleet[first : first + BATCH], grid)
        for r_km, v_km_s in zip(ephemeris.r_km, ephemeris.v_km_s, strict=True):
            r_first, v_first = np.ascontiguousarray(r_km.T), np.ascontiguousarray(v_km_s.T)
            places = Places(r_first, v_first, grid.sun_km.T)
            rates = hazard_rates(spacecraft, active, state.downstream, places, state.zhr)
            checksum += float(rates[0, 0, 0])
    assert np.isfinite(checksum)
    return time.perf_counter() - started


def run_lines(satellites: int) -> Iterator[dict[str, object]]:
    """Peak memory and time of one scheduled run over a fleet in a fresh database."""
    with tempfile.TemporaryDirectory() as folder:
        settings = load_settings(
            dir=Path(folder), database_url="", horizon_low_days=10.0, horizon_high_days=10.0
        )
        with open_store(settings) as store:
            store.migrate()
            with store.write() as session:
                for i, each in enumerate(elements(satellites)):
                    put_satellite(session, cube(f"bench-{i:05d}", 2))
                    put_orbit(session, f"bench-{i:05d}", each, "omm-json")
            started = time.perf_counter()
            with peak_memory() as peak:
                run = run_once(store, settings, parse_utc(AS_OF))
            seconds = time.perf_counter() - started
    common = {"satellites": satellites, "computed": run.computed, "workers": settings.workers}
    yield {
        "line": "run_memory",
        "value": round(max(peak) / 2**30, 3),
        "unit": "GiB",
        "target_at_most": 1.0,
        **common,
    }
    yield {"line": "run_seconds_per_1000", "value": round(seconds * 1000.0 / satellites, 1), **common}


@contextmanager
def peak_memory() -> Iterator[list[int]]:
    """Sample the resident memory of this process and its children, in bytes (shared pages counted once each)."""
    samples, end, me = [0], threading.Event(), psutil.Process()

    def watch() -> None:
        while not end.wait(0.1):
            samples.append(resident(me))

    thread = threading.Thread(target=watch, daemon=True)
    thread.start()
    try:
        yield samples
    finally:
        end.set()
        thread.join()


def resident(process: psutil.Process) -> int:
    """Proportional set size of a process tree where the system tells it, else resident size."""
    total = 0
    for each in [process, *process.children(recursive=True)]:
        try:
            info = each.memory_full_info()
            total += getattr(info, "pss", info.rss)
        except psutil.Error:  # it has just ended
            continue
    return total


def elements(count: int) -> list[MeanElements]:
    """Invented orbits: four of five low, the others at 26,600 km and in the geostationary ring."""
    random = np.random.default_rng(20260810)
    epoch_jd = 2461262.5
    fleet = []
    for i in range(count):
        low = i % 5 != 4
        motion = random.uniform(14.2, 15.4) if low else (2.0056, 1.0027)[i // 5 % 2]
        raan, perigee, anomaly = random.uniform(0.0, 360.0, 3)
        fleet.append(
            MeanElements(
                f"BENCH {i}", "UNKNOWN", epoch_jd, 0.0, motion, 0.001, random.uniform(0.5, 98.0), raan, perigee,
                anomaly, 1e-5 if low else 0.0,
            )
        )  # fmt: skip
    return fleet


def cube(satellite_id: str, criteria: int) -> Spacecraft:
    """A box of six faces with one or two criteria each."""
    kinds = (Criterion(CriterionKind.CHARGE, 1e-3), Criterion(CriterionKind.PENETRATION, 1.0, "al-6061-t6"))
    faces = tuple(Face(name, normal, 1.0, kinds[:criteria]) for name, normal in NORMALS.items())
    return Spacecraft(satellite_id, satellite_id, faces, policy=Policy())


def strongest() -> tuple:
    """The ten strongest streams of the catalogue; their rates differ, the work does not."""
    by_rate = sorted(load_catalogue().streams, key=lambda s: -max(c.zhr_peak for c in s.components))
    return tuple(by_rate[:STREAMS])


if __name__ == "__main__":
    main()
