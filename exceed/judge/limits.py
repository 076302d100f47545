"""Limits in all their written forms -> a series along a block.

A value, an aircraft fact (with its tables over altitude, mass or flaps), a table over a quantity, or one quantity
relative to another.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from exceed.core.intervals import Array
from exceed.core.trace import Trace
from exceed.documents.limits import ConstantLimit, Limit, RelativeLimit, TableLimit
from exceed.judge.compiled import Series

if TYPE_CHECKING:
    from exceed.documents.aircraft import Aircraft
    from exceed.judge.block import Block

# within one degree of zero flaps are up, and the smallest listed setting at or above the angle less one degree holds
FLAP_SLACK = np.radians(1.0)
# aircraft facts that the derive stage works out sample by sample (rows by flaps, mass, speed, airbrakes, rolling)
DERIVED_FACTS = {
    "aircraft.load_factor.maximum": "load_factor_maximum",
    "aircraft.load_factor.minimum": "load_factor_minimum",
}
# what a table over a fact's quantity is called in the trace
OVER = {"flaps": "flap_angle", "pressure_altitude": "pressure_altitude", "mass": "mass"}


@dataclass(frozen=True, slots=True)
class FoundLimit:
    """A limit made ready, or why it cannot be: `missing` (not applicable) or `unassessed`."""

    series: Series | None = None
    source: str = ""
    assumed: bool = False
    airspeed: str | None = None
    grid_names: tuple[str, ...] = ()
    missing: str | None = None
    unassessed: str | None = None
    notes: tuple[str, ...] = ()
    last_flaps: float | None = None  # largest setting that it has a row for, rad


def constant(value: float) -> Series:
    return Series(frozenset(), lambda block: value)


def follow(name: str) -> Series:
    """A quantity of the trace, sample by sample."""
    return Series(frozenset({name}), lambda block: block.values[name])


def linear(name: str, x: Array, y: Array) -> Series:
    """A table over a quantity, linear between its points; beyond its ends the last value is held."""

    def of(block: Block) -> Array:
        return np.interp(block.values[name], x, y)

    return Series(frozenset({name}), of)


def step(name: str, x: Array, y: Array) -> Series:
    """A table over a quantity: each value holds from its x up to the next one."""

    def of(block: Block) -> Array:
        at = block.values[name]
        index = np.clip(np.searchsorted(x, at, side="right") - 1, 0, len(x) - 1)
        return np.where(np.isnan(at), np.nan, y[index])

    return Series(frozenset({name}), of)


def by_flaps(settings: Array, values: Array, none_when_up: bool) -> Series:
    """Rows by flap setting: the smallest listed setting >= angle - 1 deg holds, past the last the last one.

    none_when_up : with flaps within one degree of zero there is no limit (+inf).
    """

    def of(block: Block) -> Array:
        angle = np.abs(block.values["flap_angle"])
        index = np.clip(np.searchsorted(settings, angle - FLAP_SLACK, side="left"), 0, len(settings) - 1)
        held = values[index]
        if none_when_up:
            held = np.where(angle <= FLAP_SLACK, np.inf, held)
        return np.where(np.isnan(angle), np.nan, held)

    return Series(frozenset({"flap_angle"}), of)


def relative(name: str, times: float, plus: float) -> Series:
    return Series(frozenset({name}), lambda block: block.values[name] * times + plus)


def root_of_mass(value: float, mass: float) -> Series:
    """A speed that goes with the root of mass, where the manual says so."""
    return Series(frozenset({"mass"}), lambda block: value * np.sqrt(block.values["mass"] / mass))


def why_missing(trace: Trace, name: str) -> str:
    """Why a quantity cannot be had, in words."""
    words = name.replace("_", " ")
    why = trace.missing.get(name) or "not recorded"
    # the reason alone would not say what is missing
    if why.startswith("not recorded"):
        return f"{words} {why}"
    return why if words in why else f"{words}: {why}"


def find_limit(limit: Limit, trace: Trace, aircraft: Aircraft | None) -> FoundLimit:
    """The series of a rule's limit, whichever of its four forms it is written in."""
    if isinstance(limit, ConstantLimit):
        return FoundLimit(constant(float(limit.value)), str(limit.value), airspeed=limit.value.airspeed)
    if isinstance(limit, TableLimit):
        return _table(limit, trace)
    if isinstance(limit, RelativeLimit):
        name = limit.quantity
        if not trace.has(name):
            return FoundLimit(unassessed=why_missing(trace, name))
        plus = float(limit.plus) if limit.plus is not None else 0.0
        words = name.replace("_", " ") if float(limit.times) == 1.0 else f"{limit.times} x {name.replace('_', ' ')}"
        words += f" + {limit.plus}" if limit.plus is not None else ""
        return FoundLimit(relative(name, float(limit.times), plus), words, grid_names=(name,))
    return _fact(limit.fact, trace, aircraft)


