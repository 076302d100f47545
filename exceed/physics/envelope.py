"""The flight envelope (V-n diagram) at one mass, altitude and flap setting, in equivalent airspeed.

Stall boundaries meet limit factors meet the speed limit; gust lines where the wing's data are there. The limits
themselves come from `load_limits`, `category` and `tables`, whose functions are offered here as well.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from exceed.physics._arrays import Array, floats, quiet, where
from exceed.physics.category import CATEGORIES, CategoryLimits, category_load_factors
from exceed.physics.load_limits import (
    LoadFactorTable,
    load_factor_at_mass,
    load_factor_margin,
    load_factor_maximum,
    load_factor_maximum_rolling,
    load_factor_minimum,
    overweight_for_limits,
)
from exceed.physics.stall import stall_speed_at_load_factor
from exceed.physics.tables import (
    FLAP_TOLERANCE,
    StepTable,
    Table,
    flap_setting_in_force,
    flaps_extended_speed,
    outside_table,
    past_last_setting,
    table_value,
)

__all__ = [
    "CATEGORIES",
    "FLAP_TOLERANCE",
    "CategoryLimits",
    "Corner",
    "Envelope",
    "LoadFactorTable",
    "StepTable",
    "Table",
    "category_load_factors",
    "design_manoeuvring_speed",
    "envelope",
    "envelope_lower",
    "envelope_upper",
    "flap_setting_in_force",
    "flaps_extended_speed",
    "load_factor_at_mass",
    "load_factor_margin",
    "load_factor_maximum",
    "load_factor_maximum_rolling",
    "load_factor_minimum",
    "outside_table",
    "overweight_for_limits",
    "past_last_setting",
    "table_value",
    "tapered_load_factor",
]


@dataclass(frozen=True, slots=True)
class Corner:
    """A named point of the diagram: m/s EAS, and load factor."""

    name: str
    equivalent_airspeed: float
    load_factor: float


@dataclass(frozen=True, slots=True, eq=False)
class Envelope:
    """The diagram's boundary: `equivalent_airspeed` (n,), m/s, from 0 to the speed limit; `upper`, `lower` (n,), 1.

    `lower` is NaN throughout where no inverted stall speed or no negative limit is known; `corners` in the order of a
    walk round the diagram, from the 1 g stall clockwise.
    """

    equivalent_airspeed: Array
    upper: Array
    lower: Array
    corners: tuple[Corner, ...]


def design_manoeuvring_speed(stall_speed: ArrayLike, load_factor_maximum: ArrayLike) -> Array:
    """Speed at which the stall line meets the positive limit: V_s sqrt(n), the least V_A of the codes.

    Parameters: stall_speed : (n,) array, m/s EAS at 1 g; load_factor_maximum : (n,) array, 1.
    Returns: (n,) array, m/s EAS. NaN where an input is NaN or the speed negative.
    Source: [14CFR23-OLD] 23.335(c), [14CFR25] 25.335(c). A manual's V_A may be another speed, and goes first.
    """
    return stall_speed_at_load_factor(stall_speed, load_factor_maximum)


@quiet
def tapered_load_factor(
    equivalent_airspeed: ArrayLike,
    cruise_speed: ArrayLike,
    dive_speed: ArrayLike,
    load_factor_at_cruise: ArrayLike,
    load_factor_at_dive: ArrayLike,
) -> Array:
    """Limit factor that is constant up to V_C and runs in a straight line to another value at V_D.

    Parameters: equivalent_airspeed, cruise_speed, dive_speed : (n,) arrays, m/s of one kind; load_factor_at_cruise,
    load_factor_at_dive : (n,) arrays, 1.
    Returns: (n,) array, 1; beyond V_D the value there. NaN where an input is NaN or V_D is not above V_C.
    Source: [14CFR23-OLD] 23.333(b)(3), [14CFR25] 25.337(c).
    """
    cruise, dive = floats(cruise_speed), floats(dive_speed)
    first, last = floats(load_factor_at_cruise), floats(load_factor_at_dive)
    share = np.clip((floats(equivalent_airspeed) - cruise) / (dive - cruise), 0.0, 1.0)
    return where(dive > cruise, first + share * (last - first))


def _limit_at(speed: ArrayLike, cruise: ArrayLike, dive: ArrayLike, limit: ArrayLike, at_dive: ArrayLike) -> Array:
    """Limit factor at a speed: constant where no cruise speed or no figure at the dive speed is known."""
    tapered = tapered_load_factor(speed, cruise, dive, limit, at_dive)
    plain = np.isnan(floats(cruise)) | np.isnan(floats(at_dive))
    return np.asarray(np.where(plain, floats(limit), tapered))


@quiet
def envelope_upper(
    equivalent_airspeed: ArrayLike,
    stall_speed: ArrayLike,
    load_factor_maximum: ArrayLike,
    speed_limit: ArrayLike,
    cruise_speed: ArrayLike = np.nan,
    load_factor_maximum_at_dive: ArrayLike = np.nan,
) -> Array:
    """Upper boundary of the V-n diagram: the lower of stall line and positive limit.

    Parameters
    ----------
    equivalent_airspeed : (n,) array, m/s
    stall_speed : m/s EAS, upright at 1 g, at the diagram's mass and flaps
    load_factor_maximum : 1
    speed_limit : m/s EAS, V_NE or V_D
    cruise_speed, load_factor_maximum_at_dive : m/s EAS and 1, for limits that taper to V_D; NaN for none

    Returns
    -------
    (n,) array, 1. NaN beyond the speed limit, where nothing is allowed, for negative speeds and unknown inputs.

    Source
    ------
    [VN-DIAGRAM].
    """
    speed, stall, end = floats(equivalent_airspeed), floats(stall_speed), floats(speed_limit)
    limit = _limit_at(speed, cruise_speed, end, load_factor_maximum, load_factor_maximum_at_dive)
    return where((speed >= 0.0) & (speed <= end) & (stall > 0.0), np.minimum((speed / stall) ** 2, limit))


@quiet
def envelope_lower(
    equivalent_airspeed: ArrayLike,
    stall_speed_inverted: ArrayLike,
    load_factor_minimum: ArrayLike,
    speed_limit: ArrayLike,
    cruise_speed: ArrayLike = np.nan,
    load_factor_minimum_at_dive: ArrayLike = np.nan,
) -> Array:
    """Lower boundary of the V-n diagram: the higher of inverted stall line and negative limit.

    Parameters and Returns: as in `envelope_upper`, stall_speed_inverted at -1 g.
    Source: [VN-DIAGRAM].
    """
    speed, stall, end = floats(equivalent_airspeed), floats(stall_speed_inverted), floats(speed_limit)
    limit = _limit_at(speed, cruise_speed, end, load_factor_minimum, load_factor_minimum_at_dive)
    return where((speed >= 0.0) & (speed <= end) & (stall > 0.0), np.maximum(-((speed / stall) ** 2), limit))


@quiet
def envelope(
    stall_speed: float,
    stall_speed_inverted: float,
    load_factor_maximum: float,
    load_factor_minimum: float,
    speed_limit: float,
    cruise_speed: float = np.nan,
    load_factor_maximum_at_dive: float = np.nan,
    load_factor_minimum_at_dive: float = np.nan,
    points: int = 201,
) -> Envelope:
    """The V-n diagram: boundary curves and corner points.

    Parameters
    ----------
    stall_speed, stall_speed_inverted : m/s EAS at 1 g and -1 g; the inverted one may be NaN
    load_factor_maximum, load_factor_minimum : 1, limits up to cruise speed; the minimum may be NaN
    speed_limit : m/s EAS, V_NE or V_D
    cruise_speed : m/s EAS, V_C or V_NO; NaN for none
    load_factor_maximum_at_dive, load_factor_minimum_at_dive : 1, where limits taper to the speed limit; NaN for none
    points : number of speeds in the curves, besides the corners' own

    Returns
    -------
    Envelope. Corners that cannot be had are left out: the list says only what is known.

    Raises
    ------
    ValueError : a stall speed, positive limit or speed limit that is NaN or not positive.

    Source
    ------
    [VN-DIAGRAM].
    """
    for name, value in (
        ("stall_speed", stall_speed),
        ("load_factor_maximum", load_factor_maximum),
        ("speed_limit", speed_limit),
    ):
        if not (np.isfinite(value) and value > 0.0):
            raise ValueError(f"{name} must be a positive number, not {value}")
    # a cruise speed at or above the limit, as a note V_NO = V_NE, leaves nothing to taper over
    cruise = cruise_speed if 0.0 < cruise_speed < speed_limit else np.nan
    top = (stall_speed, load_factor_maximum, speed_limit, cruise, load_factor_maximum_at_dive)
    bottom = (stall_speed_inverted, load_factor_minimum, speed_limit, cruise, load_factor_minimum_at_dive)
    corner_up = float(_meeting(stall_speed, load_factor_maximum, top, speed_limit))
    corner_down = float(_meeting(stall_speed_inverted, -load_factor_minimum, bottom, speed_limit))
    walk = (
        ("stall at 1 g", stall_speed, envelope_upper, top),
        ("stall line meets positive limit", corner_up, envelope_upper, top),
        ("cruise speed, positive limit", cruise, envelope_upper, top),
        ("speed limit, positive limit", speed_limit, envelope_upper, top),
        ("speed limit, negative limit", speed_limit, envelope_lower, bottom),
        ("cruise speed, negative limit", cruise, envelope_lower, bottom),
        ("stall line meets negative limit", corner_down, envelope_lower, bottom),
        ("inverted stall at -1 g", stall_speed_inverted, envelope_lower, bottom),
    )
    corners = tuple(
        Corner(name, float(speed), float(load_factor))
        for name, speed, boundary, facts in walk
        if np.isfinite(speed) and np.isfinite(load_factor := boundary(speed, *facts))
    )
    speeds = np.unique(
        np.concatenate((np.linspace(0.0, speed_limit, points), [corner.equivalent_airspeed for corner in corners]))
    )
    return Envelope(speeds, envelope_upper(speeds, *top), envelope_lower(speeds, *bottom), corners)


def _meeting(stall: float, size: float, facts: tuple[float, ...], end: float) -> float:
    """Speed at which the stall line reaches the limit, NaN where it does not before the speed limit."""
    _, limit, _, cruise, at_dive = facts
    speed = stall * np.sqrt(size) if size > 0.0 else np.nan
    if speed <= end and not (np.isfinite(at_dive) and speed > cruise):
        return float(speed)
    if not (np.isfinite(at_dive) and cruise < speed) or not stall > 0.0:
        return float("nan")
    # on the taper: (V/Vs)2 = |limit| + share * (|at_dive| - |limit|), share linear in V
    slope = (abs(at_dive) - abs(limit)) / (end - cruise)
    roots = np.roots([1.0 / stall**2, -slope, slope * cruise - abs(limit)])
    inside = [float(root.real) for root in roots if abs(root.imag) < 1e-12 and cruise <= root.real <= end]
    return inside[0] if inside else float("nan")
