"""Traces and rules made by hand in a few lines, for the tests of this room."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from exceed.core.intervals import Intervals
from exceed.core.phases import PHASE_CODE, Flight, FlightTrack, PhaseTrack
from exceed.core.recording import Channel, Clock, Recording, median_interval
from exceed.core.trace import Step, Trace
from exceed.documents.aircraft import Aircraft, load_aircraft
from exceed.documents.rulebook import load_rules
from exceed.judge.compile import compile_rule
from exceed.judge.compiled import Compiled


def channel(name: str, values, *, rows=None, time=None, interval=None, u: float = 0.0, **more) -> Channel:
    values = np.asarray(values, dtype=float)
    spacing = interval if interval is not None else median_interval(time)
    more = {"noise": 0.0, "unit": "by hand", **more}
    return Channel(name, name.upper(), values, rows=rows, interval=spacing, standard_uncertainty=u, **more)


def make_trace(
    time, channels: Mapping[str, object], *, flights=None, u: Mapping[str, float] | None = None, spans=None, steps=None,
    phase: str = "cruise", interval: float | None = None, discrete=(), more: Mapping[str, dict] | None = None,
) -> Trace:  # fmt: skip
    """A trace of recorded channels. channels : name -> values on `time`, or (values, rows)."""
    time = np.asarray(time, dtype=float)
    made = {}
    for name, given in channels.items():
        values, rows = given if isinstance(given, tuple) else (given, None)
        own = time if rows is None else time[rows]
        made[name] = channel(
            name, values, rows=rows, time=own, interval=interval, u=(u or {}).get(name, 0.0), discrete=name in discrete,
            **((more or {}).get(name, {})),
        )  # fmt: skip
    recording = Recording("by-hand.csv", time, made, Clock("elapsed"), rows=len(time))
    spans_in_air = flights if flights is not None else [(time[0], time[-1] + 1e-9)]
    rows = tuple(Flight(i + 1, float(a), float(b)) for i, (a, b) in enumerate(spans_in_air))
    airborne = Intervals(np.array([row.start for row in rows]), np.array([row.end for row in rows]))
    phases = PhaseTrack(np.array([time[0]]), np.array([PHASE_CODE[phase]], dtype=np.int8))
    track = FlightTrack(rows, phases, airborne, known=True, method="by hand")
    all_steps = {name: Step(name, "recorded", None) for name in made}
    all_steps.update(steps or {})
    return Trace(recording, made, all_steps, track, spans=spans or {})


def compile_text(text: str, trace: Trace, aircraft: Aircraft | None = None) -> list[Compiled]:
    """Rules from the text under `rules:` of a rules file."""
    rules = load_rules("format: exceed-rules/1\n" + text)
    return [
        one for rule in rules.rules for one in compile_rule(rule, trace, aircraft, "by hand", dict(rules.quantities))
    ]


def aircraft_of(text: str) -> Aircraft:
    return load_aircraft("format: exceed-aircraft/1\nregistration: ZZ-NMA\n" + text)
