"""The standard atmosphere: pressure, temperature, density and altitude in terms of one another.

Altitudes are geopotential unless named geometric. `pressure_altitude` is the geopotential altitude at which the
standard atmosphere has the static pressure at hand; it is not the height above anything. Dry air throughout.
Valid from 5 km below sea level to 32 km; NaN outside.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from exceed.core.constants import (
    DENSITY_0,
    EARTH_RADIUS,
    GAMMA,
    GAS_CONSTANT,
    LAPSE_RATE_TROPOSPHERE,
    LAPSE_RATE_UPPER,
    PRESSURE_0,
    STANDARD_GRAVITY,
    TEMPERATURE_0,
    TROPOPAUSE,
    UPPER_LAYER_BASE,
    UPPER_LAYER_TOP,
)
from exceed.physics._arrays import Array, all_within, finite, floats, quiet, where

LOWEST_ALTITUDE = -5000.0

_TROPOSPHERE_EXPONENT = -STANDARD_GRAVITY / (GAS_CONSTANT * LAPSE_RATE_TROPOSPHERE)  # 5.2559
_UPPER_EXPONENT = -STANDARD_GRAVITY / (GAS_CONSTANT * LAPSE_RATE_UPPER)  # -34.163
_TEMPERATURE_TROPOPAUSE = TEMPERATURE_0 + LAPSE_RATE_TROPOSPHERE * TROPOPAUSE  # 216.65 K
_PRESSURE_TROPOPAUSE = PRESSURE_0 * (_TEMPERATURE_TROPOPAUSE / TEMPERATURE_0) ** _TROPOSPHERE_EXPONENT
_SCALE_HEIGHT = GAS_CONSTANT * _TEMPERATURE_TROPOPAUSE / STANDARD_GRAVITY  # m, of the isothermal layer
_PRESSURE_UPPER_BASE = _PRESSURE_TROPOPAUSE * float(np.exp(-(UPPER_LAYER_BASE - TROPOPAUSE) / _SCALE_HEIGHT))
_TEMPERATURE_TOP = _TEMPERATURE_TROPOPAUSE + LAPSE_RATE_UPPER * (UPPER_LAYER_TOP - UPPER_LAYER_BASE)
_PRESSURE_TOP = _PRESSURE_UPPER_BASE * (_TEMPERATURE_TOP / _TEMPERATURE_TROPOPAUSE) ** _UPPER_EXPONENT
_PRESSURE_LOWEST = (
    PRESSURE_0 * (1.0 + LAPSE_RATE_TROPOSPHERE * LOWEST_ALTITUDE / TEMPERATURE_0) ** _TROPOSPHERE_EXPONENT
)
_DENSITY_TROPOPAUSE = _PRESSURE_TROPOPAUSE / (GAS_CONSTANT * _TEMPERATURE_TROPOPAUSE)
_DENSITY_UPPER_BASE = _PRESSURE_UPPER_BASE / (GAS_CONSTANT * _TEMPERATURE_TROPOPAUSE)


@quiet
def standard_temperature(pressure_altitude: ArrayLike) -> Array:
    """Air temperature of the standard atmosphere.

    Parameters: pressure_altitude : (n,) array, m.
    Returns: (n,) array, K. NaN outside -5 km to 32 km.
    Source: [ISO-2533] temperature layers.
    """
    altitude = floats(pressure_altitude)
    if all_within(altitude, LOWEST_ALTITUDE, TROPOPAUSE):
        return finite(TEMPERATURE_0 + LAPSE_RATE_TROPOSPHERE * altitude)
    below = np.minimum(altitude, TROPOPAUSE)
    above = np.maximum(altitude, UPPER_LAYER_BASE) - UPPER_LAYER_BASE
    temperature = TEMPERATURE_0 + LAPSE_RATE_TROPOSPHERE * below + LAPSE_RATE_UPPER * above
    return where((altitude >= LOWEST_ALTITUDE) & (altitude <= UPPER_LAYER_TOP), temperature)


@quiet
def static_pressure(pressure_altitude: ArrayLike) -> Array:
    """Static pressure at a pressure altitude; the inverse of `pressure_altitude`.

    Parameters: pressure_altitude : (n,) array, m.
    Returns: (n,) array, Pa. NaN outside -5 km to 32 km.
    Source: [ISO-2533] hydrostatic equation with constant lapse rate in each layer.
    """
    altitude = floats(pressure_altitude)
    # log1p keeps the digits of a small height above sea level; one buffer, for new memory costs more than the sums
    pressure = np.multiply(altitude, LAPSE_RATE_TROPOSPHERE / TEMPERATURE_0, out=np.empty(altitude.shape))
    np.log1p(pressure, out=pressure)
    pressure *= _TROPOSPHERE_EXPONENT
    np.exp(pressure, out=pressure)
    pressure *= PRESSURE_0
    if all_within(altitude, LOWEST_ALTITUDE, TROPOPAUSE):
        return pressure[()]
    high = altitude > TROPOPAUSE
    above = altitude[high]
    isothermal = _PRESSURE_TROPOPAUSE * np.exp((TROPOPAUSE - above) / _SCALE_HEIGHT)
    warming = (LAPSE_RATE_UPPER / _TEMPERATURE_TROPOPAUSE) * (above - UPPER_LAYER_BASE)
    upper = _PRESSURE_UPPER_BASE * np.exp(_UPPER_EXPONENT * np.log1p(warming))
    pressure[high] = np.where(above > UPPER_LAYER_BASE, upper, isothermal)
    return where((altitude >= LOWEST_ALTITUDE) & (altitude <= UPPER_LAYER_TOP), pressure)


@quiet
def pressure_altitude(static_pressure: ArrayLike) -> Array:
    """Geopotential altitude at which the standard atmosphere has this static pressure.

    Parameters: static_pressure : (n,) array, Pa.
    Returns: (n,) array, m. NaN outside -5 km to 32 km, and for pressures that are not positive.
    Source: [ISO-2533] the pressure law solved for altitude.
    """
    pressure = floats(static_pressure)
    altitude = np.divide(pressure, PRESSURE_0, out=np.empty(pressure.shape))
    np.log(altitude, out=altitude)
    altitude /= _TROPOSPHERE_EXPONENT
    np.expm1(altitude, out=altitude)
    altitude *= TEMPERATURE_0 / LAPSE_RATE_TROPOSPHERE
    if all_within(pressure, _PRESSURE_TROPOPAUSE, _PRESSURE_LOWEST):
        return altitude[()]
    high = pressure < _PRESSURE_TROPOPAUSE
    if high.any():
        isothermal = TROPOPAUSE - _SCALE_HEIGHT * np.log(pressure / _PRESSURE_TROPOPAUSE)
        warming = np.expm1(np.log(pressure / _PRESSURE_UPPER_BASE) / _UPPER_EXPONENT)
        upper = UPPER_LAYER_BASE + (_TEMPERATURE_TROPOPAUSE / LAPSE_RATE_UPPER) * warming
        altitude = np.where(high, np.where(pressure < _PRESSURE_UPPER_BASE, upper, isothermal), altitude)
    # a hair of slack, so that the ends of the range return where they came from
    return where((pressure <= _PRESSURE_LOWEST * (1 + 1e-12)) & (pressure >= _PRESSURE_TOP * (1 - 1e-12)), altitude)


@quiet
def density(static_pressure: ArrayLike, static_air_temperature: ArrayLike) -> Array:
    """Air density from the gas law, dry air.

    Parameters
    ----------
    static_pressure : (n,) array, Pa
    static_air_temperature : (n,) array, K

    Returns
    -------
    (n,) array, kg/m3. NaN where an input is NaN, the pressure negative or the temperature not positive.

    Source
    ------
    [ISO-2533] equation of state.
    """
    pressure, temperature = floats(static_pressure), floats(static_air_temperature)
    return where((pressure >= 0.0) & (temperature > 0.0), pressure / (GAS_CONSTANT * temperature))


def standard_density(pressure_altitude: ArrayLike) -> Array:
    """Density of the standard atmosphere at a pressure altitude.

    Parameters: pressure_altitude : (n,) array, m.
    Returns: (n,) array, kg/m3. NaN outside -5 km to 32 km.
    Source: [ISO-2533].
    """
    return density(static_pressure(pressure_altitude), standard_temperature(pressure_altitude))


@quiet
def speed_of_sound(static_air_temperature: ArrayLike) -> Array:
    """Speed of sound in dry air.

    Parameters: static_air_temperature : (n,) array, K.
    Returns: (n,) array, m/s. NaN where the temperature is not positive.
    Source: [ISO-2533] a = sqrt(gamma R T).
    """
    temperature = floats(static_air_temperature)
    return where(temperature > 0.0, np.sqrt(GAMMA * GAS_CONSTANT * temperature))


@quiet
def temperature_ratio(static_air_temperature: ArrayLike) -> Array:
    """Temperature over sea-level standard temperature (theta).

    Parameters: static_air_temperature : (n,) array, K.    Returns: (n,) array, 1; NaN where not positive.
    Source: [ISO-2533].
    """
    temperature = floats(static_air_temperature)
    return where(temperature > 0.0, temperature / TEMPERATURE_0)


@quiet
def pressure_ratio(static_pressure: ArrayLike) -> Array:
    """Pressure over sea-level standard pressure (delta).

    Parameters: static_pressure : (n,) array, Pa.    Returns: (n,) array, 1; NaN where negative.
    Source: [ISO-2533].
    """
    pressure = floats(static_pressure)
    return where(pressure >= 0.0, pressure / PRESSURE_0)


@quiet
def density_ratio(static_pressure: ArrayLike, static_air_temperature: ArrayLike) -> Array:
    """Density over sea-level standard density (sigma).

    Parameters: static_pressure : (n,) array, Pa; static_air_temperature : (n,) array, K.
    Returns: (n,) array, 1; NaN as in `density`.
    Source: [ISO-2533].
    """
    return finite(density(static_pressure, static_air_temperature) / DENSITY_0)


@quiet
def density_altitude(static_pressure: ArrayLike, static_air_temperature: ArrayLike) -> Array:
    """Altitude at which the standard atmosphere has the density at hand (dry air).

    Parameters
    ----------
    static_pressure : (n,) array, Pa
    static_air_temperature : (n,) array, K

    Returns
    -------
    (n,) array, m, geopotential. NaN where the density is not positive or the answer would leave -5 km to 20 km.

    Source
    ------
    [ISO-2533] the density law solved for altitude.
    """
    rho = density(static_pressure, static_air_temperature)
    low = (TEMPERATURE_0 / LAPSE_RATE_TROPOSPHERE) * np.expm1(np.log(rho / DENSITY_0) / (_TROPOSPHERE_EXPONENT - 1.0))
    high = TROPOPAUSE - _SCALE_HEIGHT * np.log(rho / _DENSITY_TROPOPAUSE)
    altitude = np.where(rho < _DENSITY_TROPOPAUSE, high, low)
    return where((rho >= _DENSITY_UPPER_BASE * (1 - 1e-12)) & (altitude >= LOWEST_ALTITUDE), altitude)


def altimeter_shift(altimeter_setting: ArrayLike) -> Array:
    """What to add to an altimeter's reading on this setting to have pressure altitude.

    Parameters: altimeter_setting : (n,) array, Pa (QNH or QFE; 101325 gives 0).
    Returns: (n,) array, m: the pressure altitude of the setting; NaN as in `pressure_altitude`.
    Source: [ISO-2533]; altimeters are built so that the setting moves the whole scale by this shift.
    """
    return pressure_altitude(altimeter_setting)


@quiet
def pressure_altitude_from_indicated(indicated_altitude: ArrayLike, altimeter_setting: ArrayLike) -> Array:
    """Pressure altitude from an altimeter's reading and the pressure set on it.

    Parameters: indicated_altitude : (n,) array, m; altimeter_setting : (n,) array, Pa.
    Returns: (n,) array, m. NaN where an input is.
    Source: [ISO-2533], see `altimeter_shift`.
    """
    return finite(floats(indicated_altitude) + altimeter_shift(altimeter_setting))


@quiet
def geopotential_altitude(geometric_altitude: ArrayLike) -> Array:
    """Geopotential from geometric altitude.

    Parameters: geometric_altitude : (n,) array, m above sea level.
    Returns: (n,) array, m. NaN below the centre of the earth.
    Source: [ISO-2533] H = r h / (r + h), r = 6 356 766 m.
    """
    altitude = floats(geometric_altitude)
    return where(altitude > -EARTH_RADIUS, EARTH_RADIUS * altitude / (EARTH_RADIUS + altitude))


@quiet
def geometric_altitude(geopotential_altitude: ArrayLike) -> Array:
    """Geometric from geopotential altitude; the inverse of `geopotential_altitude`.

    Parameters: geopotential_altitude : (n,) array, m.
    Returns: (n,) array, m. NaN at and beyond one earth radius.
    Source: [ISO-2533] h = r H / (r - H).
    """
    altitude = floats(geopotential_altitude)
    return where(altitude < EARTH_RADIUS, EARTH_RADIUS * altitude / (EARTH_RADIUS - altitude))
