"""What runs in a worker: compute some satellites and make sure that what comes back can be stored."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

from app.pipeline import Registered, RunInputs, SatelliteResult
from app.store.text import canonical_json

LARGEST_CHUNK = 100
SMALLEST_CHUNK = 20
CHUNKS = 16
Compute = Callable[[RunInputs, Sequence[Registered]], list[SatelliteResult]]


def compute_chunk(
    compute: Compute, inputs: RunInputs, satellites: Sequence[Registered]
) -> list[SatelliteResult]:
    """Compute; a satellite whose advisories cannot be stored comes back as failed, with the reason.

    Raises ``ValueError`` when the results are not those of the satellites, in their order.
    """
    results = compute(inputs, satellites)
    wanted = [each.spacecraft.id for each in satellites]
    if [result.satellite_id for result in results] != wanted:
        raise ValueError("the computation did not return one result for each satellite, in order")
    return [_storable(result) for result in results]


def chunk_size(satellites: int) -> int:
    """Return how many satellites to compute together: enough to share work, few enough to spread.

    It depends on the fleet only, never on the number of workers: the last bits of a sum may depend on how
    many satellites were computed together, and any executor shall give the same bytes.
    """
    return min(LARGEST_CHUNK, max(SMALLEST_CHUNK, -(-satellites // CHUNKS)))


def failed(satellite_id: str, reason: str) -> SatelliteResult:
    """Mark a satellite as failed."""
    return SatelliteResult(satellite_id=satellite_id, state="failed", reason=reason, advisories=())


def _storable(result: SatelliteResult) -> SatelliteResult:
    seen: set[str] = set()
    for body in result.advisories:
        problem = _problem(body, result.satellite_id, seen)
        if problem:
            return replace(result, state="failed", reason=f"advisory {body['id']}: {problem}", advisories=())
        seen.add(body["id"])
    return result


def _problem(body: dict[str, object], satellite_id: str, seen: set[str]) -> str | None:
    if body["satellite"] != satellite_id:
        return f"it is of another satellite, '{body['satellite']}'"
    if body["id"] in seen:
        return "it was produced twice"
    try:
        canonical_json(body)
    except (TypeError, ValueError) as error:
        return f"it cannot be written as JSON: {error}"
    return None
