"""What tells flying from rolling: the evidence of speed, height and the wheels, as stretches of air time.

Figures are common practice of the trade, no source, and chosen wide; thresholds rest on the aeroplane's stall speed
where it is known, else on the speeds of the recording itself.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from exceed.core.constants import EARTH_RADIUS
from exceed.core.intervals import normal, runs
from exceed.core.recording import Array, Recording
from exceed.derive.coarse import Coarse
from exceed.physics.airspeed import calibrated_airspeed_from_impact_pressure
from exceed.physics.atmosphere import pressure_altitude

AIRSPEEDS = ("indicated_airspeed", "calibrated_airspeed", "equivalent_airspeed", "true_airspeed")
HEIGHTS = ("pressure_altitude", "geometric_altitude")
# what the evidence may come from, for reading no more columns than needed
EVIDENCE = (*AIRSPEEDS, "ground_speed", *HEIGHTS, "static_pressure", "impact_pressure", "weight_on_wheels")
POSITION = ("latitude", "longitude")  # tells speed where nothing else does

# common practice of the trade, no source: the figures of this module, chosen wide
HOP = 5.0  # s: shorter time in the air is a bounce or a hop
BOUNCE_GROUND = 8.0  # s: a bounce comes so soon after a touchdown
TOUCH = 90.0  # s: a touch-and-go stays on the runway no longer than this
BREAK = 1800.0  # s without a sample: what comes after is another flight
GROUND_WITH_HEIGHT = 8.0  # s of slow and level that make a landing
GROUND_WITHOUT_HEIGHT = 25.0  # s of slow that make a landing where height cannot confirm it: stall turns are shorter
AT_AN_END = 0.25  # of these for a run that the recording's end cuts
AIR_WITH_HEIGHT = 5.0
AIR_WITHOUT_HEIGHT = 20.0  # a rejected take-off is shorter
CLIMBED = 15.0  # m: a flight rises at least so far
SETTLED = 1.0  # m/s: less vertical speed than this over ten seconds is level
HARDEST_STOP = 7.0  # m/s2: brakes, soft ground and reverse thrust give less
LEAST_SPEED = 16.0  # m/s: nothing that flies in these logs lifts off slower


@dataclass(frozen=True, slots=True)
class Thresholds:
    """Speeds that tell flying from rolling, m/s, in the kind of `speed`; `how` says where they come from."""

    airborne: float
    ground: float
    how: str


@dataclass(slots=True)
class Stretch:
    """A stretch of air (or ground) time while it is put together; `seen` tells whether its ends were observed."""

    start: float
    end: float
    start_seen: bool = True
    end_seen: bool = True


@dataclass(frozen=True, slots=True, eq=False)
class Signals:
    """The evidence on the coarse cells; None where it is not recorded."""

    coarse: Coarse
    speed: Array | None
    speed_name: str
    height: Array | None
    height_name: str
    climb: Array | None  # m/s over ten seconds
    rolling: Array | None  # speed over the ground, for standing and taxiing


def signals_of(coarse: Coarse) -> Signals:
    """The best speed and height that the recording has."""
    speed_name = next((name for name in AIRSPEEDS if coarse.has(name)), "")
    speed = coarse.pick(speed_name) if speed_name else None
    if speed is None and coarse.has("impact_pressure"):
        speed_name = "calibrated_airspeed"
        speed = calibrated_airspeed_from_impact_pressure(np.maximum(coarse.pick("impact_pressure"), 0.0))
    rolling = coarse.pick("ground_speed") if coarse.has("ground_speed") else _speed_of_positions(coarse)
    if speed is None and rolling is not None:
        speed_name, speed = "ground_speed", rolling
    height_name = "pressure_altitude" if coarse.has("pressure_altitude") else ""
    height = coarse.pick(height_name) if height_name else None
    if height is None and coarse.has("static_pressure"):
        height_name, height = "pressure_altitude", pressure_altitude(coarse.pick("static_pressure"))
    if height is None and coarse.has("geometric_altitude"):
        height_name, height = "geometric_altitude", coarse.pick("geometric_altitude")
    return Signals(
        coarse,
        speed,
        speed_name,
        height,
        height_name,
        coarse.slope(height) if height is not None else None,
        rolling,
    )


def _speed_of_positions(coarse: Coarse) -> Array | None:
    """Speed over the ground from latitude and longitude; None where they are not recorded."""
    if not (coarse.has("latitude") and coarse.has("longitude")):
        return None
    latitude, longitude = coarse.pick("latitude"), coarse.pick("longitude")
    known = np.isfinite(longitude)
    unwrapped = np.full(len(longitude), np.nan)
    unwrapped[known] = np.unwrap(longitude[known])
    north, east = coarse.slope(latitude, 2.0), coarse.slope(unwrapped, 2.0) * np.cos(latitude)
    speed: Array = EARTH_RADIUS * np.hypot(north, east)
    return speed


def thresholds_of(signals: Signals, stall_speed: float | None) -> Thresholds | None:
    """Speeds that tell flying from rolling; `stall_speed` m/s is the aeroplane's lowest clean one, if known."""
    speed = signals.speed
    if speed is None:
        return None
    through_air = signals.speed_name in AIRSPEEDS
    name = signals.speed_name.replace("_", " ")
    if stall_speed is not None and through_air:
        return Thresholds(0.95 * stall_speed, 0.7 * stall_speed, f"{name} against the stall speed")
    moving = speed[np.isfinite(speed) & (speed > 10.0)]
    if len(moving) == 0:
        return Thresholds(LEAST_SPEED, 0.7 * LEAST_SPEED, f"{name} against {LEAST_SPEED:g} m/s")
    # indicated speeds grow little with height, true ones much: a smaller share of the usual speed is the take-off's
    share = 0.42 if signals.speed_name in AIRSPEEDS[:3] else 0.3
    airborne = float(np.clip(share * np.percentile(moving, 90.0), LEAST_SPEED, 75.0))
    return Thresholds(airborne, 0.75 * airborne, f"{name} against a share of its usual value, stall speed not known")


