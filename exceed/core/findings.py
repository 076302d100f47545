"""Findings: events, what stayed undecided, and what could and could not be assessed. All values in SI."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from exceed.core.recording import Rejected

SEVERITIES: tuple[str, ...] = ("advisory", "caution", "warning")
CERTAINTIES: tuple[str, ...] = ("doubtful", "possible", "likely", "established")

CAUTIONS: tuple[str, ...] = (
    "This informs; it releases no aeroplane. The approved manual, local regulations, the operator's procedures and"
    " licensed engineers and pilots decide.",
    "An absent event is no proof of an absent exceedance: see what was not assessed.",
)


@dataclass(frozen=True, slots=True)
class PeakValue:
    """Where the value lies furthest beyond the limit in force then.

    `recorded` the cell as written in `recorded_unit` (None where the quantity is derived), `value` that sample after
    the corrections, `estimate` and [low, high] of the true extreme with 95 %; an open end is None. `time` s.
    """

    time: float
    value: float
    estimate: float | None = None
    low: float | None = None
    high: float | None = None
    recorded: float | None = None
    recorded_unit: str | None = None
    sized: bool = True
    saturated: bool = False


@dataclass(frozen=True, slots=True)
class LimitValue:
    """The limit in force at the peak. `source` says where it came from, `assumed` that it is a category's."""

    value: float
    source: str
    assumed: bool = False


@dataclass(frozen=True, slots=True)
class Level:
    """One severity level at the peak: its threshold, when the value was beyond it, and how surely."""

    severity: str
    limit: float
    start: float | None
    end: float | None
    beyond: float
    probability: float


@dataclass(frozen=True, slots=True)
class Task:
    """The inspection that an event asks for, as the rule has it."""

    text: str
    ata: str | None = None
    before: str | None = None
    wanted: bool = True  # severity and certainty reach what the rule asks for
    severity: str = "caution"  # from which on it is asked for


@dataclass(frozen=True, slots=True, eq=False)
class Event:
    """One excursion beyond a rule's lowest level (or, in `undecided`, one that sampling may have hidden).

    `rows` are the first and last places on the recording's axis, `row` that of the extreme sample.
    """

    rule: str
    title: str
    quantity: str
    side: str  # above, below, is
    severity: str
    limit_exceeded: bool
    certainty: str
    probability: float
    flight: int | None
    phase: str
    start: float
    end: float
    peak: PeakValue
    limit: LimitValue
    levels: tuple[Level, ...]
    rows: tuple[int, int]
    row: int
    context: Mapping[str, float] = field(default_factory=dict)
    cut_by: str | None = None
    task: Task | None = None
    notes: tuple[str, ...] = ()
    set_name: str = ""

    @property
    def duration(self) -> float:
        return self.end - self.start


@dataclass(frozen=True, slots=True)
class Coverage:
    """What of the recorded time a rule could assess, s. assessed + unassessed + not_applicable = recorded."""

    rule: str
    flight: int | None
    assessed: float
    unassessed: float
    not_applicable: float
    shortest_seen: float | None
    reasons: tuple[tuple[str, float], ...] = ()


@dataclass(frozen=True, slots=True)
class Extreme:
    """A quantity's largest and smallest value in a flight, (value, time), and how near a limit it came (share)."""

    quantity: str
    flight: int | None
    maximum: tuple[float, float] | None
    minimum: tuple[float, float] | None
    closest_to_limit: float | None = None


@dataclass(frozen=True, slots=True)
class RejectedFinding:
    """Rejected samples and the rules that they would have tripped."""

    rejected: Rejected
    would_exceed: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class Findings:
    """All that judging one trace gives."""

    events: tuple[Event, ...] = ()
    undecided: tuple[Event, ...] = ()
    coverage: tuple[Coverage, ...] = ()
    extremes: tuple[Extreme, ...] = ()
    rejected: tuple[RejectedFinding, ...] = ()
    within_sensor_error: tuple[tuple[str, float], ...] = ()
    notes: tuple[str, ...] = ()
