"""Airspeeds and Mach number in terms of one another.

Calibrated airspeed V_c is a name for an impact pressure; equivalent airspeed V_e one for a dynamic pressure; true
airspeed V is the speed itself. Below Mach 1 the pitot pressure is isentropic, above it the Rayleigh relation
(a normal shock ahead of the tube) holds; the same switch is in V_c at the sea-level speed of sound.
A negative airspeed is none: NaN.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from exceed.core.constants import DENSITY_0, GAMMA, PRESSURE_0, SPEED_OF_SOUND_0
from exceed.physics._arrays import Array, all_within, finite, floats, quiet, where
from exceed.physics.atmosphere import pressure_altitude as _pressure_altitude
from exceed.physics.atmosphere import speed_of_sound
from exceed.physics.atmosphere import static_pressure as _static_pressure

# (1 + M2/5)^3.5 - 1 at Mach 1: the impact pressure ratio where the pitot shock begins
_SONIC_RATIO = 1.2**3.5 - 1.0
# Rayleigh for gamma 1.4: p02/p = 166.92 M^7 / (7 M2 - 1)^2.5
_LOG_RAYLEIGH = 3.5 * float(np.log(1.2)) + 2.5 * float(np.log(6.0))


def _impact_ratio(mach: ArrayLike) -> Array:
    """Impact pressure over static pressure; NaN for negative Mach. Always an array, a fresh one."""
    number = floats(mach)
    # log1p and expm1: plain powers lose most digits when the aircraft stands still
    ratio = np.multiply(number, number, out=np.empty(number.shape))
    ratio *= 0.2
    np.log1p(ratio, out=ratio)
    ratio *= 3.5
    np.expm1(ratio, out=ratio)
    if all_within(number, 0.0, 1.0):
        return ratio
    fast = number > 1.0
    above = number[fast]
    ratio[fast] = np.expm1(_LOG_RAYLEIGH + 7.0 * np.log(above) - 2.5 * np.log(7.0 * above * above - 1.0))
    ratio[~(number >= 0.0)] = np.nan
    return ratio


def _mach_of_ratio(ratio: Array) -> Array:
    """Mach number of an impact pressure ratio; the inverse of `_impact_ratio`. NaN for negative ratios."""
    mach = np.log1p(ratio, out=np.empty(ratio.shape))
    mach *= 1.0 / 3.5
    np.expm1(mach, out=mach)
    mach *= 5.0
    np.sqrt(mach, out=mach)
    if all_within(ratio, 0.0, _SONIC_RATIO):
        return mach
    fast = ratio > _SONIC_RATIO
    # Newton on the logarithm of Rayleigh: increasing and concave there, so it comes from the left and stays
    target = np.log1p(ratio[fast])
    guess = np.maximum(1.0, np.exp(0.5 * (target - _LOG_RAYLEIGH + 2.5 * np.log(7.0))))
    for _ in range(12):
        square = guess * guess
        value = _LOG_RAYLEIGH + 7.0 * np.log(guess) - 2.5 * np.log(7.0 * square - 1.0)
        slope = 7.0 * (2.0 * square - 1.0) / (guess * (7.0 * square - 1.0))
        guess = np.maximum(1.0, guess + (target - value) / slope)
    mach[fast] = guess
    return mach


@quiet
def impact_pressure(calibrated_airspeed: ArrayLike) -> Array:
    """Impact pressure (pitot minus static) that a calibrated airspeed stands for.

    Parameters: calibrated_airspeed : (n,) array, m/s, not negative.
    Returns: (n,) array, Pa. NaN for negative speeds.
    Source: [PITOT-STATIC] definition of calibrated airspeed; above 340.3 m/s [NACA-1135] Rayleigh.
    """
    pressure = _impact_ratio(floats(calibrated_airspeed) / SPEED_OF_SOUND_0)
    pressure *= PRESSURE_0
    return finite(pressure)


@quiet
def impact_pressure_from_mach(mach: ArrayLike, static_pressure: ArrayLike) -> Array:
    """Impact pressure at a Mach number.

    Parameters: mach : (n,) array, 1, not negative; static_pressure : (n,) array, Pa.
    Returns: (n,) array, Pa. NaN for a negative Mach number or pressure.
    Source: [PITOT-STATIC]; above Mach 1 [NACA-1135] Rayleigh.
    """
    pressure = floats(static_pressure)
    return where(pressure >= 0.0, pressure * _impact_ratio(mach))


@quiet
def calibrated_airspeed_from_impact_pressure(impact_pressure: ArrayLike) -> Array:
    """Calibrated airspeed of an impact pressure; the inverse of `impact_pressure`.

    Parameters: impact_pressure : (n,) array, Pa.    Returns: (n,) array, m/s. NaN for negative pressures.
    Source: [PITOT-STATIC], [NACA-1135].
    """
    speed = _mach_of_ratio(np.asarray(floats(impact_pressure) / PRESSURE_0))
    speed *= SPEED_OF_SOUND_0
    return finite(speed)


@quiet
def mach_from_impact_pressure(impact_pressure: ArrayLike, static_pressure: ArrayLike) -> Array:
    """Mach number from the two measured pressures; the inverse of `impact_pressure_from_mach`.

    Parameters: impact_pressure, static_pressure : (n,) arrays, Pa.
    Returns: (n,) array, 1. NaN for a negative impact or a non-positive static pressure.
    Source: [PITOT-STATIC], [NACA-1135].
    """
    pressure = floats(static_pressure)
    return where(pressure > 0.0, _mach_of_ratio(np.asarray(floats(impact_pressure) / pressure)))


def mach(calibrated_airspeed: ArrayLike, pressure_altitude: ArrayLike) -> Array:
    """Mach number from calibrated airspeed at a pressure altitude.

    Parameters: calibrated_airspeed : (n,) array, m/s; pressure_altitude : (n,) array, m.
    Returns: (n,) array, 1. NaN where an input is NaN or out of its range.
    Source: [PITOT-STATIC], [NACA-1135], static pressure of [ISO-2533].
    """
    return mach_from_impact_pressure(impact_pressure(calibrated_airspeed), _static_pressure(pressure_altitude))


def calibrated_airspeed_from_mach(mach: ArrayLike, pressure_altitude: ArrayLike) -> Array:
    """Calibrated airspeed from Mach number at a pressure altitude; the inverse of `mach`.

    Parameters: mach : (n,) array, 1; pressure_altitude : (n,) array, m.
    Returns: (n,) array, m/s. NaN where an input is NaN or out of its range.
    Source: [PITOT-STATIC], [NACA-1135].
    """
    return calibrated_airspeed_from_impact_pressure(
        impact_pressure_from_mach(mach, _static_pressure(pressure_altitude))
    )


@quiet
def true_airspeed_from_mach(mach: ArrayLike, static_air_temperature: ArrayLike) -> Array:
    """True airspeed V = M a.

    Parameters: mach : (n,) array, 1; static_air_temperature : (n,) array, K, of the undisturbed air.
    Returns: (n,) array, m/s. NaN for a negative Mach number or a non-positive temperature.
    Source: [PITOT-STATIC].
    """
    number = floats(mach)
    return where(number >= 0.0, number * speed_of_sound(static_air_temperature))


@quiet
def mach_from_true_airspeed(true_airspeed: ArrayLike, static_air_temperature: ArrayLike) -> Array:
    """Mach number M = V / a.

    Parameters: true_airspeed : (n,) array, m/s; static_air_temperature : (n,) array, K.
    Returns: (n,) array, 1. NaN for a negative speed or a non-positive temperature.
    Source: [PITOT-STATIC].
    """
    speed = floats(true_airspeed)
    return where(speed >= 0.0, speed / speed_of_sound(static_air_temperature))


def true_airspeed(
    calibrated_airspeed: ArrayLike, pressure_altitude: ArrayLike, static_air_temperature: ArrayLike
) -> Array:
    """True airspeed from calibrated airspeed, compressible.

    Parameters
    ----------
    calibrated_airspeed : (n,) array, m/s, not negative
    pressure_altitude : (n,) array, m
    static_air_temperature : (n,) array, K, of the undisturbed air

    Returns
    -------
    (n,) array, m/s. NaN where an input is NaN or out of its range.

    Raises
    ------
    ValueError : shapes that do not broadcast.

    Source
    ------
    [PITOT-STATIC], [NACA-1135], static pressure of [ISO-2533].
    """
    return true_airspeed_from_mach(mach(calibrated_airspeed, pressure_altitude), static_air_temperature)


def calibrated_airspeed_from_true(
    true_airspeed: ArrayLike, pressure_altitude: ArrayLike, static_air_temperature: ArrayLike
) -> Array:
    """Calibrated airspeed from true airspeed; the inverse of `true_airspeed`.

    Parameters: true_airspeed : (n,) array, m/s; pressure_altitude : (n,) array, m; static_air_temperature :
    (n,) array, K.
    Returns: (n,) array, m/s. NaN where an input is NaN or out of its range.
    Source: [PITOT-STATIC], [NACA-1135].
    """
    return calibrated_airspeed_from_mach(
        mach_from_true_airspeed(true_airspeed, static_air_temperature), pressure_altitude
    )


@quiet
def equivalent_airspeed_from_mach(mach: ArrayLike, pressure_altitude: ArrayLike) -> Array:
    """Equivalent airspeed V_e = a0 M sqrt(delta): it needs no temperature.

    Parameters: mach : (n,) array, 1; pressure_altitude : (n,) array, m.
    Returns: (n,) array, m/s. NaN where an input is NaN or out of its range.
    Source: [PITOT-STATIC] definition, 1/2 rho0 V_e2 = 1/2 gamma p M2.
    """
    number = floats(mach)
    return where(number >= 0.0, SPEED_OF_SOUND_0 * number * np.sqrt(_static_pressure(pressure_altitude) / PRESSURE_0))


@quiet
def mach_from_equivalent(equivalent_airspeed: ArrayLike, pressure_altitude: ArrayLike) -> Array:
    """Mach number from equivalent airspeed; the inverse of `equivalent_airspeed_from_mach`.

    Parameters: equivalent_airspeed : (n,) array, m/s; pressure_altitude : (n,) array, m.
    Returns: (n,) array, 1. NaN where an input is NaN or out of its range.
    Source: [PITOT-STATIC].
    """
    speed = floats(equivalent_airspeed)
    return where(speed >= 0.0, speed / (SPEED_OF_SOUND_0 * np.sqrt(_static_pressure(pressure_altitude) / PRESSURE_0)))


@quiet
def equivalent_airspeed(calibrated_airspeed: ArrayLike, pressure_altitude: ArrayLike) -> Array:
    """Equivalent airspeed from calibrated airspeed.

    Parameters: calibrated_airspeed : (n,) array, m/s; pressure_altitude : (n,) array, m.
    Returns: (n,) array, m/s. NaN where an input is NaN or out of its range.
    Source: [PITOT-STATIC].
    """
    pressure = _static_pressure(pressure_altitude)
    number = mach_from_impact_pressure(impact_pressure(calibrated_airspeed), pressure)
    return finite(SPEED_OF_SOUND_0 * number * np.sqrt(pressure / PRESSURE_0))


@quiet
def calibrated_airspeed_from_equivalent(equivalent_airspeed: ArrayLike, pressure_altitude: ArrayLike) -> Array:
    """Calibrated airspeed from equivalent airspeed; the inverse of `equivalent_airspeed`.

    Parameters: equivalent_airspeed : (n,) array, m/s; pressure_altitude : (n,) array, m.
    Returns: (n,) array, m/s. NaN where an input is NaN or out of its range.
    Source: [PITOT-STATIC], [NACA-1135].
    """
    pressure = _static_pressure(pressure_altitude)
    number = floats(equivalent_airspeed) / (SPEED_OF_SOUND_0 * np.sqrt(pressure / PRESSURE_0))
    return calibrated_airspeed_from_impact_pressure(impact_pressure_from_mach(number, pressure))


@quiet
def equivalent_airspeed_from_true(
    true_airspeed: ArrayLike, pressure_altitude: ArrayLike, static_air_temperature: ArrayLike
) -> Array:
    """Equivalent airspeed V_e = V sqrt(sigma).

    Parameters: true_airspeed : (n,) array, m/s; pressure_altitude : (n,) array, m; static_air_temperature :
    (n,) array, K.
    Returns: (n,) array, m/s. NaN where an input is NaN or out of its range.
    Source: [PITOT-STATIC].
    """
    return equivalent_airspeed_from_mach(
        mach_from_true_airspeed(true_airspeed, static_air_temperature), pressure_altitude
    )


def true_airspeed_from_equivalent(
    equivalent_airspeed: ArrayLike, pressure_altitude: ArrayLike, static_air_temperature: ArrayLike
) -> Array:
    """True airspeed V = V_e / sqrt(sigma).

    Parameters: equivalent_airspeed : (n,) array, m/s; pressure_altitude : (n,) array, m; static_air_temperature :
    (n,) array, K.
    Returns: (n,) array, m/s. NaN where an input is NaN or out of its range.
    Source: [PITOT-STATIC].
    """
    return true_airspeed_from_mach(mach_from_equivalent(equivalent_airspeed, pressure_altitude), static_air_temperature)


@quiet
def dynamic_pressure(mach: ArrayLike, static_pressure: ArrayLike) -> Array:
    """Dynamic pressure q = 1/2 gamma p M2 (equal to 1/2 rho0 V_e2).

    Parameters: mach : (n,) array, 1; static_pressure : (n,) array, Pa.
    Returns: (n,) array, Pa. NaN for negative inputs.
    Source: [PITOT-STATIC].
    """
    number, pressure = floats(mach), floats(static_pressure)
    return where((number >= 0.0) & (pressure >= 0.0), 0.5 * GAMMA * pressure * number**2)


@quiet
def dynamic_pressure_from_equivalent(equivalent_airspeed: ArrayLike) -> Array:
    """Dynamic pressure q = 1/2 rho0 V_e2.

    Parameters: equivalent_airspeed : (n,) array, m/s.    Returns: (n,) array, Pa. NaN for negative speeds.
    Source: [PITOT-STATIC].
    """
    speed = floats(equivalent_airspeed)
    return where(speed >= 0.0, 0.5 * DENSITY_0 * speed**2)


@quiet
def static_air_temperature(
    total_air_temperature: ArrayLike, mach: ArrayLike, recovery_factor: ArrayLike = 1.0
) -> Array:
    """Temperature of the undisturbed air from what a probe at speed shows.

    Parameters
    ----------
    total_air_temperature : (n,) array, K, as the probe gives it
    mach : (n,) array, 1, not negative
    recovery_factor : 1 for an ideal total-temperature probe, less for a plain one

    Returns
    -------
    (n,) array, K. NaN where an input is NaN, negative, or the temperature not positive.

    Source
    ------
    [STAGNATION] T_t = T (1 + 0.2 r M2).
    """
    total, number = floats(total_air_temperature), floats(mach)
    return where((total > 0.0) & (number >= 0.0), total / (1.0 + 0.2 * floats(recovery_factor) * number**2))


@quiet
def total_air_temperature(
    static_air_temperature: ArrayLike, mach: ArrayLike, recovery_factor: ArrayLike = 1.0
) -> Array:
    """What a probe at speed shows; the inverse of `static_air_temperature`.

    Parameters: static_air_temperature : (n,) array, K; mach : (n,) array, 1; recovery_factor : 1 for an ideal probe.
    Returns: (n,) array, K. NaN where an input is NaN, negative, or the temperature not positive.
    Source: [STAGNATION].
    """
    static, number = floats(static_air_temperature), floats(mach)
    return where((static > 0.0) & (number >= 0.0), static * (1.0 + 0.2 * floats(recovery_factor) * number**2))


@quiet
def crossover_altitude(calibrated_airspeed: ArrayLike, mach: ArrayLike) -> Array:
    """Pressure altitude at which a calibrated airspeed and a Mach number are the same speed.

    Parameters: calibrated_airspeed : (n,) array, m/s; mach : (n,) array, 1.
    Returns: (n,) array, m. NaN where it would leave the atmosphere's range or an input is not positive.
    Source: [PITOT-STATIC]; the static pressure is the one that makes both impact pressures equal.
    """
    return _pressure_altitude(finite(impact_pressure(calibrated_airspeed) / _impact_ratio(mach)))
