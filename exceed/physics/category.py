"""Published limit load factors of airworthiness categories, for an aeroplane whose manual is not at hand.

Rule figures, never a flight manual's: a real aircraft's own manual always wins.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from exceed.core.constants import POUND
from exceed.physics._arrays import Array, finite, floats, quiet, where

ULTIMATE_OVER_LIMIT = 1.5  # 14 CFR 25.303, CAM 522.303 looked up; 23.303 from memory
ROLLING_FRACTION = 2.0 / 3.0  # 14 CFR 23.349(b), 25.349(a)
UNKNOWN = float("nan")


@dataclass(frozen=True, slots=True)
class CategoryLimits:
    """Limit load factors of a category, 1; NaN where the published figure is not at hand.

    `maximum`, `minimum` up to cruise speed (V_C, or V_A for sailplanes); `..._at_dive` at V_D, linear between;
    `..._flaps` with flaps out, `..._airbrakes` with airbrakes out. `source` and `flaps_source` are keys of SOURCES;
    `needs_mass` says that the formula wants the maximum take-off mass; `note` how the figures were had.
    """

    category: str
    maximum: float
    minimum: float
    maximum_at_dive: float
    minimum_at_dive: float
    maximum_flaps: float
    minimum_flaps: float
    maximum_airbrakes: float
    minimum_airbrakes: float
    source: str
    flaps_source: str
    needs_mass: bool
    note: str


def _row(
    category: str,
    limits: tuple[float, float],
    dive: tuple[float, float],
    flaps: tuple[float, float],
    source: str,
    note: str,
    *,
    flaps_source: str = "",
    airbrakes: tuple[float, float] = (UNKNOWN, UNKNOWN),
    needs_mass: bool = False,
) -> CategoryLimits:
    return CategoryLimits(
        category, *limits, *dive, *flaps, *airbrakes, source, flaps_source or source, needs_mass, note
    )


_LOWER_FLAPS = "flaps-out lower figure 0 from a public question bank"
# The mass-dependent ones carry NaN here and are completed by `category_load_factors`.
CATEGORIES: dict[str, CategoryLimits] = {
    row.category: row
    for row in (
        _row(
            "normal", (UNKNOWN, UNKNOWN), (UNKNOWN, 0.0), (2.0, 0.0), "14CFR23-OLD", f"looked up; {_LOWER_FLAPS}",
            needs_mass=True,
        ),
        _row(
            "commuter", (UNKNOWN, UNKNOWN), (UNKNOWN, 0.0), (2.0, 0.0), "14CFR23-OLD", f"looked up; {_LOWER_FLAPS}",
            needs_mass=True,
        ),
        _row("utility", (4.4, -1.76), (4.4, -1.0), (2.0, 0.0), "14CFR23-OLD", f"looked up; {_LOWER_FLAPS}"),
        _row("aerobatic", (6.0, -3.0), (6.0, -1.0), (2.0, 0.0), "14CFR23-OLD", f"looked up; {_LOWER_FLAPS}"),
        _row(
            "transport", (UNKNOWN, -1.0), (UNKNOWN, 0.0), (2.0, 0.0), "14CFR25", f"looked up; {_LOWER_FLAPS}",
            flaps_source="CS-25", needs_mass=True,
        ),
        _row(
            "very-light", (3.8, -1.5), (UNKNOWN, UNKNOWN), (UNKNOWN, UNKNOWN), "CS-VLA",
            "factors from memory; figures at V_D and with flaps not at hand",
        ),
        _row(
            "light-sport", (4.0, -2.0), (UNKNOWN, UNKNOWN), (UNKNOWN, UNKNOWN), "ASTM-F2245",
            "+4 confirmed by a public design study, -2 from memory; figures at V_D and with flaps not at hand",
        ),
        _row(
            "sailplane-utility", (5.3, -2.65), (4.0, -1.5), (4.0, UNKNOWN), "CS-22",
            "looked up in public JAR-22 material but -1.5 at V_D, from memory; flaps figure is for landing settings",
            airbrakes=(3.5, -1.5),
        ),
        _row(
            "sailplane-aerobatic", (7.0, -5.0), (7.0, -5.0), (4.0, UNKNOWN), "CS-22",
            "from memory; flaps and airbrakes figures looked up", airbrakes=(3.5, -1.5),
        ),
    )
}  # fmt: skip


@quiet
def load_factor_maximum_by_mass(maximum_take_off_mass: ArrayLike) -> Array:
    """Positive limit of the normal and commuter categories: 2.1 + 24000/(W + 10000), W in lb, at most 3.8.

    Parameters: maximum_take_off_mass : (n,) array, kg.    Returns: (n,) array, 1. NaN where the mass is not positive.
    Source: [14CFR23-OLD] 23.337(a).
    """
    weight = floats(maximum_take_off_mass) / POUND
    return where(weight > 0.0, np.minimum(3.8, 2.1 + 24000.0 / (weight + 10000.0)))


@quiet
def load_factor_maximum_transport(maximum_take_off_mass: ArrayLike) -> Array:
    """Positive limit of transport aeroplanes: the same formula, at least 2.5 and at most 3.8.

    Parameters: maximum_take_off_mass : (n,) array, kg.    Returns: (n,) array, 1. NaN where the mass is not positive.
    Source: [14CFR25] 25.337(b).
    """
    weight = floats(maximum_take_off_mass) / POUND
    return where(weight > 0.0, np.clip(2.1 + 24000.0 / (weight + 10000.0), 2.5, 3.8))


@quiet
def ultimate_load_factor(load_factor: ArrayLike) -> Array:
    """Ultimate load factor of a limit load factor: 1.5 times it.

    Parameters: load_factor : (n,) array, 1.    Returns: (n,) array, 1.
    Source: [14CFR25] 25.303, [CAM-522] 522.303, [14CFR23-OLD] 23.303.
    """
    return finite(ULTIMATE_OVER_LIMIT * floats(load_factor))


def category_load_factors(category: str, maximum_take_off_mass: float | None = None) -> CategoryLimits:
    """Published limit load factors of a category.

    Parameters
    ----------
    category : a key of CATEGORIES: normal, utility, aerobatic, commuter, transport, very-light, light-sport,
        sailplane-utility, sailplane-aerobatic
    maximum_take_off_mass : kg; asked for where `needs_mass`, else not used

    Returns
    -------
    CategoryLimits; where the mass is asked for and not given, the figures that need it are NaN.

    Raises
    ------
    ValueError : a category that is not in the table.

    Source
    ------
    [14CFR23-OLD], [14CFR25], [CS-22], [CS-VLA], [ASTM-F2245], as the row says.
    """
    if category not in CATEGORIES:
        raise ValueError(f"no category {category!r}; known: {', '.join(sorted(CATEGORIES))}")
    row = CATEGORIES[category]
    if not row.needs_mass:
        return row
    mass = UNKNOWN if maximum_take_off_mass is None else maximum_take_off_mass
    if category == "transport":
        maximum = float(load_factor_maximum_transport(mass))
        minimum = row.minimum
    else:
        maximum = float(load_factor_maximum_by_mass(mass))
        minimum = -0.4 * maximum
    return CategoryLimits(
        category=row.category,
        maximum=maximum,
        minimum=minimum,
        maximum_at_dive=maximum,
        minimum_at_dive=row.minimum_at_dive,
        maximum_flaps=row.maximum_flaps,
        minimum_flaps=row.minimum_flaps,
        maximum_airbrakes=row.maximum_airbrakes,
        minimum_airbrakes=row.minimum_airbrakes,
        source=row.source,
        flaps_source=row.flaps_source,
        needs_mass=row.needs_mass,
        note=row.note,
    )
