"""From a recording and the facts of its aeroplane to a Trace: what is needed backwards, then forwards once."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

import numpy as np

from exceed.core.constants import KNOT
from exceed.core.quantities import TRACE_ORDER
from exceed.core.recording import Channel, Recording, frozen
from exceed.core.trace import Step, Trace
from exceed.derive import evidence, mass, phases
from exceed.derive.facts import Facts, facts_of
from exceed.derive.first_pass import FirstPass, first_pass, inverted_time
from exceed.derive.resolve import (
    FOUND_FACTS,
    LOAD_FACTORS,
    Resolver,
    base_name,
    closure,
    leaves,
    with_uncertainty,
)
from exceed.physics.kinematics import lever_arm_uncertainty

if TYPE_CHECKING:
    from exceed.documents.aircraft import Aircraft

POSITION_ERROR = "position error table"  # the method of the rows that correct airspeed by the aeroplane's table
# typical sizes of rotation where it is not recorded (roll, pitch, yaw rate; roll, pitch acceleration): judgement
_ROTATION = (0.2, 0.1, 0.1, 0.5, 0.3)


def needed_channels(
    quantities: Iterable[str] | None,
    available: Iterable[str],
    aircraft: Aircraft | None = None,
    *,
    mass_known: bool = False,
) -> set[str]:
    """The recorded channels that these quantities rest on, and those that tell flights and phases.

    quantities : names, None for all. available : the quantities that the log's columns hold. mass_known : the mass is
    given as a figure, so that fuel channels are only needed for the fuel used. Never lacks a channel that `build_trace`
    would use; may hold a few more, since sampling rates are not known yet.
    """
    available = set(available)
    facts = facts_of(aircraft)
    wanted = list(TRACE_ORDER) + sorted(available - set(TRACE_ORDER)) if quantities is None else list(quantities)
    needed: set[str] = set()
    found = dict.fromkeys(FOUND_FACTS, True)
    for interval in (0.05, 5.0):  # as if all were fast, as if all were slow
        preset = {} if "mass" in available else {"mass": Step("mass", "", None, constant=0.0)}
        preset["centre_of_gravity"] = Step("centre_of_gravity", "", None, constant=0.0)
        resolver = Resolver(dict.fromkeys(available, interval), facts, found, preset)
        for name in TRACE_ORDER:
            resolver.resolve(name)
        for name in wanted:
            resolver.resolve(name)
        rests = closure(resolver.steps, wanted) | set(wanted)
        needed |= leaves(resolver.steps, wanted)
        if rests & {"mass", "centre_of_gravity", "zero_fuel_mass", "fuel_mass"}:
            needed |= {name for name in available if base_name(name) in mass.EVIDENCE}
    if "ground_speed" not in available:
        needed |= set(evidence.POSITION)
    return (needed | set(evidence.EVIDENCE) | set(phases.EVIDENCE)) & available


def build_trace(
    recording: Recording,
    aircraft: Aircraft | None = None,
    *,
    quantities: Iterable[str] | None = None,
    mass: float | None = None,
    loading: Any = None,
) -> Trace:
    """A trace: one fixed method for each quantity that can be had, and the reason for each that cannot.

    quantities : names wanted, None for every quantity known or recorded. mass : kg, taken as take-off mass. loading : a
    loading document, or several, of which each flight takes its own.
    """
    from exceed.derive.mass import masses_of

    quantities = None if quantities is None else list(quantities)
    facts = facts_of(aircraft)
    recording, disowned = _believed(recording)
    first = first_pass(recording, aircraft, facts.stall_speed)
    weight = masses_of(first, aircraft, facts, mass, _several(loading))
    channels: dict[str, Channel] = {**first.channels, **weight.channels}
    empty = [name for name, channel in first.channels.items() if not _any_reading(channel)]
    intervals = {name: channel.interval for name, channel in first.channels.items() if name not in empty}
    preset = dict(weight.steps)
    bank = first.channels.get("bank_angle")
    if bank is not None and (quantities is None or "inverted_time" in quantities):
        channels["inverted_time"] = inverted_time(bank, recording.time, first.track.airborne)
        preset["inverted_time"] = Step("inverted_time", "time beyond 90 degrees of bank", None, source="DEFINITION")
    resolver = Resolver(intervals, facts, first.facts, preset)
    everything = [*TRACE_ORDER, *sorted(set(recording.channels) - set(TRACE_ORDER))]
    for name in everything:
        resolver.resolve(name)
    wanted = everything
    if quantities is not None:
        # engine_speed asks for engine_speed_1 and _2 as well, where the channels are one an engine
        indexed = [name for name in everything if base_name(name) in quantities]
        wanted = list(dict.fromkeys([*quantities, *indexed]))
    for name in wanted:
        resolver.resolve(name)
    resolver.missing.update({name: why for name, why in weight.missing.items() if name in resolver.missing})
    used = closure(resolver.steps, wanted)
    steps = {name: _as_built(step, facts, channels) for name, step in resolver.steps.items() if name in used}
    missing = {name: why for name, why in resolver.missing.items() if name in wanted}
    missing |= {name: f"column {first.channels[name].column} holds no reading" for name in empty if name in missing}
    derived = [name for name in empty if name in steps]
    instead = [f"column {first.channels[name].column} holds no reading: {name} is derived" for name in derived]
    held = _held_correction(steps, facts, first)
    notes = tuple(dict.fromkeys((*disowned, *first.notes, *facts.notes, *weight.notes, *instead, *held)))
    return Trace(
        recording,
        MappingProxyType(channels),
        MappingProxyType(steps),
        first.track,
        MappingProxyType(missing),
        MappingProxyType(dict(weight.spans)),
        notes,
        weight.flights,
    )


def _believed(recording: Recording) -> tuple[Recording, list[str]]:
    """The recording without the readings that the user calls faulty, and what to say of them."""
    channels, said = dict(recording.channels), []
    for quantity, start, end, reason in recording.faulty:
        channel = channels.get(quantity)
        if channel is None:
            continue
        when = recording.channel_time(channel)
        values = np.where((when >= start) & (when <= end), np.nan, channel.values)
        channels[quantity] = replace(channel, values=frozen(values))
        said.append(f"column {channel.column}: called faulty from {start:.1f} to {end:.1f} s and left out: {reason}")
    return (replace(recording, channels=MappingProxyType(channels)), said) if said else (recording, [])


def _held_correction(steps: Mapping[str, Step], facts: Facts, first: FirstPass) -> list[str]:
    """What to say where airspeeds were flown beyond the ends of the position error table, where it is held."""
    table = facts.values.get("position_error")
    used = [step for step in steps.values() if step.function is not None and step.method == POSITION_ERROR]
    said = []
    for step in used:
        name = "indicated_airspeed" if step.quantity == "calibrated_airspeed" else "calibrated_airspeed"
        channel = first.channels.get(name)
        if channel is None or table is None:
            continue
        known = (table.indicated if name == "indicated_airspeed" else table.calibrated)[0]
        when = first.coarse.recording.channel_time(channel)
        flown = channel.values[first.track.airborne.contains(when)]
        flown = flown[np.isfinite(flown)]
        low, high = float(np.min(known)), float(np.max(known))
        if len(flown) and (flown.min() < low or flown.max() > high):
            said.append(
                f"position error: flown {flown.min() / KNOT:.0f} to {flown.max() / KNOT:.0f} kt, its table goes from"
                f" {low / KNOT:.0f} to {high / KNOT:.0f} kt: beyond its ends the last correction is held"
            )
    return said


def _any_reading(channel: Channel) -> bool:
    """Whether a channel holds any reading: an empty column must not stand in the way of a derivation."""
    some = channel.values[:: max(1, len(channel.values) // 1000)]
    return bool(np.isfinite(some).any()) or bool(np.isfinite(channel.values).any())


def _several(loading: Any) -> Sequence[Any]:
    if loading is None:
        return ()
    return list(loading) if isinstance(loading, list | tuple) else [loading]


def _as_built(step: Step, facts: Facts, channels: Mapping[str, Channel]) -> Step:
    """What only the aeroplane's facts and the channels tell: the lever arm of an accelerometer that was not moved."""
    position = facts.values.get("accelerometer_position")
    if step.quantity not in LOAD_FACTORS or step.function is not None or step.constant is not None:
        return step
    if step.quantity != "load_factor" or position is None or not np.any(position):
        return step
    own = float(lever_arm_uncertainty(position, *_ROTATION))
    far = float(np.linalg.norm(position))
    text = f"rotation not recorded fast enough: accelerometer {far:.2f} m off the centre of gravity not moved to it"
    return with_uncertainty(step, own, text)


__all__ = ["build_trace", "needed_channels"]
