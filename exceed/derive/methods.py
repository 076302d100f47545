"""The functions of `DERIVATIONS` that are more than one of physics: pure, arrays (n,) in SI, NaN where unknown.

A parameter is named for a quantity, for `recorded_QUANTITY` (the channel beneath a correction), for `time`, or for a
fact. One with the default None is used where it can be had.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from exceed.core.constants import EARTH_RADIUS, STANDARD_GRAVITY
from exceed.core.intervals import Intervals
from exceed.core.phases import PHASE_CODE, PhaseTrack
from exceed.core.recording import Array
from exceed.physics import airspeed, atmosphere, gust, kinematics, load_limits, smoothing, stall, tables
from exceed.physics.load_limits import LoadFactorTable
from exceed.physics.stall import StallTable

GUST_BANK = np.radians(30.0)  # steeper is a manoeuvre; common practice, no source
FLAPS_UP = np.radians(1.0)


def slope(time: Array, values: Array, width: float, max_gap: float) -> Array:
    """Rate of change by local least-squares parabolas over `width` s to either side; the reach is `width`.

    (n,) in, (n,) out. Even spacing without holes takes a short way to the same numbers. Source: [SAVITZKY-GOLAY].
    """
    count = len(time)
    if count < 2:
        return np.full(count, np.nan)
    step = float(time[-1] - time[0]) / (count - 1)
    half = int(width * (1.0 + 1e-6) / step) if step > 0.0 else 0
    even = half >= 1 and step <= max_gap and count > 2 * half
    if even:
        spacing = np.diff(time)
        even = float(np.max(spacing) - np.min(spacing)) < 1e-4 * step and bool(np.isfinite(values).all())
    if not even:
        return smoothing.smooth_derivative(time, values, width, max_gap)
    offsets = np.arange(half, -half - 1, -1, dtype=np.float64)
    kernel = offsets / (np.sum(offsets**2) * step)
    result = np.convolve(values, kernel, mode="same")
    edge = min(2 * half + 1, count)
    result[:half] = smoothing.smooth_derivative(time[:edge], values[:edge], width, max_gap)[:half]
    result[-half:] = smoothing.smooth_derivative(time[-edge:], values[-edge:], width, max_gap)[-half:]
    return result


def angle_slope(time: Array, angle: Array, width: float, max_gap: float) -> Array:
    """Rate of change of an angle that wraps, rad/s; as `slope`."""
    return slope(time, smoothing.unwrap_angle(angle), width, max_gap)


def _flown(time: Array, airborne: Intervals, values: Array) -> Array:
    return np.where(airborne.contains(time), values, np.nan)


# --- airspeed and air -------------------------------------------------------------------------------------------


def as_it_is(values: Array) -> Array:
    return np.array(values, dtype=np.float64)


def calibrated_taken_as_indicated(indicated_airspeed: Array) -> Array:
    return as_it_is(indicated_airspeed)


def indicated_taken_as_calibrated(calibrated_airspeed: Array) -> Array:
    return as_it_is(calibrated_airspeed)


def standard_air_temperature(pressure_altitude: Array) -> Array:
    return atmosphere.standard_temperature(pressure_altitude)


def total_air_temperature(recorded_static_air_temperature: Array, mach: Array) -> Array:
    return airspeed.total_air_temperature(recorded_static_air_temperature, mach)


def mach_from_pressures(recorded_impact_pressure: Array, recorded_static_pressure: Array) -> Array:
    return airspeed.mach_from_impact_pressure(recorded_impact_pressure, recorded_static_pressure)


def pressure_altitude_from_geometric(geometric_altitude: Array) -> Array:
    return as_it_is(geometric_altitude)


def height_above_aerodrome(time: Array, pressure_altitude: Array, field_levels: tuple[Array, Array]) -> Array:
    """Height above the field of the nearer take-off or landing; levels of `field_levels` (instants, levels)."""
    return pressure_altitude - _nearest(time, *field_levels)


def height_above_aerodrome_geometric(
    time: Array, geometric_altitude: Array, field_levels: tuple[Array, Array]
) -> Array:
    return geometric_altitude - _nearest(time, *field_levels)


def _nearest(time: Array, instants: Array, levels: Array) -> Array:
    if len(instants) == 0:
        return np.full(len(time), np.nan)
    middle = 0.5 * (instants[1:] + instants[:-1])
    found: Array = levels[np.searchsorted(middle, time)]
    return found


def vertical_speed(time: Array, pressure_altitude: Array, width: float, max_gap: float) -> Array:
    return slope(time, pressure_altitude, width, max_gap)


def vertical_speed_geometric(time: Array, geometric_altitude: Array, width: float, max_gap: float) -> Array:
    return slope(time, geometric_altitude, width, max_gap)


# --- motion over the ground and turning -------------------------------------------------------------------------


def _over_ground(time: Array, latitude: Array, longitude: Array, width: float, max_gap: float) -> tuple[Array, Array]:
    north = slope(time, latitude, width, max_gap) * EARTH_RADIUS
    east = angle_slope(time, longitude, width, max_gap) * EARTH_RADIUS * np.cos(latitude)
    return north, east


def ground_speed(time: Array, latitude: Array, longitude: Array, width: float, max_gap: float) -> Array:
    return np.hypot(*_over_ground(time, latitude, longitude, width, max_gap))


def track_angle(time: Array, latitude: Array, longitude: Array, width: float, max_gap: float) -> Array:
    north, east = _over_ground(time, latitude, longitude, width, max_gap)
    return np.where(np.hypot(north, east) > 1.0, np.mod(np.arctan2(east, north), 2.0 * np.pi), np.nan)


def turn_rate_from_heading(time: Array, heading: Array, width: float, max_gap: float) -> Array:
    return angle_slope(time, heading, width, max_gap)


def turn_rate_from_track(time: Array, track_angle: Array, width: float, max_gap: float) -> Array:
    return angle_slope(time, track_angle, width, max_gap)


def roll_rate(time: Array, bank_angle: Array, width: float, max_gap: float) -> Array:
    return angle_slope(time, bank_angle, width, max_gap)


def pitch_rate(
    time: Array, pitch_angle: Array, bank_angle: Array, heading: Array, width: float, max_gap: float
) -> Array:
    """Body pitch rate of the attitude: q = dΘ cos Φ + dΨ cos Θ sin Φ. Source: [AXES]."""
    nod, swing = slope(time, pitch_angle, width, max_gap), angle_slope(time, heading, width, max_gap)
    return nod * np.cos(bank_angle) + swing * np.cos(pitch_angle) * np.sin(bank_angle)


def yaw_rate(time: Array, pitch_angle: Array, bank_angle: Array, heading: Array, width: float, max_gap: float) -> Array:
    """Body yaw rate of the attitude: r = dΨ cos Θ cos Φ - dΘ sin Φ. Source: [AXES]."""
    nod, swing = slope(time, pitch_angle, width, max_gap), angle_slope(time, heading, width, max_gap)
    return swing * np.cos(pitch_angle) * np.cos(bank_angle) - nod * np.sin(bank_angle)


def roll_acceleration(time: Array, recorded_roll_rate: Array, width: float, max_gap: float) -> Array:
    return slope(time, recorded_roll_rate, width, max_gap)


def pitch_acceleration(time: Array, recorded_pitch_rate: Array, width: float, max_gap: float) -> Array:
    return slope(time, recorded_pitch_rate, width, max_gap)


def yaw_acceleration(time: Array, recorded_yaw_rate: Array, width: float, max_gap: float) -> Array:
    return slope(time, recorded_yaw_rate, width, max_gap)


# --- load factor ------------------------------------------------------------------------------------------------


def load_factor_moved(
    recorded_load_factor: Array,
    recorded_roll_rate: Array,
    recorded_pitch_rate: Array,
    recorded_yaw_rate: Array,
    roll_acceleration: Array,
    pitch_acceleration: Array,
    accelerometer_position: Array,
) -> Array:
    return kinematics.load_factor_at_cg(
        recorded_load_factor,
        recorded_roll_rate,
        recorded_pitch_rate,
        recorded_yaw_rate,
        roll_acceleration,
        pitch_acceleration,
        accelerometer_position,
    )


def _path(
    time: Array, true_airspeed: Array, vertical_speed: Array, width: float, max_gap: float
) -> tuple[Array, Array]:
    """Load factor upwards in the vertical plane, cos γ + V dγ/g, and cos γ."""
    with np.errstate(invalid="ignore", divide="ignore"):
        ratio = np.where(true_airspeed > 5.0, vertical_speed / true_airspeed, np.nan)
    path = np.arcsin(np.clip(ratio, -1.0, 1.0))
    bend = slope(time, path, width, max_gap)
    return np.cos(path) + true_airspeed * bend / STANDARD_GRAVITY, np.cos(path)


def load_factor_from_path_and_turn(
    time: Array,
    true_airspeed: Array,
    vertical_speed: Array,
    bank_angle: Array,
    turn_rate: Array,
    width: float,
    max_gap: float,
) -> Array:
    """Path curvature upwards and sideways, both seen along the aeroplane's normal axis: up cos Φ + side sin Φ.

    Source: [FLIGHT-PATH]; n cos Φ = V dγ/g + cos γ and n sin Φ = V dχ cos γ / g, put together.
    """
    up, level = _path(time, true_airspeed, vertical_speed, width, max_gap)
    side = true_airspeed * turn_rate * level / STANDARD_GRAVITY
    return up * np.cos(bank_angle) + side * np.sin(bank_angle)


def load_factor_from_path_and_bank(
    time: Array, true_airspeed: Array, vertical_speed: Array, bank_angle: Array, width: float, max_gap: float
) -> Array:
    """As `kinematics.load_factor_from_flight_path`: n = (V dγ/g + cos γ) / cos Φ, NaN near a knife edge."""
    up, _ = _path(time, true_airspeed, vertical_speed, width, max_gap)
    cosine = np.cos(bank_angle)
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(np.abs(cosine) >= np.cos(np.radians(85.0)), up / cosine, np.nan)


def load_factor_from_path(
    time: Array, true_airspeed: Array, vertical_speed: Array, turn_rate: Array, width: float, max_gap: float
) -> Array:
    """Size from the path alone, with the sign of its upward part. Source: [FLIGHT-PATH]."""
    up, level = _path(time, true_airspeed, vertical_speed, width, max_gap)
    side = true_airspeed * turn_rate * level / STANDARD_GRAVITY
    # near weightlessness the side part is all noise of the turn rate, which no lift could have made
    return np.sign(up) * np.hypot(up, np.where(np.abs(up) > 0.5, side, 0.0))


def load_factor_wings_level(time: Array, vertical_speed: Array, width: float, max_gap: float) -> Array:
    return 1.0 + slope(time, vertical_speed, width, max_gap) / STANDARD_GRAVITY


# --- stall and limits -------------------------------------------------------------------------------------------


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


# --- gusts and touchdown ----------------------------------------------------------------------------------------


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
            fits &= ~(bank > GUST_BANK)
            undisturbed = np.where(bank <= GUST_BANK, 1.0 / np.cos(np.minimum(bank, GUST_BANK)), undisturbed)
        if flap_angle is not None:
            fits &= ~(np.abs(flap_angle) > FLAPS_UP)
    increment = np.where(np.isfinite(load_factor), load_factor - undisturbed, np.nan)
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
