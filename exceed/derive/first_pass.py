"""Whole-log statistics before anything is judged: flights, phases, the accelerometer's datum, each channel's accuracy.

They rest on cells of one second, so their cost hardly grows with the sampling rate and no block size can change them.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from exceed.core.intervals import Intervals, lasting, normal
from exceed.core.phases import FlightTrack
from exceed.core.recording import Array, Channel, Figure, Recording, frozen
from exceed.derive.coarse import Coarse, coarse_of
from exceed.derive.evidence import Signals, signals_of
from exceed.derive.flights import Found, flights_of
from exceed.derive.phases import phases_of
from exceed.physics.uncertainty import DEFAULT_ACCURACY

if TYPE_CHECKING:
    from exceed.documents.aircraft import Aircraft

# common practice of the trade, no source: the figures of the datum estimate
QUIET_BANK = np.radians(5.0)
QUIET_TURN = np.radians(3.0)  # of heading in ten seconds
QUIET_CLIMB = 1.0  # m/s
QUIET_SCATTER = 0.03  # of load factor, between the means of neighbouring seconds
LEAST_STANDSTILL = 5.0  # s
LEAST_LEVEL = 30.0  # s of one level stretch
# what a standstill cannot tell: the nose's attitude, where pitch is not recorded (cos 12 degrees, on a tail wheel, is
# 0.978: within twice the figure)
ATTITUDE_UNKNOWN, ATTITUDE_KNOWN = 0.012, 0.002
# what steady level flight cannot tell: angle of attack (the body axis is not the lift axis), slow climbs
LEVEL_UNKNOWN = 0.006
# quiet stretches of which nothing else is known may be a shallow turn
QUIET_UNKNOWN = 0.03
COVERAGE = 2.0  # a datum is corrected only beyond twice its standard uncertainty


@dataclass(frozen=True, slots=True, eq=False)
class FirstPass:
    """What the first pass found. `facts` are those that derivations ask for: airborne, phases, touchdowns, ..."""

    channels: Mapping[str, Channel]
    track: FlightTrack
    coarse: Coarse
    signals: Signals
    found: Found
    facts: Mapping[str, Any]
    notes: tuple[str, ...]


def first_pass(recording: Recording, aircraft: Aircraft | None = None, stall_speed: float | None = None) -> FirstPass:
    """Flights, phases, datum and accuracies. stall_speed : clean, m/s, for the thresholds; None if unknown."""
    coarse = coarse_of(recording)
    signals = signals_of(coarse)
    found = flights_of(coarse, signals, stall_speed)
    phases, standing, phase_notes = phases_of(coarse, signals, found)
    notes = [*found.notes, *phase_notes]
    track = FlightTrack(
        found.flights, phases, found.airborne, found.known, found.method, (*found.notes, *phase_notes), standing
    )
    channels = dict(recording.channels)
    if "load_factor" in channels:
        channel, text = with_datum(channels["load_factor"], coarse, signals, found, standing)
        channels["load_factor"] = channel
        if text:
            notes.append(text)
    channels = {name: with_uncertainty(channel, aircraft) for name, channel in channels.items()}
    touchdowns = np.array([when for flight in found.flights for when in flight.touchdowns])
    facts = {
        "airborne": found.airborne,
        "phases": phases,
        "field_levels": _field_levels(coarse, signals, found),
        "touchdowns": touchdowns if len(touchdowns) else None,
        "touchdown_windows": found.windows if len(found.windows) else None,
    }
    return FirstPass(MappingProxyType(channels), track, coarse, signals, found, MappingProxyType(facts), tuple(notes))


def inverted_time(bank: Channel, time: Array, airborne: Intervals) -> Channel:
    """Seconds since the aeroplane turned beyond 90 degrees of bank, 0 upright, on the bank's own samples.

    time : (n,) s, of the recording's axis. Continues over samples that are missing, not over gaps. [DEFINITION]
    """
    when = time if bank.rows is None else time[bank.rows]
    angle = np.abs((bank.values + np.pi) % (2.0 * np.pi) - np.pi)
    inverted = (angle > 0.5 * np.pi) & airborne.contains(when)
    # the latest instant at which it was known not to be inverted, or at which a gap ended
    upright = ~inverted & np.isfinite(angle)
    upright[1:] |= np.diff(when) > bank.gap
    last = np.maximum.accumulate(np.where(upright, np.arange(len(when)), 0)) if len(when) else np.empty(0, dtype=int)
    values = np.where(np.isfinite(angle), np.where(inverted, when - when[last], 0.0), np.nan)
    return Channel("inverted_time", "", frozen(values), bank.rows, bank.interval, found_by="derived")


def _field_levels(coarse: Coarse, signals: Signals, found: Found) -> tuple[Array, Array] | None:
    """Instants and levels of the fields of take-offs and landings, as the altitude that is used shows them."""
    if signals.height is None:
        return None
    instants = []
    for flight in found.flights:
        instants += [flight.start] if flight.take_off_seen else []
        instants += [when for when in flight.touchdowns if when < flight.end or flight.landing_seen]
    instants.sort()
    levels = [coarse.median_near(signals.height, when, 3.0) for when in instants]
    kept = [when for when, level in zip(instants, levels, strict=True) if np.isfinite(level)]
    levels = [level for level in levels if np.isfinite(level)]
    return (np.array(kept), np.array(levels)) if kept else None


# --- datum of the accelerometer -----------------------------------------------------------------------------------


def with_datum(
    channel: Channel, coarse: Coarse, signals: Signals, found: Found, standing: Intervals
) -> tuple[Channel, str]:
    """The accelerometer with its datum corrected where the evidence is surer than its own uncertainty; and a note."""
    if channel.bias is not None:
        return channel, ""
    estimates = [
        estimate
        for estimate in (_at_standstill(coarse, standing), _in_level_flight(coarse, signals, found))
        if estimate is not None
    ]
    if not estimates:
        quiet = _in_quiet_air(coarse)
        if quiet is None:
            return channel, "datum of the accelerometer: no standstill and no steady flight to tell it by"
        estimates = [quiet]
    values = np.array([value for value, _, _ in estimates])
    weights = np.array([1.0 / u**2 for _, u, _ in estimates])
    bias = float(np.sum(values * weights) / np.sum(weights))
    own = float(1.0 / np.sqrt(np.sum(weights)))
    # where two estimates disagree by more than they allow, their spread is the better uncertainty
    spread = float(np.max(values) - np.min(values)) / 2.0
    uncertainty = max(own, spread) if len(values) > 1 else own
    source = " and ".join(text for _, _, text in estimates)
    if abs(bias) <= COVERAGE * uncertainty:
        shown = round(bias, 3) + 0.0  # no -0.000
        text = f"datum of the accelerometer: {shown:+.3f} g by {source}, not beyond its uncertainty, not corrected"
        return _added(channel, uncertainty), text
    moved = replace(
        channel,
        values=frozen(channel.values - bias),
        offset=channel.offset - bias,
        bias=Figure(bias, uncertainty),
        saturation=(channel.saturation[0] - bias, channel.saturation[1] - bias),
    )
    return _added(moved, uncertainty), f"datum of the accelerometer: {bias:+.3f} g by {source}, taken off"


def _added(channel: Channel, uncertainty: float) -> Channel:
    """The datum's uncertainty kept for the accuracy of the channel (see `with_uncertainty`)."""
    return channel if channel.bias is not None else replace(channel, bias=Figure(0.0, uncertainty))


