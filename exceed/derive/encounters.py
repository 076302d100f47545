"""Gusts and touchdowns: functions of `DERIVATIONS` that give a value only where there is one; pure, (n,) in SI."""

from __future__ import annotations

import numpy as np

from exceed.core.intervals import Intervals
from exceed.core.phases import PHASE_CODE, PhaseTrack
from exceed.core.recording import Array
from exceed.physics import atmosphere, gust

GUST_BANK = np.radians(30.0)  # steeper is a manoeuvre; common practice, no source
FLAPS_UP = np.radians(1.0)


def gust_velocity(
    time: Array,
    load_factor: Array,
    equivalent_airspeed: Array,
    mass: Array,
    wing_area: float,
    mean_chord: float,
    lift_curve_slope: float,
    airborne: Intervals,
    phases: PhaseTrack,
    pressure_altitude: Array | None = None,
    static_air_temperature: Array | None = None,
    bank_angle: Array | None = None,
    flap_angle: Array | None = None,
) -> Array:
    """Derived equivalent gust velocity in excursions of less than two seconds; null elsewhere, and where the aeroplane
    manoeuvres, banks steeply or has flaps out. Source: [NACA-1206], [TWO-SECOND-RULE].
    """
    result = np.full(len(time), np.nan)
    fits = airborne.contains(time) & (phases.at(time) != PHASE_CODE["manoeuvring"]) & np.isfinite(load_factor)
    undisturbed = np.ones(len(time))
    with np.errstate(invalid="ignore"):
        if bank_angle is not None:
            bank = np.abs((bank_angle + np.pi) % (2.0 * np.pi) - np.pi)
            fits &= bank <= GUST_BANK
            undisturbed = np.where(bank <= GUST_BANK, 1.0 / np.cos(np.minimum(bank, GUST_BANK)), undisturbed)
        if flap_angle is not None:
            fits &= np.abs(flap_angle) <= FLAPS_UP
    increment = np.where(np.isfinite(load_factor), load_factor - undisturbed, np.nan)
    # a datum out by a hundredth of g would otherwise keep the record on one side of the mean for minutes
    increment = np.where(np.abs(increment) <= gust.USUAL_DEAD_ZONE, 0.0, increment)
    found = gust.peaks_between_means(time, increment)
    short = gust.is_gust(found.duration)
    if not short.any():
        return result
    first, last = found.first[short], found.last[short]
    inside = np.zeros(len(time) + 1, dtype=np.int64)
    np.add.at(inside, first, 1)
    np.add.at(inside, last + 1, -1)
    place = np.flatnonzero((np.cumsum(inside[:-1]) > 0) & fits)
    altitude = np.zeros(len(place)) if pressure_altitude is None else pressure_altitude[place]
    air = atmosphere.standard_temperature(altitude) if static_air_temperature is None else static_air_temperature[place]
    density = atmosphere.density(atmosphere.static_pressure(altitude), air)
    result[place] = gust.derived_gust_velocity(
        increment[place], equivalent_airspeed[place], mass[place], wing_area, mean_chord, lift_curve_slope, density
    )
    return result


def touchdown_load_factor(time: Array, recorded_load_factor: Array, touchdown_windows: Intervals) -> Array:
    """The accelerometer as recorded, round each touchdown only."""
    return np.where(touchdown_windows.contains(time), recorded_load_factor, np.nan)


def touchdown_sink_rate_radio(time: Array, height_above_ground: Array, touchdowns: Array, width: float) -> Array:
    """Sink rate over the last second before each touchdown, next to it: least squares on radio height."""
    result = np.full(len(time), np.nan)
    for when in _within(touchdowns, time):
        last = (time >= when - width) & (time <= when) & np.isfinite(height_above_ground)
        if last.sum() >= 2:
            run = time[last] - np.mean(time[last])
            result[np.abs(time - when) <= 0.5 * width] = -np.sum(run * height_above_ground[last]) / np.sum(run**2)
    return result


def touchdown_sink_rate(time: Array, vertical_speed: Array, touchdowns: Array, width: float) -> Array:
    """Mean sink rate over the last second before each touchdown, at the samples next to it."""
    result = np.full(len(time), np.nan)
    for when in _within(touchdowns, time):
        last = (time >= when - width) & (time <= when) & np.isfinite(vertical_speed)
        if last.any():
            result[np.abs(time - when) <= 0.5 * width] = -np.mean(vertical_speed[last])
    return result


def _within(touchdowns: Array, time: Array) -> list[float]:
    if len(time) == 0:
        return []
    inside = (touchdowns >= time[0] - 5.0) & (touchdowns <= time[-1] + 5.0)
    found: list[float] = touchdowns[inside].tolist()
    return found
