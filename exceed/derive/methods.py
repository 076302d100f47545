"""Air, motion and load factor: functions of `DERIVATIONS` that are more than one function of physics.

Pure, arrays (n,) in SI, NaN where unknown. A parameter is named for a quantity, for `recorded_QUANTITY` (the channel
beneath a correction), for `time`, or for a fact. One with the default None is used where it can be had.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from exceed.core.constants import EARTH_RADIUS, STANDARD_GRAVITY
from exceed.core.intervals import runs
from exceed.core.recording import Array
from exceed.physics import airspeed, atmosphere, kinematics, smoothing, turning

MOST_PATCHES = 8  # more of them cost more than the long way for all
# a step of vertical speed that asks for more than this, beside a value that did not change, is an update come late: a
# body does not go from exactly no change to that at once (judgement, seen in surveillance data)
LATE_STEP = STANDARD_GRAVITY
HELD = 2  # repeats that make a value held
# the path is compared with what a window so much wider makes of it, which together is how far its methods look
WIDER = 2.5
PATH_LOOKS = 2.5


def slope(time: Array, values: Array, width: float, max_gap: float) -> Array:
    """Rate of change by local least-squares parabolas over `width` s to either side; the reach is `width`.

    (n,) in, (n,) out. Evenly spaced samples take a short way to the same numbers: there a parabola's slope at its
    middle is a straight line's, so one kernel serves all. Source: [SAVITZKY-GOLAY].
    """
    count = len(time)
    if count < 2:
        return np.full(count, np.nan)
    step = float(time[-1] - time[0]) / (count - 1)
    half = int(width * (1.0 + 1e-6) / step) if step > 0.0 else 0
    if half < 1 or step > max_gap or count <= 2 * half:
        return smoothing.smooth_derivative(time, values, width, max_gap)
    spacing = np.diff(time)
    if float(np.max(spacing) - np.min(spacing)) >= 1e-4 * step:
        return smoothing.smooth_derivative(time, values, width, max_gap)
    # a missing sample, or an end, within reach leaves another set of samples: those places take the long way
    holed = ~np.isfinite(values)
    holed[0] = holed[-1] = True
    near = np.concatenate([[0], np.cumsum(holed)])
    own = np.arange(count)
    touched = near[np.minimum(own + half + 1, count)] > near[np.maximum(own - half, 0)]
    patches = runs(touched)
    if len(patches) > MOST_PATCHES or 2 * np.count_nonzero(touched) > count:
        return smoothing.smooth_derivative(time, values, width, max_gap)
    offsets = np.arange(half, -half - 1, -1, dtype=np.float64)
    kernel = offsets / (np.sum(offsets**2) * step)
    result = np.convolve(np.where(np.isfinite(values), values, 0.0), kernel, mode="same")
    for first, stop in patches.tolist():
        low, high = max(first - half, 0), min(stop + half, count)
        part = smoothing.smooth_derivative(time[low:high], values[low:high], width, max_gap)
        result[first:stop] = part[first - low : stop - low]
    return result


def angle_slope(time: Array, angle: Array, width: float, max_gap: float) -> Array:
    """Rate of change of an angle that wraps, rad/s; as `slope`."""
    return slope(time, smoothing.unwrap_angle(angle), width, max_gap)


# --- airspeed and air -------------------------------------------------------------------------------------------


def as_it_is(values: Array) -> Array:
    return np.array(values, dtype=np.float64)


def calibrated_taken_as_indicated(indicated_airspeed: Array) -> Array:
    return as_it_is(indicated_airspeed)


def calibrated_airspeed_of_equivalent(recorded_equivalent_airspeed: Array, pressure_altitude: Array) -> Array:
    return airspeed.calibrated_airspeed_from_equivalent(recorded_equivalent_airspeed, pressure_altitude)


def calibrated_airspeed_of_mach(recorded_mach: Array, pressure_altitude: Array) -> Array:
    return airspeed.calibrated_airspeed_from_mach(recorded_mach, pressure_altitude)


def calibrated_airspeed_of_true(
    recorded_true_airspeed: Array, pressure_altitude: Array, static_air_temperature: Array
) -> Array:
    return airspeed.calibrated_airspeed_from_true(recorded_true_airspeed, pressure_altitude, static_air_temperature)


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


def load_factor_moved_spread(
    recorded_load_factor: Array,
    recorded_roll_rate: Array,
    recorded_pitch_rate: Array,
    recorded_yaw_rate: Array,
    roll_acceleration: Array,
    pitch_acceleration: Array,
    accelerometer_position: Array,
) -> Array:
    """Standard uncertainty of what differentiated rates move: the share of angular acceleration, taken as uniform.

    Between samples a rate may bend as it likes: a slope of samples 1/8 s apart may be all of the true acceleration's
    size off, as in a pull that is held for a moment. (n,), 1. [JCGM-100] 4.3.7 for the uniform distribution.
    """
    still = np.zeros_like(recorded_load_factor)
    with_spin = load_factor_moved(
        recorded_load_factor,
        recorded_roll_rate,
        recorded_pitch_rate,
        recorded_yaw_rate,
        roll_acceleration,
        pitch_acceleration,
        accelerometer_position,
    )
    without = load_factor_moved(
        recorded_load_factor,
        recorded_roll_rate,
        recorded_pitch_rate,
        recorded_yaw_rate,
        still,
        still,
        accelerometer_position,
    )
    spread: Array = np.abs(with_spin - without) / np.sqrt(3.0)
    return spread


def _path(
    time: Array, true_airspeed: Array, vertical_speed: Array, width: float, max_gap: float
) -> tuple[Array, Array]:
    """Load factor upwards in the vertical plane, cos γ + V dγ/g, and cos γ."""
    with np.errstate(invalid="ignore", divide="ignore"):
        ratio = np.where(true_airspeed > 5.0, vertical_speed / true_airspeed, np.nan)
    path = np.arcsin(np.clip(ratio, -1.0, 1.0))
    bend = np.where(_late(time, vertical_speed, width), np.nan, slope(time, path, width, max_gap))
    return np.cos(path) + true_airspeed * bend / STANDARD_GRAVITY, np.cos(path)


def _late(time: Array, values: Array, width: float) -> NDArray[np.bool_]:
    """Where a slope over `width` would take in a late update: a step too steep for a body, beside held values."""
    count = len(time)
    touched = np.zeros(count, dtype=bool)
    if count < HELD + 2:
        return touched
    spacing = np.diff(time)
    change = np.diff(values)
    with np.errstate(invalid="ignore"):
        steep = np.abs(change) > LATE_STEP * spacing
    still = change == 0.0
    before, after = np.zeros(count - 1, dtype=bool), np.zeros(count - 1, dtype=bool)
    before[HELD:] = np.logical_and.reduce([still[HELD - k : count - 1 - k] for k in range(1, HELD + 1)])
    after[: count - 1 - HELD] = np.logical_and.reduce([still[k : count - 1 - HELD + k] for k in range(1, HELD + 1)])
    for place in np.flatnonzero(steep & (before | after)):
        low = np.searchsorted(time, time[place] - width, side="left")
        high = np.searchsorted(time, time[place + 1] + width, side="right")
        touched[low:high] = True
    return touched


def path_spread(
    time: Array, true_airspeed: Array, vertical_speed: Array, turn_rate: Array, width: float, max_gap: float
) -> Array:
    """How far a wider window would move the load factor: what the samples leave open about the path's curvature."""
    with np.errstate(invalid="ignore", divide="ignore"):
        ratio = np.where(true_airspeed > 5.0, vertical_speed / true_airspeed, np.nan)
    path = np.arcsin(np.clip(ratio, -1.0, 1.0))
    narrow = slope(time, path, width, max_gap)
    wide = slope(time, path, WIDER * width, max_gap)
    return np.abs(true_airspeed * (narrow - wide)) / STANDARD_GRAVITY


