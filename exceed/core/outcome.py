"""Outcomes: what scanning one log, and a day of logs, gives to the outputs. Values only, picklable, all in SI.

The pipeline fills them, the report words them. Nothing in here is computed from flight. Mappings are plain dicts here:
a MappingProxyType cannot be pickled, and these travel between processes.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from exceed.core.findings import Findings
from exceed.core.recording import Array, Unresolved
from exceed.errors import Problem

if TYPE_CHECKING:
    from exceed.core.phases import Flight

STATUSES: tuple[str, ...] = ("ok", "partial", "failed")
LIMITS: tuple[str, ...] = ("own", "assumed", "none")


@dataclass(frozen=True, slots=True)
class AircraftInfo:
    """The aeroplane a log belongs to. `limits`: own (from its file), assumed (a published category's), none.

    `source` is shown with every limit. `recorder` are plain texts about its sensors, e.g.
    {"accelerometer calibrated": "2031-01-10"}. `path` is its file as judged with, or None.
    """

    registration: str | None
    serial: str | None = None
    type: str | None = None
    category: str | None = None
    limits: str = "none"
    source: str | None = None
    recorder: tuple[tuple[str, str], ...] = ()
    path: str | None = None


@dataclass(frozen=True, slots=True)
class ChannelRow:
    """How a column was recognised. `unit` as in the log, `bias` and `standard_uncertainty` in SI of the quantity."""

    column: str
    quantity: str
    unit: str
    rate_hz: float | None
    found_by: str
    reason: str = ""
    sign: str | None = None
    datum: str | None = None
    bias: float | None = None
    standard_uncertainty: float | None = None
    uncertainty_source: str = ""
    resolution: float | None = None
    valid_share: float = 1.0
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class MethodRow:
    """How a quantity was had. `inputs` are column names where recorded, else quantities; the uncertainty in SI."""

    quantity: str
    method: str
    inputs: tuple[str, ...] = ()
    assumes: str | None = None
    standard_uncertainty: float | None = None
    source: str = ""


@dataclass(frozen=True, slots=True)
class MassRow:
    """Mass of a flight, kg; a range (low, high) where it is not known. `method` says how it was had."""

    take_off: float | None
    landing: float | None
    method: str
    low: float | None = None
    high: float | None = None


@dataclass(frozen=True, slots=True)
class FlightRow:
    """A flight and its mass. `number` None: nothing tells flights apart, and all recorded time counts as airborne."""

    number: int | None
    start: float
    end: float
    landings: int | None = None
    take_off_seen: bool = True
    landing_seen: bool = True
    mass: MassRow | None = None
    bounces: int = 0
    go_arounds: int = 0
    notes: tuple[str, ...] = ()

    @classmethod
    def of(cls, flight: Flight, mass: MassRow | None = None, notes: tuple[str, ...] = ()) -> FlightRow:
        """The row of a flight that the first pass found."""
        return cls(
            number=flight.number,
            start=flight.start,
            end=flight.end,
            landings=flight.landings,
            take_off_seen=flight.take_off_seen,
            landing_seen=flight.landing_seen,
            mass=mass,
            bounces=flight.bounces,
            go_arounds=flight.go_arounds,
            notes=notes,
        )


@dataclass(frozen=True, slots=True)
class ClockRow:
    """How time was had. `start` UTC seconds since 1970 at time 0, None where not absolute. `gaps` (start, end) in s."""

    kind: str
    start: float | None = None
    resets: int = 0
    gaps: tuple[tuple[float, float], ...] = ()
    zone: str = ""
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class Series:
    """A stretch of one quantity for a plot: time (n,) s from the first sample, values (n,) SI, NaN where none."""

    quantity: str
    time: Array
    values: Array


@dataclass(frozen=True, slots=True, eq=False)
class EventPlot:
    """What the page draws for one event (of `events` or `undecided`, known by rule and extreme row).

    samples : the judged quantity as recorded and corrected. estimate : the smooth curve between them. limit : the limit
    in force over the stretch. more : further channels, folded away on the page.
    """

    rule: str
    row: int
    samples: Series
    estimate: Series | None = None
    limit: Series | None = None
    more: tuple[Series, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class EnvelopeLine:
    """One line of the V-n diagram: speed (k,) m/s over load factor (k,) 1. `kind`: stall, load factor, speed, gust."""

    label: str
    kind: str
    speed: Array
    load_factor: Array


@dataclass(frozen=True, slots=True, eq=False)
class VnPlot:
    """Flown points, speed (n,) m/s and load factor (n,), and the envelope. `speed_kind` names the airspeed meant."""

    speed_kind: str
    speed: Array
    load_factor: Array
    envelope: tuple[EnvelopeLine, ...] = ()
    note: str = ""


@dataclass(frozen=True, slots=True, eq=False)
class SpectrumPlot:
    """Level crossings of load factor: level (k,) 1, crossings per flight hour (k,). `hours` flown, h."""

    level: Array
    per_hour: Array
    hours: float
    note: str = ""


@dataclass(frozen=True, slots=True, eq=False)
class LogPlots:
    """Everything the page draws for one log, found again by its path."""

    path: str
    events: tuple[EventPlot, ...] = ()
    vn: VnPlot | None = None
    spectrum: SpectrumPlot | None = None
    declared: Mapping[str, str] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class FeedRow:
    """Whether a log can feed a rule, for `describe`. `lacks` says what is missing, empty where nothing is."""

    rule_set: str
    rule: str
    title: str
    lacks: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class LogOutcome:
    """What one log gave. Only `path`, `status` and, for a failed one, `problem` are always known.

    path : relative to the PATH given, forward slashes. recorded : s, last minus first time, gaps included. declared :
    quantity -> shown unit, for quantities that a rules or channels file names itself (and rates: `rate_of:load_factor`
    -> g/s). flights : empty only where the log failed; a row with number None where nothing tells flights apart.
    """

    path: str
    status: str = "ok"
    problem: Problem | None = None
    sha256: str | None = None
    content_sha256: str | None = None
    registration: str | None = None
    aircraft: AircraftInfo | None = None
    rows: int = 0
    recorded: float = 0.0
    clock: ClockRow | None = None
    channels: tuple[ChannelRow, ...] = ()
    unused: tuple[str, ...] = ()
    unresolved: tuple[Unresolved, ...] = ()
    methods: tuple[MethodRow, ...] = ()
    flights: tuple[FlightRow, ...] = ()
    flights_method: str = ""
    missing: Mapping[str, str] = field(default_factory=dict)
    findings: Findings = field(default_factory=Findings)
    rule_sets: tuple[str, ...] = ()
    declared: Mapping[str, str] = field(default_factory=dict)
    notes: tuple[str, ...] = ()
    feeds: tuple[FeedRow, ...] = ()
    plots: LogPlots | None = None


@dataclass(frozen=True, slots=True)
class JudgedWith:
    """One thing the judgement rests on: a file (path and sha256) or an option (name and value)."""

    kind: str  # rules, aircraft, channels, loading, fleet, option
    path: str | None = None
    sha256: str | None = None
    name: str | None = None
    value: str | None = None


@dataclass(frozen=True, slots=True)
class RuleSetRow:
    """A rule set used. `titles`: rule id -> title. `overrides`: ids that replaced an earlier file's rule.

    `quantities`: rule id -> the quantity it judges.
    """

    name: str
    title: str
    rules: int
    titles: tuple[tuple[str, str], ...] = ()
    overrides: tuple[str, ...] = ()
    quantities: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class DayOutcome:
    """What one scan gave. `created` is ISO 8601 in UTC. `skipped`: (path, why) of files that are no logs.

    `aircraft` may be left empty: then it is gathered from the logs. `interrupted`: some logs were left undone, named in
    `skipped`.
    """

    logs: tuple[LogOutcome, ...]
    created: str
    judged_with: tuple[JudgedWith, ...] = ()
    rules: tuple[RuleSetRow, ...] = ()
    aircraft: tuple[AircraftInfo, ...] = ()
    skipped: tuple[tuple[str, str], ...] = ()
    fleet: str | None = None
    operator: str | None = None
    time_zone: str | None = None
    replaces: str | None = None
    notes: tuple[str, ...] = ()
    interrupted: bool = False
