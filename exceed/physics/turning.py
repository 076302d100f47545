"""Turns and pull-ups: load factor, bank, radius, rate; and the wind triangle.

Bank, turn rate and lateral motion are positive to the right, so a mirrored turn mirrors their signs and leaves load
factor and radius alone. "Level turn" here always means level and coordinated; beyond 85 degrees of bank none is flown.
True airspeed is never made from ground speed.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from exceed.core.constants import STANDARD_GRAVITY
from exceed.physics._arrays import STEEPEST_BANK, Array, finite, floats, quiet, where

STANDARD_RATE = float(np.radians(3.0))  # rad/s, a full turn in two minutes
_STEEPEST_COSINE = float(np.cos(STEEPEST_BANK))


@quiet
def load_factor_level_turn(bank_angle: ArrayLike) -> Array:
    """Normal load factor that holds height in a coordinated turn: n = 1 / cos(bank).

    Parameters: bank_angle : (n,) array, rad.
    Returns: (n,) array, 1, at least 1. NaN beyond 85 degrees, where a level turn is not flown.
    Source: [LEVEL-TURN], [FAA-PHAK] (60 degrees gives 2).
    """
    bank = floats(bank_angle)
    return where(np.abs(bank) <= STEEPEST_BANK, 1.0 / np.cos(bank))


@quiet
def load_factor_level_turn_uncertainty(bank_angle: ArrayLike, bank_angle_uncertainty: ArrayLike) -> Array:
    """Standard uncertainty of `load_factor_level_turn` that an uncertain bank brings (not that the turn is not level).

    Parameters: bank_angle : (n,) array, rad; bank_angle_uncertainty : standard uncertainty, rad.
    Returns: (n,) array, 1: second order, so that it does not vanish at zero bank. NaN beyond 85 degrees.
    Source: [JCGM-100] propagation, dn = tan(bank)/cos(bank) u and the curvature term n(1 + 2 tan2) u2 / sqrt 2.
    """
    bank, u = floats(bank_angle), floats(bank_angle_uncertainty)
    load_factor, tangent = 1.0 / np.cos(bank), np.tan(bank)
    second = load_factor * (1.0 + 2.0 * tangent**2) * u**2 / np.sqrt(2.0)
    return where((np.abs(bank) <= STEEPEST_BANK) & (u >= 0.0), np.hypot(load_factor * tangent * u, second))


@quiet
def bank_angle_from_load_factor(load_factor: ArrayLike) -> Array:
    """Bank of the level coordinated turn that takes this load factor, without its side.

    Parameters: load_factor : (n,) array, 1.
    Returns: (n,) array, rad, 0 to 85 degrees. NaN below 1 (no level turn) and beyond 85 degrees.
    Source: [LEVEL-TURN].
    """
    n = floats(load_factor)
    return where((n >= 1.0) & (n * _STEEPEST_COSINE <= 1.0 + 1e-12), np.arccos(1.0 / n))


@quiet
def bank_angle_level_turn(true_airspeed: ArrayLike, turn_rate: ArrayLike) -> Array:
    """Bank of a level coordinated turn from speed and turn rate: tan(bank) = V omega / g.

    Parameters: true_airspeed : (n,) array, m/s; turn_rate : (n,) array, rad/s, positive to the right, through the air
    (heading rate; track rate only in still air).
    Returns: (n,) array, rad, with the sign of the turn. NaN for negative speeds.
    Source: [LEVEL-TURN].
    """
    speed = floats(true_airspeed)
    return where(speed >= 0.0, np.arctan(speed * floats(turn_rate) / STANDARD_GRAVITY))


@quiet
def load_factor_from_turn_rate(true_airspeed: ArrayLike, turn_rate: ArrayLike) -> Array:
    """Load factor of a level coordinated turn from speed and turn rate: n = sqrt(1 + (V omega / g)2).

    Parameters: true_airspeed : (n,) array, m/s; turn_rate : (n,) array, rad/s.
    Returns: (n,) array, 1, at least 1. NaN for negative speeds.
    Source: [LEVEL-TURN].
    """
    speed = floats(true_airspeed)
    return where(speed >= 0.0, np.hypot(1.0, speed * floats(turn_rate) / STANDARD_GRAVITY))


@quiet
def turn_rate(bank_angle: ArrayLike, true_airspeed: ArrayLike) -> Array:
    """Turn rate of a level coordinated turn: omega = g tan(bank) / V.

    Parameters: bank_angle : (n,) array, rad; true_airspeed : (n,) array, m/s.
    Returns: (n,) array, rad/s, positive to the right. NaN at no speed and beyond 85 degrees of bank.
    Source: [LEVEL-TURN].
    """
    bank, speed = floats(bank_angle), floats(true_airspeed)
    return where((np.abs(bank) <= STEEPEST_BANK) & (speed > 0.0), STANDARD_GRAVITY * np.tan(bank) / speed)


@quiet
def turn_radius(bank_angle: ArrayLike, true_airspeed: ArrayLike) -> Array:
    """Radius of a level coordinated turn through the air: V2 / (g tan(bank)).

    Parameters: bank_angle : (n,) array, rad; true_airspeed : (n,) array, m/s.
    Returns: (n,) array, m, not negative. NaN with wings level (no circle) and beyond 85 degrees of bank.
    Source: [LEVEL-TURN].
    """
    bank, speed = np.abs(floats(bank_angle)), floats(true_airspeed)
    return where((bank <= STEEPEST_BANK) & (bank > 0.0) & (speed >= 0.0), speed**2 / (STANDARD_GRAVITY * np.tan(bank)))


@quiet
def turn_radius_from_turn_rate(true_airspeed: ArrayLike, turn_rate: ArrayLike) -> Array:
    """Radius of any steady turn: V / |omega|.

    Parameters: true_airspeed : (n,) array, m/s; turn_rate : (n,) array, rad/s.
    Returns: (n,) array, m. NaN where the rate is zero or the speed negative.
    Source: [LEVEL-TURN].
    """
    speed, rate = floats(true_airspeed), np.abs(floats(turn_rate))
    return where((speed >= 0.0) & (rate > 0.0), speed / rate)


@quiet
def turn_time(turn_rate: ArrayLike, turned: ArrayLike = 2.0 * np.pi) -> Array:
    """Time to turn through an angle, a full circle by default.

    Parameters: turn_rate : (n,) array, rad/s; turned : rad.
    Returns: (n,) array, s, not negative. NaN at zero rate.
    Source: [DEFINITION].
    """
    rate = np.abs(floats(turn_rate))
    return where(rate > 0.0, np.abs(floats(turned)) / rate)


@quiet
def true_airspeed_of_turn(bank_angle: ArrayLike, turn_rate: ArrayLike) -> Array:
    """Speed at which a bank gives a turn rate in level coordinated flight: V = g tan(bank) / omega.

    Parameters: bank_angle : (n,) array, rad; turn_rate : (n,) array, rad/s, of the same side.
    Returns: (n,) array, m/s. NaN at zero rate, for opposite sides, and beyond 85 degrees of bank.
    Source: [LEVEL-TURN].
    """
    bank, rate = floats(bank_angle), floats(turn_rate)
    speed = STANDARD_GRAVITY * np.tan(bank) / rate
    return where((np.abs(bank) <= STEEPEST_BANK) & (rate != 0.0) & (speed >= 0.0), speed)


def bank_angle_standard_rate(true_airspeed: ArrayLike) -> Array:
    """Bank of a level turn at the standard rate of 3 degrees a second, without its side.

    Parameters: true_airspeed : (n,) array, m/s.    Returns: (n,) array, rad. NaN for negative speeds.
    Source: [LEVEL-TURN], [ICAO-8168] for the rate.
    """
    return bank_angle_level_turn(true_airspeed, STANDARD_RATE)


@quiet
def load_factor_pull_up(true_airspeed: ArrayLike, pull_up_radius: ArrayLike, flight_path_angle: ArrayLike) -> Array:
    """Load factor on a vertical circle, wings level: n = cos(gamma) + V2 / (g r).

    Parameters
    ----------
    true_airspeed : (n,) array, m/s
    pull_up_radius : (n,) array, m; negative for a push-over
    flight_path_angle : (n,) array, rad, positive climbing; pi at the top of a loop

    Returns
    -------
    (n,) array, 1. NaN at zero radius or for a negative speed.

    Source
    ------
    [FLIGHT-PATH].
    """
    speed, radius = floats(true_airspeed), floats(pull_up_radius)
    n = np.cos(floats(flight_path_angle)) + speed**2 / (STANDARD_GRAVITY * radius)
    return where((speed >= 0.0) & (radius != 0.0), n)


@quiet
def wind_north(heading: ArrayLike, true_airspeed: ArrayLike, track_angle: ArrayLike, ground_speed: ArrayLike) -> Array:
    """Northward part of the wind (air moving north is positive), without sideslip and climb.

    Parameters: heading, track_angle : (n,) arrays, rad, from the same north; true_airspeed, ground_speed : (n,), m/s.
    Returns: (n,) array, m/s. NaN for negative speeds.
    Source: [WIND-TRIANGLE].
    """
    air, ground = floats(true_airspeed), floats(ground_speed)
    north = ground * np.cos(floats(track_angle)) - air * np.cos(floats(heading))
    return where((air >= 0.0) & (ground >= 0.0), north)


@quiet
def wind_east(heading: ArrayLike, true_airspeed: ArrayLike, track_angle: ArrayLike, ground_speed: ArrayLike) -> Array:
    """Eastward part of the wind (air moving east is positive), without sideslip and climb.

    Parameters, Returns and Source as in `wind_north`: [WIND-TRIANGLE].
    """
    air, ground = floats(true_airspeed), floats(ground_speed)
    east = ground * np.sin(floats(track_angle)) - air * np.sin(floats(heading))
    return where((air >= 0.0) & (ground >= 0.0), east)


@quiet
def wind_speed(heading: ArrayLike, true_airspeed: ArrayLike, track_angle: ArrayLike, ground_speed: ArrayLike) -> Array:
    """Speed of the wind.

    Parameters: as in `wind_north`.    Returns: (n,) array, m/s, not negative.
    Source: [WIND-TRIANGLE].
    """
    triangle = (heading, true_airspeed, track_angle, ground_speed)
    return finite(np.hypot(wind_north(*triangle), wind_east(*triangle)))


@quiet
def wind_direction(
    heading: ArrayLike, true_airspeed: ArrayLike, track_angle: ArrayLike, ground_speed: ArrayLike
) -> Array:
    """Direction the wind comes from, clockwise from north.

    Parameters: as in `wind_north`.    Returns: (n,) array, rad, 0 to 2 pi. NaN in no wind at all.
    Source: [WIND-TRIANGLE]; "from" is the trade's way of naming winds.
    """
    triangle = (heading, true_airspeed, track_angle, ground_speed)
    north, east = wind_north(*triangle), wind_east(*triangle)
    return where((north != 0.0) | (east != 0.0), np.mod(np.arctan2(-east, -north), 2.0 * np.pi))
