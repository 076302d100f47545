"""What `exceed envelope` and `exceed spectrum` give to the outputs. Values only, picklable, all in SI.

`exceed.envelopes` and `exceed.spectra` fill them, the report words them.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from exceed.core.outcome import AircraftInfo, EnvelopeLine, JudgedWith
from exceed.core.recording import Array
from exceed.errors import Problem


@dataclass(frozen=True, slots=True)
class Airspeeds:
    """One airspeed in the kinds that can be had, m/s; None where one cannot."""

    equivalent: float | None = None
    calibrated: float | None = None
    indicated: float | None = None


@dataclass(frozen=True, slots=True)
class CornerRow:
    """A named point of the diagram's boundary. `source`: the key of the aircraft file it rests on, or 'computed'."""

    name: str
    speed: Airspeeds
    load_factor: float | None
    source: str


@dataclass(frozen=True, slots=True)
class SpeedRow:
    """A speed of the manual at the conditions asked for, or one computed. `given`: the kind the manual gives it in."""

    symbol: str
    name: str
    speed: Airspeeds
    source: str
    given: str | None = None
    mach: float | None = None
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class LimitRow:
    """Limit load factors in force under one condition (empty: none besides the speed); None where not known.

    Above `speed_from` up to `speed_to`, m/s in the kind of airspeed `kind`; None for no such bound.
    """

    condition: str
    maximum: float | None
    minimum: float | None
    source: str
    speed_from: float | None = None
    speed_to: float | None = None
    kind: str | None = None


@dataclass(frozen=True, slots=True)
class GustRow:
    """A design gust (m/s EAS, either way) at a speed, and the load factors it gives from 1 g."""

    velocity: float
    at: str
    speed: Airspeeds
    up: float
    down: float


@dataclass(frozen=True, slots=True, eq=False)
class EnvelopeOutcome:
    """The V-n diagram of an aeroplane at one mass (kg, None: not known), pressure altitude (m) and flap angle (rad).

    missing : (what, why). lines : what the page draws, equivalent airspeed over load factor.
    """

    aircraft: AircraftInfo
    mass: float | None
    mass_source: str
    pressure_altitude: float
    flaps: float
    corners: tuple[CornerRow, ...] = ()
    speeds: tuple[SpeedRow, ...] = ()
    limits: tuple[LimitRow, ...] = ()
    stalls: tuple[CornerRow, ...] = ()
    gusts: tuple[GustRow, ...] = ()
    missing: tuple[tuple[str, str], ...] = ()
    notes: tuple[str, ...] = ()
    lines: tuple[EnvelopeLine, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class Tally:
    """Counts of one history, or of several added up. level (k,) 1; crossings, peaks (k,) counts at each level.

    peaks : above the level of rest peaks at or above the level, below it valleys at or below. lowest, highest : values
    met, NaN where nothing was counted. seconds : time between the samples counted.
    """

    level: Array
    crossings: Array
    peaks: Array
    lowest: float
    highest: float
    seconds: float


@dataclass(frozen=True, slots=True, eq=False)
class CycleTally:
    """Rainflow cycles by range and mean: whole, half (m, j) counts in bins of one step; `range` (m,) and `mean` (j,)
    are the lower edges. A half cycle counts one in `half`."""

    range: Array
    mean: Array
    whole: Array
    half: Array


@dataclass(frozen=True, slots=True, eq=False)
class SpectrumRow:
    """The spectrum of one aeroplane (or `registration` None and `everything`: of all logs).

    by_phase, by_cause : tallies of parts, which add up to `tally`. cause_note : why gusts and manoeuvres are told apart
    only in part, or not. weighted : crossings and cycles of load factor x mass / `reference_mass` (kg), None where it
    cannot be had, and `weighted_note` says why or for how many logs it stands.
    """

    registration: str | None
    everything: bool
    logs: int
    flights: int | None
    airborne: float
    stretches: int
    samples: int
    rates: tuple[float, ...]
    tally: Tally
    cycles: CycleTally
    by_phase: tuple[tuple[str, Tally], ...] = ()
    by_cause: tuple[tuple[str, Tally], ...] = ()
    cause_note: str = ""
    weighted: Tally | None = None
    weighted_cycles: CycleTally | None = None
    reference_mass: float | None = None
    weighted_note: str = ""
    derived: bool = False


@dataclass(frozen=True, slots=True, eq=False)
class SpectrumLog:
    """How one log was counted. status: counted, partial, not counted (counted already), failed.

    not_counted : (why, s) of airborne time. at_end : samples at the sensor's end, where the true load lies beyond.
    """

    path: str
    status: str
    problem: Problem | None = None
    registration: str | None = None
    sha256: str | None = None
    content_sha256: str | None = None
    method: str = ""
    interval: float | None = None
    flights: int | None = None
    flights_by: str = ""
    airborne: float = 0.0
    counted: float = 0.0
    stretches: int = 0
    samples: int = 0
    not_counted: tuple[tuple[str, float], ...] = ()
    at_end: int = 0
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class SpectrumOutcome:
    """What one spectrum run gave: a row an aeroplane, and one of everything where there are several."""

    logs: tuple[SpectrumLog, ...]
    rows: tuple[SpectrumRow, ...]
    step: float
    reference: float
    judged_with: tuple[JudgedWith, ...] = ()
    skipped: tuple[tuple[str, str], ...] = ()
    notes: tuple[str, ...] = field(default_factory=tuple)
