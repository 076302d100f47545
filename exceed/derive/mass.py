"""Mass and centre of gravity along a recording, on the once-a-second cells.

Take-off mass: loading sheet, else the figure given, else unknown (empty to maximum take-off). Fuel used: fuel quantity,
else fuel flow integrated, else the aircraft file's consumption while airborne, else none (the mass is held). A recorded
mass beats all of it. What is assumed is said.
"""

from __future__ import annotations

import datetime
import itertools
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

import numpy as np

from exceed.core.phases import Flight
from exceed.core.recording import Array, Channel, frozen
from exceed.core.trace import FlightMass, Step, Trace
from exceed.derive.coarse import Coarse
from exceed.derive.facts import Facts
from exceed.derive.first_pass import FirstPass
from exceed.derive.resolve import base_name
from exceed.physics.loading import AVGAS_DENSITY, fuel_burnt

if TYPE_CHECKING:
    from exceed.documents.aircraft import Aircraft
    from exceed.documents.loading import LoadingSheet

EVIDENCE = ("mass", "fuel_mass", "fuel_volume", "fuel_mass_flow", "fuel_volume_flow")
# common practice, no source: a loading sheet is good to some per cent of what was loaded, and consumption varies
LOAD_SHARE = 0.02
SLOSH = 30.0  # s: the fuel gauge is averaged over so long to either side
JET_FUEL_DENSITY = 800.0  # kg/m3, kerosene; common practice, no source


