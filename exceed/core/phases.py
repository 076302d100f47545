"""Phases of flight in the words of the CAST/ICAO taxonomy, and the flights of a recording.

[CICTT-PHASE] Phase of flight: definitions and usage notes, edition 1.3.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from exceed.core.intervals import EMPTY, Array, Intervals

PHASES: tuple[str, ...] = (
    "unknown",
    "standing",
    "taxi",
    "take-off",
    "initial climb",
    "climb",
    "cruise",
    "descent",
    "manoeuvring",
    "approach",
    "landing",
)
PHASE_CODE: dict[str, int] = {name: code for code, name in enumerate(PHASES)}
# what happens so soon after a landing belongs to it, s (an impact, a bounce): judgement
LANDING_ROLL = 10.0
# and what happens so soon before a take-off (a rotation) to the flight that begins, s: judgement
TAKE_OFF_RUN = 10.0
AIRBORNE = "airborne"  # the group word: every instant from take-off to landing, unknown included


@dataclass(frozen=True, slots=True, eq=False)
class PhaseTrack:
    """Which phase holds when: phase `code[i]` from `start[i]` up to `start[i + 1]`. start (k,) s ascending."""

    start: Array
    code: NDArray[np.int8]

    def at(self, time: Array) -> NDArray[np.int8]:
        """(n,) int8 codes of PHASES at instants."""
        if len(self.start) == 0:
            return np.zeros(np.shape(time), dtype=np.int8)
        index = np.searchsorted(self.start, time, side="right") - 1
        codes = self.code[np.maximum(index, 0)]
        return np.where(index >= 0, codes, 0).astype(np.int8)

    def name_at(self, time: float) -> str:
        return PHASES[int(self.at(np.array([time]))[0])]


@dataclass(frozen=True, slots=True)
class Flight:
    """One flight: from take-off to (last) landing, s on the recording's axis.

    `take_off_seen` / `landing_seen` are False where the recording begins or ends in the air. `touchdowns` are instants
    of wheels meeting the ground (touch-and-goes and bounces too), `landings` counts those that were no bounce.
    """

    number: int
    start: float
    end: float
    take_off_seen: bool = True
    landing_seen: bool = True
    landings: int = 1
    touchdowns: tuple[float, ...] = ()
    bounces: int = 0
    go_arounds: int = 0


@dataclass(frozen=True, slots=True, eq=False)
class FlightTrack:
    """What the first pass over a recording found: flights, phases, when airborne, and by which evidence.

    Where nothing tells flights apart, `known` is False, `flights` is empty, and all recorded time counts as airborne.
    """

    flights: tuple[Flight, ...]
    phases: PhaseTrack
    airborne: Intervals
    known: bool
    method: str
    notes: tuple[str, ...] = ()
    standing: Intervals = field(default_factory=lambda: EMPTY)

    def number_at(self, time: float) -> int | None:
        """The flight that an instant belongs to; the seconds of its take-off run and landing roll are part of it."""
        for flight in self.flights:
            if flight.start <= time <= flight.end:
                return flight.number
        for flight in self.flights:
            if flight.landing_seen and 0.0 < time - flight.end <= LANDING_ROLL:
                return flight.number
        for flight in self.flights:
            if flight.take_off_seen and 0.0 < flight.start - time <= TAKE_OFF_RUN:
                return flight.number
        return None