def _at_standstill(coarse: Coarse, standing: Intervals) -> tuple[float, float, str] | None:
    still = lasting(Intervals(standing.start + 1.0, np.maximum(standing.end - 1.0, standing.start + 1.0)), 0.1)
    still = lasting(still, LEAST_STANDSTILL - 2.0)
    if len(still) == 0:
        return None
    inside = still.contains(coarse.time)
    mean = coarse.statistics("load_factor").mean[inside]
    pitch = coarse.pick("pitch_angle")[inside] if coarse.has("pitch_angle") else np.full(len(mean), np.nan)
    good = np.isfinite(mean)
    if good.sum() < 3:
        return None
    known = np.isfinite(pitch[good])
    attitude = np.where(known, np.cos(np.where(known, pitch[good], 0.0)), 1.0)
    error = mean[good] - attitude
    scatter = 1.4826 * float(np.median(np.abs(error - np.median(error))))
    allowed = ATTITUDE_KNOWN if known.mean() > 0.9 else ATTITUDE_UNKNOWN
    return float(np.median(error)), float(np.hypot(scatter / np.sqrt(good.sum()), allowed)), "standstill on the ground"


def _straight(coarse: Coarse) -> NDArray[np.bool_] | None:
    """(m,) bool: cells of wings level or, where bank is not recorded, of a steady heading; None if neither tells."""
    if coarse.has("bank_angle"):
        level: NDArray[np.bool_] = np.abs((coarse.pick("bank_angle") + np.pi) % (2.0 * np.pi) - np.pi) < QUIET_BANK
        return level
    if coarse.has("heading"):
        heading = coarse.pick("heading")
        known = np.isfinite(heading)
        steady: NDArray[np.bool_] = coarse.spread(np.unwrap(np.where(known, heading, 0.0)), 5.0) < QUIET_TURN
        return known & steady
    return None