@dataclass(frozen=True, slots=True, eq=False)
class Masses:
    """Whole-log series as channels, steps that use them, what is missing, ranges, and each flight's masses."""

    channels: Mapping[str, Channel] = field(default_factory=lambda: MappingProxyType({}))
    steps: Mapping[str, Step] = field(default_factory=lambda: MappingProxyType({}))
    missing: Mapping[str, str] = field(default_factory=lambda: MappingProxyType({}))
    spans: Mapping[str, tuple[float, float]] = field(default_factory=lambda: MappingProxyType({}))
    notes: tuple[str, ...] = ()
    flights: tuple[FlightMass, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class _Used:
    """Fuel used since the first cell, (m,) kg; `left` (m,) kg in the tanks where a gauge tells."""

    burnt: Array
    method: str
    share: float  # standard uncertainty as a share of what was used
    left: Array | None = None


def masses_of(
    first: FirstPass, aircraft: Aircraft | None, facts: Facts, mass: float | None, sheets: Sequence[LoadingSheet]
) -> Masses:
    """Mass and centre of gravity. mass : kg at take-off, of every flight without a sheet. Raises DocumentError."""
    coarse = first.coarse
    notes: list[str] = []
    if coarse.has("mass"):
        flights = _summary(first, coarse.pick("mass"), "recorded")
        return Masses(missing=_no_cg(sheets), flights=flights, notes=tuple(notes))
    if len(coarse) == 0:
        return Masses(missing={"mass": "the recording is empty", "centre_of_gravity": "the recording is empty"})
    used = _fuel_used(first, aircraft, facts, notes)
    loads = _loads(first, aircraft, sheets, notes)
    notes += _zero_fuel_notes(aircraft, loads)
    spans = _spans(first)
    series, arms = np.full(len(coarse), np.nan), np.full(len(coarse), np.nan)
    unknown = []
    for place, (start, end, take_off) in enumerate(spans):
        inside = coarse.part(start, end)
        load = loads.get(place)
        at_take_off = int(np.searchsorted(coarse.time, take_off, side="right")) - 1
        since = used.burnt[inside] - used.burnt[max(at_take_off, 0)]
        if load is not None:
            total = load.total(used, max(at_take_off, 0))
        elif mass is not None:
            total = mass
        else:
            unknown.append(place + 1)
            continue
        series[inside] = total - since
        if load is not None and load.moment is not None and load.fuel_arm is not None:
            moment = load.moment_with_fuel(total) - since * load.fuel_arm
            arms[inside] = moment / (total - since)
    if unknown:
        if mass is None and not loads:
            return _range(facts, notes)
        text = ", ".join(str(number) for number in unknown)
        notes.append(f"flight {text} has no loading sheet and no mass: mass is a range for the whole recording")
        return _range(facts, notes)
    how = "loading sheet" if loads and len(loads) == len(spans) else "given take-off mass"
    if loads and len(loads) < len(spans):
        how = "loading sheets, and the given take-off mass for flights without one"
    method = f"{how} and {used.method}" if used.share or used.left is not None else how
    assumes = None if used.share or used.left is not None else "no fuel used: take-off mass held"
    extent = float(np.ptp(used.burnt[np.isfinite(used.burnt)])) if np.isfinite(used.burnt).any() else 0.0
    lightest = facts.empty_mass if facts.empty_mass is not None else 0.6 * float(np.nanmax(series))
    loaded = max(float(np.nanmax(series)) - lightest, 0.0) if loads else 0.0
    own = float(np.hypot(LOAD_SHARE * loaded, used.share * extent))
    made = {"mass": _series(coarse, "mass", series)}
    zero = np.full(len(coarse), np.nan)
    for place, load in loads.items():
        start, end, _ = spans[place]
        zero[coarse.part(start, end)] = load.zero_fuel
    steps = {"mass": Step("mass", method, None, assumes=assumes, uncertainty=own, source="FAA-WB")}
    missing = {}
    if np.isfinite(zero).any():
        made["zero_fuel_mass"] = _series(coarse, "zero_fuel_mass", zero)
        steps["zero_fuel_mass"] = Step("zero_fuel_mass", "loading sheet", None, source="FAA-WB")
    if np.isfinite(arms).any():
        made["centre_of_gravity"] = _series(coarse, "centre_of_gravity", arms)
        method_cg = "loading sheet, fuel burnt at its station"
        steps["centre_of_gravity"] = Step("centre_of_gravity", method_cg, None, source="FAA-WB")
    else:
        missing = _no_cg(sheets)
    return Masses(made, steps, missing, {}, tuple(notes), _summary(first, series, method, loads, arms))


def _no_cg(sheets: Sequence[LoadingSheet]) -> dict[str, str]:
    reason = "the arms of all stations, the empty arm and the empty mass are needed" if sheets else "no loading sheet"
    return {"centre_of_gravity": reason}


def _range(facts: Facts, notes: list[str]) -> Masses:
    """Mass known only as a range: the step holds the heaviest, conservative for stall speed and limits by mass."""
    low, high = facts.empty_mass, facts.maximum_take_off
    missing = {"centre_of_gravity": "no loading sheet"}
    if high is None:
        missing["mass"] = "not recorded; no loading sheet, no mass given, no maximum take-off mass known"
        return Masses(missing=missing, notes=tuple(notes))
    text = "mass not known: taken as maximum take-off mass" + ("" if low is None else ", between empty and that")
    step = Step("mass", "range from empty to maximum take-off mass", None, assumes=text, constant=high, source="FAA-WB")
    return Masses({}, {"mass": step}, missing, {"mass": (low if low is not None else high, high)}, tuple(notes))


def _spans(first: FirstPass) -> list[tuple[float, float, float]]:
    """For each flight the time its mass holds for, up to half-way to its neighbours, and its take-off."""
    flights = first.track.flights
    if not flights:
        return [(-np.inf, np.inf, float(first.coarse.time[0]))]
    edges = [0.5 * (one.end + two.start) for one, two in itertools.pairwise(flights)]
    return [
        (low, high, flight.start)
        for low, high, flight in zip([-np.inf, *edges], [*edges, np.inf], flights, strict=True)
    ]


def _series(coarse: Coarse, name: str, values: Array) -> Channel:
    every = len(coarse.first) == len(coarse.recording.time)
    interval = max(1.0, coarse.recording.interval)
    return Channel(name, "", frozen(values), None if every else frozen(coarse.first), interval, found_by="derived")


def _summary(
    first: FirstPass,
    series: Array,
    method: str,
    loads: Mapping[int, _Load] | None = None,
    arms: Array | None = None,
) -> tuple[FlightMass, ...]:
    found = []
    time = first.coarse.time
    # where nothing tells flights apart the recording counts as one, without a number
    whole = [] if first.track.known or not len(time) else [Flight(0, float(time[0]), float(time[-1]))]
    for place, flight in enumerate(first.track.flights or whole):
        cells = first.coarse.part(flight.start - 1.0, flight.end + 1e-9)
        inside = np.arange(cells.start, cells.stop)[np.isfinite(series[cells])]
        if not len(inside):
            continue
        flown = series[inside]
        load = (loads or {}).get(place)
        centres: dict[str, float] = {}
        if arms is not None and np.isfinite(arms[inside]).any():
            centres = {"take_off": float(arms[inside][0]), "landing": float(arms[inside][-1])}
            if load is not None and load.zero_fuel is not None and load.moment is not None:
                centres["zero_fuel"] = load.moment / load.zero_fuel
        zero = load.zero_fuel if load is not None else None
        found.append(
            FlightMass(flight.number, float(flown[0]), float(flown[-1]), method, zero, MappingProxyType(centres))
        )
    return tuple(found)


# --- loading sheets ---------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Load:
    """One sheet worked out: without fuel, its moment, and the fuel on it (None where the sheet names none)."""

    zero_fuel: float
    moment: float | None
    fuel: float | None
    fuel_arm: float | None

    def total(self, used: _Used, at: int) -> float:
        if self.fuel is not None:
            return self.zero_fuel + self.fuel
        return self.zero_fuel + (float(used.left[at]) if used.left is not None and np.isfinite(used.left[at]) else 0.0)

    def moment_with_fuel(self, total: float) -> float:
        assert self.moment is not None
        assert self.fuel_arm is not None
        return self.moment + (total - self.zero_fuel) * self.fuel_arm


def _zero_fuel_notes(aircraft: Aircraft | None, loads: Mapping[int, _Load]) -> list[str]:
    """The centre of gravity without fuel against the envelope: no sample shows it, yet the loading must allow it."""
    rows = () if aircraft is None else aircraft.loading.envelope
    if not rows:
        return []
    mass, forward, aft = (np.array([float(row[column]) for row in rows]) for column in range(3))
    said = []
    for place, load in sorted(loads.items()):
        if load.moment is None:
            continue
        arm = load.moment / load.zero_fuel
        low, high = float(np.interp(load.zero_fuel, mass, forward)), float(np.interp(load.zero_fuel, mass, aft))
        if not low <= arm <= high:
            said.append(
                f"flight {place + 1}: without fuel, at {load.zero_fuel:.0f} kg, the centre of gravity would be at"
                f" {arm:.3f} m, outside its limits from {low:.3f} to {high:.3f} m"
            )
    return said


def _loads(
    first: FirstPass, aircraft: Aircraft | None, sheets: Sequence[LoadingSheet], notes: list[str]
) -> dict[int, _Load]:
    if not sheets or aircraft is None or aircraft.mass.empty is None:
        return {}
    from exceed.documents.loading import overloaded, sheet_for_flights, station_masses

    recording, flights = first.coarse.recording, first.track.flights
    start = recording.clock.start
    take_offs: list[datetime.datetime | None] = [
        None if start is None else datetime.datetime.fromtimestamp(start + flight.start, datetime.UTC)
        for flight in flights
    ] or [None]
    registration = recording.registration or aircraft.registration
    found = {}
    for place, sheet in sheet_for_flights(sheets, registration, recording.path, take_offs).items():
        weights = station_masses(sheet, aircraft)
        notes.extend(f"flight {place + 1}: {note}" for note in overloaded(sheet, aircraft))
        stations = aircraft.loading.stations
        tanks = {
            name for name in weights if stations[name].density is not None or sheet.stations[name].kind == "volume"
        }
        empty = float(aircraft.mass.empty)
        zero = empty + sum(weight for name, weight in weights.items() if name not in tanks)
        moment = None
        if aircraft.loading.empty_arm is not None:
            moment = empty * float(aircraft.loading.empty_arm)
            moment += sum(w * float(stations[name].arm) for name, w in weights.items() if name not in tanks)
        fuel = sum(weights[name] for name in tanks) if tanks else None
        at = [(weights[name], float(stations[name].arm)) for name in tanks]
        arm = None
        if at and fuel:
            # several tanks are taken to empty alike
            arm = sum(weight * place_ for weight, place_ in at) / fuel
        elif at or any(row.density is not None for row in stations.values()):
            arm = at[0][1] if at else next(float(row.arm) for row in stations.values() if row.density is not None)
        found[place] = _Load(zero, moment, fuel, arm)
    return found


# --- fuel used ----------------------------------------------------------------------------------------------------


def _fuel_used(first: FirstPass, aircraft: Aircraft | None, facts: Facts, notes: list[str]) -> _Used:
    coarse = first.coarse
    seams = first.coarse.recording.seams
    time = coarse.time.copy()
    for low, high in seams:
        time -= np.clip(coarse.time - low, 0.0, high - low)
    for name in ("fuel_mass", "fuel_volume"):
        if parts := _parts(coarse, name):
            scale = 1.0 if name == "fuel_mass" else _density(aircraft, facts, notes)
            left = np.sum([_smoothed(coarse, coarse.pick(part)) for part in parts], axis=0) * scale
            known = np.flatnonzero(np.isfinite(left))
            gauge: Array = np.interp(time, time[known], left[known])
            return _Used(gauge[0] - gauge, "fuel quantity", 0.05, gauge)
    for name in ("fuel_mass_flow", "fuel_volume_flow"):
        if parts := _parts(coarse, name):
            scale = 1.0 if name == "fuel_mass_flow" else _density(aircraft, facts, notes)
            flow = np.sum([coarse.statistics(part).mean for part in parts], axis=0) * scale
            burnt = fuel_burnt(time, flow)
            known = np.flatnonzero(np.isfinite(burnt))
            return _Used(np.interp(time, time[known], burnt[known]), "fuel flow integrated", 0.03)
    rate: Any = None if aircraft is None else aircraft.fuel_consumption
    if rate is not None:
        steady = float(rate) * (1.0 if rate.kind == "mass flow" else _density(aircraft, facts, notes))
        flown = np.zeros(len(coarse), dtype=bool)
        for flight in first.track.flights:
            flown[coarse.part(flight.start, flight.end)] = True
        flown |= not first.track.known
        passed = np.concatenate([[0.0], np.cumsum(np.diff(time) * flown[:-1])])
        return _Used(steady * passed, "fuel consumption of the aircraft file", 0.2)
    return _Used(np.zeros(len(coarse)), "no fuel used", 0.0)


def _parts(coarse: Coarse, name: str) -> list[str]:
    """The channel of a quantity, or those of several tanks or engines (fuel_mass_1, fuel_mass_2)."""
    if coarse.has(name):
        return [name]
    return [part for part in sorted(coarse.recording.channels) if base_name(part) == name and coarse.has(part)]


def _density(aircraft: Aircraft | None, facts: Facts, notes: list[str]) -> float:
    known = facts.values.get("fuel_density")
    if known is not None:
        return float(known)
    jet = aircraft is not None and aircraft.mach.maximum_operating is not None
    assumed = JET_FUEL_DENSITY if jet else AVGAS_DENSITY
    notes.append(f"density of the fuel not given: {assumed:.0f} kg/m3 assumed")
    return assumed


def _smoothed(coarse: Coarse, values: Array) -> Array:
    """Mean over SLOSH s to either side, of the readings that are there."""
    good = np.isfinite(values)
    sums = np.concatenate([[0.0], np.cumsum(np.where(good, values, 0.0))])
    counts = np.concatenate([[0], np.cumsum(good)])
    left, right = coarse.window(SLOSH)
    number = counts[right + 1] - counts[left]
    with np.errstate(invalid="ignore", divide="ignore"):
        mean: Array = np.where(number > 0, (sums[right + 1] - sums[left]) / number, np.nan)
    return mean


def mass_summary(trace: Trace) -> list[dict[str, Any]]:
    """Per flight {flight, take_off, landing, zero_fuel, centre_of_gravity, unit, method}, kg, for the summary."""
    return [
        {
            "flight": row.flight,
            "take_off": row.take_off,
            "landing": row.landing,
            "zero_fuel": row.zero_fuel,
            "centre_of_gravity": dict(row.centre_of_gravity),
            "unit": "kg",
            "method": row.method,
        }
        for row in trace.masses
    ]
