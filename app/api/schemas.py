"""The shapes of what is answered. They are written from records and documents; tests hold answers to them."""

from __future__ import annotations

from typing import Annotated, Generic, Literal, TypeVar

from pydantic import BaseModel, ConfigDict, Field, FiniteFloat

Item = TypeVar("Item")
Time = Annotated[
    str,
    Field(pattern=r"^\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d(\.\d+)?Z$", json_schema_extra={"format": "date-time"}),
]
Level = Literal["steady", "ready", "shelter"]
Status = Literal["current", "superseded", "withdrawn"]
Caution = Annotated[
    str, Field(description="What this advice is, and what it is not. Show it with the advice.")
]


class Shape(BaseModel):
    """Base: what is documented is what is answered."""

    model_config = ConfigDict(extra="forbid", allow_inf_nan=False)


class ItemsPage(Shape, Generic[Item]):
    """A page of a list. ``next_cursor`` is null on the last one; the ``Link`` header holds the full address."""

    items: list[Item]
    next_cursor: str | None


class Problem(BaseModel):
    """RFC 9457. ``field`` is the dotted path of a wrong field, ``where`` the line or keyword of a file."""

    model_config = ConfigDict(extra="allow")

    type: str = Field(description="A relative reference that names the kind of problem.")
    title: str
    status: int = Field(ge=400, le=599)
    detail: str = Field(description="What is wrong and what to mend.")
    field: str | None = None
    where: str | None = None


class Band(Shape):
    """10th, 50th and 90th percentile. ``low`` and ``high`` are null until they are computed."""

    low: FiniteFloat | None
    mid: FiniteFloat
    high: FiniteFloat | None


class CriterionBand(Band):
    """A value for one criterion (its label)."""

    criterion: str


class FaceBand(CriterionBand):
    """A value for one criterion on one face."""

    face: str
    sensitive: bool


class LeeWindow(Shape):
    """The Earth hides every stream that matters, named in ``streams``, from ``start`` to ``end``."""

    start: Time
    end: Time
    duration_s: int
    streams: list[str]


class Change(Shape):
    """What moved since the revision before, and in words."""

    what: str
    text: str


class Provenance(BaseModel):
    """Where an advisory's numbers come from."""

    model_config = ConfigDict(extra="allow")

    run: str
    software: str
    catalogue_digest: str
    orbit_epoch: Time
    orbit_age_days: FiniteFloat


class Advisory(BaseModel):
    """One revision of the advice for one passage of one satellite. It is never edited; only its status moves."""

    model_config = ConfigDict(extra="allow", allow_inf_nan=False)

    id: str
    satellite: str
    stream: str
    stream_name: str
    passage: str
    revision: int = Field(ge=1)
    status: Status
    level: Level
    depth: Literal["outlook", "plan"]
    issued_at: Time
    onset: Time
    peak_at: Time
    end: Time
    peak_solar_longitude_deg: FiniteFloat
    peak_zhr: FiniteFloat
    satellite_enhancement_peak: list[CriterionBand]
    enhancement_peak: list[FaceBand]
    expected_impacts: list[CriterionBand]
    background_impacts: list[CriterionBand]
    lee_windows: list[LeeWindow]
    safe_attitude_windows: list[LeeWindow]
    plan_until: Time | None
    actions: list[str]
    changes: list[Change]
    provenance: Provenance
    caution: Caution


class Omm(BaseModel):
    """Orbit Mean-Elements Message, CCSDS 502.0-B-3, JSON form."""

    model_config = ConfigDict(extra="allow", allow_inf_nan=False)

    OBJECT_NAME: str
    OBJECT_ID: str
    EPOCH: str
    MEAN_MOTION: FiniteFloat
    ECCENTRICITY: FiniteFloat
    INCLINATION: FiniteFloat
    RA_OF_ASC_NODE: FiniteFloat
    ARG_OF_PERICENTER: FiniteFloat
    MEAN_ANOMALY: FiniteFloat
    BSTAR: FiniteFloat = 0.0


