"""Gusts: load factor of a gust, gust velocity of a load factor, design gusts, and telling gusts from manoeuvres.

Velocities are equivalent ones. A derived gust velocity is a way to compare encounters, not a measurement of the air;
it must not be mixed with the older "effective" gust velocity, which is smaller by a factor of about 1.6 to 2.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from exceed.core.constants import DENSITY_0, FOOT, KNOT, POUND_FORCE, STANDARD_GRAVITY
from exceed.physics._arrays import Array, finite, floats, quiet, where
from exceed.physics.atmosphere import density, static_pressure

# V a Ude / (498 W/S) with V in kt, Ude in ft/s and W/S in lb/ft2: as the rule prints it, in SI (kg/m3)
PRINTED_CONSTANT = POUND_FORCE / FOOT**2 / (498.0 * KNOT * FOOT)
# what the printed number stands for; 0.1 per cent smaller
EXACT_CONSTANT = DENSITY_0 / 2.0
# sharp-edged gust as NAVWEPS prints it: 0.115 a V K U / (W/S), a per degree, same units
_PRINTED_SHARP = 0.115 * POUND_FORCE / FOOT**2 / (KNOT * FOOT) / float(np.degrees(1.0))

GUST_SECONDS = 2.0  # shorter excursions are taken for gusts, longer ones for manoeuvres
USUAL_DEAD_ZONE = 0.05  # from memory

_DESIGN_GUSTS_23 = {  # ft/s over ft
    "rough-air": ([20000.0, 50000.0], [66.0, 38.0]),
    "cruise": ([20000.0, 50000.0], [50.0, 25.0]),
    "dive": ([20000.0, 50000.0], [25.0, 12.5]),
    "flaps": ([20000.0, 50000.0], [25.0, 25.0]),  # 23.345(a)(2) and CS 25.345(a)(2), whatever the height
}


@quiet
def mass_ratio(
    mass: ArrayLike, wing_area: ArrayLike, mean_chord: ArrayLike, lift_curve_slope: ArrayLike, density: ArrayLike
) -> Array:
    """Aeroplane mass ratio mu = 2 (m/S) / (rho c a).

    Parameters: mass : (n,) array, kg; wing_area : m2; mean_chord : m; lift_curve_slope : 1/rad; density : (n,), kg/m3.
    Returns: (n,) array, 1. NaN where an input is not positive.
    Source: [NACA-1206], [14CFR23-OLD] 23.341(c).
    """
    m, area, chord, slope, rho = map(floats, (mass, wing_area, mean_chord, lift_curve_slope, density))
    positive = (m > 0) & (area > 0) & (chord > 0) & (slope > 0) & (rho > 0)
    return where(positive, 2.0 * m / (area * rho * chord * slope))


@quiet
def gust_alleviation_factor(mass_ratio: ArrayLike) -> Array:
    """Gust alleviation factor K_g = 0.88 mu / (5.3 + mu).

    Parameters: mass_ratio : (n,) array, 1.    Returns: (n,) array, 0 to 0.88. NaN for negative mass ratios.
    Source: [NACA-1206], [14CFR23-OLD] 23.341(c).
    """
    mu = floats(mass_ratio)
    return where(mu >= 0.0, 0.88 * mu / (5.3 + mu))


@quiet
def _per_velocity(
    speed: ArrayLike, mass: ArrayLike, area: ArrayLike, chord: ArrayLike, slope: ArrayLike, rho: ArrayLike, k: float
) -> Array:
    """Load factor increment of 1 m/s of derived gust velocity."""
    kg = gust_alleviation_factor(mass_ratio(mass, area, chord, slope, rho))
    v = floats(speed)
    wing_load = floats(mass) * STANDARD_GRAVITY / floats(area)
    return where(v >= 0.0, k * kg * v * floats(slope) / wing_load)


@quiet
def gust_load_factor_increment(
    gust_velocity: ArrayLike,
    equivalent_airspeed: ArrayLike,
    mass: ArrayLike,
    wing_area: ArrayLike,
    mean_chord: ArrayLike,
    lift_curve_slope: ArrayLike,
    density: ArrayLike,
    gust_constant: float = PRINTED_CONSTANT,
) -> Array:
    """Load factor increment of a gust: K_g U_de V a / (498 W/S).

    Parameters
    ----------
    gust_velocity : (n,) array, m/s EAS, derived, up positive
    equivalent_airspeed : (n,) array, m/s, not negative
    mass : (n,) array, kg; wing_area : m2; mean_chord : m (mean geometric); lift_curve_slope : 1/rad
    density : (n,) array, kg/m3, of the air at hand
    gust_constant : PRINTED_CONSTANT as the rule prints it, or EXACT_CONSTANT (rho0 / 2)

    Returns
    -------
    (n,) array, 1, to be added to 1 g. NaN where an input is out of its range.

    Source
    ------
    [14CFR23-OLD] 23.341(c), [NACA-1206]; [CS-22] 22.341 with EXACT_CONSTANT.
    """
    each = _per_velocity(equivalent_airspeed, mass, wing_area, mean_chord, lift_curve_slope, density, gust_constant)
    return finite(floats(gust_velocity) * each)


@quiet
def derived_gust_velocity(
    load_factor_increment: ArrayLike,
    equivalent_airspeed: ArrayLike,
    mass: ArrayLike,
    wing_area: ArrayLike,
    mean_chord: ArrayLike,
    lift_curve_slope: ArrayLike,
    density: ArrayLike,
    gust_constant: float = PRINTED_CONSTANT,
) -> Array:
    """Derived equivalent gust velocity U_de that would give a load factor increment; the inverse of the above.

    Parameters: as in `gust_load_factor_increment`, load_factor_increment : (n,) array, 1.
    Returns: (n,) array, m/s EAS, up positive. NaN at zero speed and where an input is out of its range.
    Source: [NACA-1206], [14CFR23-OLD] 23.341(c).
    """
    each = _per_velocity(equivalent_airspeed, mass, wing_area, mean_chord, lift_curve_slope, density, gust_constant)
    return where(each > 0.0, floats(load_factor_increment) / each)


@quiet
def gust_velocity(
    load_factor: ArrayLike,
    equivalent_airspeed: ArrayLike,
    mass: ArrayLike,
    pressure_altitude: ArrayLike,
    static_air_temperature: ArrayLike,
    wing_area: ArrayLike,
    mean_chord: ArrayLike,
    lift_curve_slope: ArrayLike,
) -> Array:
    """Derived equivalent gust velocity of a load factor, taking 1 g for the undisturbed flight.

    Parameters: load_factor : (n,), 1; equivalent_airspeed : (n,), m/s; mass : (n,), kg; pressure_altitude : (n,), m;
    static_air_temperature : (n,), K; wing_area : m2; mean_chord : m; lift_curve_slope : 1/rad.
    Returns: (n,) array, m/s EAS, up positive. Meaningful only at gust peaks in flight that does not manoeuvre; choosing
    those is the caller's work. NaN as in `derived_gust_velocity`.
    Source: [NACA-1206], [14CFR23-OLD] 23.341(c).
    """
    rho = density(static_pressure(pressure_altitude), static_air_temperature)
    increment = floats(load_factor) - 1.0
    return derived_gust_velocity(increment, equivalent_airspeed, mass, wing_area, mean_chord, lift_curve_slope, rho)


@quiet
def sharp_edged_gust_increment(
    gust_velocity: ArrayLike,
    equivalent_airspeed: ArrayLike,
    mass: ArrayLike,
    wing_area: ArrayLike,
    lift_curve_slope: ArrayLike,
) -> Array:
    """Load factor increment of an effective sharp-edged gust, without alleviation.

    Parameters: gust_velocity : (n,), m/s EAS, alleviation included; others as in `gust_load_factor_increment`.
    Returns: (n,) array, 1. NaN where the mass, area or speed is not positive.
    Source: [NAVWEPS-00-80T-80], with its printed 0.115.
    """
    v, m, area = floats(equivalent_airspeed), floats(mass), floats(wing_area)
    wing_load = m * STANDARD_GRAVITY / area
    increment = _PRINTED_SHARP * floats(gust_velocity) * v * floats(lift_curve_slope) / wing_load
    return where((v >= 0.0) & (m > 0.0) & (area > 0.0), increment)


@quiet
def design_gust_velocity(pressure_altitude: ArrayLike, at: str) -> Array:
    """Design gust of the older part 23: constant to 20 000 ft, linear to 50 000 ft.

    Parameters: pressure_altitude : (n,), m; at : 'cruise' (50 to 25 ft/s), 'dive' (25 to 12.5), 'rough-air' (66 to
    38 ft/s, commuter category) or 'flaps' (25 ft/s, flaps out).
    Returns: (n,) array, m/s EAS; held above 50 000 ft. NaN where the altitude is.
    Raises: ValueError for another condition.
    Source: [14CFR23-OLD] 23.333(c)(1), 23.345(a)(2); 38 ft/s at 50 000 ft from memory.
    """
    if at not in _DESIGN_GUSTS_23:
        raise ValueError(f"no design gust {at!r}; known: {', '.join(sorted(_DESIGN_GUSTS_23))}")
    heights, gusts = _DESIGN_GUSTS_23[at]
    return finite(np.interp(floats(pressure_altitude) / FOOT, heights, gusts) * FOOT)


@quiet
def reference_gust_velocity(pressure_altitude: ArrayLike) -> Array:
    """Reference gust of transport aeroplanes, V_B to V_C: 56 ft/s at sea level, 44 at 15 000 ft, 20.86 at 60 000 ft.

    Parameters: pressure_altitude : (n,) array, m.    Returns: (n,) array, m/s EAS; ends held. NaN where the input is.
    Source: [14CFR25] 25.341(a)(5)(i).
    """
    return finite(np.interp(floats(pressure_altitude) / FOOT, [0.0, 15e3, 60e3], [56.0, 44.0, 20.86]) * FOOT)


@quiet
def design_gust_of_gradient(
    reference_gust_velocity: ArrayLike, gust_gradient: ArrayLike, flight_profile_factor: ArrayLike = 1.0
) -> Array:
    """Design gust of a gradient distance: U_ds = U_ref F_g (H / 350 ft)^(1/6).

    Parameters: reference_gust_velocity : (n,), m/s; gust_gradient : (n,), m; flight_profile_factor : 1.
    Returns: (n,) array, m/s EAS. NaN where the gradient is negative.
    Source: [14CFR25] 25.341(a)(4).
    """
    gradient = floats(gust_gradient) / (350.0 * FOOT)
    velocity = floats(reference_gust_velocity) * floats(flight_profile_factor) * np.power(gradient, 1.0 / 6.0)
    return where(gradient >= 0.0, velocity)


@quiet
def gust_profile(design_gust: ArrayLike, gust_gradient: ArrayLike, penetration: ArrayLike) -> Array:
    """One-minus-cosine gust: U = U_ds / 2 (1 - cos(pi s / H)) for 0 <= s <= 2H, else 0.

    Parameters: design_gust : (n,), m/s; gust_gradient : (n,), m; penetration : (n,), m into the gust.
    Returns: (n,) array, m/s. NaN where the gradient is not positive or an input is NaN.
    Source: [14CFR25] 25.341(a)(2).
    """
    gradient, s = floats(gust_gradient), floats(penetration)
    inside = (s >= 0.0) & (s <= 2.0 * gradient)
    velocity = floats(design_gust) * np.sin(0.5 * np.pi * s / gradient) ** 2
    return where((gradient > 0.0) & ~np.isnan(velocity), np.where(inside, velocity, 0.0))


@quiet
def rough_air_speed_minimum(
    stall_speed: ArrayLike,
    gust_alleviation_factor: ArrayLike,
    reference_gust_velocity: ArrayLike,
    cruise_speed: ArrayLike,
    lift_curve_slope: ArrayLike,
    wing_loading: ArrayLike,
) -> Array:
    """Least rough-air speed V_B = V_S1 sqrt(1 + K_g U_ref V_C a / (498 w)).

    Parameters: stall_speed, cruise_speed : (n,), m/s EAS; gust_alleviation_factor : 1; reference_gust_velocity :
    m/s EAS; lift_curve_slope : 1/rad; wing_loading : kg/m2.
    Returns: (n,) array, m/s EAS. NaN where the loading is not positive.
    Source: [14CFR25] 25.335(d)(1).
    """
    loading = floats(wing_loading)
    product = floats(gust_alleviation_factor) * floats(reference_gust_velocity) * floats(cruise_speed)
    increment = PRINTED_CONSTANT * product * floats(lift_curve_slope) / (loading * STANDARD_GRAVITY)
    return where(loading > 0.0, floats(stall_speed) * np.sqrt(1.0 + increment))


@dataclass(frozen=True, slots=True, eq=False)
class Excursions:
    """Excursions of a load factor increment outside a dead zone: first and last row outside, row of the extreme, its
    value, and the time for which the record stays on that side of the mean, s. Arrays of one length (k,)."""

    first: NDArray[np.intp]
    last: NDArray[np.intp]
    row: NDArray[np.intp]
    extreme: Array
    duration: Array


@quiet
def peaks_between_means(
    times: ArrayLike, load_factor_increment: ArrayLike, dead_zone: float = USUAL_DEAD_ZONE
) -> Excursions:
    """One peak for each excursion outside a dead zone about the mean.

    An excursion begins with the first sample outside the zone and ends where one is inside or on the other side;
    excursions of one side parted by a visit to the zone count apart; the end of the record, and a NaN, close one.

    Parameters
    ----------
    times : (n,) array, s, rising
    load_factor_increment : (n,) array, 1, about its mean (usually n - 1)
    dead_zone : half-width, 1

    Returns
    -------
    Excursions. `duration` runs between the crossings of the mean on either side, straight between samples; where the
    record ends or has a NaN before such a crossing, to the last sample there: at least that long.

    Raises
    ------
    ValueError : shapes other than (n,), or a negative dead zone.

    Source
    ------
    [PEAKS-BETWEEN-MEANS].
    """
    t, dn = floats(times), floats(load_factor_increment)
    if t.ndim != 1 or t.shape != dn.shape or not dead_zone >= 0.0:
        raise ValueError("times and load_factor_increment must be of one shape (n,), dead_zone not negative")
    side = np.where(dn > dead_zone, 1, np.where(dn < -dead_zone, -1, 0))
    edges = np.flatnonzero(np.diff(side, prepend=0))
    first = edges[side[edges] != 0] if t.size else np.empty(0, dtype=np.intp)
    if not first.size:
        empty = np.empty(0, dtype=np.intp)
        return Excursions(empty, empty, empty, np.empty(0), np.empty(0))
    last = np.append(edges, t.size)[np.searchsorted(edges, first) + 1] - 1
    size = np.abs(dn)
    top = np.maximum.reduceat(np.where(side != 0, size, 0.0), first)
    label = np.repeat(np.arange(first.size), last - first + 1)
    rows = np.concatenate([np.arange(a, b + 1) for a, b in zip(first, last, strict=True)])
    hits = rows[size[rows] == top[label]]
    # the first sample that reaches the extreme stands for it
    row = hits[np.unique(label[size[rows] == top[label]], return_index=True)[1]]
    before, after = _mean_crossings(t, dn)
    return Excursions(first, last, row, dn[row].copy(), after[row] - before[row])


def _mean_crossings(t: Array, dn: Array) -> tuple[Array, Array]:
    """Time of the last mean crossing before each sample and of the first after it (or the end of what is known)."""
    sign = np.sign(np.where(np.isnan(dn), 0.0, dn))
    n = t.size
    step = np.flatnonzero((sign[1:] != sign[:-1]) | np.isnan(dn[1:]) | np.isnan(dn[:-1]))
    low, high = dn[step], dn[step + 1]
    share = np.where(np.isnan(low - high), np.nan, low / (low - high))
    when = t[step] + share * (t[step + 1] - t[step])
    # beside a NaN nothing is known of the crossing: the neighbouring sample bounds it
    leaving = np.where(np.isnan(when), t[step], when)
    entering = np.where(np.isnan(when), t[step + 1], when)
    before = np.concatenate(([t[0]], entering))[np.searchsorted(step, np.arange(n) - 1, side="right")]
    after = np.concatenate((leaving, [t[-1]]))[np.searchsorted(step, np.arange(n), side="left")]
    return before, after


@quiet
def is_gust(duration: ArrayLike) -> NDArray[np.bool_]:
    """Whether an excursion is short enough to be taken for a gust rather than a manoeuvre: below two seconds.

    Parameters: duration : (n,) array, s, between crossings of the mean.    Returns: (n,) array of bool; False for NaN.
    Source: [TWO-SECOND-RULE]; the side on which exactly 2.0 s falls is our choice. In aerobatics most pulls are
    shorter than that, so it says something only where nobody manoeuvres.
    """
    return np.asarray(floats(duration) < GUST_SECONDS)
