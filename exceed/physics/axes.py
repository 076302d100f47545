"""Body axes, lift axis, path and earth in terms of one another: what turns with attitude and angle of attack.

Senses as in `kinematics`: load factors forward, right and up; angles and rates right wing down, nose up, nose right.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from exceed.physics._arrays import STEEPEST_BANK, Array, finite, floats, quiet, where

_STEEPEST_COSINE = float(np.cos(STEEPEST_BANK))


@quiet
def load_factor_lift_axis(
    longitudinal_load_factor: ArrayLike, load_factor: ArrayLike, angle_of_attack: ArrayLike
) -> Array:
    """Load factor along the lift axis (square to the airflow) from the body's.

    Parameters: longitudinal_load_factor, load_factor : (n,) arrays, 1; angle_of_attack : (n,) array, rad.
    Returns: (n,) array, 1. NaN where an input is.
    Source: [AXES] n_lift = n_x sin(alpha) + n_z cos(alpha).
    """
    alpha = floats(angle_of_attack)
    return finite(floats(longitudinal_load_factor) * np.sin(alpha) + floats(load_factor) * np.cos(alpha))


@quiet
def longitudinal_load_factor_path_axis(
    longitudinal_load_factor: ArrayLike, load_factor: ArrayLike, angle_of_attack: ArrayLike
) -> Array:
    """Load factor along the path (positive forward: thrust less drag) from the body's.

    Parameters: longitudinal_load_factor, load_factor : (n,) arrays, 1; angle_of_attack : (n,) array, rad.
    Returns: (n,) array, 1. NaN where an input is.
    Source: [AXES] n_path = n_x cos(alpha) - n_z sin(alpha).
    """
    alpha = floats(angle_of_attack)
    return finite(floats(longitudinal_load_factor) * np.cos(alpha) - floats(load_factor) * np.sin(alpha))


@quiet
def longitudinal_load_factor_at_rest(pitch_angle: ArrayLike) -> Array:
    """What a longitudinal accelerometer shows at rest: sin(pitch).

    Parameters: pitch_angle : (n,) array, rad.    Returns: (n,) array, 1.
    Source: [AXES]: the specific force at rest is gravity reversed.
    """
    return finite(np.sin(floats(pitch_angle)))


@quiet
def lateral_load_factor_at_rest(pitch_angle: ArrayLike, bank_angle: ArrayLike) -> Array:
    """What a lateral accelerometer shows at rest: -cos(pitch) sin(bank).

    Parameters: pitch_angle, bank_angle : (n,) arrays, rad.    Returns: (n,) array, 1.
    Source: [AXES].
    """
    return finite(-np.cos(floats(pitch_angle)) * np.sin(floats(bank_angle)))


@quiet
def load_factor_at_rest(pitch_angle: ArrayLike, bank_angle: ArrayLike) -> Array:
    """What a normal accelerometer shows at rest: cos(pitch) cos(bank).

    Parameters: pitch_angle, bank_angle : (n,) arrays, rad.    Returns: (n,) array, 1.
    Source: [AXES].
    """
    return finite(np.cos(floats(pitch_angle)) * np.cos(floats(bank_angle)))


@quiet
def roll_rate_level_turn(turn_rate: ArrayLike, pitch_angle: ArrayLike) -> Array:
    """Roll rate p about the body axis in a steady turn: -psi_dot sin(theta).

    Parameters: turn_rate : (n,) array, rad/s; pitch_angle : (n,) array, rad.    Returns: (n,) array, rad/s.
    Source: [LEVEL-TURN], [AXES].
    """
    return finite(-floats(turn_rate) * np.sin(floats(pitch_angle)))


@quiet
def pitch_rate_level_turn(turn_rate: ArrayLike, pitch_angle: ArrayLike, bank_angle: ArrayLike) -> Array:
    """Pitch rate q in a steady turn: psi_dot cos(theta) sin(phi).

    Parameters: turn_rate : (n,) array, rad/s; pitch_angle, bank_angle : (n,) arrays, rad.    Returns: (n,), rad/s.
    Source: [LEVEL-TURN], [AXES].
    """
    return finite(floats(turn_rate) * np.cos(floats(pitch_angle)) * np.sin(floats(bank_angle)))


@quiet
def yaw_rate_level_turn(turn_rate: ArrayLike, pitch_angle: ArrayLike, bank_angle: ArrayLike) -> Array:
    """Yaw rate r in a steady turn: psi_dot cos(theta) cos(phi).

    Parameters: turn_rate : (n,) array, rad/s; pitch_angle, bank_angle : (n,) arrays, rad.    Returns: (n,), rad/s.
    Source: [LEVEL-TURN], [AXES].
    """
    return finite(floats(turn_rate) * np.cos(floats(pitch_angle)) * np.cos(floats(bank_angle)))


@quiet
def bank_angle_from_body_rates(pitch_rate: ArrayLike, yaw_rate: ArrayLike) -> Array:
    """Bank of a steady upright level turn from body rates: tan(phi) = q / r, of the side that the nose turns to.

    Parameters: pitch_rate, yaw_rate : (n,) arrays, rad/s.
    Returns: (n,) array, rad. NaN where neither rate is there: not turning, so no bank to tell.
    Source: [LEVEL-TURN].
    """
    q, r = floats(pitch_rate), floats(yaw_rate)
    side = np.where(r < 0.0, -1.0, 1.0)
    return where((q != 0.0) | (r != 0.0), np.arctan2(q * side, np.abs(r)))


@quiet
def turn_rate_from_body_rates(
    pitch_rate: ArrayLike, yaw_rate: ArrayLike, pitch_angle: ArrayLike, bank_angle: ArrayLike
) -> Array:
    """Heading rate from body rates and attitude: (q sin(phi) + r cos(phi)) / cos(theta).

    Parameters: pitch_rate, yaw_rate : (n,) arrays, rad/s; pitch_angle, bank_angle : (n,) arrays, rad.
    Returns: (n,) array, rad/s, to the right. NaN within 5 degrees of the vertical, where heading means nothing.
    Source: [AXES].
    """
    phi, cosine = floats(bank_angle), np.cos(floats(pitch_angle))
    rate = (floats(pitch_rate) * np.sin(phi) + floats(yaw_rate) * np.cos(phi)) / cosine
    return where(np.abs(cosine) >= _STEEPEST_COSINE, rate)
