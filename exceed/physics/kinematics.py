"""Specific force and load factor as seen from elsewhere: sensor to CG, body to path axes, from the flight path.

Body axes: x forward, y to the right, z down; positions are (forward, right, down) from the centre of gravity, m.
Load factors are the specific force over g: longitudinal positive forward, lateral positive to the right (+y),
normal (`load_factor`) positive up (-z), so +1 in steady level flight.
Angular rates p, q, r follow the right hand: right wing down, nose up, nose right.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from exceed.core.constants import STANDARD_GRAVITY
from exceed.physics._arrays import STEEPEST_BANK, Array, finite, floats, quiet, where
from exceed.physics.axes import (
    bank_angle_from_body_rates,
    lateral_load_factor_at_rest,
    load_factor_at_rest,
    load_factor_lift_axis,
    longitudinal_load_factor_at_rest,
    longitudinal_load_factor_path_axis,
    pitch_rate_level_turn,
    roll_rate_level_turn,
    turn_rate_from_body_rates,
    yaw_rate_level_turn,
)
from exceed.physics.smoothing import (
    smooth,
    smooth_derivative,
    smooth_derivative_uncertainty,
    smooth_uncertainty,
    unwrap_angle,
)

__all__ = [
    "bank_angle_from_body_rates",
    "bank_angle_from_path_rates",
    "flight_path_angle",
    "lateral_load_factor_at_cg",
    "lateral_load_factor_at_rest",
    "lever_arm_uncertainty",
    "load_factor_at_cg",
    "load_factor_at_rest",
    "load_factor_from_flight_path",
    "load_factor_from_path_rates",
    "load_factor_from_vertical_acceleration",
    "load_factor_lift_axis",
    "load_factor_of_specific_force",
    "longitudinal_load_factor_at_cg",
    "longitudinal_load_factor_at_rest",
    "longitudinal_load_factor_path_axis",
    "oscillation_load_factor",
    "pitch_rate_level_turn",
    "roll_rate_level_turn",
    "smooth",
    "smooth_derivative",
    "smooth_derivative_uncertainty",
    "smooth_uncertainty",
    "specific_force_at_cg",
    "specific_force_at_sensor",
    "stopping_load_factor",
    "turn_rate_from_body_rates",
    "unwrap_angle",
    "yaw_rate_level_turn",
]

_STEEPEST_COSINE = float(np.cos(STEEPEST_BANK))


def _lever(rates: Array, accelerations: Array, position: Array) -> Array:
    """Acceleration of a point at `position` relative to the CG, axes last: alpha x r + omega x (omega x r)."""
    return np.asarray(np.cross(accelerations, position) + np.cross(rates, np.cross(rates, position)))


@quiet
def specific_force_at_cg(
    specific_force: ArrayLike, angular_rate: ArrayLike, angular_acceleration: ArrayLike, sensor_position: ArrayLike
) -> Array:
    """Specific force at the centre of gravity from what a sensor elsewhere feels.

    Parameters
    ----------
    specific_force : (..., 3) array, m/s2, body axes, at the sensor
    angular_rate : (..., 3) array, rad/s: p, q, r
    angular_acceleration : (..., 3) array, rad/s2
    sensor_position : (3,) or (..., 3) array, m, forward, right, down from the CG

    Returns
    -------
    (..., 3) array, m/s2. NaN where an input that enters is NaN.

    Source
    ------
    [RIGID-BODY] f_cg = f_s - alpha x r - omega x (omega x r).
    """
    lever = _lever(floats(angular_rate), floats(angular_acceleration), floats(sensor_position))
    return finite(floats(specific_force) - lever)


@quiet
def specific_force_at_sensor(
    specific_force: ArrayLike, angular_rate: ArrayLike, angular_acceleration: ArrayLike, sensor_position: ArrayLike
) -> Array:
    """Specific force at a sensor from the one at the centre of gravity; the inverse of `specific_force_at_cg`.

    Parameters, Returns and Source as there: [RIGID-BODY].
    """
    lever = _lever(floats(angular_rate), floats(angular_acceleration), floats(sensor_position))
    return finite(floats(specific_force) + lever)


@quiet
def load_factor_of_specific_force(specific_force_down: ArrayLike) -> Array:
    """Normal load factor from the specific force along the body's z axis: n = -f_z / g.

    Parameters: specific_force_down : (n,) array, m/s2, positive down.    Returns: (n,) array, 1, positive up.
    Source: [DEFINITION], senses of [AXES].
    """
    return finite(-floats(specific_force_down) / STANDARD_GRAVITY)


@quiet
def load_factor_at_cg(
    load_factor: ArrayLike,
    roll_rate: ArrayLike,
    pitch_rate: ArrayLike,
    yaw_rate: ArrayLike,
    roll_acceleration: ArrayLike,
    pitch_acceleration: ArrayLike,
    accelerometer_position: ArrayLike,
) -> Array:
    """Normal load factor at the CG from an accelerometer elsewhere.

    Parameters
    ----------
    load_factor : (n,) array, 1, at the sensor, positive up
    roll_rate, pitch_rate, yaw_rate : (n,) arrays, rad/s
    roll_acceleration, pitch_acceleration : (n,) arrays, rad/s2
    accelerometer_position : (3,) array, m, forward, right, down from the CG

    Returns
    -------
    (n,) array, 1. NaN where an input is.

    Source
    ------
    [RIGID-BODY], z component.
    """
    p, q, r = floats(roll_rate), floats(pitch_rate), floats(yaw_rate)
    x, y, z = floats(accelerometer_position)
    down = floats(roll_acceleration) * y - floats(pitch_acceleration) * x + r * (p * x + q * y) - z * (p**2 + q**2)
    return finite(floats(load_factor) + down / STANDARD_GRAVITY)


@quiet
def longitudinal_load_factor_at_cg(
    longitudinal_load_factor: ArrayLike,
    roll_rate: ArrayLike,
    pitch_rate: ArrayLike,
    yaw_rate: ArrayLike,
    pitch_acceleration: ArrayLike,
    yaw_acceleration: ArrayLike,
    accelerometer_position: ArrayLike,
) -> Array:
    """Longitudinal load factor at the CG from an accelerometer elsewhere.

    Parameters: as in `load_factor_at_cg`, longitudinal_load_factor positive forward.
    Returns: (n,) array, 1. NaN where an input is.
    Source: [RIGID-BODY], x component.
    """
    p, q, r = floats(roll_rate), floats(pitch_rate), floats(yaw_rate)
    x, y, z = floats(accelerometer_position)
    forward = floats(pitch_acceleration) * z - floats(yaw_acceleration) * y + p * (q * y + r * z) - x * (q**2 + r**2)
    return finite(floats(longitudinal_load_factor) - forward / STANDARD_GRAVITY)


@quiet
def lateral_load_factor_at_cg(
    lateral_load_factor: ArrayLike,
    roll_rate: ArrayLike,
    pitch_rate: ArrayLike,
    yaw_rate: ArrayLike,
    roll_acceleration: ArrayLike,
    yaw_acceleration: ArrayLike,
    accelerometer_position: ArrayLike,
) -> Array:
    """Lateral load factor at the CG from an accelerometer elsewhere.

    Parameters: as in `load_factor_at_cg`, lateral_load_factor positive to the right.
    Returns: (n,) array, 1. NaN where an input is.
    Source: [RIGID-BODY], y component.
    """
    p, q, r = floats(roll_rate), floats(pitch_rate), floats(yaw_rate)
    x, y, z = floats(accelerometer_position)
    right = floats(yaw_acceleration) * x - floats(roll_acceleration) * z + q * (p * x + r * z) - y * (p**2 + r**2)
    return finite(floats(lateral_load_factor) - right / STANDARD_GRAVITY)


@quiet
def lever_arm_uncertainty(
    accelerometer_position: ArrayLike,
    roll_rate: ArrayLike,
    pitch_rate: ArrayLike,
    yaw_rate: ArrayLike,
    roll_acceleration: ArrayLike,
    pitch_acceleration: ArrayLike,
) -> Array:
    """Standard uncertainty of load factor left by a lever arm when the rotation is not recorded.

    Parameters
    ----------
    accelerometer_position : (3,) array, m, forward, right, down from the CG
    roll_rate, pitch_rate, yaw_rate : typical sizes (root mean square), rad/s
    roll_acceleration, pitch_acceleration : typical sizes, rad/s2

    Returns
    -------
    (n,) array, 1: the terms of `load_factor_at_cg` in quadrature, rates and accelerations taken as unrelated.

    Source
    ------
    [RIGID-BODY] with [JCGM-100] combination; the sizes are the caller's judgement.
    """
    p, q, r = floats(roll_rate), floats(pitch_rate), floats(yaw_rate)
    x, y, z = floats(accelerometer_position)
    terms = (
        floats(roll_acceleration) * y,
        floats(pitch_acceleration) * x,
        r * p * x,
        r * q * y,
        z * (p**2 + q**2),
    )
    return finite(np.sqrt(sum(term**2 for term in terms)) / STANDARD_GRAVITY)


@quiet
def flight_path_angle(vertical_speed: ArrayLike, true_airspeed: ArrayLike) -> Array:
    """Flight path angle against the air: sin(gamma) = climb rate / V, still air.

    Parameters: vertical_speed, true_airspeed : (n,) arrays, m/s.
    Returns: (n,) array, rad. NaN where the climb rate exceeds the speed or there is no speed.
    Source: [FLIGHT-PATH].
    """
    climb, speed = floats(vertical_speed), floats(true_airspeed)
    return where((speed > 0.0) & (np.abs(climb) <= speed), np.arcsin(climb / speed))


@quiet
def load_factor_from_flight_path(
    true_airspeed: ArrayLike, flight_path_angle_rate: ArrayLike, flight_path_angle: ArrayLike, bank_angle: ArrayLike
) -> Array:
    """Load factor along the lift axis from path curvature in the vertical plane and bank.

    Parameters: true_airspeed : (n,) array, m/s; flight_path_angle_rate : (n,) array, rad/s; flight_path_angle,
    bank_angle : (n,) arrays, rad.
    Returns: (n,) array, 1. NaN where the bank is within 5 degrees of a knife edge: the vertical says nothing there.
    Source: [FLIGHT-PATH] n cos(bank) = V gamma_dot / g + cos(gamma).
    """
    up = floats(true_airspeed) * floats(flight_path_angle_rate) / STANDARD_GRAVITY + np.cos(floats(flight_path_angle))
    cosine = np.cos(floats(bank_angle))
    return where(np.abs(cosine) >= _STEEPEST_COSINE, up / cosine)


@quiet
def load_factor_from_path_rates(
    true_airspeed: ArrayLike, flight_path_angle_rate: ArrayLike, turn_rate: ArrayLike, flight_path_angle: ArrayLike
) -> Array:
    """Size of the load factor square to the path, from the path alone (no attitude needed).

    Parameters: true_airspeed : (n,) array, m/s; flight_path_angle_rate, turn_rate : (n,) arrays, rad/s, of the path
    through the air; flight_path_angle : (n,) array, rad.
    Returns: (n,) array, 1, not negative: a pushed-over path cannot be told from an inverted pull.
    Source: [FLIGHT-PATH] n cos(mu) = V gamma_dot / g + cos(gamma), n sin(mu) = V chi_dot cos(gamma) / g.
    """
    speed, gamma = floats(true_airspeed), floats(flight_path_angle)
    up = speed * floats(flight_path_angle_rate) / STANDARD_GRAVITY + np.cos(gamma)
    side = speed * floats(turn_rate) * np.cos(gamma) / STANDARD_GRAVITY
    return finite(np.hypot(up, side))


@quiet
def bank_angle_from_path_rates(
    true_airspeed: ArrayLike, flight_path_angle_rate: ArrayLike, turn_rate: ArrayLike, flight_path_angle: ArrayLike
) -> Array:
    """Bank about the velocity vector that the path's curvature takes, coordinated.

    Parameters: as in `load_factor_from_path_rates`.
    Returns: (n,) array, rad, positive to the right. NaN where the path is ballistic (no lift, so no bank to tell).
    Source: [FLIGHT-PATH].
    """
    speed, gamma = floats(true_airspeed), floats(flight_path_angle)
    up = speed * floats(flight_path_angle_rate) / STANDARD_GRAVITY + np.cos(gamma)
    side = speed * floats(turn_rate) * np.cos(gamma) / STANDARD_GRAVITY
    return where((up != 0.0) | (side != 0.0), np.arctan2(side, up))


@quiet
def load_factor_from_vertical_acceleration(
    vertical_acceleration: ArrayLike,
    pitch_angle: ArrayLike,
    bank_angle: ArrayLike,
    longitudinal_load_factor: ArrayLike = 0.0,
    lateral_load_factor: ArrayLike = 0.0,
) -> Array:
    """Body normal load factor from the earth-vertical acceleration and attitude.

    Parameters
    ----------
    vertical_acceleration : (n,) array, m/s2, up, gravity not included (0 in steady flight)
    pitch_angle, bank_angle : (n,) arrays, rad
    longitudinal_load_factor, lateral_load_factor : (n,) arrays, 1; 0 where not recorded, which neglects them

    Returns
    -------
    (n,) array, 1. NaN where the normal axis is within 5 degrees of the horizon: the vertical says nothing there.

    Source
    ------
    [AXES] n_x sin(theta) - n_y sin(phi) cos(theta) + n_z cos(phi) cos(theta) = 1 + a_up / g.
    """
    theta, phi = floats(pitch_angle), floats(bank_angle)
    along = floats(longitudinal_load_factor) * np.sin(theta)
    across = floats(lateral_load_factor) * np.sin(phi) * np.cos(theta)
    cosine = np.cos(phi) * np.cos(theta)
    n = (1.0 + floats(vertical_acceleration) / STANDARD_GRAVITY - along + across) / cosine
    return where(np.abs(cosine) >= _STEEPEST_COSINE, n)


@quiet
def oscillation_load_factor(amplitude: ArrayLike, frequency: ArrayLike) -> Array:
    """Peak load-factor increment of a sinusoidal height: A (2 pi f)2 / g.

    Parameters: amplitude : m; frequency : Hz.    Returns: 1, as the inputs broadcast.
    Source: [DEFINITION] second derivative of a sinusoid.
    """
    return finite(floats(amplitude) * (2.0 * np.pi * floats(frequency)) ** 2 / STANDARD_GRAVITY)


@quiet
def stopping_load_factor(touchdown_sink_rate: ArrayLike, stopping_time: ArrayLike) -> Array:
    """Mean load-factor increment that takes away a sink rate in a time: w / (g t). The peak is higher.

    Parameters: touchdown_sink_rate : m/s, down; stopping_time : s.    Returns: 1. NaN at zero time.
    Source: [DEFINITION] mean deceleration.
    """
    time = floats(stopping_time)
    return where(time > 0.0, floats(touchdown_sink_rate) / (STANDARD_GRAVITY * time))
