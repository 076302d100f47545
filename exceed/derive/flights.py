"""Take-offs, landings, touchdowns: which time of a recording was flown.

Evidence in order of merit: weight on wheels; airspeed (else ground speed) with height; airspeed alone; height alone.
Thresholds rest on the aeroplane's stall speed where it is known, else on the speeds of the recording itself. Where
nothing tells flights apart all recorded time counts as airborne, and that is said.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from exceed.core.intervals import EMPTY, Intervals, complement, joined, normal
from exceed.core.phases import Flight
from exceed.core.recording import Recording
from exceed.derive.coarse import Coarse
from exceed.derive.evidence import (
    BOUNCE_GROUND,
    BREAK,
    HOP,
    TOUCH,
    Signals,
    Stretch,
    Thresholds,
    air_by_height,
    air_by_speed,
    air_by_wheels,
    contradicted,
    thresholds_of,
)
from exceed.derive.touchdowns import go_arounds, rolls_on, touchdown_near, touches_between


@dataclass(frozen=True, slots=True, eq=False)
class Found:
    """Flights, the time flown (impacts taken out), and how it was told."""

    flights: tuple[Flight, ...]
    airborne: Intervals
    ground: Intervals
    known: bool
    method: str
    notes: tuple[str, ...]
    thresholds: Thresholds | None
    windows: Intervals = field(default_factory=lambda: EMPTY)  # around each touchdown
    passes: tuple[float, ...] = ()  # instants of going around


def flights_of(coarse: Coarse, signals: Signals, stall_speed: float | None = None) -> Found:
    """Flights of a recording, from whatever it has. Never fails: what cannot be told is `known=False` with a note."""
    recording = coarse.recording
    limits = thresholds_of(signals, stall_speed)
    notes: list[str] = []
    wheels = air_by_wheels(recording)
    if wheels is not None and contradicted(wheels, signals, limits):
        notes.append("weight on wheels contradicts speed and height and was not used")
        wheels = None
    if wheels is not None:
        stretches, method = wheels, "weight on wheels"
        interval = recording.channels["weight_on_wheels"].interval
        # a slow switch only brackets the touchdown, and the accelerometer may show it
        before, touch_within = 0.5 + interval, interval if interval > 0.3 else 0.0
    elif signals.speed is not None and limits is not None:
        stretches = air_by_speed(signals, limits, notes)
        method = limits.how + (f", with {signals.height_name.replace('_', ' ')}" if signals.height is not None else "")
        before, touch_within = 2.0, 6.0
    elif signals.height is not None:
        stretches = air_by_height(signals)
        method = f"{signals.height_name.replace('_', ' ')} alone"
        before, touch_within = 5.0, 6.0
    else:
        everything = _recorded_time(recording)
        reason = "no speed, height or weight on wheels tells flights apart: all recorded time counts as airborne"
        return Found((), everything, EMPTY, False, "none", (*notes, reason), None)
    stretches = _cut_at_seams(stretches, recording)
    return _assembled(stretches, recording, signals, limits, method, notes, before, touch_within, wheels is not None)


def _recorded_time(recording: Recording) -> Intervals:
    if len(recording.time) == 0:
        return EMPTY
    whole = normal([float(recording.time[0])], [float(np.nextafter(recording.time[-1], np.inf))])
    seams = normal([s for s, _ in recording.seams], [e for _, e in recording.seams])
    return complement(seams, whole)


def _cut_at_seams(stretches: list[Stretch], recording: Recording) -> list[Stretch]:
    """An air stretch across a clock reset, or across half an hour without a sample, is two."""
    time = recording.time
    spacing = np.diff(time)
    long = np.flatnonzero(spacing > BREAK)
    cuts = sorted({*recording.seams, *((float(time[i]), float(time[i + 1])) for i in long.tolist())})
    for begin, finish in cuts:
        cut = []
        for stretch in stretches:
            if stretch.start < finish and stretch.end > begin:
                if stretch.start < begin:
                    cut.append(Stretch(stretch.start, begin, stretch.start_seen, False))
                if stretch.end > finish:
                    cut.append(Stretch(finish, stretch.end, False, stretch.end_seen))
            else:
                cut.append(stretch)
        stretches = cut
    return stretches


def _assembled(
    stretches: list[Stretch],
    recording: Recording,
    signals: Signals,
    limits: Thresholds | None,
    method: str,
    notes: list[str],
    before: float,
    touch_within: float,
    by_wheels: bool,
) -> Found:
    """Air stretches -> flights: hops, bounces and touch-and-goes put where they belong."""
    groups: list[list[Stretch]] = []
    bounces: dict[int, int] = {}
    for stretch in stretches:
        short = stretch.end - stretch.start < HOP and stretch.start_seen and stretch.end_seen
        previous = groups[-1][-1] if groups else None
        parted = previous is None or not previous.end_seen or not stretch.start_seen
        pause = np.inf if previous is None or parted else stretch.start - previous.end
        if short and previous is not None and pause < BOUNCE_GROUND:
            bounces[len(groups)] = bounces.get(len(groups), 0) + 1
            groups[-1].append(stretch)
        elif previous is not None and pause < TOUCH and rolls_on(signals, limits, previous.end, stretch.start):
            groups[-1].append(stretch)
        else:
            groups.append([stretch])
    # a hop before the take-off proper belongs to the take-off run
    kept = [(number, group) for number, group in enumerate(groups, start=1) if not _only_hops(group)]
    if len(kept) < len(groups):
        notes.append(f"{len(groups) - len(kept)} hop(s) of less than {HOP:g} s taken as ground time")
    flights = []
    passes: list[float] = []
    air: list[tuple[float, float]] = []
    impacts: list[tuple[float, float]] = []
    for number, (key, group) in enumerate(kept, start=1):
        while group[0].end - group[0].start < HOP and group[0].start_seen and len(group) > 1:
            group.pop(0)
        touchdowns: list[float] = []
        hops = 0
        for stretch in group:
            if not by_wheels:
                touchdowns.extend(touches_between(signals, limits, stretch.start, stretch.end))
            if stretch.end_seen:
                stretch.end = touchdown_near(recording, stretch.end, touch_within)
                touchdowns.append(stretch.end)
            hops += stretch.end - stretch.start < HOP
            if stretch.end > stretch.start:
                air.append((stretch.start, stretch.end))
        last = group[-1]
        hops = max(min(hops, bounces.get(key, 0), len(touchdowns) - 1), 0)
        low = [when for part in group for when in go_arounds(signals, limits, part.start, part.end, touchdowns)]
        passes.extend(low)
        flights.append(
            Flight(number, group[0].start, last.end, group[0].start_seen, last.end_seen,
                   len(touchdowns) - hops, tuple(touchdowns), hops, len(low))
        )  # fmt: skip
        impacts.extend((when - before, when + 2.0) for when in touchdowns)
    windows = normal([s for s, _ in impacts], [e for _, e in impacts])
    flown = normal([s for s, _ in air], [e for _, e in air])
    # the instant of landing itself is still flight's end, so flights and airborne time agree at open ends
    open_ends = [flight.end for flight in flights if not flight.landing_seen]
    if open_ends:
        flown = Intervals(
            flown.start, np.where(np.isin(flown.end, open_ends), np.nextafter(flown.end, np.inf), flown.end)
        )
    everything = _recorded_time(recording)
    airborne = complement(windows, flown)
    ground = complement(joined(flown, 0.0), everything)
    if not flights:
        notes.append("no flight found: the whole recording counts as ground time")
    return Found(tuple(flights), airborne, ground, True, method, tuple(notes), limits, windows, tuple(passes))


def _only_hops(group: list[Stretch]) -> bool:
    return all(s.end - s.start < HOP and s.start_seen and s.end_seen for s in group)