def air_by_wheels(recording: Recording) -> list[Stretch] | None:
    """Air stretches from the switch itself, at its own rate; None where it has no readings."""
    channel = recording.channels.get("weight_on_wheels")
    if channel is None:
        return None
    good = np.isfinite(channel.values)
    if not good.any():
        return None
    every = bool(good.all())
    values = channel.values if every else channel.values[good]
    time = recording.channel_time(channel)
    time = time if every else time[good]
    down = values > 0.5
    change = np.flatnonzero(down[1:] != down[:-1])
    middle = 0.5 * (time[change] + time[change + 1])
    edges = np.concatenate([[recording.time[0]], middle, [recording.time[-1]]])
    state = np.concatenate([[down[0]], down[change + 1]])
    last = len(state) - 1
    return [
        Stretch(float(edges[i]), float(edges[i + 1]), i > 0, i < last)
        for i in np.flatnonzero(~state).tolist()
        if edges[i + 1] > edges[i]
    ]


def contradicted(stretches: list[Stretch], signals: Signals, limits: Thresholds | None) -> bool:
    """Does the switch say ground for minutes of fast and high, or air for minutes of standing?"""
    coarse = signals.coarse
    if signals.speed is None or limits is None:
        return False
    air = normal([s.start for s in stretches], [s.end for s in stretches]).contains(coarse.time)
    fast = signals.speed > 1.3 * limits.airborne
    if signals.climb is not None:
        fast &= np.abs(np.nan_to_num(signals.climb)) > SETTLED
    still = signals.speed < 0.3 * limits.ground
    if signals.height is not None and signals.climb is not None:
        still &= np.abs(np.nan_to_num(signals.climb, nan=99.0)) < 0.3
    step = coarse.step
    for says, truly in ((fast, air), (still, ~air)):
        wrong, right = float(np.sum(step[says & ~truly])), float(np.sum(step[says & truly]))
        if wrong > 60.0 and wrong > right:
            return True
    return False


def air_by_speed(signals: Signals, limits: Thresholds, notes: list[str]) -> list[Stretch]:
    """Air stretches from speed, with the height (if there) to tell a landing from slow flight."""
    coarse, speed, climb = signals.coarse, signals.speed, signals.climb
    assert speed is not None
    evidence = np.zeros(len(coarse), dtype=np.int8)
    with np.errstate(invalid="ignore"):
        evidence[speed > limits.airborne] = 1
        slow = (speed < limits.ground) & ~_failed(coarse, speed, limits, notes)
        if climb is not None:
            # climbing or sinking steadily is flying, however slow: a spin, a hover in wave
            evidence[np.abs(climb) > 2.5 * SETTLED] = 1
            slow &= ~(np.abs(climb) > SETTLED)
        evidence[slow & (evidence == 0)] = -1
    with_height = climb is not None and bool(np.isfinite(climb).any())
    least_air = AIR_WITH_HEIGHT if with_height else AIR_WITHOUT_HEIGHT
    least_ground = GROUND_WITH_HEIGHT if with_height else GROUND_WITHOUT_HEIGHT
    stretches = _settled(coarse, evidence, least_air, least_ground)
    kept = []
    rejected: list[str] = []
    for stretch in stretches:
        _refine(stretch, signals, limits)
        if with_height and stretch.start_seen and stretch.end_seen and not _climbed(stretch, signals):
            rejected.append(
                f"fast on the ground without a climb at {stretch.start:.0f} s: taken as a rejected take-off"
            )
            continue
        kept.append(stretch)
    notes.extend(_told(rejected))
    return kept


