"""The JSON summary's form, `exceed/summary/1`, as models: what a reader may rely on, and where its schema comes from.

Building a summary does not go through these (thousands of events would pay for it); tests hold every summary against
the schema with an independent validator.
"""

from __future__ import annotations

from typing import Any, Literal

from pydantic import BaseModel, ConfigDict, Field

from exceed.report.summary import FORMAT

Severity = Literal["advisory", "caution", "warning"]
Certainty = Literal["doubtful", "possible", "likely", "established"]
Number = float | None


class _Row(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid", allow_inf_nan=False)


class Tool(_Row):
    name: str
    version: str


class JudgedWith(_Row):
    """A file (path and sha256) or an option (name and value) that the judgement rests on."""

    kind: str
    path: str | None = None
    sha256: str | None = None
    name: str | None = None
    value: str | None = None


class Measured(_Row):
    value: Number
    unit: str


class Aircraft(_Row):
    registration: str | None
    serial: str | None
    type: str | None
    category: str | None
    limits: Literal["own", "assumed", "none"]
    source: str | None
    recorder: dict[str, str] = Field(description="what its file says of the sensors, as plain text")
    path: str | None = Field(description="its file, as in judged_with")


class RuleSet(_Row):
    set: str
    title: str
    rules: int
    titles: dict[str, str] = Field(description="rule id -> title")
    overrides: list[str] = Field(description="ids of rules that replaced those of an earlier file")
    quantities: dict[str, str] = Field(description="rule id -> the quantity it judges")


class Problem(_Row):
    place: str
    problem: str
    expected: str
    do: str


class Stretch(_Row):
    start_s: float
    end_s: float


class Clock(_Row):
    kind: str
    start: str | None = Field(description="UTC, null where the clock is not absolute")
    resets: int
    gaps: list[Stretch]
    zone: str
    notes: list[str]


class Channel(_Row):
    column: str
    quantity: str
    unit: str
    rate_hz: Number
    found_by: str
    reason: str
    sign: str | None
    datum: str | None
    bias: Measured | None
    standard_uncertainty: Measured | None
    uncertainty_source: str
    valid_share: Number
    notes: list[str]


class Unresolved(_Row):
    column: str
    reason: str
    question: str


class Method(_Row):
    quantity: str
    method: str
    inputs: list[str]
    assumes: str | None
    standard_uncertainty: Measured | None
    source: str


class Mass(_Row):
    take_off: Number
    landing: Number
    unit: str
    method: str
    low: Number
    high: Number


class At(_Row):
    value: Number
    time_s: Number


class Extreme(_Row):
    quantity: str
    maximum: At | None
    minimum: At | None
    unit: str
    closest_to_limit: Number = Field(description="largest share of a limit that was used, 1 at the limit")


class Flight(_Row):
    flight: int | None = Field(description="null where nothing tells flights apart")
    start_s: float
    end_s: float
    take_off: str | None
    landing: str | None
    landings: int | None
    take_off_recorded: bool
    landing_recorded: bool
    bounces: int
    go_arounds: int
    mass: Mass | None
    extremes: list[Extreme]
    notes: list[str]


class Peak(_Row):
    time_s: float
    recorded: Number
    recorded_unit: str | None
    value: Number
    estimate: Number
    low: Number
    high: Number
    unit: str
    sized: bool
    saturated: bool


class Limit(_Row):
    value: Number
    unit: str
    source: str
    assumed: bool


class Level(_Row):
    severity: Severity
    limit: Number
    start_s: Number
    end_s: Number
    beyond_s: float
    probability: Number


class Event(_Row):
    id: str
    rule: str
    title: str
    quantity: str
    side: Literal["above", "below", "is"]
    severity: Severity
    limit_exceeded: bool
    certainty: Certainty
    probability: Number
    registration: str | None
    flight: int | None
    phase: str
    start: str | None
    end: str | None
    start_s: float
    end_s: float
    duration_s: float
    peak: Peak
    limit: Limit
    levels: list[Level]
    context: dict[str, Measured]
    cut_by: str | None
    inspection: str | None
    notes: list[str]
    set: str
    row: int = Field(description="place of the extreme sample on the recording's axis, from 0")


class Extremum(_Row):
    value: Number
    unit: str


class Rejected(_Row):
    quantity: str
    column: str
    start_s: float
    end_s: float
    samples: int
    reason: Literal["spike", "stuck", "out_of_range", "not_a_number", "duplicate_time"]
    extreme: Extremum | None
    would_exceed: list[str]


class SensorError(_Row):
    rule: str
    seconds: float


class Reason(_Row):
    reason: str
    seconds: float


class Assessment(_Row):
    rule: str
    flight: int | None
    assessed_s: float
    unassessed_s: float
    not_applicable_s: float
    shortest_seen_s: Number
    reasons: list[Reason]


class Recording(_Row):
    path: str
    sha256: str | None
    content_sha256: str | None
    registration: str | None
    limits: Literal["own", "assumed", "none"]
    rows: int
    recorded_s: float
    status: Literal["ok", "partial", "failed"]
    problem: Problem | None
    clock: Clock | None
    channels: list[Channel]
    unused_columns: list[str]
    unresolved_columns: list[Unresolved]
    methods: list[Method]
    missing: dict[str, str] = Field(description="quantity -> why it could not be had")
    flights_by: str
    flights: list[Flight]
    events: list[Event]
    undecided: list[Event]
    rejected: list[Rejected]
    within_sensor_error: list[SensorError]
    assessment: list[Assessment]
    rule_sets: list[str]
    notes: list[str]


class EventCounts(_Row):
    advisory: int
    caution: int
    warning: int


class Totals(_Row):
    recordings: int
    failed: int
    flights: int
    flight_s: float
    events: EventCounts
    near_limit: int = Field(description="advisories inside the limit, among the events")
    doubtful: int = Field(description="doubtful ones among the events")
    undecided: int


class Inspection(_Row):
    id: str
    registration: str | None
    serial: str | None
    task: str
    ata: str | None
    before: str | None
    status: Literal["due", "to_be_decided"]
    certainty: Certainty
    rule: str
    events: list[str]


class Skipped(_Row):
    path: str
    reason: str


class Summary(_Row):
    """One scan: what was read, what was found, what could not be assessed, what is due."""

    model_config = ConfigDict(title=FORMAT)

    format: Literal["exceed/summary/1"]
    tool: Tool
    created: str
    replaces: str | None
    cautions: list[str]
    operator: str | None
    fleet: str | None
    time_zone: str | None
    judged_with: list[JudgedWith]
    aircraft: list[Aircraft]
    rules: list[RuleSet]
    recordings: list[Recording]
    skipped: list[Skipped]
    totals: Totals
    inspections: list[Inspection]
    notes: list[str]


def schema_summary(*, strict: bool = False) -> dict[str, Any]:
    """JSON Schema (2020-12) of the summary.

    The format grows by adding, so a reader's schema lets further keys pass; `strict` forbids them, for our own tests.
    """
    schema = Summary.model_json_schema(mode="serialization")
    if not strict:
        _open(schema)
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", **schema}


def _open(node: Any) -> None:
    if isinstance(node, dict):
        if node.get("additionalProperties") is False:
            del node["additionalProperties"]
        for value in node.values():
            _open(value)
    elif isinstance(node, list):
        for value in node:
            _open(value)