class OrbitOut(Shape):
    """The orbit in use, as an OMM, with its age at ``as_of`` (the last full hour)."""

    satellite: str
    source_format: str
    received_at: Time
    epoch: Time
    age_days: FiniteFloat
    as_of: Time
    omm: Omm
    notes: list[str]


class OnDemandProvenance(Shape):
    """Where the numbers of a series or of windows come from."""

    software: str
    catalogue_digest: str
    mass_law: str
    orbit_epoch: Time
    orbit_source_format: str


class SeriesBand(Shape):
    """Enhancement factor at each time; null where the background is zero.

    ``by_stream``: what each stream adds to 1, so that 1 plus their sum is ``mid``.
    """

    criterion: str
    low: list[FiniteFloat | None] | None
    mid: list[FiniteFloat | None]
    high: list[FiniteFloat | None] | None
    by_stream: dict[str, list[FiniteFloat | None]]


class FaceSeries(SeriesBand):
    """Enhancement factor of one face for one criterion over its background rate."""

    face: str
    background_per_m2_s: FiniteFloat


class StreamSeries(Shape):
    """A stream's zenithal hourly rate, and whether none of it reaches the satellite."""

    zhr: list[FiniteFloat]
    sheltered: list[bool]


class Enhancement(Shape):
    """Factors over time. All lists are as long as ``times``."""

    satellite: str
    times: list[Time]
    streams: dict[str, StreamSeries]
    whole: list[SeriesBand] = Field(description="Of the satellite: rates summed over faces, area times rate.")
    faces: list[FaceSeries]
    provenance: OnDemandProvenance
    caution: Caution


class Windows(Shape):
    """Windows that overlap the interval asked for."""

    satellite: str
    kind: Literal["lee"]
    windows: list[LeeWindow]
    provenance: OnDemandProvenance
    caution: Caution


class CatalogueValue(Shape):
    """A value of the catalogue with where it comes from: read there, computed from it, or from memory."""

    value: FiniteFloat
    source: str
    citation: list[str]
    provenance: Literal["read", "computed", "memory"]


class CatalogueText(Shape):
    """One text of the catalogue and where it comes from."""

    value: str
    source: str
    citation: list[str]
    provenance: str


class StreamOut(Shape):
    """A stream as catalogued; one table of values for each component of its activity."""

    code: str
    name: str
    confidence: str
    enabled: bool
    why_off: str | None
    parent_body: CatalogueText | None
    component_names: list[str]
    components: list[dict[str, CatalogueValue]]
    notes: list[str]
    catalogue_digest: str


class RunRequest(BaseModel):
    """What to compute: as of when (default now), and which satellites (default all)."""

    model_config = ConfigDict(extra="forbid", strict=True)

    as_of: str | None = Field(default=None, max_length=40, json_schema_extra={"format": "date-time"})
    satellites: list[str] | None = Field(default=None, min_length=1, max_length=10_000)


class RunOut(Shape):
    """A run. Nothing it computes is visible before it is published, whole."""

    id: str
    state: Literal["queued", "running", "published", "failed"]
    as_of: Time
    requested_at: Time
    started_at: Time | None
    finished_at: Time | None
    satellites_total: int
    satellites_done: int
    computed: int
    failed: int
    revisions_new: int
    reason: str | None


class RunSatelliteOut(Shape):
    """What became of one satellite, and why when it failed."""

    satellite: str
    state: Literal["pending", "computed", "failed"]
    reason: str | None


class RunDetail(RunOut):
    """A run with a page of its satellites."""

    satellites: ItemsPage[RunSatelliteOut]


class TrialOut(BaseModel):
    """Flux and factors per state, stream, face and criterion, in the order of the request."""

    model_config = ConfigDict(extra="allow", allow_inf_nan=False)

    states: list[dict[str, object]]
    caution: Caution


class Ready(Shape):
    """The service can answer."""

    status: Literal["ready"]
    schema_: Literal["newest"] = Field(alias="schema")
    published_run: str | None
    published_run_age_s: FiniteFloat | None
    published_run_failed: int


class Alive(Shape):
    """The process answers; nothing else was looked at."""

    status: Literal["alive"]