def _in_level_flight(coarse: Coarse, signals: Signals, found: Found) -> tuple[float, float, str] | None:
    """Mean over long stretches of level flight: their vertical speed does not change, so the mean is 1 g."""
    straight = _straight(coarse)
    if not found.known or signals.climb is None or straight is None:
        return None
    mean = coarse.statistics("load_factor").mean
    with np.errstate(invalid="ignore"):
        level = straight & (np.abs(signals.climb) < QUIET_CLIMB) & np.isfinite(mean)
    level &= found.airborne.contains(coarse.time)
    runs = lasting(normal(coarse.time[level], (coarse.time + coarse.step)[level]), LEAST_LEVEL)
    if len(runs) == 0:
        return None
    inside = runs.contains(coarse.time) & level
    errors, spans = mean[inside] - 1.0, float(np.sum(coarse.step[inside]))
    # a change of vertical speed over the stretches leaves (change / time) / g
    drift = QUIET_CLIMB * len(runs) / spans / 9.80665
    scatter = float(np.std(errors)) / np.sqrt(max(len(errors) / 4.0, 1.0))
    return float(np.mean(errors)), float(np.sqrt(scatter**2 + drift**2 + LEVEL_UNKNOWN**2)), "steady level flight"


def _in_quiet_air(coarse: Coarse) -> tuple[float, float, str] | None:
    """Where no long level flight is to be had: what is quiet for long is 1 g or a steady turn, which only adds."""
    mean = coarse.statistics("load_factor").mean
    if len(mean) < 30:
        return None
    scatter = coarse.spread(mean, 5.0)
    quiet = np.isfinite(mean) & (scatter < 2.0 * QUIET_SCATTER)
    straight = _straight(coarse)
    if straight is not None:
        quiet &= straight
    runs = lasting(normal(coarse.time[quiet], (coarse.time + coarse.step)[quiet]), 20.0)
    if len(runs) == 0:
        return None
    # a steep turn held for long is as quiet as level flight: the lowest stretch is the one that turns least
    parts = (coarse.part(start, end) for start, end in runs)
    error = min(float(np.median(mean[part][quiet[part]])) for part in parts) - 1.0
    if abs(error) > 0.3:
        return None  # no datum error of a sound accelerometer: it is something else, and must be seen
    return error, QUIET_UNKNOWN, "quiet stretches"


# --- accuracy of a channel ----------------------------------------------------------------------------------------


def with_uncertainty(channel: Channel, aircraft: Aircraft | None) -> Channel:
    """The channel with its standard uncertainty: stated accuracy, else what recording rules ask, resolution, datum."""
    if channel.discrete:
        return channel
    parts = [channel.resolution / np.sqrt(12.0)]
    stated = None if aircraft is None else aircraft.recorder.accuracy.get(channel.quantity)
    if channel.standard_uncertainty is not None:
        parts.append(channel.standard_uncertainty)
        source = channel.uncertainty_source or "stated accuracy"
    elif stated is not None:
        parts.append(float(stated) / 1.96)
        source = "aircraft file"
    elif channel.quantity in DEFAULT_ACCURACY:
        row = DEFAULT_ACCURACY[channel.quantity]
        # a mere share of the reading is taken where limits matter: at the greatest
        finite = channel.values[:: max(1, len(channel.values) // 20_000)]
        finite = finite[np.isfinite(finite)]
        size = float(np.max(np.abs(finite))) if not row.half_width and len(finite) else 0.0
        parts.append(max(row.half_width, row.relative * size) / np.sqrt(3.0))
        source = f"published recording requirement {row.source}"
    else:
        source = "resolution only: no accuracy is known"
    bias = channel.bias if channel.bias is not None and channel.bias.value != 0.0 else None
    own = stated is not None or channel.standard_uncertainty is not None
    # a stated accuracy has the datum in it; what recording rules ask leaves it out, and a correction brings its own
    if channel.bias is not None and channel.bias.uncertainty and (bias is not None or not own):
        parts.append(channel.bias.uncertainty)
    # hypot: figures beyond all sense (1e200) must not overflow on their way to being told
    total = math.hypot(*parts)
    return replace(channel, standard_uncertainty=total, uncertainty_source=source, bias=bias)