def path_and_turn_spread(
    time: Array,
    true_airspeed: Array,
    vertical_speed: Array,
    recorded_bank_angle: Array,
    turn_rate: Array,
    width: float,
    max_gap: float,
) -> Array:
    """As `path_spread`, seen along the aeroplane's normal axis."""
    return path_spread(time, true_airspeed, vertical_speed, turn_rate, width, max_gap) * np.abs(
        np.cos(recorded_bank_angle)
    )


def path_and_bank_spread(
    time: Array, true_airspeed: Array, vertical_speed: Array, recorded_bank_angle: Array, width: float, max_gap: float
) -> Array:
    """As `path_spread`, brought to the aeroplane's normal axis."""
    cosine = np.maximum(np.abs(np.cos(recorded_bank_angle)), np.sin(np.radians(15.0)))
    return path_spread(time, true_airspeed, vertical_speed, np.zeros_like(time), width, max_gap) / cosine


def load_factor_from_path_and_turn(
    time: Array,
    true_airspeed: Array,
    vertical_speed: Array,
    recorded_bank_angle: Array,
    turn_rate: Array,
    width: float,
    max_gap: float,
) -> Array:
    """Path curvature upwards and sideways, both seen along the aeroplane's normal axis: up cos Φ + side sin Φ.

    Source: [FLIGHT-PATH]; n cos Φ = V dγ/g + cos γ and n sin Φ = V dχ cos γ / g, put together.
    """
    up, level = _path(time, true_airspeed, vertical_speed, width, max_gap)
    side = true_airspeed * turn_rate * level / STANDARD_GRAVITY
    return up * np.cos(recorded_bank_angle) + side * np.sin(recorded_bank_angle)