def _table(limit: Any, trace: Trace) -> FoundLimit:
    name = limit.over
    if not trace.has(name):
        return FoundLimit(unassessed=why_missing(trace, name))
    x = np.array([float(pair[0]) for pair in limit.points])
    y = np.array([float(pair[1]) for pair in limit.points])
    series = linear(name, x, y) if limit.between == "linear" else step(name, x, y)
    return FoundLimit(series, f"table over {name.replace('_', ' ')}", airspeed=limit.points[0][1].airspeed)


def _fact(name: str, trace: Trace, aircraft: Aircraft | None) -> FoundLimit:
    if aircraft is None:
        return FoundLimit(missing="no limits known for this aeroplane")
    fact = aircraft.fact(name)
    about: dict[str, Any] = {"source": name, "assumed": fact.assumed, "airspeed": fact.airspeed}
    if fact.value is None:
        return FoundLimit(missing=fact.missing, **about)
    if name in DERIVED_FACTS:
        derived = DERIVED_FACTS[name]
        if not trace.has(derived):
            return FoundLimit(unassessed=why_missing(trace, derived), **about)
        assumes = trace.steps[derived].assumes
        settings = [float(row.flaps) for row in fact.value if row.flaps is not None]
        last = max(settings) if settings and trace.has("flap_angle") else None
        return FoundLimit(follow(derived), notes=(assumes,) if assumes else (), last_flaps=last, **about)
    if name.startswith("aircraft.loading."):
        return _centre_of_gravity(name, fact.value, trace, about)
    if name == "aircraft.speeds.flaps_extended":
        return _flap_speeds(fact.value, trace, aircraft, about)
    value = fact.value
    if hasattr(value, "points"):
        return _speed(value, trace, about)
    return FoundLimit(constant(float(value)), **about)


def _speed(limit: Any, trace: Trace, about: dict[str, Any]) -> FoundLimit:
    if limit.points:
        over = OVER[limit.over]
        if not trace.has(over):
            return FoundLimit(unassessed=why_missing(trace, over), **about)
        x = np.array([float(pair[0]) for pair in limit.points])
        y = np.array([float(pair[1]) for pair in limit.points])
        if over == "flap_angle":
            return FoundLimit(by_flaps(x, y, none_when_up=False), last_flaps=float(x[-1]), **about)
        return FoundLimit(linear(over, x, y), **about)
    if limit.scale == "sqrt_mass":
        if not trace.has("mass"):
            return FoundLimit(unassessed=why_missing(trace, "mass"), **about)
        return FoundLimit(root_of_mass(float(limit.value), float(limit.mass)), **about)
    return FoundLimit(constant(float(limit.value)), **about)


def _flap_speeds(rows: Any, trace: Trace, aircraft: Aircraft, about: dict[str, Any]) -> FoundLimit:
    if aircraft.flaps == "not_recorded" or not trace.has("flap_angle"):
        return FoundLimit(unassessed=why_missing(trace, "flap_angle"), **about)
    if len(rows) == 1 and rows[0].flaps is None:
        settings = np.array([np.pi])
    else:
        settings = np.array([float(row.flaps) for row in rows])
    series = by_flaps(settings, np.array([float(row.maximum) for row in rows]), none_when_up=True)
    return FoundLimit(series, last_flaps=float(settings[-1]), **about)


def _centre_of_gravity(name: str, rows: Any, trace: Trace, about: dict[str, Any]) -> FoundLimit:
    if not trace.has("mass"):
        return FoundLimit(unassessed=why_missing(trace, "mass"), **about)
    column = 1 if name.endswith("forward") else 2
    x = np.array([float(row[0]) for row in rows])
    y = np.array([float(row[column]) for row in rows])
    return FoundLimit(linear("mass", x, y), **about)
