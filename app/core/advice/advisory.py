"""An advisory: a finding put into the words and fields that are stored and served."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator
from typing import Any

import numpy as np

from app.core.advice.assessment import Level
from app.core.advice.satellite import Finding
from app.core.exposure.damage import critical_mass
from app.core.exposure.faces import criterion_rows
from app.core.orbit.elements import SECONDS_PER_DAY
from app.core.run import Registered, RunInputs
from app.core.sky.bodies import wrap_deg
from app.core.sky.times import TimeGrid, format_utc
from app.core.streams.activity import stream_zhr
from app.core.streams.flux import TRUSTED_R, VISUAL_LIMIT, MassLaw, mass_law
from app.core.streams.model import Stream
from app.core.streams.sporadic import analytic_speeds

CAUTION = (
    "Advice to support the mission's own flight rules and the responsible authority's decision. "
    "The models are uncertain by factors. Not for crewed-flight safety decisions."
)
STRETCHED_DECADES = 3.0
BACKGROUND_SOURCE = "Gruen, Zook, Fechtig & Giese 1985"


def advisory(
    inputs: RunInputs, satellite: Registered, plan_until_unix_s: float | None, finding: Finding
) -> dict[str, Any]:
    """Write a finding as JSON-ready fields, all but ``revision``, ``status`` and ``changes``."""
    judged, base, spacecraft = finding.assessment, finding.base, satellite.spacecraft
    stream = finding.stream
    body: dict[str, Any] = {
        "id": f"{finding.passage.name}.{spacecraft.id}",
        "satellite": spacecraft.id,
        "stream": stream.code,
        "stream_name": stream.name,
        "passage": finding.passage.name,
        "level": judged.level.value,
        "depth": finding.depth,
        "issued_at": format_utc(inputs.as_of_unix_s),
        "onset": format_utc(judged.onset_unix_s),
        "peak_at": format_utc(judged.peak_unix_s),
        "end": format_utc(judged.end_unix_s),
        **_stream_at_peak(stream, judged.peak_unix_s),
        "satellite_enhancement_peak": _by_label(base.labels, judged.satellite_peak),
        "enhancement_peak": _by_row(finding),
        "expected_impacts": _by_label(base.labels, judged.impacts),
        "background_impacts": _by_label(base.labels, judged.background_impacts),
        "lee_windows": list(_lee(finding)),
        "lee_windows_from": format_utc(finding.cover.start_unix_s) if finding.cover else None,
        "lee_windows_until": format_utc(finding.cover.end_unix_s) if finding.cover else None,
        "safe_attitude_windows": [],
        "plan_until": format_utc(plan_until_unix_s) if plan_until_unix_s is not None else None,
    }
    body["actions"] = list(_actions(body, judged.level))
    body["provenance"] = _provenance(inputs, satellite, plan_until_unix_s, finding)
    body["caution"] = CAUTION
    return body


def band(mid: float) -> dict[str, float | None]:
    """A value with its band; the band is left open until it can be computed. Six significant digits."""
    return {"low": None, "mid": float(f"{mid:.6g}"), "high": None}


def lee_window(start_unix_s: float, end_unix_s: float, codes: Iterable[str]) -> dict[str, Any]:
    """A lee window in whole seconds that lie inside the true one."""
    start, end = math.ceil(start_unix_s), math.floor(end_unix_s)
    return {
        "start": format_utc(start),
        "end": format_utc(end),
        "duration_s": end - start,
        "streams": list(codes),
    }


def _stream_at_peak(stream: Stream, peak_unix_s: float) -> dict[str, float]:
    longitude = TimeGrid(np.array([peak_unix_s])).solar_longitude_deg
    away = float(wrap_deg(longitude[0] - stream.components[0].solar_longitude_peak_deg))
    return {
        "peak_solar_longitude_deg": round(float(longitude[0]), 4),
        "peak_zhr": round(float(stream_zhr(stream, longitude)[0]), 2),
        "radiant_ra_deg": round((stream.radiant_ra_deg + stream.drift_ra_deg_per_deg * away) % 360.0, 2),
        "radiant_dec_deg": round(stream.radiant_dec_deg + stream.drift_dec_deg_per_deg * away, 2),
        "v_geocentric_km_s": stream.v_geocentric_km_s,
    }


def _by_label(labels: Iterable[str], values: Iterable[float]) -> list[dict[str, Any]]:
    return [{"criterion": a, **band(float(b))} for a, b in zip(labels, values, strict=True)]


def _by_row(finding: Finding) -> list[dict[str, Any]]:
    spacecraft = finding.base.spacecraft
    return [
        {
            "criterion": row.criterion.label,
            "face": spacecraft.faces[row.face].name,
            "sensitive": spacecraft.faces[row.face].sensitive,
            **band(float(peak)),
        }
        for row, peak in zip(criterion_rows(spacecraft), finding.assessment.row_peak, strict=True)
    ]


def _lee(finding: Finding) -> Iterator[dict[str, Any]]:
    for window, codes in finding.lee:
        yield lee_window(window.start_unix_s, window.end_unix_s, codes)


def _actions(body: dict[str, Any], level: Level) -> Iterator[str]:
    if level is Level.STEADY:
        if body["depth"] == "outlook":
            yield (
                "On the average over the orbit nothing beyond routine operations is advised. The plan, which looks "
                "at each minute, may ask for more: send a fresh orbit before the peak."
            )
        else:
            yield "Nothing beyond routine operations is advised for this passage."
        return
    begin = "Now" if body["onset"] == body["issued_at"] else f"Prepare before {body['onset']}"
    yield (
        f"{begin}: staff the console and keep manoeuvres and other critical operations out of {body['onset']} to "
        f"{body['end']}, most of all near {body['peak_at']}."
    )
    if level is Level.SHELTER:
        yield (
            f"From {body['onset']} to {body['end']} hold the least exposed attitude the mission allows: particles "
            f"come from right ascension {body['radiant_ra_deg']:.1f}, declination {body['radiant_dec_deg']:+.1f} "
            "degrees (before the Earth's pull and the satellite's own motion). Close covers; lower high voltages."
        )
    if body["depth"] == "outlook":
        yield "Send a fresh orbit within the plan's horizon of the peak; times and lee windows come with the plan."
    elif body["lee_windows"]:
        longest = max(body["lee_windows"], key=lambda w: w["duration_s"])
        yield (
            f"What cannot wait fits into a lee window: {len(body['lee_windows'])} are listed, the longest from "
            f"{longest['start']} to {longest['end']}."
        )
    yield f"Return to routine operations after {body['end']}."


def _provenance(
    inputs: RunInputs, satellite: Registered, plan_until_unix_s: float | None, finding: Finding
) -> dict[str, Any]:
    law, elements = mass_law(inputs.mass_law), satellite.elements
    assert elements is not None  # without an orbit there is no finding
    return {
        "run": inputs.run_id,
        "as_of": format_utc(inputs.as_of_unix_s),
        "software": inputs.software,
        "catalogue_digest": inputs.catalogue.digest,
        "orbit_epoch": format_utc(elements.epoch_unix_s),
        "orbit_age_days": round((inputs.as_of_unix_s - elements.epoch_unix_s) / SECONDS_PER_DAY, 3),
        "mass_law": law.name,
        "mass_law_source": law.source,
        "background_source": BACKGROUND_SOURCE,
        "background_speeds_source": analytic_speeds().source,
        "notes": [*_notes_on_time(inputs, satellite, plan_until_unix_s, finding), *_notes(law, finding)],
    }


def untrusted(inputs: RunInputs, satellite: Registered) -> str:
    """Say why there is no plan for a satellite whose orbit is not trusted at the time of the run."""
    elements = satellite.elements
    assert elements is not None  # without an orbit nothing is computed
    return (
        f"The orbit of {format_utc(elements.epoch_unix_s)} is trusted {inputs.horizon_days(elements):g} days either "
        "side of its epoch, not now: only the outlook is given. Send a fresh one"
    )


def _notes_on_time(
    inputs: RunInputs, satellite: Registered, plan_until_unix_s: float | None, finding: Finding
) -> Iterator[str]:
    if plan_until_unix_s is None:
        yield f"{untrusted(inputs, satellite)}."
    if finding.assessment.onset_unix_s == inputs.as_of_unix_s:
        yield "The passage is under way: onset is the time of this run, and impacts are of what still lies ahead."
    if finding.passage.peak_unix_s < inputs.as_of_unix_s:
        yield "The stream is past its own maximum: times, factors and impacts are of what still lies ahead."


def _notes(law: MassLaw, finding: Finding) -> Iterator[str]:
    stream = finding.stream
    yield "low and high are not computed yet; read mid as good to a factor of several."
    if finding.depth == "outlook":
        yield "Averaged over orbit phase; the plane is carried by its secular drift, the semi-major axis held."
    if finding.capped:
        yield (
            "Near the anti-radiant axis the Earth's lens is limited by the radiant's own spread; the factor there "
            "is held at its value on the edge of that zone."
        )
    if not TRUSTED_R[0] <= stream.population_index_r <= TRUSTED_R[1]:
        yield f"Population index {stream.population_index_r:g} lies outside {TRUSTED_R[0]} to {TRUSTED_R[1]}."
    for label, decades in _stretch(law, finding).items():
        if decades > STRETCHED_DECADES:
            yield f"{label}: the mass law is stretched {decades:.1f} decades below the visual range."


def _stretch(law: MassLaw, finding: Finding) -> dict[str, float]:
    """Decades by which each label's critical mass, face-on at entry speed, lies below the visual limit."""
    stream = finding.stream
    visual_g = float(law.mass_g(VISUAL_LIMIT, stream.v_entry_km_s))
    decades: dict[str, float] = {}
    for row in criterion_rows(finding.base.spacecraft):
        limit = critical_mass(row.criterion, stream.bulk_density_kg_m3)
        critical_g = limit.at_1_km_s_g * stream.v_entry_km_s**-limit.speed_exponent
        label = row.criterion.label
        decades[label] = max(decades.get(label, -math.inf), math.log10(visual_g / critical_g))
    return decades