def _failed(coarse: Coarse, speed: Array, limits: Thresholds, notes: list[str]) -> NDArray[np.bool_]:
    """Slow stretches that began more suddenly than any aeroplane stops: a blocked pitot, a lost fix. No landing is."""
    failed = np.zeros(len(coarse), dtype=bool)
    time = coarse.time
    told: list[str] = []
    for first, stop in runs(speed < limits.ground).tolist():
        before = coarse.part(time[first] - 4.0, time[first])
        after = slice(first, min(first + 2, stop))
        if before.stop == before.start or time[first] - time[first - 1] > 2.0:
            continue
        fastest = speed[before][np.isfinite(speed[before])]
        if len(fastest) and float(np.max(fastest)) - float(np.min(speed[after])) > 4.0 * HARDEST_STOP:
            failed[first:stop] = True
            text = f"speed fell from {np.max(fastest):.0f} to {np.min(speed[after]):.0f} m/s within seconds"
            told.append(f"{text} at {time[first]:.0f} s: taken for a failed reading, no landing")
    notes.extend(_told(told))
    return failed


def _told(notes: list[str]) -> list[str]:
    """The first of many notes alike, and how many more there are."""
    return notes if len(notes) <= 1 else [f"{notes[0]} (and {len(notes) - 1} more)"]


def _settled(coarse: Coarse, evidence: NDArray[np.int8], least_air: float, least_ground: float) -> list[Stretch]:
    """Evidence (1 air, -1 ground, 0 none) -> air stretches: what lasts too short yields to what surrounds it."""
    known = np.flatnonzero(evidence)
    if len(known) == 0:
        return []
    time = coarse.time
    state = evidence[known] > 0
    change = np.flatnonzero(state[1:] != state[:-1])
    # a run's own time is that between its first and last evidence; between two runs lies what is not told
    first = np.concatenate([[0], change + 1])
    last = np.concatenate([change, [len(known) - 1]])
    air, begin, stop = state[first], time[known[first]], time[known[last]] + coarse.step[known[last]]
    end = float(time[-1])
    while len(air) > 1:
        least = np.where(air, least_air, least_ground)
        # at an end of the recording the run may have lasted longer than was recorded
        least[0] *= AT_AN_END
        least[-1] *= AT_AN_END if stop[-1] >= end - 3.0 else 1.0
        share = (stop - begin) / least
        # the shortest of their neighbourhood yield, all at once: no two of them touch
        yields = (share < 1.0) & (share < np.append(np.inf, share[:-1])) & (share <= np.append(share[1:], np.inf))
        if not yields.any():
            break
        air = air ^ yields
        opens = np.flatnonzero(np.concatenate([[True], air[1:] != air[:-1]]))
        closes = np.append(opens[1:], len(air)) - 1
        air, begin, stop = air[opens], begin[opens], stop[closes]
    # an open end is that of the recording: the last cell begins up to a second before it
    final = float(coarse.recording.time[-1])
    found = []
    for place in np.flatnonzero(air).tolist():
        start_seen, end_seen = place > 0, place < len(air) - 1
        since, until = float(begin[place]) if start_seen else float(time[0]), float(stop[place]) if end_seen else final
        found.append(Stretch(since, until, start_seen, end_seen))
    return found


def _climbed(stretch: Stretch, signals: Signals) -> bool:
    assert signals.height is not None
    time = signals.coarse.time
    low, high = np.searchsorted(time, [stretch.start, stretch.end])
    inside = signals.height[max(low - 5, 0) : high + 1]
    inside = inside[np.isfinite(inside)]
    return len(inside) < 3 or float(np.ptp(inside)) > CLIMBED


