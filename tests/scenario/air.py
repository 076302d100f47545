"""Air data of the flight model, written apart from the program's own so that the two can disagree.

SI throughout. Source: ISO 2533 atmosphere; compressible pitot relations as in NACA Report 837 (from memory).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]

G0 = 9.80665
GAS_CONSTANT = 287.05287
GAMMA = 1.4
TEMPERATURE_0 = 288.15
PRESSURE_0 = 101325.0
LAPSE = 0.0065
TROPOPAUSE = 11000.0
DENSITY_0 = PRESSURE_0 / (GAS_CONSTANT * TEMPERATURE_0)
SOUND_0 = (GAMMA * GAS_CONSTANT * TEMPERATURE_0) ** 0.5

KT = 1852.0 / 3600.0
FT = 0.3048
DEG = np.pi / 180.0
FT_MIN = FT / 60.0


def standard_temperature(pressure_altitude: ArrayLike) -> Array:
    """ISA temperature in K at a pressure altitude in m, up to 20 km."""
    height = np.asarray(pressure_altitude, dtype=float)
    return np.asarray(TEMPERATURE_0 - LAPSE * np.minimum(height, TROPOPAUSE))


def standard_pressure(pressure_altitude: ArrayLike) -> Array:
    """ISA pressure in Pa at a pressure altitude in m, up to 20 km."""
    height = np.asarray(pressure_altitude, dtype=float)
    below = PRESSURE_0 * (standard_temperature(height) / TEMPERATURE_0) ** (G0 / (GAS_CONSTANT * LAPSE))
    above = np.exp(-G0 * np.maximum(height - TROPOPAUSE, 0.0) / (GAS_CONSTANT * 216.65))
    return below * above


def mach_number(true_airspeed: ArrayLike, static_temperature: ArrayLike) -> Array:
    """Mach number from TAS in m/s and static temperature in K."""
    return np.asarray(true_airspeed, dtype=float) / np.sqrt(GAMMA * GAS_CONSTANT * np.asarray(static_temperature))


def calibrated_airspeed(mach: ArrayLike, static_pressure: ArrayLike) -> Array:
    """CAS in m/s from Mach number (below 1) and static pressure in Pa."""
    impact = np.asarray(static_pressure) * ((1.0 + 0.2 * np.asarray(mach, dtype=float) ** 2) ** 3.5 - 1.0)
    return np.asarray(SOUND_0 * np.sqrt(5.0 * ((impact / PRESSURE_0 + 1.0) ** (2.0 / 7.0) - 1.0)))


def true_from_calibrated(calibrated: float, static_pressure: float, static_temperature: float) -> float:
    """TAS in m/s from CAS in m/s, static pressure in Pa and temperature in K (scalars)."""
    impact = PRESSURE_0 * ((1.0 + 0.2 * (calibrated / SOUND_0) ** 2) ** 3.5 - 1.0)
    mach_squared = 5.0 * ((impact / static_pressure + 1.0) ** (2.0 / 7.0) - 1.0)
    return float((mach_squared * GAMMA * GAS_CONSTANT * static_temperature) ** 0.5)


def indicated_airspeed(calibrated: ArrayLike, position_error: tuple[tuple[float, float], ...]) -> Array:
    """IAS in m/s from CAS in m/s by a table of (IAS, CAS) in kt; the end corrections are held beyond the ends."""
    table = np.asarray(position_error, dtype=float) * KT
    cas = np.asarray(calibrated, dtype=float)
    error = np.interp(cas, table[:, 1], table[:, 1] - table[:, 0])
    # linear between the rows in IAS, so the inverse is linear in CAS as well
    return np.asarray(np.maximum(cas - error, 0.0))
