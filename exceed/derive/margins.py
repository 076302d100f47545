"""Stall, limits in force, mass, configuration: functions of `DERIVATIONS`; pure, (n,) in SI, NaN where unknown."""

from __future__ import annotations

from typing import Any

import numpy as np

from exceed.core.intervals import Intervals
from exceed.core.recording import Array
from exceed.physics import load_limits, stall, tables
from exceed.physics.load_limits import LoadFactorTable
from exceed.physics.stall import StallTable


def _flown(time: Array, airborne: Intervals, values: Array) -> Array:
    return np.where(airborne.contains(time), values, np.nan)


def _flaps(flap_angle: Array | None, like: Array) -> Array:
    return np.zeros(np.shape(like)) if flap_angle is None else flap_angle


def stall_speed(
    time: Array,
    load_factor: Array,
    mass: Array,
    stall_table: StallTable,
    airborne: Intervals,
    flap_angle: Array | None = None,
    pressure_altitude: Array | None = None,
) -> Array:
    """Calibrated airspeed of the stall at the sample's load factor; null on the ground. Source: [CONSTANT-CL]."""
    flaps = _flaps(flap_angle, load_factor)
    if pressure_altitude is None:
        # at sea level equivalent is calibrated
        return _flown(time, airborne, stall.stall_speed_equivalent(load_factor, mass, flaps, stall_table))
    return _flown(time, airborne, stall.stall_speed(load_factor, mass, flaps, pressure_altitude, stall_table))


def stall_speed_ratio(
    time: Array,
    calibrated_airspeed: Array,
    mass: Array,
    stall_table: StallTable,
    airborne: Intervals,
    flap_angle: Array | None = None,
) -> Array:
    """Calibrated airspeed over the 1 g stall speed at this mass and these flaps. Source: [CONSTANT-CL]."""
    one_g = stall.stall_speed_1g(mass, _flaps(flap_angle, calibrated_airspeed), stall_table)
    return _flown(time, airborne, stall.stall_speed_ratio(calibrated_airspeed, one_g))


def _limit_keys(time: Array, keys: tuple[Array | None, ...]) -> tuple[Array, ...]:
    flaps, mass, speed, brakes = keys
    nothing = np.full(len(time), np.nan)
    still = np.zeros(len(time))
    return (
        still if flaps is None else flaps,
        nothing if mass is None else mass,
        nothing if speed is None else speed,
        still if brakes is None else brakes,
    )


def load_factor_maximum(
    time: Array,
    load_factor_table: LoadFactorTable,
    rolling: tuple[float, float] | None = None,
    limit_flap_angle: Array | None = None,
    limit_mass: Array | None = None,
    limit_airspeed: Array | None = None,
    limit_airbrakes: Array | None = None,
    limit_roll_rate: Array | None = None,
) -> Array:
    """Positive limit load factor in force: rows by flaps, mass, speed, airbrakes; the manual's reduction while rolling.

    Source: [COMMON-PRACTICE], see `load_limits.load_factor_maximum`.
    """
    keys = _limit_keys(time, (limit_flap_angle, limit_mass, limit_airspeed, limit_airbrakes))
    limit = _limit(load_limits.load_factor_maximum, keys, load_factor_table)
    if rolling is not None and limit_roll_rate is not None:
        limit = load_limits.load_factor_maximum_rolling(limit, limit_roll_rate, *rolling)
    return np.broadcast_to(limit, time.shape)


def load_factor_minimum(
    time: Array,
    load_factor_table: LoadFactorTable,
    limit_flap_angle: Array | None = None,
    limit_mass: Array | None = None,
    limit_airspeed: Array | None = None,
    limit_airbrakes: Array | None = None,
) -> Array:
    """Negative limit load factor in force. Source: [COMMON-PRACTICE], see `load_limits.load_factor_minimum`."""
    keys = _limit_keys(time, (limit_flap_angle, limit_mass, limit_airspeed, limit_airbrakes))
    return np.broadcast_to(_limit(load_limits.load_factor_minimum, keys, load_factor_table), time.shape)


def _limit(function: Any, keys: tuple[Array, ...], table: LoadFactorTable) -> Array:
    # a key that keeps one value all through the block, as flaps and mass mostly do, is worked out once
    flat = [key[:1] if (len(key) and (key[0] == key).all()) or np.isnan(key).all() else key for key in keys]
    found: Array = function(*flat, table)
    return found


def manoeuvring_speed(time: Array, manoeuvring: Any, manoeuvring_over: Array | None = None) -> Array:
    """V_A by the manual's table, in the kind of airspeed it is given in. Source: [DEFINITION]."""
    if isinstance(manoeuvring, float):
        return np.full(len(time), manoeuvring)
    over = np.zeros(len(time)) if manoeuvring_over is None else manoeuvring_over
    if isinstance(manoeuvring, tables.Table):
        return tables.table_value(manoeuvring, over)
    _, value, mass = manoeuvring
    return stall.speed_at_mass(value, over, mass)


def zero_fuel_mass(mass: Array, recorded_fuel_mass: Array) -> Array:
    return mass - recorded_fuel_mass


def gear_moving(time: Array, gear_down: Array, width: float) -> Array:
    """1 within `width` s before the gear shows down, and after it ceases to. A state; NaN where gear down is."""
    known = np.isfinite(gear_down)
    down = gear_down > 0.5
    change = np.flatnonzero((down[1:] != down[:-1]) & known[1:] & known[:-1])
    moving = np.zeros(len(time), dtype=bool)
    for place in change.tolist():
        when = time[place + 1]
        moving |= (time >= when) & (time <= when + width) if down[place] else (time <= when) & (time >= when - width)
    return np.where(known, moving.astype(np.float64), np.nan)
