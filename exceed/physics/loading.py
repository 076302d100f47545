"""Mass and balance: moments, centre of gravity, fuel, and the loading envelope.

Arms are from the manual's datum, aft positive. Stations lie along the last axis, so one call serves a loading sheet
(k,) or one for each sample (n, k).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from exceed.core.constants import POUND, US_GALLON
from exceed.physics._arrays import Array, finite, floats, quiet, where
from exceed.physics.tables import freeze

AVGAS_DENSITY = 6.0 * POUND / US_GALLON  # kg/m3; the handbook's 6 lb a US gallon [FAA-PHAK]


@dataclass(frozen=True, slots=True, eq=False)
class LoadingEnvelope:
    """CG limits over mass: `mass` (k,) kg rising, `forward`, `aft` (k,) m from the datum, aft positive."""

    mass: Array
    forward: Array
    aft: Array

    def __post_init__(self) -> None:
        freeze(self)
        if not all(np.isfinite(column).all() for column in (self.mass, self.forward, self.aft)):
            raise ValueError("LoadingEnvelope: all numbers must be finite")
        if (np.diff(self.mass) <= 0).any() or (self.forward > self.aft).any():
            raise ValueError("LoadingEnvelope: masses must rise, and forward must not lie aft of aft")


@quiet
def total_mass(masses: ArrayLike) -> Array:
    """Sum of the stations' masses.

    Parameters: masses : (..., k) array, kg; negative where something was taken out.
    Returns: (...) array, kg. NaN where a station's mass is NaN: an unknown item is not nothing.
    Source: [FAA-WB].
    """
    return finite(np.sum(floats(masses), axis=-1))


@quiet
def total_moment(masses: ArrayLike, arms: ArrayLike) -> Array:
    """Sum of mass times arm.

    Parameters: masses : (..., k) array, kg; arms : (k,) or (..., k) array, m.
    Returns: (...) array, kg m. NaN where an item is NaN.
    Source: [FAA-WB].
    """
    return finite(np.sum(floats(masses) * floats(arms), axis=-1))


@quiet
def centre_of_gravity_of_stations(masses: ArrayLike, arms: ArrayLike) -> Array:
    """Centre of gravity: total moment over total mass.

    Parameters: masses : (..., k) array, kg; arms : (k,) or (..., k) array, m.
    Returns: (...) array, m aft of the datum. NaN where an item is NaN or the total mass not positive.
    Source: [FAA-WB].
    """
    mass = total_mass(masses)
    return where(np.asarray(mass) > 0.0, total_moment(masses, arms) / mass)


@quiet
def centre_of_gravity_after_change(
    mass: ArrayLike, centre_of_gravity: ArrayLike, added_mass: ArrayLike, added_arm: ArrayLike
) -> Array:
    """Centre of gravity after something was added, or (negative) taken out, as fuel burnt.

    Parameters: mass : (n,), kg, before; centre_of_gravity : (n,), m; added_mass : (n,), kg; added_arm : (n,), m.
    Returns: (n,) array, m. NaN where nothing is left.
    Source: [FAA-WB].
    """
    m, added = floats(mass), floats(added_mass)
    total = m + added
    return where(total > 0.0, (m * floats(centre_of_gravity) + added * floats(added_arm)) / total)


@quiet
def centre_of_gravity_shift(moved_mass: ArrayLike, distance: ArrayLike, mass: ArrayLike) -> Array:
    """How far the centre of gravity moves when something is moved within the aeroplane.

    Parameters: moved_mass : (n,), kg; distance : (n,), m, aft positive; mass : (n,), kg, of the whole.
    Returns: (n,) array, m. NaN where the mass is not positive.
    Source: [FAA-WB].
    """
    m = floats(mass)
    return where(m > 0.0, floats(moved_mass) * floats(distance) / m)


@quiet
def centre_of_gravity_fraction(
    centre_of_gravity: ArrayLike, chord_leading_edge: ArrayLike, mean_chord: ArrayLike
) -> Array:
    """Centre of gravity as a fraction of the mean aerodynamic chord (times 100: % MAC).

    Parameters: centre_of_gravity : (n,), m; chord_leading_edge : m from the datum; mean_chord : m.
    Returns: (n,) array, 1. NaN where the chord is not positive.
    Source: [FAA-WB].
    """
    chord = floats(mean_chord)
    return where(chord > 0.0, (floats(centre_of_gravity) - floats(chord_leading_edge)) / chord)


@quiet
def fuel_mass_of_volume(fuel_volume: ArrayLike, fuel_density: ArrayLike) -> Array:
    """Mass of a volume of fuel.

    Parameters: fuel_volume : (n,), m3; fuel_density : kg/m3.    Returns: (n,) array, kg. NaN where negative.
    Source: [DEFINITION]; AVGAS_DENSITY [FAA-PHAK].
    """
    volume, rho = floats(fuel_volume), floats(fuel_density)
    return where((volume >= 0.0) & (rho > 0.0), volume * rho)


@quiet
def mass_after_burn(mass: ArrayLike, fuel_mass_flow: ArrayLike, elapsed: ArrayLike) -> Array:
    """Mass after a time of constant fuel flow.

    Parameters: mass : (n,), kg, at the start; fuel_mass_flow : (n,), kg/s; elapsed : (n,), s.
    Returns: (n,) array, kg. NaN where the result would be negative.
    Source: [DEFINITION].
    """
    left = floats(mass) - floats(fuel_mass_flow) * floats(elapsed)
    return where(left >= 0.0, left)


@quiet
def fuel_burnt(times: ArrayLike, fuel_mass_flow: ArrayLike) -> Array:
    """Fuel burnt since the first sample, by the trapezium rule over the known samples.

    Parameters: times : (n,) array, s, rising; fuel_mass_flow : (n,) array, kg/s; NaN is bridged by a straight line
    between the known neighbours (the engine does not stop for a dropout).
    Returns: (n,) array, kg. NaN at unknown samples and before the first known one.
    Raises: ValueError for shapes other than (n,).
    Source: [DEFINITION].
    """
    t, flow = floats(times), floats(fuel_mass_flow)
    if t.ndim != 1 or t.shape != flow.shape:
        raise ValueError(f"times and fuel_mass_flow must be of one shape (n,), not {t.shape} and {flow.shape}")
    burnt = np.full(t.shape, np.nan)
    known = np.flatnonzero(np.isfinite(t) & np.isfinite(flow))
    if known.size:
        pieces = 0.5 * (flow[known][1:] + flow[known][:-1]) * np.diff(t[known])
        burnt[known] = np.concatenate(([0.0], np.cumsum(pieces)))
    return finite(burnt)


def _limit(mass: ArrayLike, table: LoadingEnvelope, column: Array) -> Array:
    m = floats(mass)
    return where((m >= table.mass[0]) & (m <= table.mass[-1]), np.interp(m, table.mass, column))


@quiet
def centre_of_gravity_forward_limit(mass: ArrayLike, loading_envelope: LoadingEnvelope) -> Array:
    """Forward limit of the CG at a mass, linear between rows.

    Parameters: mass : (n,), kg; loading_envelope : LoadingEnvelope.
    Returns: (n,) array, m. NaN below the first and above the last mass of the envelope: there is no limit to quote, the
    mass itself is outside.
    Source: [FAA-WB].
    """
    return _limit(mass, loading_envelope, loading_envelope.forward)


@quiet
def centre_of_gravity_aft_limit(mass: ArrayLike, loading_envelope: LoadingEnvelope) -> Array:
    """Aft limit of the CG at a mass, linear between rows.

    Parameters, Returns and Source: as in `centre_of_gravity_forward_limit`: [FAA-WB].
    """
    return _limit(mass, loading_envelope, loading_envelope.aft)


@quiet
def centre_of_gravity_margin(mass: ArrayLike, centre_of_gravity: ArrayLike, loading_envelope: LoadingEnvelope) -> Array:
    """Distance from the CG to the nearer limit; negative outside.

    Parameters: mass : (n,), kg; centre_of_gravity : (n,), m; loading_envelope : LoadingEnvelope.
    Returns: (n,) array, m. NaN where the mass is outside the envelope's masses.
    Source: [FAA-WB].
    """
    cg = floats(centre_of_gravity)
    forward = centre_of_gravity_forward_limit(mass, loading_envelope)
    aft = centre_of_gravity_aft_limit(mass, loading_envelope)
    return finite(np.minimum(cg - forward, aft - cg))


@quiet
def overweight(mass: ArrayLike, maximum_mass: ArrayLike) -> NDArray[np.bool_]:
    """Whether a mass is above its maximum; the maximum itself is allowed.

    Parameters: mass, maximum_mass : (n,) arrays, kg.    Returns: (n,) array of bool; False for NaN.
    Source: [DEFINITION].
    """
    return np.asarray(floats(mass) > floats(maximum_mass))
