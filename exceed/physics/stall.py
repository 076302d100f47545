"""Stall speed at any load factor, mass, flap setting and altitude; margins to it.

At constant maximum lift coefficient the equivalent airspeed of the stall goes with sqrt(|n| m). Handbook stall speeds
are calibrated, taken at low altitude, where calibrated and equivalent are one (they are the same at sea level).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from exceed.physics._arrays import Array, finite, floats, quiet, where
from exceed.physics.airspeed import calibrated_airspeed_from_equivalent
from exceed.physics.tables import FLAP_TOLERANCE, freeze


@dataclass(frozen=True, slots=True, eq=False)
class StallTable:
    """Stall speeds of the manual: level, 1 g, idle. Columns of one length (k,), in any order.

    flap_angle : rad; mass : kg, of the row's speeds; upright, inverted : m/s, calibrated at sea level (so equivalent);
    inverted NaN where not given.
    """

    flap_angle: Array
    mass: Array
    upright: Array
    inverted: Array

    def __post_init__(self) -> None:
        freeze(self)
        if not (np.isfinite(self.flap_angle).all() and (self.mass > 0).all() and (self.upright > 0).all()):
            raise ValueError("StallTable: flap_angle must be finite, mass and upright positive")
        if (self.inverted <= 0).any():
            raise ValueError("StallTable: inverted must be positive, or NaN where not given")


def _speed_of_root_mass(setting: float, mass: Array, table: StallTable, speeds: Array) -> Array:
    """V/sqrt(m) of one flap setting: one row holds for all masses, several are interpolated over mass, ends held."""
    rows = np.flatnonzero((table.flap_angle == setting) & np.isfinite(speeds))
    rows = rows[np.argsort(table.mass[rows], kind="stable")]
    scaled = speeds[rows] / np.sqrt(table.mass[rows])
    return np.where(np.isnan(mass), np.nan, scaled[0] if rows.size == 1 else np.interp(mass, table.mass[rows], scaled))


def _one_g(mass: Array, flap_angle: Array, table: StallTable, speeds: Array, snap: bool) -> Array:
    """1 g stall speed, equivalent, m/s. `snap`: nothing is held beyond the rows that give a speed."""
    settings = np.unique(table.flap_angle[np.isfinite(speeds)])
    mass, flap_angle = np.broadcast_arrays(mass, flap_angle)
    if settings.size == 0:
        return np.full(mass.shape, np.nan)
    if np.unique(table.flap_angle[np.isfinite(speeds)], return_counts=True)[1].max() == 1:
        rows = np.flatnonzero(np.isfinite(speeds))
        rows = rows[np.argsort(table.flap_angle[rows])]
        scaled = speeds[rows] / np.sqrt(table.mass[rows])
        result = np.interp(flap_angle, table.flap_angle[rows], scaled)
    else:
        result = _interpolated_curves(flap_angle, mass, table, speeds, settings)
    if snap:
        known = (flap_angle >= settings[0] - FLAP_TOLERANCE - 1e-9) & (
            flap_angle <= settings[-1] + FLAP_TOLERANCE + 1e-9
        )
        result = np.where(known, result, np.nan)
    return np.asarray(result * np.sqrt(mass))


def _interpolated_curves(flap_angle: Array, mass: Array, table: StallTable, speeds: Array, settings: Array) -> Array:
    """V/sqrt(m) between settings some of which have several rows over mass."""
    curves = [_speed_of_root_mass(float(setting), mass, table, speeds) for setting in settings]
    result = curves[-1]
    for j in range(settings.size - 2, -1, -1):
        low, high = settings[j], settings[j + 1]
        share = np.clip((flap_angle - low) / (high - low), 0.0, 1.0)
        result = np.where(flap_angle < high, curves[j] + share * (curves[j + 1] - curves[j]), result)
    return np.where(np.isnan(flap_angle), np.nan, result)


@quiet
def stall_speed_1g(mass: ArrayLike, flap_angle: ArrayLike, stall_table: StallTable) -> Array:
    """Upright stall speed at 1 g, equivalent.

    Parameters: mass : (n,) array, kg; flap_angle : (n,) array, rad; stall_table : StallTable.
    Returns: (n,) array, m/s EAS. Linear between flap settings, held beyond the first and last. NaN where an input is
    NaN or the mass not positive.
    Source: [CONSTANT-CL].
    """
    m, flaps = floats(mass), floats(flap_angle)
    return where((m > 0.0) & ~np.isnan(flaps), _one_g(m, flaps, stall_table, stall_table.upright, snap=False))


@quiet
def stall_speed_1g_inverted(mass: ArrayLike, flap_angle: ArrayLike, stall_table: StallTable) -> Array:
    """Inverted stall speed at -1 g, equivalent.

    Parameters: as in `stall_speed_1g`.
    Returns: (n,) array, m/s EAS. Linear between the settings that give one; NaN more than a degree outside them:
    flaps move it and the manual does not say how.
    Source: [CONSTANT-CL].
    """
    m, flaps = floats(mass), floats(flap_angle)
    return where((m > 0.0) & ~np.isnan(flaps), _one_g(m, flaps, stall_table, stall_table.inverted, snap=True))


@quiet
def stall_speed_at_load_factor(stall_speed: ArrayLike, load_factor: ArrayLike) -> Array:
    """Stall speed at a load factor of the same sign of lift: V_s sqrt(|n|), in equivalent airspeed.

    Parameters: stall_speed : (n,) array, m/s EAS, at 1 g; load_factor : (n,) array, 1.
    Returns: (n,) array, m/s EAS; 0 at n = 0. NaN where an input is NaN or the speed negative.
    Source: [CONSTANT-CL], [FAA-PHAK] (twice the speed at 4 g).
    """
    speed = floats(stall_speed)
    return where(speed >= 0.0, speed * np.sqrt(np.abs(floats(load_factor))))


@quiet
def speed_at_mass(speed: ArrayLike, mass: ArrayLike, reference_mass: ArrayLike) -> Array:
    """A speed of constant lift coefficient and load factor at another mass: V sqrt(m / m_ref).

    Parameters: speed : (n,) array, m/s EAS, at reference_mass; mass, reference_mass : (n,) arrays, kg.
    Returns: (n,) array, m/s EAS. NaN for a negative mass or a reference that is not positive.
    Source: [CONSTANT-CL]. For V_A only where the manual says so: a step in the limit factor breaks it.
    """
    m, reference = floats(mass), floats(reference_mass)
    return where((m >= 0.0) & (reference > 0.0), floats(speed) * np.sqrt(m / reference))


@quiet
def stall_speed_equivalent(
    load_factor: ArrayLike, mass: ArrayLike, flap_angle: ArrayLike, stall_table: StallTable
) -> Array:
    """Equivalent airspeed at which the wing stalls at this load factor, mass and flap setting.

    Parameters and Returns: as in `stall_speed`, but m/s EAS and without altitude.
    Source: [CONSTANT-CL].
    """
    n, m, flaps = np.broadcast_arrays(floats(load_factor), floats(mass), floats(flap_angle))
    one_g = np.asarray(stall_speed_1g(m, flaps, stall_table))
    negative = n < 0.0
    if negative.any():
        one_g = np.array(one_g)
        one_g[negative] = stall_speed_1g_inverted(m[negative], flaps[negative], stall_table)
    return finite(one_g * np.sqrt(np.abs(n)))


def stall_speed(
    load_factor: ArrayLike,
    mass: ArrayLike,
    flap_angle: ArrayLike,
    pressure_altitude: ArrayLike,
    stall_table: StallTable,
) -> Array:
    """Calibrated airspeed at which the wing stalls at this load factor, mass, flap setting and altitude.

    Parameters
    ----------
    load_factor : (n,) array, 1; below zero the inverted speed is used
    mass : (n,) array, kg
    flap_angle : (n,) array, rad
    pressure_altitude : (n,) array, m
    stall_table : StallTable

    Returns
    -------
    (n,) array, m/s CAS; tends to 0 with n, and is 0 there. NaN where an input is NaN, and for n < 0 where no inverted
    speed is given.

    Source
    ------
    [CONSTANT-CL] in equivalent airspeed, then [PITOT-STATIC] to calibrated.
    """
    return calibrated_airspeed_from_equivalent(
        stall_speed_equivalent(load_factor, mass, flap_angle, stall_table), pressure_altitude
    )


@quiet
def stall_margin(calibrated_airspeed: ArrayLike, stall_speed: ArrayLike) -> Array:
    """How far the speed is above the stall speed; negative below it.

    Parameters: calibrated_airspeed, stall_speed : (n,) arrays, m/s CAS.    Returns: (n,) array, m/s.
    Source: [DEFINITION].
    """
    return finite(floats(calibrated_airspeed) - floats(stall_speed))


@quiet
def stall_speed_ratio(calibrated_airspeed: ArrayLike, stall_speed: ArrayLike) -> Array:
    """Speed over stall speed: 1 at the stall, 1.3 on a usual approach.

    Parameters: calibrated_airspeed, stall_speed : (n,) arrays, m/s CAS, not negative.
    Returns: (n,) array, 1. NaN where the stall speed is zero (no lift asked, no ratio) or an input negative.
    Source: [DEFINITION].
    """
    speed, stall = floats(calibrated_airspeed), floats(stall_speed)
    return where((speed >= 0.0) & (stall > 0.0), speed / stall)


def stall_margin_fraction(calibrated_airspeed: ArrayLike, stall_speed: ArrayLike) -> Array:
    """Margin to the stall as a fraction of the stall speed: V / V_s - 1.

    Parameters and Returns: as in `stall_speed_ratio`, less one.
    Source: [DEFINITION].
    """
    return finite(stall_speed_ratio(calibrated_airspeed, stall_speed) - 1.0)


@quiet
def load_factor_at_stall(equivalent_airspeed: ArrayLike, stall_speed: ArrayLike) -> Array:
    """Load factor that the wing can give before it stalls: (V / V_s)2, the stall line of the V-n diagram.

    Parameters: equivalent_airspeed : (n,) array, m/s EAS; stall_speed : (n,) array, m/s EAS, at 1 g.
    Returns: (n,) array, 1, the size without sign. NaN where the stall speed is not positive or the speed negative.
    Source: [VN-DIAGRAM], [CONSTANT-CL].
    """
    speed, stall = floats(equivalent_airspeed), floats(stall_speed)
    return where((speed >= 0.0) & (stall > 0.0), (speed / stall) ** 2)