def load_factor_from_path_and_bank(
    time: Array, true_airspeed: Array, vertical_speed: Array, recorded_bank_angle: Array, width: float, max_gap: float
) -> Array:
    """n = (V dγ/g + cos γ) / cos Φ; NaN within 15 degrees of a knife edge, where the vertical says little.

    Source: [FLIGHT-PATH].
    """
    up, _ = _path(time, true_airspeed, vertical_speed, width, max_gap)
    cosine = np.cos(recorded_bank_angle)
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(np.abs(cosine) >= np.sin(np.radians(15.0)), up / cosine, np.nan)


def load_factor_from_path(
    time: Array, true_airspeed: Array, vertical_speed: Array, turn_rate: Array, width: float, max_gap: float
) -> Array:
    """Size from the path alone, with the sign of its upward part; NaN where the path is steeper than 60 degrees, since
    heading swings round at the vertical. Source: [FLIGHT-PATH].
    """
    up, level = _path(time, true_airspeed, vertical_speed, width, max_gap)
    side = true_airspeed * turn_rate * level / STANDARD_GRAVITY
    # near weightlessness the side part is all noise of the turn rate, which no lift could have made
    size = np.sign(up) * np.hypot(up, np.where(np.abs(up) > 0.5, side, 0.0))
    return np.where(level >= 0.5, size, np.nan)


def load_factor_level_turn(time: Array, bank_angle: Array, width: float, max_gap: float) -> Array:
    """1 / cos Φ while the bank is held; NaN while rolling faster than 10 deg/s, for a roll is no level turn.

    Source: [LEVEL-TURN].
    """
    with np.errstate(invalid="ignore"):
        held = np.abs(angle_slope(time, bank_angle, width, max_gap)) <= np.radians(10.0)
    return np.where(held, turning.load_factor_level_turn(bank_angle), np.nan)


def load_factor_wings_level(time: Array, vertical_speed: Array, width: float, max_gap: float) -> Array:
    return 1.0 + slope(time, vertical_speed, width, max_gap) / STANDARD_GRAVITY
