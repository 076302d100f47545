"""Phases of flight on the coarse cells, in the words of the CAST/ICAO taxonomy; unknown where it cannot be told.

35 ft (end of take-off) and 1000 ft (end of initial climb, begin of approach) are the taxonomy's own figures
[CICTT-PHASE]; the rates and durations that part climb, cruise, descent and manoeuvring are common practice, no source.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from exceed.core.constants import FOOT, STANDARD_GRAVITY
from exceed.core.intervals import Intervals, joined, lasting, normal
from exceed.core.phases import PHASE_CODE, Flight, PhaseTrack
from exceed.core.recording import Array
from exceed.derive.coarse import Coarse
from exceed.derive.evidence import Signals
from exceed.derive.flights import Found

# channels that tell manoeuvring and taxiing, besides the evidence of flights
EVIDENCE = ("bank_angle", "pitch_angle", "load_factor", "heading", "vertical_speed")

SCREEN = 35.0 * FOOT
CIRCUIT = 1000.0 * FOOT
FLARE = 30.0 * FOOT
CLIMBING = 1.5  # m/s (300 ft/min) begins a climb or descent
LEVELLED = 0.75  # m/s ends it
LEAST_LEG = 15.0  # s: a shorter climb, cruise or descent joins its neighbour
STEEP_BANK = np.radians(55.0)
STEEP_PITCH = np.radians(30.0)
PULLED, PUSHED = 1.8, 0.4  # mean load factor of a second
PATH_BENT = 0.5 * STANDARD_GRAVITY  # m/s2 of change of vertical speed
MANOEUVRE_LEAST, MANOEUVRE_JOIN, MANOEUVRE_PAD = 1.5, 30.0, 5.0  # s
MOVING = 1.0  # m/s over the ground
CRAWL = 8.0  # m/s: below, an airspeed indicator says nothing of movement
SLIVER = 5.0  # s
LONGEST_CIRCUIT = 600.0  # s
AROUND = 120.0  # s before and after a flight that belong to its runs on the ground
ROLLING_FAST = 15.0  # m/s: the landing roll ends, the take-off run begins

Mask = NDArray[np.bool_]


def phases_of(coarse: Coarse, signals: Signals, found: Found) -> tuple[PhaseTrack, Intervals, tuple[str, ...]]:
    """Phase at every cell, the time of standing still, and what could not be told."""
    count = len(coarse)
    codes = np.zeros(count, dtype=np.int8)
    if count == 0:
        return PhaseTrack(np.empty(0), codes), normal([], []), ()
    notes: list[str] = []
    standing = _on_ground(coarse, signals, found, codes)
    climb = signals.climb
    if climb is None and coarse.has("vertical_speed"):
        climb = coarse.pick("vertical_speed")
    if climb is None and found.flights:
        notes.append("no height and no vertical speed: phases of the flight cannot be told")
    manoeuvring, told = _manoeuvring(coarse, climb)
    if not told:
        notes.append("no bank, pitch or load factor: manoeuvring cannot be told")
    passes = np.sort(np.array(found.passes))
    for flight in found.flights:
        cells = coarse.part(flight.start - AROUND, flight.end + AROUND)
        time, code = coarse.time[cells], codes[cells]
        inside = (time >= flight.start) & (time < flight.end)
        if climb is not None:
            _legs(time, climb[cells], inside, code)
        _ends(coarse, signals, flight, cells, inside, code)
        low = np.isin(code, [PHASE_CODE["take-off"], PHASE_CODE["landing"]])
        code[inside & manoeuvring[cells] & ~low] = PHASE_CODE["manoeuvring"]
        for when in passes[slice(*np.searchsorted(passes, [flight.start, flight.end]).tolist())].tolist():
            _low_pass(coarse, signals, flight, when, codes, touched=False)
        for when in flight.touchdowns:
            if when < flight.end - AROUND / 2.0:
                _low_pass(coarse, signals, flight, when, codes, touched=True)
            codes[coarse.part(when - 2.0, min(when + 8.0, flight.end))] = PHASE_CODE["landing"]
        _rolls(signals, flight, time, cells, code)
        _without_slivers(time, code, inside)
    if not found.known:
        codes[manoeuvring] = PHASE_CODE["manoeuvring"]
    change = np.concatenate([[0], np.flatnonzero(codes[1:] != codes[:-1]) + 1])
    return PhaseTrack(coarse.time[change], codes[change]), standing, tuple(notes)


def _on_ground(coarse: Coarse, signals: Signals, found: Found, codes: NDArray[np.int8]) -> Intervals:
    """Marks standing and taxi; returns the stretches of standing still."""
    ground = found.ground.contains(coarse.time)
    still: Mask | None = None
    moving = np.zeros(len(coarse), dtype=bool)
    if signals.rolling is not None:
        known = np.isfinite(signals.rolling)
        still = known & (signals.rolling < MOVING)
        moving = known & (signals.rolling >= MOVING)
    elif signals.speed is not None:
        # an airspeed indicator says nothing below its first mark, but a reading above it is movement
        known = np.isfinite(signals.speed)
        moving = known & (signals.speed > CRAWL)
        # the wind makes a slow reading waver about the mark: what moves, moves for a while
        moving = lasting(joined(_stretches(coarse, moving), 15.0), 5.0).contains(coarse.time)
        if coarse.has("heading"):
            heading = coarse.pick("heading")
            turned = coarse.spread(np.unwrap(np.nan_to_num(heading)), 5.0)
            moving |= turned > np.radians(2.0)
            still = known & ~moving
    codes[ground & moving] = PHASE_CODE["taxi"]
    if still is None:
        return normal([], [])
    # a heading that stays tells standing from taxiing straight on only where it lasts
    runs = lasting(_stretches(coarse, ground & still), 5.0 if signals.rolling is not None else 20.0)
    stopped = runs.contains(coarse.time)
    codes[ground & stopped] = PHASE_CODE["standing"]
    codes[ground & still & ~stopped] = PHASE_CODE["taxi"]
    return runs


def _stretches(coarse: Coarse, mask: Mask) -> Intervals:
    """Cells -> stretches of time; each cell lasts to the next one."""
    step = coarse.step
    return normal(coarse.time[mask], (coarse.time + step)[mask])


def _manoeuvring(coarse: Coarse, climb: Array | None) -> tuple[Mask, bool]:
    """Aerobatic or steep flying: bank, pitch, a second's mean load factor, or the path's bending over six seconds."""
    marks = np.zeros(len(coarse), dtype=bool)
    told = False
    with np.errstate(invalid="ignore"):
        if coarse.has("bank_angle"):
            bank = (coarse.pick("bank_angle") + np.pi) % (2.0 * np.pi) - np.pi
            marks |= np.abs(bank) > STEEP_BANK
            told = True
        if coarse.has("pitch_angle"):
            marks |= np.abs(coarse.pick("pitch_angle")) > STEEP_PITCH
            told = True
        if "load_factor" in coarse.recording.channels:
            mean = coarse.statistics("load_factor").mean
            told |= bool(np.isfinite(mean).any())
            marks |= (mean > PULLED) | (mean < PUSHED)
        if coarse.has("vertical_speed"):
            climb = coarse.pick("vertical_speed")
        if climb is not None:
            marks |= np.abs(coarse.slope(climb, 3.0)) > PATH_BENT
    found = lasting(joined(_stretches(coarse, marks), 3.0), MANOEUVRE_LEAST)
    padded = normal(found.start - MANOEUVRE_PAD, found.end + MANOEUVRE_PAD)
    return joined(padded, MANOEUVRE_JOIN).contains(coarse.time), told


def _legs(time: Array, climb: Array, inside: Mask, codes: NDArray[np.int8]) -> None:
    """Climb, cruise and descent with hysteresis; legs that last too short join the one before."""
    place = np.flatnonzero(inside & np.isfinite(climb))
    if len(place) == 0:
        return
    rate, time = climb[place], time[place]
    up, level, down = (PHASE_CODE[name] for name in ("climb", "cruise", "descent"))
    # hysteresis without a loop: a decided cell holds until another one decides
    decided = np.select([rate > CLIMBING, rate < -CLIMBING, np.abs(rate) < LEVELLED], [up, down, level], default=-1)
    decided = decided.astype(np.int8)
    last = np.maximum.accumulate(np.where(decided >= 0, np.arange(len(place)), -1))
    state = np.where(last >= 0, decided[np.maximum(last, 0)], level).astype(np.int8)
    edges = np.concatenate([[0], np.flatnonzero(np.diff(state)) + 1, [len(state)]])
    legs: list[list[int]] = []  # first, last, code
    for first, stop in zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True):
        lasted = float(time[min(stop, len(time) - 1)] - time[first])
        if legs and (lasted < LEAST_LEG or legs[-1][2] == int(state[first])):
            legs[-1][1] = stop
        else:
            legs.append([first, stop, int(state[first])])
    for first, stop, code in legs:
        codes[place[first:stop]] = code


def _ends(
    coarse: Coarse, signals: Signals, flight: Flight, cells: slice, inside: Mask, codes: NDArray[np.int8]
) -> None:
    """Take-off, initial climb, approach and landing, from height above the field at either end."""
    time, start, end = coarse.time[cells], flight.start, flight.end
    take_off, initial = PHASE_CODE["take-off"], PHASE_CODE["initial climb"]
    approach, landing = PHASE_CODE["approach"], PHASE_CODE["landing"]
    if signals.height is None:
        codes[inside & flight.take_off_seen & (time < start + 5.0)] = take_off
        codes[inside & flight.landing_seen & (time >= end - 5.0)] = landing
        return
    height = signals.height[cells]
    if flight.take_off_seen:
        above = height - coarse.median_near(signals.height, start, 4.0)
        codes[inside & _until(time, above > SCREEN, start, 30.0)] = take_off
        climbing = inside & (time >= start) & (codes != take_off)
        # it ends at 1000 ft, or where the climb does: the first cruise or descent in the circuit
        levelled = (codes == PHASE_CODE["cruise"]) | (codes == PHASE_CODE["descent"])
        ends = (above > CIRCUIT) | (levelled & (above > SCREEN) & (time > start + 20.0))
        codes[climbing & _until(time, ends, start, 600.0)] = initial
    if flight.landing_seen:
        above = height - coarse.median_near(signals.height, end, 4.0)
        backwards = -time[::-1]
        low = _until(backwards, (above > CIRCUIT)[::-1], -end, 1800.0)[::-1] & inside
        low &= ~np.isin(codes, [take_off, initial])
        codes[low] = approach
        codes[inside & _until(backwards, (above > FLARE)[::-1], -end, 60.0)[::-1]] = landing


def _low_pass(
    coarse: Coarse, signals: Signals, flight: Flight, when: float, codes: NDArray[np.int8], touched: bool
) -> None:
    """A touch-and-go, or a missed approach, which belongs to the approach until it is back in the circuit.

    codes : (m,) of all cells.
    """
    if signals.height is None or signals.climb is None:
        return
    cells = coarse.part(max(when - LONGEST_CIRCUIT, flight.start), min(when + LONGEST_CIRCUIT, flight.end))
    time, height, climb, code = coarse.time[cells], signals.height[cells], signals.climb[cells], codes[cells]
    above = height - coarse.median_near(signals.height, when, 2.0)
    backwards = -time[::-1]
    before = _until(backwards, ((above > CIRCUIT) | (climb > CLIMBING))[::-1], -when, LONGEST_CIRCUIT)[::-1]
    code[before] = PHASE_CODE["approach"]
    levelled = (above > SCREEN) & (climb < LEVELLED) & (time > when + 20.0)
    after = _until(time, (above > CIRCUIT) | levelled, when, LONGEST_CIRCUIT)
    code[after] = PHASE_CODE["initial climb" if touched else "approach"]
    if touched:
        code[_until(backwards, (above > FLARE)[::-1], -when, 60.0)[::-1]] = PHASE_CODE["landing"]
        code[_until(time, above > SCREEN, when, 60.0)] = PHASE_CODE["take-off"]


def _without_slivers(time: Array, codes: NDArray[np.int8], inside: Mask) -> None:
    """Legs of a few seconds that manoeuvring cut off go to what follows them."""
    legs = [PHASE_CODE[name] for name in ("climb", "cruise", "descent")]
    edges = np.concatenate([[0], np.flatnonzero(np.diff(codes)) + 1, [len(codes)]])
    for first, stop in reversed(list(zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True))):
        if first > 0 and stop < len(codes) and codes[first] in legs and inside[first] and inside[stop]:
            beside = PHASE_CODE["manoeuvring"] in (codes[first - 1], codes[stop])
            if beside and time[stop] - time[first] < SLIVER:
                codes[first:stop] = codes[stop]


def _until(time: Array, stop: Mask, start: float, longest: float) -> Mask:
    """Cells from `start` on up to the first where `stop` holds, `longest` s at most."""
    after = np.flatnonzero(stop & (time >= start))
    end = float(time[after[0]]) if len(after) else np.inf
    return (time >= start) & (time < min(end, start + longest))


def _rolls(signals: Signals, flight: Flight, time: Array, cells: slice, codes: NDArray[np.int8]) -> None:
    """The take-off run before lift-off and the landing roll after touchdown, while the wheels run fast."""
    source = signals.rolling if signals.rolling is not None else signals.speed
    if source is None:
        return
    speed = source[cells]
    if flight.take_off_seen:
        slow = (speed < ROLLING_FAST / 3.0)[::-1]
        run = _until(-time[::-1], slow, -flight.start, 60.0)[::-1] & (time < flight.start)
        codes[run] = PHASE_CODE["take-off"]
    if flight.landing_seen:
        codes[_until(time, speed < ROLLING_FAST, flight.end, 60.0)] = PHASE_CODE["landing"]