def _refine(stretch: Stretch, signals: Signals, limits: Thresholds) -> None:
    """Move the ends of an air stretch from the cells where the evidence settled to where the wheels left or met."""
    if stretch.start_seen:
        stretch.start = _lift_off(stretch.start, signals, limits, backwards=False)
    if stretch.end_seen:
        stretch.end = _lift_off(stretch.end, signals, limits, backwards=True)


def _lift_off(near: float, signals: Signals, limits: Thresholds, *, backwards: bool) -> float:
    """The instant at which height leaves the runway's level (or, backwards in time, meets it); else the speed's."""
    coarse = signals.coarse
    sign = -1.0 if backwards else 1.0
    inside = np.flatnonzero(np.abs(coarse.time - near) <= 60.0)
    order = inside[::-1] if backwards else inside
    time, speed = sign * (coarse.time[order] - near), signals.speed
    assert speed is not None
    crossing = near
    quick = np.flatnonzero(speed[order] > limits.airborne)
    slow = np.flatnonzero(speed[order] < limits.airborne)
    if len(quick) and len(slow):
        # the last crossing upwards before the stretch is settled
        after = quick[quick > slow[slow < quick[-1]][-1]] if (slow < quick[-1]).any() else quick
        crossing = float(coarse.time[order[after[0]]])
    if signals.height is None:
        return crossing
    height = signals.height[order]
    rolling = (speed[order] < limits.ground) & (time <= 5.0) & np.isfinite(height)
    if rolling.sum() < 3:
        return crossing
    field_level = float(np.median(height[rolling][-20:]))
    scatter = float(np.median(np.abs(height[rolling][-20:] - field_level)))
    step = 1.5 + 3.0 * max(scatter, 0.3 * _quantum(height[np.isfinite(height)]))
    above = np.isfinite(height) & (height > field_level + step)
    # the first cell from which it stays above for ten seconds
    for place in np.flatnonzero(above & (time > time[rolling][-1] - 1.0)).tolist():
        ahead = (time >= time[place]) & (time <= time[place] + 10.0) & np.isfinite(height)
        if above[ahead].all():
            rise = (height[ahead][-1] - height[place]) / max(time[ahead][-1] - time[place], 1.0)
            back = min(step / max(rise, 0.5), 8.0)
            return float(near + sign * (time[place] - back))
    return crossing


def air_by_height(signals: Signals) -> list[Stretch]:
    """Air stretches from height alone: level stretches that height leaves upwards on both sides are the ground."""
    coarse, height = signals.coarse, signals.height
    assert height is not None
    good = np.flatnonzero(np.isfinite(height))
    if len(good) == 0:
        return []
    spread = coarse.spread(height, 10.0)
    quantum = _quantum(height[good])
    flat = np.isfinite(spread) & (spread <= max(3.0, 1.05 * quantum))
    edges = np.flatnonzero(np.diff(np.concatenate([[0], flat.astype(np.int8), [0]])))
    evidence = np.ones(len(coarse), dtype=np.int8)
    evidence[~np.isfinite(height)] = 0
    for start, stop in edges.reshape(-1, 2).tolist():
        level = float(np.median(height[start:stop]))
        left = np.flatnonzero(np.abs(height[:start] - level) > 60.0)
        right = np.flatnonzero(np.abs(height[stop:] - level) > 60.0)
        before = bool(height[left[-1]] > level) if len(left) else None
        after = bool(height[stop + right[0]] > level) if len(right) else None
        upwards = before is not False and after is not False
        lasts = coarse.time[stop - 1] - coarse.time[start] >= (20.0 if None in (before, after) else 60.0)
        if upwards and lasts and level < 4500.0:
            evidence[start:stop] = -1
            # it stays on the ground while height stays near that level
            near = np.abs(height - level) <= max(3.0, 1.05 * quantum)
            while start > 0 and near[start - 1]:
                start -= 1
                evidence[start] = -1
            while stop < len(near) and near[stop]:
                evidence[stop] = -1
                stop += 1
    stretches = _settled(coarse, evidence, 20.0, 15.0)
    return [s for s in stretches if not (s.start_seen and s.end_seen) or _climbed(s, signals)]


def _quantum(values: Array) -> float:
    """Step of a channel that is written in steps, 0 if it is smooth."""
    change = np.abs(np.diff(values[:20_000]))
    change = change[change > 1e-6]
    return float(np.min(change)) if len(change) else 0.0
